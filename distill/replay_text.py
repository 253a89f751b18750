"""A followed record as plain data, and as lines to read."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Any

from thumbwright.distill.case import Case
from thumbwright.distill.cautions import cautions
from thumbwright.distill.decimals import json_number
from thumbwright.distill.replay import WATCH, Step
from thumbwright.distill.rules import SHOWN, Rule
from thumbwright.distill.texts import columns


def replay_record(
    case: Case, agent: str, rule: Rule, steps: Sequence[Step], remarks: Sequence[str]
) -> dict[str, Any]:
    """Everything about a followed record as JSON holds it; full double precision."""
    rows = rule.rows
    entries: list[dict[str, Any]] = []
    for one in steps:
        row = None if one.rule.row is None else rows[one.rule.row]
        entries.append(
            {
                "step": one.step,
                "sign": one.sign,
                "shows": {a: SHOWN[state] for a, state in zip(rule.seen, one.states, strict=True)},
                "own_count": one.count,
                "own_nats": json_number(one.own),
                "rule": {
                    "row": None if one.rule.row is None else one.rule.row + 1,
                    "nats": json_number(one.rule.worth),
                    "minus_at_or_below": None if row is None else row.minus_at,
                    "plus_at_or_above": None if row is None else row.plus_at,
                    "does": one.rule.does,
                },
                "exact": {
                    "worth": json_number(one.exact.worth),
                    "belief": json_number(one.exact.belief),
                    "probability_of_plus": probability(one.exact.belief),
                    "does": one.exact.does,
                },
                "impossible": one.impossible,
            }
        )
    impossible = next((one for one in steps if one.impossible), None)
    return {
        "case": case.name,
        "digest": case.digest,
        "agent": agent,
        "rule": rule.form,
        "steps": entries,
        "rule_answer": _answer(entries, "rule"),
        "exact_answer": _answer(entries, "exact"),
        "no_belief_from": None if impossible is None else impossible.step,
        "impossible": None if impossible is None else impossible.impossible,
        "remarks": list(remarks),
        "caution": list(cautions(case.question.stakes)),
    }


def probability(belief: float | None) -> float | None:
    """Probability of plus at a belief (nats)."""
    if belief is None:
        return None
    if belief < 0:
        return math.exp(belief) / (1.0 + math.exp(belief))
    return 1.0 / (1.0 + math.exp(-belief))


def _answer(entries: Sequence[dict[str, Any]], who: str) -> dict[str, Any] | None:
    """When and what the rule, or the exact agent, answers; None where it does not."""
    for one in entries:
        if one[who]["does"] not in (WATCH, None):
            return {"answer": one[who]["does"], "step": one["step"]}
    return None


def replay_text(case: Case, found: dict[str, Any]) -> str:
    """A followed record as a table, and what came of it in sentences."""
    question, seen = case.question, list(found["steps"][0]["shows"])
    counted = found["steps"][0]["own_count"] is not None
    head = [
        "step",
        "sign",
        *(f"{agent} shows" for agent in seen),
        "own count" if counted else "own nats",
        "row",
        "rule",
        "worth, nats",
        "chance of plus",
        "exact",
    ]
    rows = [head]
    for one in found["steps"]:
        own = one["own_count"] if counted and one["own_count"] is not None else one["own_nats"]
        rows.append(
            [
                str(one["step"]),
                one["sign"],
                *(one["shows"][agent] for agent in seen),
                own if isinstance(own, str) else f"{own:d}" if isinstance(own, int) else _nats(own),
                _row(one["rule"]),
                one["rule"]["does"] or "",
                _nats(one["exact"]["worth"]),
                _chance(one["exact"]["probability_of_plus"]),
                one["exact"]["does"] or ("no belief" if _is_lost(found, one["step"]) else ""),
            ]
        )
    end = len(seen) + 2
    lines = [
        f"{case.title}: record of {case.agents[found['agent']].name} ({found['agent']}), "
        f"rule {found['rule']}",
        f"plus: “{question.plus}”; minus: “{question.minus}”",
        "",
        *columns(rows, right=(0, end, end + 1, end + 3, end + 4)),
        "",
        f"The rule {_ending(found['rule_answer'], found['steps'][-1]['step'])}.",
        _exact_ending(found),
    ]
    lines += [f"Note: {text}" for text in found["remarks"]]
    return "\n".join([*lines, "", *found["caution"]])


def _row(rule: dict[str, Any]) -> str:
    if rule["row"] is not None:
        return str(rule["row"])
    return "" if rule["does"] is None else "none"


def _is_lost(found: dict[str, Any], step: int) -> bool:
    """Whether the exact agent has no belief at a step, for what it has been shown."""
    start = found["no_belief_from"]
    return start is not None and step >= start


def _ending(answer: dict[str, Any] | None, last: int) -> str:
    if answer is None:
        return f"has no answer by step {last}"
    return f"answers {answer['answer']} at step {answer['step']}"


def _exact_ending(found: dict[str, Any]) -> str:
    start = found["no_belief_from"]
    if start is None:
        ending = _ending(found["exact_answer"], found["steps"][-1]["step"])
        return f"The full calculation {ending}."
    return (
        f"Impossible under the model at step {start}: {found['impossible']}. From there on the"
        " full calculation has no belief and does nothing; the rule goes on."
    )


def _nats(worth: float | str | None) -> str:
    if worth is None or isinstance(worth, str):
        return worth or ""
    return f"{worth + 0.0:.4f}" if abs(worth) >= 5e-5 else "0.0000"


def _chance(probability: float | None) -> str:
    return "" if probability is None else f"{probability:.4f}"
