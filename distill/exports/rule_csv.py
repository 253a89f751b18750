"""The rule as a CSV file with a data package beside it (Table Schema, Frictionless version 1).

The CSV is also what ``price`` reads (:mod:`thumbwright.distill.rule_reading`): one line per
row, first what the row holds for, then either its worth in nats or its bars on the own count.
The descriptor says what each column means, in which unit, and carries the caution and the
cost, so that the table does not travel without them.
"""

from __future__ import annotations

import csv
import dataclasses
import hashlib
import io
import json
from collections.abc import Iterable, Sequence
from typing import Any

from thumbwright.distill.cautions import cautions
from thumbwright.distill.decimals import json_figure, plain_decimal
from thumbwright.distill.findings import Figures, Findings
from thumbwright.distill.rules import FIRST_ANSWER, FIRST_ANSWERS, NUMBERS, SHOWN, Row, Rule

NAME = "rule as CSV"

SHOWS = "_shows"
THRESHOLDS = "_thresholds"
FROM, TO = "_from", "_to"
JOIN = "|"
"""What joins several states or thresholds that one row accepts."""

_FORMULA_STARTS = ("=", "+", "-", "@", "\t", "\r", "\n")
"""A text cell that begins so is run as a formula by spreadsheets."""


def render(findings: Findings) -> dict[str, str | bytes]:
    """Return ``rule.csv`` and ``datapackage.json``: the lines where there are some."""
    rule = chosen_form(findings)
    return {
        "rule.csv": rule_csv(rule, findings),
        "datapackage.json": datapackage_json(rule, findings),
    }


def chosen_form(findings: Findings) -> Rule:
    """Return the rule that ``rule.csv`` holds: the form ``lines``, else the first there is.

    Raises
    ------
    ValueError
        If the findings hold no rule at all.
    """
    for form in ("lines", "table", *findings.forms):
        if form in findings.forms:
            return findings.forms[form].rule
    raise ValueError("the findings hold no rule to write")


def rule_csv(rule: Rule, findings: Findings) -> str:
    """Write ``rule`` as CSV: header, then one line per row in the order of the rule.

    Numbers are plain decimals that read back as the same double; an open step, an agent that
    may show anything and a bar that is never met are blank.

    Raises
    ------
    ValueError
        If a row cannot be said in this format: worth and bars in one rule, an empty set of
        states, or an id that a spreadsheet would take for a formula.
    """
    text = io.StringIO()
    writer = csv.writer(text, lineterminator="\n")
    writer.writerow(_text_cell(field["name"]) for field in _fields(rule, findings))
    named = _agents_with_thresholds(rule)
    valued = is_valued(rule)
    for row in rule.rows:
        cells = [_whole(row.step_from), _whole(row.step_to)]
        for name in numbers_used(rule):
            cells += [_whole(end) for end in row.ranges.get(name, (None, None))]
        if answers_used(rule):
            cells.append(_joined(row.first_answer, FIRST_ANSWERS))
        for agent in rule.seen:
            if shows_used(rule):
                cells.append(_joined(row.shows.get(agent), SHOWN))
            if agent in named:
                cells.append(_joined(row.thresholds.get(agent), threshold_names(rule, findings)))
        cells += _worth_cells(row) if valued else [_whole(row.minus_at), _whole(row.plus_at)]
        writer.writerow(cells)
    return text.getvalue()


def datapackage_json(rule: Rule, findings: Findings) -> str:
    """Describe ``rule.csv`` as a data package, with caution, cost, version and case digest."""
    case = findings.case
    content = rule_csv(rule, findings).encode("utf-8")
    result = findings.forms.get(rule.form)
    descriptor: dict[str, Any] = {
        "profile": "tabular-data-package",
        "name": f"thumbwright-rule-{case.name.lower()}",
        "title": f"{case.title}: a rule for {case.agents[rule.agent].name}",
        "description": " ".join(
            (
                "One line per row; every situation meets exactly one.",
                "The figures hold for this very table: price it again after any change.",
                *cautions(case.question.stakes),
            )
        ),
        "caution": list(cautions(case.question.stakes)),
        "thumbwright": {
            "version": findings.version,
            "case": case.name,
            "case_digest": findings.digest,
            "agent": rule.agent,
            "form": rule.form,
            "answers": {"plus": case.question.plus, "minus": case.question.minus},
            "prior_plus": case.question.prior_plus,
            "costs": {
                "rule": None if result is None else figures_record(result.figures),
                "exact": figures_record(findings.exact),
                "plain_count": figures_record(findings.plain_count),
                "alone": figures_record(findings.alone),
            },
            "units": figure_units(),
            "is_exact": findings.is_exact,
            "caveats": list(findings.caveats),
        },
        "resources": [
            {
                "profile": "tabular-data-resource",
                "name": "rule",
                "path": "rule.csv",
                "format": "csv",
                "mediatype": "text/csv",
                "encoding": "utf-8",
                "bytes": len(content),
                "hash": "sha256:" + hashlib.sha256(content).hexdigest(),
                "schema": {"fields": _fields(rule, findings), "missingValues": [""]},
            }
        ],
    }
    return json.dumps(descriptor, indent=2, ensure_ascii=False, allow_nan=False) + "\n"


def is_valued(rule: Rule) -> bool:
    """Whether the rows hold worths in nats (else bars on the own count)."""
    return any(row.value is not None for row in rule.rows)


def numbers_used(rule: Rule) -> tuple[str, ...]:
    """Numbers that some row looks at, in their fixed order."""
    return tuple(name for name in NUMBERS if any(name in row.ranges for row in rule.rows))


def answers_used(rule: Rule) -> bool:
    """Whether some row looks at which answer came first."""
    return any(row.first_answer is not None for row in rule.rows)


def shows_used(rule: Rule) -> bool:
    """Whether what each agent shows belongs to the rule: not where it only counts them."""
    return any(row.shows for row in rule.rows) or not (numbers_used(rule) or answers_used(rule))


def threshold_names(rule: Rule, findings: Findings) -> tuple[str, ...]:
    """Return all threshold names in the order of the case, then any others by name."""
    declared = tuple(findings.case.thresholds)
    used = {name for row in rule.rows for names in row.thresholds.values() for name in names}
    return declared + tuple(sorted(used.difference(declared)))


def figures_record(figures: Figures) -> dict[str, Any]:
    """Return ``figures`` as JSON holds it, in the order of the class.

    Standard errors are among them only where histories were sampled.
    """
    record: dict[str, Any] = {}
    for field in dataclasses.fields(figures):
        found = getattr(figures, field.name)
        if field.name == "errors" and found is None:
            continue
        if isinstance(found, dict):
            record[field.name] = {key: json_figure(number) for key, number in found.items()}
        else:
            record[field.name] = json_figure(found)
    return record


def figure_units() -> dict[str, str]:
    """Return the unit of each figure that :func:`figures_record` writes."""
    return {
        "given_plus": "plus, minus, undecided: probability; steps: mean number of steps used",
        "given_minus": "plus, minus, undecided: probability; steps: mean number of steps used",
        "wrong_given_plus": "probability",
        "wrong_given_minus": "probability",
        "accuracy": "probability",
        "mean_step": "steps",
        "risk": "loss",
        "accuracy_lost": "probability, against exact",
        "delay_added": "steps, against exact",
        "benefit_kept": "share: 0 alone, 1 exact",
        "off_model": "probability",
    }


def _fields(rule: Rule, findings: Findings) -> list[dict[str, Any]]:
    """Return the Table Schema fields, in the order of the columns."""
    step = findings.case.time.step_label
    fields: list[dict[str, Any]] = []
    for name, end in (("step_from", "First"), ("step_to", "Last")):
        fields.append(
            {
                "name": name,
                "title": f"{end} step",
                "type": "integer",
                "description": f"{end} step for which the row holds, inclusive: the agent's own"
                " observations so far, this one included. Blank: open.",
                "unit": f"steps of {step}" if step else "steps",
                "constraints": {"minimum": 1},
            }
        )
    for name in numbers_used(rule):
        fields += _number_fields(name)
    if answers_used(rule):
        fields.append(_answers_field())
    named = _agents_with_thresholds(rule)
    for agent in rule.seen:
        if shows_used(rule):
            fields.append(_shows_field(agent, findings))
        if agent in named:
            fields.append(_thresholds_field(agent, threshold_names(rule, findings)))
    return fields + (_value_fields() if is_valued(rule) else _bar_fields(findings))


_NUMBER_MEANS = {
    "plus_shown": "how many of the seen agents show plus",
    "minus_shown": "how many of the seen agents show minus",
    "undecided_shown": "how many of the seen agents show neither answer yet",
    "steps_since_first": "steps since the first of the seen agents answered, that step included;"
    " 0 while none has",
    "steps_since_last": "steps since the latest answer of a seen agent, that step included;"
    " 0 while there is none",
    "came_first": "how many of the seen agents answered at the moment of the first answer;"
    " 0 while none has",
}


def number_means(name: str) -> str:
    """What one of ``rules.NUMBERS`` is, in words that go on in a sentence."""
    return _NUMBER_MEANS[name]


def _number_fields(name: str) -> list[dict[str, Any]]:
    unit = "steps" if name.startswith("steps") else "agents"
    ends = (name + FROM, "Least", "least"), (name + TO, "Most", "greatest")
    return [
        {
            "name": column,
            "title": f"{title}: {name.replace('_', ' ')}",
            "type": "integer",
            "description": f"The {end} number, inclusive, for which the row holds, of"
            f" {number_means(name)}. Blank: open.",
            "unit": unit,
            "constraints": {"minimum": 0},
        }
        for column, title, end in ends
    ]


def _answers_field() -> dict[str, Any]:
    answers = JOIN.join(FIRST_ANSWERS)
    return {
        "name": FIRST_ANSWER,
        "title": "First answer",
        "type": "string",
        "description": f"Which answer a seen agent gave first, several joined by {JOIN}: nobody"
        " (none yet), plus, minus, both (at the same moment). Blank: any.",
        "constraints": {"pattern": rf"^({answers})(\|({answers}))*$"},
    }


def _shows_field(agent: str, findings: Findings) -> dict[str, Any]:
    states = JOIN.join(SHOWN)
    return {
        "name": agent + SHOWS,
        "title": f"What {findings.case.agents[agent].name} shows",
        "type": "string",
        "description": f"The states the row holds for, several joined by {JOIN}: undecided, plus"
        f" ({findings.case.words.shows_plus}) or minus ({findings.case.words.shows_minus})."
        " Blank: any.",
        "constraints": {"pattern": rf"^({states})(\|({states}))*$"},
    }


def _thresholds_field(agent: str, names: Sequence[str]) -> dict[str, Any]:
    return {
        "name": agent + THRESHOLDS,
        "title": f"Thresholds of {agent}",
        "type": "string",
        "description": f"The thresholds the row holds for, several joined by {JOIN}, of"
        f" {', '.join(names)}. Blank: any.",
    }


def _value_fields() -> list[dict[str, Any]]:
    return [
        {
            "name": "nats",
            "title": "Worth",
            "type": "number",
            "description": "What the situation adds to the agent's log-odds for plus (natural"
            " logarithm), in place of the exact social evidence. A level, not a change.",
            "unit": "nats",
            "constraints": {"required": True},
        }
    ]


def _bar_fields(findings: Findings) -> list[dict[str, Any]]:
    question = findings.case.question
    count = "the agent's own count (the sum of its own observations)"
    return [
        {
            "name": "minus_at_or_below",
            "title": "Answer minus at or below",
            "type": "integer",
            "description": f'Answer minus ("{question.minus}") once {count} is this or less.'
            " Blank: never.",
            "unit": "observations",
        },
        {
            "name": "plus_at_or_above",
            "title": "Answer plus at or above",
            "type": "integer",
            "description": f'Answer plus ("{question.plus}") once {count} is this or more.'
            " Blank: never.",
            "unit": "observations",
        },
    ]


def _agents_with_thresholds(rule: Rule) -> set[str]:
    return {agent for row in rule.rows for agent in row.thresholds}


def _worth_cells(row: Row) -> list[str]:
    if row.value is None or row.minus_at is not None or row.plus_at is not None:
        raise ValueError("a rule holds either a worth in every row or bars, not both")
    return [plain_decimal(row.value)]


def _whole(number: int | None) -> str:
    return "" if number is None else str(int(number))


def _joined(accepted: Iterable[str] | None, order: Sequence[str]) -> str:
    """Join the accepted names in a fixed order; blank for "any"."""
    if accepted is None:
        return ""
    accepted = set(accepted)
    if not accepted or not accepted.issubset(order):
        raise ValueError(f"a row accepts {sorted(accepted)}, which is not among {list(order)}")
    if any(JOIN in name or name != name.strip() for name in accepted):
        raise ValueError(f"names with {JOIN!r} or outer spaces cannot be joined: {accepted}")
    return _text_cell(JOIN.join(name for name in order if name in accepted))


def _text_cell(text: str) -> str:
    """Return ``text``, refused where a spreadsheet would run it as a formula."""
    if text.startswith(_FORMULA_STARTS):
        raise ValueError(f"{text!r} would be run as a formula by a spreadsheet")
    return text
