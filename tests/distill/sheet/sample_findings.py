"""Findings for tests of the sheet: made-up or rounded figures, none of them computed here.

``frost`` is a pair with a peg on a scale, ``lots`` counts up by ranges of items, ``three``
watches three others, ``long_scale`` has bars too far apart for boxes, and ``readings`` has no
count that a person can keep.
"""

from __future__ import annotations

import math
from dataclasses import replace
from typing import Any

from thumbwright.distill.case import Case
from thumbwright.distill.findings import (
    CostBasis,
    Figures,
    Findings,
    FormResult,
    RowUse,
    WorthCurve,
)
from thumbwright.distill.rules import Row, Rule

ALPHA = math.log(1.5)
QUIET, PLUS, MINUS = (frozenset({state}) for state in ("undecided", "plus", "minus"))

FROST: dict[str, Any] = {
    "name": "frost-watch",
    "title": "Frost watch in two orchards",
    "question": {
        "plus": "frost tonight",
        "minus": "no frost tonight",
        "prior_plus": 0.5,
        "stakes": "property",
    },
    "words": {
        "check": "check",
        "plus_sign": "frost sign",
        "minus_sign": "mild sign",
        "shows_plus": "lamp lit",
        "shows_minus": "lamp blinking",
        "shows_nothing": "lamp dark",
        "do_plus": "light the lamp",
        "do_minus": "stand down",
    },
    "evidence": {"kind": "coin", "p": 0.6},
    "time": {"horizon": 40, "step_label": "10 minutes", "exchange": "once"},
    "thresholds": {
        "even": {"plus": 3, "minus": -3, "unit": "observations"},
        "quick-to-stand-down": {"plus": 4, "minus": -2, "unit": "observations"},
    },
    "agents": {
        "upper": {"name": "Upper field", "thresholds": "quick-to-stand-down", "sees": []},
        "mill": {"name": "Mill field", "thresholds": "even", "sees": ["upper"]},
    },
    "rule": {"agent": "mill"},
}

LOTS: dict[str, Any] = {
    "name": "lot-inspection",
    "title": "Two inspectors on one lot",
    "question": {"plus": "bad lot", "minus": "good lot", "stakes": "property"},
    "words": {
        "check": "item",
        "plus_sign": "defective",
        "minus_sign": "sound item",
        "shows_plus": "red tag",
        "shows_minus": "green tag",
        "shows_nothing": "no tag yet",
        "do_plus": "reject the lot",
        "do_minus": "accept the lot",
    },
    "evidence": {"kind": "bernoulli", "p_plus": 0.1, "p_minus": 0.01},
    "time": {"horizon": 120, "exchange": "once"},
    "thresholds": {"plan": {"false_plus": 0.05, "false_minus": 0.1}},
    "agents": {
        "first": {"name": "First inspector", "thresholds": "plan", "sees": []},
        "second": {"name": "Second inspector", "thresholds": "plan", "sees": ["first"]},
    },
    "rule": {"agent": "second", "rows": 24},
}

LOTS_ALONE = tuple(
    Row(first, last, minus_at=low, plus_at=high)
    for first, last, low, high in (
        (None, 19, None, 2),
        (20, 23, None, 3),
        (24, 45, 0, 3),
        (46, 48, 0, 4),
        (49, 70, 1, 4),
        (71, 73, 1, 5),
        (74, 95, 2, 5),
        (96, 99, 2, 6),
        (100, None, 3, 6),
    )
)


def figures(plus: float, minus: float, step: float, **changes: Any) -> Figures:
    """Return figures with the two wrong answers and the mean step given."""
    made = Figures(
        given_plus={"plus": 1 - plus, "minus": plus, "undecided": 0.0, "steps": step},
        given_minus={"plus": minus, "minus": 1 - minus, "undecided": 0.0, "steps": step},
        wrong_given_plus=plus,
        wrong_given_minus=minus,
        accuracy=1 - (plus + minus) / 2,
        mean_step=step,
        risk=0.29875,
        accuracy_lost=-1.25e-6,
        delay_added=0.03125,
        benefit_kept=0.98765,
        off_model=0.0,
    )
    return replace(made, **changes)


def priced(rule: Rule, cost: Figures, notes: tuple[str, ...] = ()) -> FormResult:
    """Return ``rule`` with figures and even use of its rows."""
    count = len(rule.rows)
    uses = tuple(RowUse(steps_in_force=7.0 / count, calls=1.0 / count) for _ in rule.rows)
    return FormResult(rule, cost, uses, 0.98123, 0.98765, notes)


def bars(*rows: tuple[Any, ...], agent: str, seen: tuple[str, ...]) -> Rule:
    """Return a rule of bars from (from, to, states in the order of ``seen``, minus, plus)."""
    made = []
    for first, last, states, minus_at, plus_at in rows:
        shows = dict(zip(seen, states, strict=True))
        base = not made
        made.append(Row(first, last, shows, {}, None, minus_at, plus_at, base))
    return Rule("lines", agent, seen, tuple(made))


def frost(**changes: Any) -> Findings:
    """Return a pair: the mill watches a field that is quicker to stand down."""
    case = Case.model_validate(FROST | changes)
    seen = ("upper",)
    lines = bars(
        (1, 2, [QUIET], -3, 3),
        (3, None, [QUIET], -4, 3),
        (None, None, [PLUS], -7, -1),
        (None, None, [MINUS], -1, 5),
        agent="mill",
        seen=seen,
    )
    table = Rule(
        "table",
        "mill",
        seen,
        (
            Row(1, 2, {"upper": QUIET}, value=0.0),
            Row(3, None, {"upper": QUIET}, value=0.39),
            Row(None, None, {"upper": PLUS}, value=4 * ALPHA),
            Row(None, None, {"upper": MINUS}, value=-2 * ALPHA),
        ),
    )
    card = figures(0.21873, 0.17254, 7.0321)
    steps = tuple(range(1, 41))
    quiet = tuple(0.0 if t < 3 else 0.4 * (1 - 0.7 ** (t - 2)) for t in steps)
    lit = tuple(None if t < 5 else 4 * ALPHA for t in steps)
    down = tuple(None if t < 3 else -2 * ALPHA for t in steps)
    return Findings(
        case=case,
        digest=case.digest,
        version="0.1.0",
        agent="mill",
        seen=seen,
        forms={
            "lines": priced(lines, card, ("One row merged: it changes fewer than 1 in 10,000.",)),
            "table": priced(table, card),
        },
        exact=figures(0.21872, 0.17253, 7.0320),
        plain_count=figures(0.26012, 0.15987, 6.8811),
        alone=figures(0.22857, 0.22857, 8.1428),
        costs=CostBasis(1.0, 1.0, 0.015, None, True, (0.79, 1.26), (0.0133, 0.0171), (0.97, 0.995)),
        watching_is_worth=True,
        count_is_whole=True,
        alpha=ALPHA,
        beta=0.0,
        prior=0.0,
        bounds=(-3 * ALPHA, 3 * ALPHA),
        value_offsets=(-1, 1),
        worth_curves=(
            WorthCurve("undecided", ("undecided",), steps, quiet, quiet, quiet),
            WorthCurve("plus", ("plus",), steps, lit, lit, lit),
            WorthCurve("minus", ("minus",), steps, down, down, down),
        ),
        leans={"upper": "minus"},
        alone_rows=(Row(minus_at=-3, plus_at=3),),
        labels=("minus", "plus"),
        is_exact=True,
        caveats=(),
        near_tie_mass=0.0,
        example=tuple(
            {
                "step": step,
                "shows": {"upper": shown},
                "sign": sign,
                "peg": peg,
                "line": line,
                "act": act,
            }
            for step, shown, sign, peg, line, act in (
                (1, "undecided", "minus", -1, 0, "watch"),
                (2, "undecided", "minus", -2, 0, "watch"),
                (3, "undecided", "minus", -3, 1, "watch"),
                (4, "undecided", "plus", -2, 1, "watch"),
                (5, "plus", "plus", -1, 2, "plus"),
            )
        ),
    )


def lots(**changes: Any) -> Findings:
    """Return a second inspector who counts defectives and sees the first one's tag."""
    case = Case.model_validate(LOTS | changes)
    seen = ("first",)
    rows: list[tuple[Any, ...]] = []
    for state, low, high in (
        (QUIET, (24, 49, 74, 100), (2, 20, 45, 71, 96)),
        (PLUS, (77, 102), (1, 18, 43, 68, 94)),
        (MINUS, (4, 29, 54, 79, 104), (26, 51, 76, 101)),
    ):
        cuts = sorted({1, *low, *high})
        for first, after in zip(cuts, [*cuts[1:], None], strict=True):
            accept = sum(start <= first for start in low) - 1
            reject = sum(start <= first for start in high) + (1 if state is not PLUS else 0)
            last = None if after is None else after - 1
            rows.append(
                (
                    first,
                    last,
                    [state],
                    accept if accept >= 0 else None,
                    reject if first >= min(high) else None,
                )
            )
    lines = bars(*rows, agent="second", seen=seen)
    sample = frost()
    late = {"plus": 0.9, "minus": 0.05, "undecided": 0.05, "steps": 21.4}
    card = figures(0.0512, 0.0101, 21.4, given_plus=late)
    return replace(
        sample,
        case=case,
        digest=case.digest,
        agent="second",
        seen=seen,
        forms={"lines": priced(lines, card)},
        exact=figures(0.0511, 0.0101, 21.3, given_plus=late),
        plain_count=figures(0.0533, 0.00952, 21.9, given_plus=late),
        alone=figures(0.0996, 0.0220, 26.3, given_plus=late),
        alpha=2.3978952728,
        beta=-0.09531,
        value_offsets=(0, 1),
        labels=("0", "1"),
        leans={"first": "minus"},
        alone_rows=LOTS_ALONE,
        worth_curves=tuple(
            replace(curve, low=tuple(None if w is None else w - 0.2 for w in curve.worth))
            for curve in sample.worth_curves
        ),
        example=(
            {
                "step": 1,
                "shows": {"first": "undecided"},
                "sign": "minus",
                "peg": 0,
                "line": 0,
                "act": "watch",
            },
            {
                "step": 2,
                "shows": {"first": "undecided"},
                "sign": "plus",
                "peg": 1,
                "line": 1,
                "act": "watch",
            },
            {
                "step": 20,
                "shows": {"first": "undecided"},
                "sign": "minus",
                "peg": 1,
                "line": 2,
                "act": "watch",
            },
            {
                "step": 24,
                "shows": {"first": "plus"},
                "sign": "plus",
                "peg": 2,
                "line": 11,
                "act": "plus",
            },
        ),
    )


def three(stakes: str = "people") -> Findings:
    """Return a watcher of three others, two of them with habits that lean."""
    agents = {
        "north": {"name": "North gate", "thresholds": "even", "sees": []},
        "east": {"name": "East gate", "thresholds": "quick-to-stand-down", "sees": ["north"]},
        "west": {"name": "West gate", "thresholds": "quick-to-stand-down", "sees": ["yard"]},
        "yard": {"name": "Yard", "thresholds": "even", "sees": ["north", "east", "west"]},
    }
    question = FROST["question"] | {"stakes": stakes, "prior_plus": 0.35}
    case = Case.model_validate(
        FROST | {"agents": agents, "question": question, "rule": {"agent": "yard"}}
    )
    seen = ("north", "east", "west")
    states = [
        ([QUIET, QUIET, QUIET], -3, 3),
        ([QUIET, QUIET, QUIET], -4, 3),
        ([PLUS, QUIET, QUIET], -6, 0),
        ([MINUS, QUIET, QUIET], -1, 5),
        ([QUIET | PLUS, PLUS, QUIET], -7, -1),
        ([QUIET | MINUS, MINUS, QUIET], -1, 5),
        ([QUIET | MINUS, QUIET | MINUS, MINUS], 0, 5),
        ([PLUS, PLUS, PLUS], None, -3),
    ]
    rows = [
        (1 if not place else 3 if place == 1 else None, 2 if not place else None, *row)
        for place, row in enumerate(states)
    ]
    lines = bars(*rows, agent="yard", seen=seen)
    sample = frost()
    example = tuple(
        item
        | {
            "shows": {"north": "undecided", "east": item["shows"]["upper"], "west": "undecided"},
            "line": 4 if item["line"] == 2 else item["line"],
        }
        for item in sample.example
    )
    curves = tuple(
        replace(curve, shows=(curve.shows[0], "undecided", "undecided"))
        for curve in sample.worth_curves
    )
    return replace(
        sample,
        case=case,
        digest=case.digest,
        agent="yard",
        seen=seen,
        leans={"north": "even", "east": "minus", "west": "minus"},
        forms={"lines": priced(lines, sample.forms["lines"].figures)},
        worth_curves=curves,
        example=example,
        is_exact=False,
        caveats=("Some commitments were read by the off-model convention.",),
    )


def long_scale() -> Findings:
    """Return the pair with bars too far apart for boxes."""
    sample = frost()
    rule = bars(
        (1, 7, [QUIET], -9, 9),
        (8, None, [QUIET], -12, 9),
        (None, None, [PLUS], -21, -3),
        (None, None, [MINUS], 0, 14),
        agent="mill",
        seen=("upper",),
    )
    forms = {"lines": priced(rule, sample.forms["lines"].figures)}
    return replace(sample, forms=forms, alone_rows=(Row(minus_at=-9, plus_at=9),))


def readings(stakes: str = "people") -> Findings:
    """Return the pair with measurements, for which no count can be kept by hand."""
    sample = frost(
        evidence={"kind": "normal", "d": 0.5},
        question=FROST["question"] | {"stakes": stakes},
        thresholds={
            "even": {"plus": 1.2, "minus": -1.2, "unit": "nats"},
            "quick-to-stand-down": {"plus": 1.6, "minus": -0.8, "unit": "nats"},
        },
    )
    return replace(
        sample,
        forms={"table": sample.forms["table"]},
        count_is_whole=False,
        alpha=0.05,
        bounds=(-1.2, 1.2),
        value_offsets=None,
        alone_rows=(),
        is_exact=False,
        caveats=("The measurements were put on a ladder of 0.05 nats.",),
        example=(),
    )


SAMPLES = {
    "frost": frost,
    "lots": lots,
    "three": three,
    "long-scale": long_scale,
    "readings": readings,
}
