"""Every form of the rule, with every figure, as one JSON file for other programs.

Key order is fixed by this module and by the case; figures have ten significant digits, the
values of rows all of theirs; infinities are the texts ``INF`` and ``-INF``, since JSON has none.
The caution comes first.
"""

from __future__ import annotations

import json
from typing import Any

from thumbwright.distill.cautions import cautions
from thumbwright.distill.decimals import json_figure, json_number
from thumbwright.distill.exports.rule_csv import (
    answers_used,
    figure_units,
    figures_record,
    is_valued,
    numbers_used,
    shows_used,
    threshold_names,
)
from thumbwright.distill.findings import Agreed, CostBasis, Findings, FormResult
from thumbwright.distill.rules import FIRST_ANSWERS, SHOWN, Row, Rule

NAME = "rule as JSON"


def render(findings: Findings) -> dict[str, str | bytes]:
    """Return ``rule.json``."""
    return {"rule.json": rule_json(findings)}


def rule_json(findings: Findings) -> str:
    """Write the forms with their prices, and the ways of playing they are held against."""
    case = findings.case
    document: dict[str, Any] = {
        "caution": list(cautions(case.question.stakes)),
        "thumbwright": findings.version,
        "case": {"name": case.name, "title": case.title, "digest": findings.digest},
        "question": {
            "plus": case.question.plus,
            "minus": case.question.minus,
            "prior_plus": case.question.prior_plus,
            "stakes": case.question.stakes,
        },
        "time": {
            "horizon": case.time.horizon,
            "step_label": case.time.step_label,
            "exchange": case.time.exchange,
        },
        "agent": findings.agent,
        "seen": list(findings.seen),
        "units": _units(findings),
        "forms": {name: _form(result, findings) for name, result in findings.forms.items()},
        **_reckoned(findings),
        "costs": {
            "exact": figures_record(findings.exact),
            "plain_count": figures_record(findings.plain_count),
            "alone": figures_record(findings.alone),
        },
        "losses": _losses(findings.costs),
        "watching_is_worth_something": findings.watching_is_worth,
        "own_count": {
            "is_whole": findings.count_is_whole,
            "nats_per_count": json_figure(findings.alpha),
            "nats_per_step": json_figure(findings.beta),
            "count_per_value": (
                None if findings.value_offsets is None else list(findings.value_offsets)
            ),
        },
        "is_exact": findings.is_exact,
        "caveats": list(findings.caveats),
        "near_tie_mass": json_figure(findings.near_tie_mass),
    }
    return json.dumps(document, indent=2, ensure_ascii=False, allow_nan=False) + "\n"


def _units(findings: Findings) -> dict[str, str]:
    counted = any(numbers_used(result.rule) for result in findings.forms.values())
    return {
        "step_from": "step, inclusive; null is open",
        "step_to": "step, inclusive; null is open",
        **({"ranges": "least and greatest number, inclusive; null is open"} if counted else {}),
        "nats": "worth of the situation: what it adds to the log-odds for plus",
        "minus_at_or_below": "own count; null is never",
        "plus_at_or_above": "own count; null is never",
        "steps_in_force": "steps per outing",
        "calls": "share of outings that end in an answer by this row",
        "information_kept": "share of what one best fixed worth leaves to gain",
        "losses": "loss; per_step is loss per step",
        "near_tie_mass": "probability",
        **figure_units(),
    }


def _form(result: FormResult, findings: Findings) -> dict[str, Any]:
    rows = []
    for row, use in zip(result.rule.rows, result.uses, strict=True):
        record = _row(row, result.rule, findings)
        record["steps_in_force"] = json_figure(use.steps_in_force)
        record["calls"] = json_figure(use.calls)
        rows.append(record)
    return {
        "rows": rows,
        "information_kept": json_figure(result.information_kept),
        "information_ceiling": json_figure(result.information_ceiling),
        "costs": figures_record(result.figures),
        "costs_if_everybody_uses_it": (
            None if result.everybody is None else figures_record(result.everybody)
        ),
        "agreement": _agreement(result.agreed),
        "notes": list(result.notes),
    }


def _reckoned(findings: Findings) -> dict[str, Any]:
    """Return the forms that have no rows, where there are any: numbers, and what they mean."""
    if not findings.reckoned:
        return {}
    forms = {
        name: {
            "nats_per_unit": json_number(one.rule.unit),
            "numbers": {key: json_number(value) for key, value in one.rule.parameters.items()},
            "sentences": list(one.rule.sentences()),
            "information_kept": json_figure(one.information_kept),
            "costs": figures_record(one.figures),
            "notes": list(one.notes),
        }
        for name, one in findings.reckoned.items()
    }
    return {"reckoned": forms}


def _agreement(agreed: Agreed | None) -> dict[str, Any] | None:
    """Return how a rule compares with exact play on the same observations."""
    if agreed is None:
        return None
    record: dict[str, Any] = {
        name: json_figure(getattr(agreed, name)) for name in ("same", "opposite", "steps_apart")
    }
    if agreed.errors is not None:
        record["errors"] = {name: json_figure(error) for name, error in agreed.errors.items()}
    return record


def _row(row: Row, rule: Rule, findings: Findings) -> dict[str, Any]:
    """Return one row; every seen agent is named with all states that the row accepts."""
    record: dict[str, Any] = {
        "step_from": row.step_from,
        "step_to": row.step_to,
        "shows": {
            agent: [state for state in SHOWN if state in row.shows.get(agent, SHOWN)]
            for agent in rule.seen
            if shows_used(rule)
        },
    }
    if numbers_used(rule):
        record["ranges"] = {
            name: list(row.ranges.get(name, (None, None))) for name in numbers_used(rule)
        }
    if answers_used(rule):
        accepted = FIRST_ANSWERS if row.first_answer is None else row.first_answer
        record["first_answer"] = [answer for answer in FIRST_ANSWERS if answer in accepted]
    if any(other.thresholds for other in rule.rows):
        order = threshold_names(rule, findings)
        record["thresholds"] = {
            agent: [name for name in order if name in names]
            for agent, names in row.thresholds.items()
        }
    if is_valued(rule):
        record["nats"] = json_number(row.value)
    else:
        record["minus_at_or_below"] = row.minus_at
        record["plus_at_or_above"] = row.plus_at
    record["base"] = row.base
    return record


def _losses(basis: CostBasis | None) -> dict[str, Any] | None:
    """Return the losses used; null where none are known."""
    if basis is None:
        return None
    return {
        "false_plus": json_figure(basis.false_plus),
        "false_minus": json_figure(basis.false_minus),
        "per_step": json_figure(basis.per_step),
        "undecided": json_figure(basis.undecided),
        "inferred_from_thresholds": basis.inferred,
        "loss_ratio_range": _range(basis.loss_ratio_range),
        "per_step_range": _range(basis.per_step_range),
        "benefit_kept_range": _range(basis.benefit_kept_range),
    }


def _range(pair: tuple[float, float] | None) -> list[Any] | None:
    return None if pair is None else [json_figure(end) for end in pair]
