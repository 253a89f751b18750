# A rule of thumb for one watcher, as Python. A calculation, made by thumbwright: read
# the caution and the cost below before you use it.
#
# Case: Frost watch in two orchards
# Case frost-watch, digest 56c9f779be1f; thumbwright 0.1.0.
# For Mill field (mill), watching Upper field (upper).
# plus: frost tonight
# minus: no frost tonight
# Worked out for steps 1 to 40. At later steps the rows that are open at the end still hold,
#   but nothing was worked out or priced there.
#
# CAUTION
# Property or money can be lost by a wrong answer: contracts, agreed standards and insurance
#   terms prevail over it.
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
#
#                                 wrong, plus true  wrong, minus true  mean steps
# decide()                                  0.2168             0.1686        7.27
# answering by value()                      0.2168             0.1686        7.27
# the full calculation                      0.2168             0.1686        7.27
# undecided neighbours ignored              0.2603             0.1581        6.66
# everybody ignored                         0.2281             0.2281        8.13
#
# FUNCTIONS
# value(step, upper): what the situation is worth, in nats: what it adds to the log-odds for
#   plus. A float; where an argument is a list or an array, an array (this needs numpy).
# decide(tally, step, upper): what to show. "plus", "minus" or "undecided"; likewise an array
#   of these. States, first answers and thresholds are handed over by name or by code.
#   ValueError for anything else.
#
# ARGUMENTS
# tally: the own count: a whole number, the sum over all own observations of what each moves
#   it (mild sign -1, frost sign +1)
# step: own observations so far, this one included (steps of 10 minutes); from 1
# upper: what Upper field shows now (undecided: lamp dark; plus: lamp lit; minus: lamp
#   blinking)
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


def value(step, upper):
    """Return what the situation is worth, in nats; ValueError where that is not known."""
    step = _whole("step", step, 1)
    upper = _code("upper", upper, _STATES)

    rows = (
        ((step >= 3) & (upper == _MINUS), -0.8109302162),
        ((step <= 2), 0.0),
        ((step >= 5) & (step <= 6) & (upper == _UNDECIDED), 0.3610133455),
        ((step >= 7) & (upper == _UNDECIDED), 0.3974664539),
        ((step >= 3) & (step <= 4) & ((upper == _UNDECIDED) | (upper == _PLUS)), 0.2719337155),
        ((step >= 5) & (upper == _PLUS), 1.621860432),
    )
    return _held(rows, step, upper)[0]


def decide(tally, step, upper):
    """Return "plus", "minus" or "undecided"; ValueError where the rule does not say."""
    tally = _whole("tally", tally)
    step = _whole("step", step, 1)
    upper = _code("upper", upper, _STATES)

    never = float("inf")
    rows = (  # condition, minus at or below, plus at or above
        ((step <= 2) & (upper == _UNDECIDED), -3, 3),
        ((step >= 3) & (upper == _UNDECIDED), -4, 3),
        ((upper == _PLUS), -7, -1),
        ((upper == _MINUS), -1, 5),
    )
    minus_at, plus_at = _held(rows, step, upper)
    return _answer(tally, minus_at, plus_at)


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
    (3, "minus", -0.8109302162),
    (40, "minus", -0.8109302162),
    (1, "undecided", 0.0),
    (2, "minus", 0.0),
    (5, "undecided", 0.3610133455),
    (6, "undecided", 0.3610133455),
    (7, "undecided", 0.3974664539),
    (40, "undecided", 0.3974664539),
    (3, "undecided", 0.2719337155),
    (4, "plus", 0.2719337155),
    (5, "plus", 1.621860432),
    (40, "plus", 1.621860432),
)
_DECISIONS = (  # tally, arguments in their order, answer
    (-2, 1, "undecided", "undecided"),
    (-3, 1, "undecided", "minus"),
    (2, 2, "undecided", "undecided"),
    (3, 2, "undecided", "plus"),
    (-3, 3, "undecided", "undecided"),
    (-4, 3, "undecided", "minus"),
    (2, 40, "undecided", "undecided"),
    (3, 40, "undecided", "plus"),
    (-6, 1, "plus", "undecided"),
    (-7, 1, "plus", "minus"),
    (-2, 40, "plus", "undecided"),
    (-1, 40, "plus", "plus"),
    (0, 1, "minus", "undecided"),
    (-1, 1, "minus", "minus"),
    (4, 40, "minus", "undecided"),
    (5, 40, "minus", "plus"),
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
