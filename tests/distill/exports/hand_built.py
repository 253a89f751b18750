"""Findings of every kind that an export must be able to say: made by hand, and the starters."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from functools import cache

from tests.distill.exports import sample
from thumbwright.distill.findings import Findings
from thumbwright.distill.gather import gather
from thumbwright.distill.reading import read_case
from thumbwright.distill.rules import Row, Rule

QUIET, PLUS, MINUS = (frozenset({state}) for state in ("undecided", "plus", "minus"))
EVEN, EARLY = frozenset({"even"}), frozenset({"early"})
SEEN = ("upper", "lower")


def of_rules(*rules: Rule, found: Findings | None = None) -> Findings:
    """Findings that hold these rules, with made-up figures."""
    forms = {rule.form: sample.result(rule) for rule in rules}
    return replace(found or sample.findings(), forms=forms)


def bars() -> Findings:
    """Lines and no worths; some situations meet no row, one row has one bar only."""
    return of_rules(sample.rule_of_bars())


def worths() -> Findings:
    """A table alone, so that worths decide; prior and thresholds are uneven."""
    rows = (
        Row(step_to=3, value=0.1 + 0.2),
        Row(step_from=4, step_to=9, shows={"upper": QUIET | PLUS}, value=-1e-9),
        Row(step_from=4, shows={"upper": MINUS, "lower": QUIET}, value=-2.3025850929940455),
        Row(shows={"lower": PLUS}, value=1e-17),
        Row(step_from=10, shows={"lower": MINUS}, value=123456.789),
    )
    found = of_rules(Rule("table", "mill", SEEN, rows))
    return replace(found, prior=-0.8472978604, bounds=(-2.5, 1.75))


def infinite() -> Findings:
    """Worths that make an answer sure."""
    rows = (
        Row(shows={"lower": MINUS}, value=float("-inf")),
        Row(shows={"lower": PLUS}, value=float("inf")),
        Row(value=0.25),
    )
    return of_rules(Rule("table", "mill", SEEN, rows))


def both() -> Findings:
    """Lines, and a table that looks at other inputs than they do."""
    table = (
        Row(shows={"lower": PLUS}, ranges={"came_first": (2, None)}, value=1.5),
        Row(shows={"lower": PLUS}, value=0.75),
        Row(value=-0.5),
    )
    return of_rules(sample.rule_of_bars(), Rule("table", "mill", SEEN, table))


def covers() -> Findings:
    """Bars that depend on whose thresholds the seen agents have."""
    rows = (
        Row(thresholds={"upper": EVEN}, shows={"upper": PLUS}, minus_at=-6, plus_at=0),
        Row(thresholds={"upper": EARLY}, shows={"upper": PLUS}, minus_at=-4, plus_at=2),
        Row(thresholds={"lower": EVEN | EARLY}, shows={"upper": MINUS}, minus_at=-2, plus_at=5),
        Row(step_to=4, shows={"upper": QUIET}, minus_at=-3, plus_at=3),
        Row(step_from=5, thresholds={"lower": EARLY}, shows={"upper": QUIET}, plus_at=4),
        Row(step_from=5, shows={"upper": QUIET}, minus_at=-5),
    )
    return of_rules(Rule("lines", "mill", SEEN, rows))


def counts() -> Findings:
    """Numbers of agents and steps, and which answer came first, in place of named agents."""
    nobody = frozenset({"nobody"})
    rows = (
        Row(first_answer=nobody, step_to=5, minus_at=-3, plus_at=3),
        Row(first_answer=nobody, ranges={"undecided_shown": (2, None)}, minus_at=-4, plus_at=3),
        Row(ranges={"plus_shown": (2, None), "minus_shown": (None, 0)}, plus_at=-2),
        Row(
            first_answer=frozenset({"plus", "both"}),
            ranges={"steps_since_first": (None, 3)},
            minus_at=-5,
            plus_at=0,
        ),
        Row(
            first_answer=frozenset({"plus"}),
            ranges={"steps_since_last": (4, 20), "came_first": (1, 1)},
            minus_at=-4,
            plus_at=1,
        ),
        Row(first_answer=frozenset({"minus"}), minus_at=-1, plus_at=5),
        Row(first_answer=frozenset({"plus", "both"}), minus_at=-2, plus_at=2),
    )
    return of_rules(Rule("lines", "mill", SEEN, rows))


def always() -> Findings:
    """One row that always holds, of an agent that looks at nobody."""
    found = replace(sample.findings(), seen=(), leans={})
    return of_rules(Rule("lines", "mill", (), (Row(minus_at=-3, plus_at=3),)), found=found)


def odd_ids() -> Findings:
    """Ids and names that mean something in one language or another, or are the same in most."""
    agents = {
        key: {"name": key, "thresholds": "even", "sees": []}
        for key in (
            "if",
            "class",
            "x",
            "x_thresholds",
            "step",
            "tally",
            "NULL",
            "value",
            "watch_refused",
        )
    }
    agents["mill"] = {"name": "Mill", "thresholds": "even", "sees": list(agents)}
    even = {"plus": 3, "minus": -3, "unit": "observations"}
    case = sample.case(agents=agents, thresholds={"even": even, "a-b": even, "default": even})
    seen = tuple(case.agents["mill"].sees)
    rows = (
        Row(shows={"if": PLUS, "class": QUIET | PLUS}, minus_at=-9, plus_at=-1),
        Row(shows={"x": MINUS}, thresholds={"x": frozenset({"a-b"})}, minus_at=-8, plus_at=1),
        Row(
            shows={"x_thresholds": MINUS},
            thresholds={"x": frozenset({"default", "a-b"})},
            minus_at=-7,
            plus_at=2,
        ),
        Row(step_to=2, shows={"step": QUIET, "tally": QUIET}, minus_at=-6, plus_at=3),
        Row(shows={"NULL": MINUS}, thresholds={"step": EVEN}, minus_at=-5, plus_at=4),
        Row(shows={"value": PLUS}, minus_at=-4, plus_at=5),
        Row(shows={"watch_refused": PLUS}, minus_at=-3, plus_at=6),
    )
    found = replace(sample.findings(), case=case, digest=case.digest, seen=seen, leans={})
    return of_rules(Rule("lines", "mill", seen, rows), found=found)


@cache
def starter(name: str) -> Findings:
    """What the main job finds for a starter."""
    return gather(read_case(name))


FINDINGS: dict[str, Callable[[], Findings]] = {
    "bars": bars,
    "worths": worths,
    "infinite": infinite,
    "both": both,
    "covers": covers,
    "counts": counts,
    "always": always,
    "odd ids": odd_ids,
    "frost-watch": lambda: starter("frost-watch"),
    "lot-inspection": lambda: starter("lot-inspection"),
    "flock-alarm": lambda: starter("flock-alarm"),
}
"""By name. "odd ids" has too many inputs for every combination of them to be asked."""
