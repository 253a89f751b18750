# A rule of thumb for one watcher, as Python. A calculation, made by thumbwright: read
# the caution and the cost below before you use it.
#
# Case: Lot inspection by two inspectors
# Case lot-inspection, digest 97f28eaf3a9e; thumbwright 0.1.0.
# For Second inspector (second), watching First inspector (first).
# plus: bad lot
# minus: good lot
# Worked out for steps 1 to 120. At later steps the rows that are open at the end still hold,
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
# decide()                                  0.1012             0.0167       17.10
# answering by value()                      0.1009             0.0167       17.11
# the full calculation                      0.1012             0.0167       17.09
# undecided neighbours ignored              0.0517             0.0206       21.38
# everybody ignored                         0.0994             0.0220       26.27
#
# FUNCTIONS
# value(step, first): what the situation is worth, in nats: what it adds to the log-odds for
#   plus. A float; where an argument is a list or an array, an array (this needs numpy).
# decide(tally, step, first): what to show. "plus", "minus" or "undecided"; likewise an array
#   of these. States, first answers and thresholds are handed over by name or by code.
#   ValueError for anything else.
#
# ARGUMENTS
# tally: the own count: a whole number, the sum over all own observations of what each moves
#   it (0 +0, 1 +1)
# step: own observations so far, this one included (steps of one item); from 1
# first: what First inspector shows now (undecided: no tag yet; plus: lot tagged rejected;
#   minus: lot tagged accepted)
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


def value(step, first):
    """Return what the situation is worth, in nats; ValueError where that is not known."""
    step = _whole("step", step, 1)
    first = _code("first", first, _STATES)

    rows = (
        ((step >= 11) & (first == _MINUS), -2.286722153),
        ((step <= 4) & ((first == _UNDECIDED) | (first == _MINUS)), -0.009379590603),
        ((step >= 5) & (step <= 6) & ((first == _UNDECIDED) | (first == _MINUS)), -0.06831709796),
        ((step >= 7) & (step <= 8) & ((first == _UNDECIDED) | (first == _MINUS)), -0.1395988488),
        ((step >= 9) & (step <= 10) & ((first == _UNDECIDED) | (first == _MINUS)), -0.227380078),
        ((step >= 11) & (step <= 11) & (first == _UNDECIDED), -0.3021154283),
        ((step >= 12) & (step <= 12) & (first == _UNDECIDED), -0.3552647973),
        ((step >= 13) & (step <= 13) & (first == _UNDECIDED), -0.4108346484),
        ((step >= 14) & (step <= 14) & (first == _UNDECIDED), -0.4685934826),
        ((step >= 15) & (step <= 15) & (first == _UNDECIDED), -0.5283408472),
        ((step >= 16) & (step <= 16) & (first == _UNDECIDED), -0.5899020423),
        ((step >= 17) & (step <= 17) & (first == _UNDECIDED), -0.6531239076),
        ((step >= 18) & (step <= 19) & (first == _UNDECIDED), -0.7500982637),
        ((step >= 20) & (step <= 24) & (first == _UNDECIDED), -0.8635289895),
        ((step >= 25) & (step <= 28) & (first == _UNDECIDED), 0.4121382511),
        ((step >= 29) & (step <= 32) & (first == _UNDECIDED), 0.234287806),
        ((step >= 33) & (step <= 35) & (first == _UNDECIDED), 0.0387761926),
        ((step >= 36) & (step <= 39) & (first == _UNDECIDED), -0.1773909195),
        ((step >= 40) & (step <= 43) & (first == _UNDECIDED), -0.4501289473),
        ((step >= 44) & (step <= 49) & (first == _UNDECIDED), -0.7430166317),
        ((step >= 50) & (step <= 59) & (first == _UNDECIDED), 0.2711233102),
        ((step >= 60) & (first == _UNDECIDED), -0.3076534977),
        ((step <= 10) & (first == _PLUS), 4.18961588),
        ((step >= 11) & (first == _PLUS), 3.559104757),
    )
    return _held(rows, step, first)[0]


def decide(tally, step, first):
    """Return "plus", "minus" or "undecided"; ValueError where the rule does not say."""
    tally = _whole("tally", tally)
    step = _whole("step", step, 1)
    first = _code("first", first, _STATES)

    never = float("inf")
    rows = (  # condition, minus at or below, plus at or above
        ((step <= 14) & (first == _UNDECIDED), -never, 2),
        ((step >= 15) & (step <= 16) & (first == _UNDECIDED), -never, 3),
        ((step >= 17) & (step <= 40) & (first == _UNDECIDED), 0, 3),
        ((step >= 41) & (step <= 42) & (first == _UNDECIDED), 0, 4),
        ((step >= 43) & (step <= 65) & (first == _UNDECIDED), 1, 4),
        ((step >= 66) & (step <= 68) & (first == _UNDECIDED), 1, 5),
        ((step >= 69) & (first == _UNDECIDED), 2, 5),
        ((step <= 10) & (first == _PLUS), -never, 0),
        ((step >= 11) & (step <= 32) & (first == _PLUS), -never, 1),
        ((step >= 33) & (step <= 57) & (first == _PLUS), -never, 2),
        ((step >= 58) & (step <= 61) & (first == _PLUS), -never, 3),
        ((step >= 62) & (step <= 86) & (first == _PLUS), 0, 3),
        ((step >= 87) & (step <= 112) & (first == _PLUS), 1, 4),
        ((step >= 113) & (first == _PLUS), 2, 4),
        ((step <= 46) & (first == _MINUS), 1, 4),
        ((step >= 47) & (step <= 49) & (first == _MINUS), 1, 5),
        ((step >= 50) & (step <= 71) & (first == _MINUS), 2, 5),
        ((step >= 72) & (step <= 75) & (first == _MINUS), 2, 6),
        ((step >= 76) & (step <= 96) & (first == _MINUS), 3, 6),
        ((step >= 97) & (step <= 100) & (first == _MINUS), 3, 7),
        ((step >= 101) & (first == _MINUS), 4, 7),
    )
    minus_at, plus_at = _held(rows, step, first)
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
    (11, "minus", -2.286722153),
    (120, "minus", -2.286722153),
    (1, "undecided", -0.009379590603),
    (4, "minus", -0.009379590603),
    (5, "undecided", -0.06831709796),
    (6, "minus", -0.06831709796),
    (7, "undecided", -0.1395988488),
    (8, "minus", -0.1395988488),
    (9, "undecided", -0.227380078),
    (10, "minus", -0.227380078),
    (11, "undecided", -0.3021154283),
    (12, "undecided", -0.3552647973),
    (13, "undecided", -0.4108346484),
    (14, "undecided", -0.4685934826),
    (15, "undecided", -0.5283408472),
    (16, "undecided", -0.5899020423),
    (17, "undecided", -0.6531239076),
    (18, "undecided", -0.7500982637),
    (19, "undecided", -0.7500982637),
    (20, "undecided", -0.8635289895),
    (24, "undecided", -0.8635289895),
    (25, "undecided", 0.4121382511),
    (28, "undecided", 0.4121382511),
    (29, "undecided", 0.234287806),
    (32, "undecided", 0.234287806),
    (33, "undecided", 0.0387761926),
    (35, "undecided", 0.0387761926),
    (36, "undecided", -0.1773909195),
    (39, "undecided", -0.1773909195),
    (40, "undecided", -0.4501289473),
    (43, "undecided", -0.4501289473),
    (44, "undecided", -0.7430166317),
    (49, "undecided", -0.7430166317),
    (50, "undecided", 0.2711233102),
    (59, "undecided", 0.2711233102),
    (60, "undecided", -0.3076534977),
    (120, "undecided", -0.3076534977),
    (1, "plus", 4.18961588),
    (10, "plus", 4.18961588),
    (11, "plus", 3.559104757),
    (120, "plus", 3.559104757),
)
_DECISIONS = (  # tally, arguments in their order, answer
    (0, 1, "undecided", "undecided"),
    (1, 14, "undecided", "undecided"),
    (2, 14, "undecided", "plus"),
    (0, 15, "undecided", "undecided"),
    (2, 16, "undecided", "undecided"),
    (3, 16, "undecided", "plus"),
    (1, 17, "undecided", "undecided"),
    (0, 17, "undecided", "minus"),
    (2, 40, "undecided", "undecided"),
    (3, 40, "undecided", "plus"),
    (1, 41, "undecided", "undecided"),
    (0, 41, "undecided", "minus"),
    (3, 42, "undecided", "undecided"),
    (4, 42, "undecided", "plus"),
    (2, 43, "undecided", "undecided"),
    (1, 43, "undecided", "minus"),
    (3, 65, "undecided", "undecided"),
    (4, 65, "undecided", "plus"),
    (2, 66, "undecided", "undecided"),
    (1, 66, "undecided", "minus"),
    (4, 68, "undecided", "undecided"),
    (5, 68, "undecided", "plus"),
    (3, 69, "undecided", "undecided"),
    (2, 69, "undecided", "minus"),
    (4, 120, "undecided", "undecided"),
    (5, 120, "undecided", "plus"),
    (0, 1, "plus", "plus"),
    (-1, 10, "plus", "undecided"),
    (0, 10, "plus", "plus"),
    (0, 11, "plus", "undecided"),
    (0, 32, "plus", "undecided"),
    (1, 32, "plus", "plus"),
    (0, 33, "plus", "undecided"),
    (1, 57, "plus", "undecided"),
    (2, 57, "plus", "plus"),
    (0, 58, "plus", "undecided"),
    (2, 61, "plus", "undecided"),
    (3, 61, "plus", "plus"),
    (1, 62, "plus", "undecided"),
    (0, 62, "plus", "minus"),
    (2, 86, "plus", "undecided"),
    (3, 86, "plus", "plus"),
    (2, 87, "plus", "undecided"),
    (1, 87, "plus", "minus"),
    (3, 112, "plus", "undecided"),
    (4, 112, "plus", "plus"),
    (3, 113, "plus", "undecided"),
    (2, 113, "plus", "minus"),
    (3, 120, "plus", "undecided"),
    (4, 120, "plus", "plus"),
    (2, 1, "minus", "undecided"),
    (1, 1, "minus", "minus"),
    (3, 46, "minus", "undecided"),
    (4, 46, "minus", "plus"),
    (2, 47, "minus", "undecided"),
    (1, 47, "minus", "minus"),
    (4, 49, "minus", "undecided"),
    (5, 49, "minus", "plus"),
    (3, 50, "minus", "undecided"),
    (2, 50, "minus", "minus"),
    (4, 71, "minus", "undecided"),
    (5, 71, "minus", "plus"),
    (3, 72, "minus", "undecided"),
    (2, 72, "minus", "minus"),
    (5, 75, "minus", "undecided"),
    (6, 75, "minus", "plus"),
    (4, 76, "minus", "undecided"),
    (3, 76, "minus", "minus"),
    (5, 96, "minus", "undecided"),
    (6, 96, "minus", "plus"),
    (4, 97, "minus", "undecided"),
    (3, 97, "minus", "minus"),
    (6, 100, "minus", "undecided"),
    (7, 100, "minus", "plus"),
    (5, 101, "minus", "undecided"),
    (4, 101, "minus", "minus"),
    (6, 120, "minus", "undecided"),
    (7, 120, "minus", "plus"),
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
