"""More findings for tests of the sheet, made up likewise: counts, habits and a table alone."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

from tests.distill.sheet import sample_findings as samples
from thumbwright.distill.case import Case
from thumbwright.distill.findings import Findings
from thumbwright.distill.rules import Row, Rule


def counts() -> Findings:
    """Return a watcher of seven others whose rule counts them, whoever they are."""
    ids = ["owl", *(f"watch{number}" for number in range(1, 8))]
    agents = {
        key: {
            "name": f"Post {place}",
            "thresholds": "even",
            "sees": [other for other in ids if other != key],
        }
        for place, key in enumerate(ids, 1)
    }
    case = Case.model_validate(samples.FROST | {"agents": agents, "rule": {"agent": "owl"}})
    seen = tuple(ids[1:])
    none = {"plus_shown": (0, 0), "minus_shown": (0, 0)}
    rows = (
        Row(None, 4, minus_at=-3, plus_at=3, base=True, ranges=none),
        Row(5, None, minus_at=-4, plus_at=3, ranges=none),
        Row(minus_at=-5, plus_at=1, ranges={"plus_shown": (1, 2), "minus_shown": (0, 0)}),
        Row(
            minus_at=None,
            plus_at=-2,
            ranges={"plus_shown": (3, None), "steps_since_first": (None, 6)},
            first_answer=frozenset({"plus", "both"}),
        ),
        Row(minus_at=-3, plus_at=2, ranges={"plus_shown": (1, None)}),
        Row(minus_at=-1, plus_at=5, ranges={"minus_shown": (1, None)}),
    )
    sample = samples.frost()
    shows: dict[str, Any] = dict.fromkeys(seen, "undecided")
    example = tuple(
        item
        | {
            "shows": shows | ({"watch3": "plus"} if item["shows"]["upper"] == "plus" else {}),
            "line": {0: 0, 1: 0, 2: 2}[item["line"]],
        }
        for item in sample.example
    )
    curve = replace(sample.worth_curves[0], shows=("undecided",) * len(seen))
    rule = Rule("lines", "owl", seen, rows)
    return replace(
        sample,
        case=case,
        digest=case.digest,
        agent="owl",
        seen=seen,
        leans=dict.fromkeys(seen, "even"),
        forms={"lines": samples.priced(rule, sample.exact)},
        worth_curves=(curve,),
        example=example,
    )


def habits() -> Findings:
    """Return the pair where the rule may look at the neighbour's habit and at one count."""
    sample = samples.frost(
        rule={
            "agent": "mill",
            "inputs": ["step", "shown", "thresholds"],
            "covers": ["even", "quick-to-stand-down"],
        }
    )
    even, quick = ({"upper": frozenset({name})} for name in ("even", "quick-to-stand-down"))
    quiet, lit, down = ({"upper": s} for s in (samples.QUIET, samples.PLUS, samples.MINUS))
    rows = (
        Row(None, 2, quiet, {}, None, -3, 3, True),
        Row(3, None, quiet, even, None, -3, 3),
        Row(3, None, quiet, quick, None, -4, 3),
        Row(None, None, lit, even, None, -6, 0),
        Row(None, None, lit, quick, None, -7, -1),
        Row(None, None, down, even, None, 0, 6),
        Row(None, None, down, quick, None, -1, 5, ranges={"minus_shown": (1, 1)}),
    )
    lines = samples.priced(Rule("lines", "mill", ("upper",), rows), sample.exact)
    example = tuple(item | {"line": {0: 0, 1: 2, 2: 4}[item["line"]]} for item in sample.example)
    return replace(sample, forms={"lines": lines}, example=example)


def table_alone() -> Findings:
    """Return the pair where only the table was asked for, though a count could be kept."""
    sample = samples.frost()
    return replace(sample, forms={"table": sample.forms["table"]}, example=())


def good_items() -> Findings:
    """Return the inspector who counts the signs that speak for minus: the count is turned round."""
    sample = samples.lots(evidence={"kind": "bernoulli", "p_plus": 0.1, "p_minus": 0.4})
    rows = (
        Row(None, 9, {"first": samples.QUIET}, {}, None, -3, None, True),
        Row(10, None, {"first": samples.QUIET}, {}, None, -4, 0),
        Row(None, None, {"first": samples.PLUS}, {}, None, -6, -1),
        Row(None, None, {"first": samples.MINUS}, {}, None, -1, None),
    )
    lines = samples.priced(Rule("lines", "second", ("first",), rows), sample.exact)
    return replace(sample, forms={"lines": lines}, value_offsets=(0, -1), alone_rows=(), example=())


MORE = {
    "counts": counts,
    "habits": habits,
    "table-alone": table_alone,
    "good-items": good_items,
}
EVERY = samples.SAMPLES | MORE
