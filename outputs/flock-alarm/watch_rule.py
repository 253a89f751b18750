# A rule of thumb for one watcher, as Python. A calculation, made by thumbwright: read
# the caution and the cost below before you use it.
#
# Case: Flock alarm on a stubble field
# Case flock-alarm, digest adbf2c693957; thumbwright 0.1.0.
# For any of the group, all being alike: here Agent 1 (a1), watching Agent 2 (a2), Agent 3
#   (a3), Agent 4 (a4), Agent 5 (a5), Agent 6 (a6), Agent 7 (a7), Agent 8 (a8).
# plus: hawk near
# minus: no hawk
# Worked out for steps 1 to 20. At later steps the rows that are open at the end still hold,
#   but nothing was worked out or priced there.
#
# CAUTION
# Animals can suffer from a wrong answer: animal welfare law and veterinary advice come before
#   it.
# An alarm, an order or sure evidence overrides it at once.
# This is a calculation under the assumptions stated with it, not a guarantee.
# It defers to local rules, codes of practice, contracts and the judgement of licensed or
#   trained people; where they differ from it, follow them.
# Where an assumption is clearly untrue, put it aside and fall back on usual practice.
#
# COST
# Share of outings that end in a wrong answer, given that plus or that minus is true, and the
#   mean number of steps used, where this agent alone uses the rule and the others are exact.
#   It holds for this very rule: price it again after any change.
# Not every figure is exact. What happens where everybody uses the rule was sampled, 4,000
#   public histories of too many to enumerate; those figures carry standard errors and are not
#   exact. Others take the agent for exact; by a rule it shows them what their model calls
#   impossible up to 1.22 times per outing, which they read as the same call at the latest
#   earlier moment at which the model allowed it, or as no news.
#
#                                 wrong, plus true  wrong, minus true  mean steps
# decide(), by value()                      0.0331             0.0633        5.52
# the full calculation                      0.0837             0.0620        4.80
# undecided neighbours ignored              0.0932             0.1499        4.26
# everybody ignored                         0.0814             0.1361       11.35
#
# FUNCTIONS
# value(step, plus_shown, minus_shown): what the situation is worth, in nats: what it adds to
#   the log-odds for plus. A float; where an argument is a list or an array, an array (this
#   needs numpy).
# decide(tally, step, plus_shown, minus_shown): what to show. "plus", "minus" or "undecided";
#   likewise an array of these. States, first answers and thresholds are handed over by name
#   or by code. ValueError for anything else.
#
# ARGUMENTS
# tally: the own evidence in nats, the prior left out: the sum over all own observations of
#   the natural logarithm of how much likelier each is if plus is true (here 1.349926716949 *
#   own count - 0.2513144282809 * step)
# step: own observations so far, this one included (steps of second); from 1
# plus_shown: how many of the seen agents show plus; from 0
# minus_shown: how many of the seen agents show minus; from 0
#
# CHECK
# python watch_rule.py runs the situations at the end of the file; exit status 1: mismatch.
"""What to answer in what situation. The comment above says for whom, and at what cost."""

from numbers import Real as _Real

try:
    import numpy as _numpy
except ImportError:  # one situation at a time needs the standard library alone
    _numpy = None

_STATES = ("undecided", "plus", "minus")
_UNDECIDED, _PLUS, _MINUS = 0, 1, 2

_PRIOR = -0.847297860387  # nats
_MINUS_AT = -2.9063530612  # the agent answers minus at this belief (nats) or below
_PLUS_AT = 0.536093102676  # and plus at this belief or above
_TIE = 1e-09  # so close to a threshold counts as having reached it


def value(step, plus_shown, minus_shown):
    """Return what the situation is worth, in nats; ValueError where that is not known."""
    step = _whole("step", step, 1)
    plus_shown = _whole("plus_shown", plus_shown, 0)
    minus_shown = _whole("minus_shown", minus_shown, 0)

    rows = (
        ((step >= 3) & (plus_shown <= 0) & (minus_shown <= 2), -0.6813447529),
        ((step >= 2) & (step <= 2) & (plus_shown <= 0), -0.3911367569),
        ((step >= 3) & (plus_shown <= 0) & (minus_shown >= 3), -2.21906361),
        ((step <= 1), 0.0),
        ((step >= 3) & (plus_shown >= 1) & (plus_shown <= 3) & (minus_shown <= 3), 0.3489952864),
        ((step >= 2) & (step <= 2) & (plus_shown >= 1) & (plus_shown <= 3), 1.513237877),
        ((step >= 3) & (plus_shown >= 1) & (plus_shown <= 3) & (minus_shown >= 4), -1.347774071),
        ((step >= 2) & (plus_shown >= 4), 2.037373055),
    )
    return _held(rows, step, plus_shown, minus_shown)[0]


def decide(tally, step, plus_shown, minus_shown):
    """Return "plus", "minus" or "undecided"; ValueError where the rule does not say."""
    tally = _number("tally", tally)
    belief = _PRIOR + tally + value(step, plus_shown, minus_shown)
    return _answer(_number("belief", belief), _MINUS_AT + _TIE, _PLUS_AT - _TIE)


def _is_many(given):
    """Tell whether it is a list or an array, for which numpy is needed."""
    if isinstance(given, str) or not hasattr(given, "__len__"):
        return False
    if _numpy is None:
        raise ValueError("many situations at once need numpy")
    return True


def _held(rows, *inputs):
    """Return what stands beside the first condition that holds, in each situation."""
    if not any(_is_many(one) for one in inputs):
        for row in rows:
            if row[0]:
                return row[1:]
        raise ValueError("no row of the rule holds in this situation")
    shape = _numpy.broadcast_shapes(*map(_numpy.shape, inputs))
    conditions = [_numpy.broadcast_to(row[0], shape) for row in rows]
    if not _numpy.any(conditions, axis=0).all():
        raise ValueError("no row of the rule holds in some of these situations")
    return [_numpy.select(conditions, column) for column in list(zip(*rows))[1:]]


def _answer(number, minus_at, plus_at):
    """Compare a tally or a belief with where an answer is given."""
    plus, minus = number >= plus_at, number <= minus_at
    if _is_many(plus):
        return _numpy.where(plus, "plus", _numpy.where(minus, "minus", "undecided"))
    return "plus" if plus else "minus" if minus else "undecided"


def _whole(name, given, least=None):
    """Return a whole number, or an array of them; ValueError for anything else."""
    if _is_many(given):
        given = _numpy.asarray(given)
        fine = given.dtype.kind in "iuf" and _numpy.isfinite(given).all()
        fine = fine and (given == _numpy.floor(given)).all()
        fine = fine and (least is None or (given >= least).all())
    else:
        fine = isinstance(given, _Real) and not isinstance(given, bool) and given // 1 == given
        fine = fine and (least is None or given >= least)
    if not fine:
        start = "" if least is None else f" from {least}"
        raise ValueError(f"{name} must be a whole number{start}, not {given!r}")
    return given


def _number(name, given):
    """Return a number, or an array of them; ValueError for what is none."""
    if _is_many(given):
        given = _numpy.asarray(given)
        fine = given.dtype.kind in "iuf" and not _numpy.isnan(given).any()
    else:
        fine = isinstance(given, _Real) and not isinstance(given, bool) and given == given
    if not fine:
        raise ValueError(f"{name} must be a number, not {given!r}")
    return given


def _code(name, given, names):
    """Return the code of a name, or the codes of many; ValueError for an unknown one."""
    if not _is_many(given):
        if isinstance(given, str) and given in names:
            return names.index(given)
        fine = isinstance(given, _Real) and not isinstance(given, bool)
        if fine and given in range(len(names)):
            return int(given)
        raise ValueError(f"{name} must be one of {', '.join(names)}, not {given!r}")
    given = codes = _numpy.asarray(given)
    if given.dtype.kind in "UO":
        codes = _numpy.full(given.shape, -1)
        for code, known in enumerate(names):
            codes[given == known] = code
    if codes.dtype.kind not in "iu" or ((codes < 0) | (codes >= len(names))).any():
        raise ValueError(f"{name} must be each one of {', '.join(names)}, not {given!r}")
    return codes


_WORTHS = (  # arguments in their order, nats
    (3, 0, 0, -0.6813447529),
    (20, 0, 2, -0.6813447529),
    (2, 0, 0, -0.3911367569),
    (2, 0, 3, -0.3911367569),
    (3, 0, 3, -2.21906361),
    (20, 0, 6, -2.21906361),
    (1, 0, 0, 0.0),
    (1, 3, 3, 0.0),
    (3, 1, 0, 0.3489952864),
    (20, 3, 3, 0.3489952864),
    (2, 1, 0, 1.513237877),
    (2, 3, 3, 1.513237877),
    (3, 1, 4, -1.347774071),
    (20, 3, 7, -1.347774071),
    (2, 4, 0, 2.037373055),
    (20, 7, 3, 2.037373055),
)
_DECISIONS = (  # tally, arguments in their order, answer
    (-1.37770944791, 3, 0, 0, "undecided"),
    (-1.37771144791, 3, 0, 0, "minus"),
    (2.06473471596, 20, 0, 2, "undecided"),
    (2.06473671596, 20, 0, 2, "plus"),
    (-1.66791744391, 2, 0, 0, "undecided"),
    (-1.66791944391, 2, 0, 0, "minus"),
    (1.77452671996, 2, 0, 3, "undecided"),
    (1.77452871996, 2, 0, 3, "plus"),
    (0.160009409187, 3, 0, 3, "undecided"),
    (0.160007409187, 3, 0, 3, "minus"),
    (3.60245357306, 20, 0, 6, "undecided"),
    (3.60245557306, 20, 0, 6, "plus"),
    (-2.05905420081, 1, 0, 0, "undecided"),
    (-2.05905620081, 1, 0, 0, "minus"),
    (1.38338996306, 1, 3, 3, "undecided"),
    (1.38339196306, 1, 3, 3, "plus"),
    (-2.40804948721, 3, 1, 0, "undecided"),
    (-2.40805148721, 3, 1, 0, "minus"),
    (1.03439467666, 20, 3, 3, "undecided"),
    (1.03439667666, 20, 3, 3, "plus"),
    (-3.57229207781, 2, 1, 0, "undecided"),
    (-3.57229407781, 2, 1, 0, "minus"),
    (-0.129847913937, 2, 3, 3, "undecided"),
    (-0.129845913937, 2, 3, 3, "plus"),
    (-0.711280129813, 3, 1, 4, "undecided"),
    (-0.711282129813, 3, 1, 4, "minus"),
    (2.73116403406, 20, 3, 7, "undecided"),
    (2.73116603406, 20, 3, 7, "plus"),
    (-4.09642725581, 2, 4, 0, "undecided"),
    (-4.09642925581, 2, 4, 0, "minus"),
    (-0.653983091937, 20, 7, 3, "undecided"),
    (-0.653981091937, 20, 7, 3, "plus"),
)


def _said(function, given):
    """Return what a function says, or how it refuses."""
    try:
        return function(*given)
    except ValueError as refusal:
        return f"refused: {refusal}"


def _self_check():
    """Return how many of the situations above are answered otherwise; say which."""
    wrong = 0
    checks = [(value, _WORTHS), (decide, _DECISIONS)]
    for function, samples in checks:
        for *given, expected in samples:
            said = [_said(function, given)]
            if _numpy is not None:
                said.extend(_said(function, [[one] for one in given]))
            if said != [expected] * len(said):
                print(f"{function.__name__}{tuple(given)} is {said[0]}, not {expected}")
                wrong += 1
    if not str(_said(decide, [0, 0, *_DECISIONS[0][2:-1]])).startswith("refused"):
        print("decide() takes 0 for a step")
        wrong += 1
    return wrong


if __name__ == "__main__":
    import sys

    failed = _self_check()
    print(f"{failed} wrong" if failed else "all as it should be")
    sys.exit(1 if failed else 0)
