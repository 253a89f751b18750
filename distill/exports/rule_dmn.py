"""The rule as decision tables in DMN 1.3, for ordinary decision engines.

One file per form, each with a single decision, since some engines read no more from a file:
``rule.dmn`` is the rule of ``rule.csv``, ``rule-FORM.dmn`` each other one. The tables keep to what
engines agree on: hit policy FIRST; every test of a number has one side, so that a range takes two
input clauses; every text is one quoted text, so that a row that accepts several states becomes
several; numbers are plain decimals that read back as the same double, never with an exponent.

A table of bars takes the own count and answers "plus", "minus" or "undecided"; a table of worths
gives the worth in nats. No last row catches what the rule does not cover: there an engine gives no
result. An infinite worth, which DMN has no number for, is written as :data:`BEYOND`.
"""

from __future__ import annotations

import json
import math
import re
import xml.etree.ElementTree as ET
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from itertools import product

from thumbwright.distill.cautions import cautions
from thumbwright.distill.decimals import DIGITS, plain_decimal
from thumbwright.distill.exports.rule_csv import (
    SHOWS,
    THRESHOLDS,
    chosen_form,
    is_valued,
    number_means,
    threshold_names,
)
from thumbwright.distill.findings import Findings, FormResult
from thumbwright.distill.price_tag import price_tag
from thumbwright.distill.rules import FIRST_ANSWER, FIRST_ANSWERS, NUMBERS, SHOWN, Row, Rule
from thumbwright.exact.walk import TIE

NAME = "rule as DMN"

MODEL = "https://www.omg.org/spec/DMN/20191111/MODEL/"
"""Namespace of DMN 1.3."""

STEP, TALLY, ANSWER, NATS = "step", "tally", "answer", "nats"

BEYOND = 1_000_000_000
"""Stands for an infinite worth (nats): more than all observations of an outing can outweigh."""

ANY = "-"
_AT_LEAST, _AT_MOST, _IS = ">=", "<=", "is"
_NOT_XML = re.compile("[^\t\n\r\u0020-\ud7ff\ue000-\ufffd\U00010000-\U0010ffff]")


@dataclass(frozen=True)
class Clause:
    """One input column: which input it looks at, and the one kind of test it makes."""

    input: str
    test: str


def render(findings: Findings) -> dict[str, str | bytes]:
    """Return ``rule.dmn`` and a file for every other form of the rule."""
    chosen = chosen_form(findings)
    files: dict[str, str | bytes] = {"rule.dmn": rule_dmn(chosen, findings)}
    for name, result in findings.forms.items():
        if result.rule is not chosen:
            files[f"rule-{name}.dmn"] = rule_dmn(result.rule, findings)
    return files


def input_names(rule: Rule) -> dict[str, str]:
    """The word that stands for each seen agent in names of inputs.

    Engines read a hyphen as a minus, so it becomes an underscore; where two ids then coincide, the
    later one gets a number.
    """
    words: dict[str, str] = {}
    for agent in rule.seen:
        word, number = agent.replace("-", "_"), 1
        while word in words.values():
            number += 1
            word = f"{agent.replace('-', '_')}_{number}"
        words[agent] = word
    return words


def rule_dmn(rule: Rule, findings: Findings) -> str:
    """Write one rule as a DMN 1.3 file with a single decision.

    Raises
    ------
    ValueError
        If a row holds neither a worth nor bars, or both, or accepts a state that there is not.
    """
    valued = is_valued(rule)
    name = NATS if valued else ANSWER
    clauses = clauses_of(rule)
    inputs = list(dict.fromkeys(clause.input for clause in clauses))
    root = ET.Element(
        "definitions",
        {
            "xmlns": MODEL,
            "id": "definitions",
            "name": _text(findings.case.title),
            "namespace": f"urn:thumbwright:case:{findings.digest}",
            "exporter": "thumbwright",
            "exporterVersion": _text(findings.version),
        },
    )
    _child(root, "description", "\n".join(_head(rule, findings)))
    decision = _child(root, "decision", id="decision", name=name)
    _child(decision, "description", _what(rule, findings, valued))
    question = findings.case.question
    _child(decision, "question", f"{question.plus} or {question.minus}?")
    kind = "number" if valued else "string"
    _child(decision, "variable", id="decision_variable", name=name, typeRef=kind)
    for number, word in enumerate(inputs, 1):
        needed = _child(decision, "informationRequirement", id=f"requirement_{number}")
        _child(needed, "requiredInput", href=f"#input_{word}")
    table = _child(
        decision, "decisionTable", id="table", hitPolicy="FIRST", preferredOrientation="Rule-as-Row"
    )
    texts = _texts(rule, findings)
    for number, clause in enumerate(clauses, 1):
        _add_clause(table, number, clause, texts)
    output = _child(table, "output", id="output", name=name, typeRef=kind)
    if not valued:
        values = _child(output, "outputValues", id="output_values")
        _child(values, "text", ",".join(map(_quoted, _ANSWERS)))
    for number, row in enumerate(rule.rows, 1):
        _add_row(table, number, row, rule, clauses)
    for word in inputs:
        data = _child(root, "inputData", id=f"input_{word}", name=word)
        _child(data, "description", _meaning(word, rule, findings))
        kind = "string" if word in texts else "number"
        _child(data, "variable", id=f"variable_{word}", name=word, typeRef=kind)
    ET.indent(root)
    body = ET.tostring(root, encoding="unicode")
    return f'<?xml version="1.0" encoding="UTF-8"?>\n{body}\n'


_ANSWERS = ("plus", "minus", "undecided")


def clauses_of(rule: Rule) -> tuple[Clause, ...]:
    """The input columns: those that some row makes use of, and the step in any case."""
    words = input_names(rule)
    clauses = []
    if any(row.step_from is not None for row in rule.rows):
        clauses.append(Clause(STEP, _AT_LEAST))
    if any(row.step_to is not None for row in rule.rows) or not clauses:
        clauses.append(Clause(STEP, _AT_MOST))
    for number in NUMBERS:
        for end, test in enumerate((_AT_LEAST, _AT_MOST)):
            if any(row.ranges.get(number, (None, None))[end] is not None for row in rule.rows):
                clauses.append(Clause(number, test))
    if any(row.first_answer is not None for row in rule.rows):
        clauses.append(Clause(FIRST_ANSWER, _IS))
    for agent in rule.seen:
        if any(agent in row.shows for row in rule.rows):
            clauses.append(Clause(words[agent] + SHOWS, _IS))
        if any(agent in row.thresholds for row in rule.rows):
            clauses.append(Clause(words[agent] + THRESHOLDS, _IS))
    if not is_valued(rule):
        clauses += [Clause(TALLY, _AT_MOST), Clause(TALLY, _AT_LEAST)]
    return tuple(clauses)


def _add_clause(
    table: ET.Element, number: int, clause: Clause, texts: Mapping[str, Sequence[str]]
) -> None:
    label = clause.input if clause.test == _IS else f"{clause.input} {clause.test}"
    column = _child(table, "input", id=f"clause_{number}", label=label)
    kind = "string" if clause.input in texts else "number"
    expression = _child(column, "inputExpression", id=f"expression_{number}", typeRef=kind)
    _child(expression, "text", clause.input)
    if clause.input in texts:
        values = _child(column, "inputValues", id=f"values_{number}")
        _child(values, "text", ",".join(map(_quoted, texts[clause.input])))


def _add_row(
    table: ET.Element, number: int, row: Row, rule: Rule, clauses: Sequence[Clause]
) -> None:
    """Add a row of the rule: one line for each combination of texts and each answer."""
    for line, (tests, result) in enumerate(_lines(row, rule), 1):
        entry = _child(table, "rule", id=f"row_{number}_{line}")
        _child(entry, "description", f"row {number}")
        for place, clause in enumerate(clauses, 1):
            cell = _child(entry, "inputEntry", id=f"entry_{number}_{line}_{place}")
            _child(cell, "text", tests.get(clause, ANY))
        made = _child(entry, "outputEntry", id=f"result_{number}_{line}")
        _child(made, "text", result)


def _lines(row: Row, rule: Rule) -> Iterator[tuple[dict[Clause, str], str]]:
    """The lines a row becomes: the tests of its cells that are not blank, and its result."""
    words = input_names(rule)
    fixed = dict(_sides(STEP, row.step_from, row.step_to))
    for name, (least, greatest) in row.ranges.items():
        fixed.update(_sides(name, least, greatest))
    listed: list[tuple[Clause, tuple[str, ...]]] = []
    if row.first_answer is not None:
        listed.append((Clause(FIRST_ANSWER, _IS), _in_order(row.first_answer, FIRST_ANSWERS)))
    for agent in rule.seen:
        if agent in row.shows:
            states = _in_order(row.shows[agent], SHOWN)
            listed.append((Clause(words[agent] + SHOWS, _IS), states))
        if agent in row.thresholds:
            names = tuple(sorted(row.thresholds[agent]))
            listed.append((Clause(words[agent] + THRESHOLDS, _IS), names))
    for texts in product(*(accepted for _, accepted in listed)):
        tests = dict(fixed)
        for (clause, _), text in zip(listed, texts, strict=True):
            tests[clause] = _quoted(text)
        for more, result in _results(row, rule):
            yield {**tests, **more}, result


def _results(row: Row, rule: Rule) -> Iterator[tuple[dict[Clause, str], str]]:
    bars = row.minus_at is not None or row.plus_at is not None
    if is_valued(rule):
        if row.value is None or bars:
            raise ValueError("a rule holds either a worth in every row or bars, not both")
        yield {}, worth_text(row.value)
        return
    low, high = Clause(TALLY, _AT_MOST), Clause(TALLY, _AT_LEAST)
    if row.minus_at is not None:
        yield {low: f"{_AT_MOST} {row.minus_at}"}, _quoted("minus")
    if row.plus_at is not None:
        yield {high: f"{_AT_LEAST} {row.plus_at}"}, _quoted("plus")
    yield {}, _quoted("undecided")


def worth_text(value: float) -> str:
    """A worth (nats) as a plain decimal; an infinite one as plus or minus :data:`BEYOND`."""
    if math.isinf(value):
        return str(int(math.copysign(BEYOND, value)))
    return plain_decimal(value)


def _sides(name: str, least: int | None, greatest: int | None) -> Iterator[tuple[Clause, str]]:
    for test, end in ((_AT_LEAST, least), (_AT_MOST, greatest)):
        if end is not None:
            yield Clause(name, test), f"{test} {end}"


def _in_order(accepted: frozenset[str], order: Sequence[str]) -> tuple[str, ...]:
    if not accepted or not accepted.issubset(order):
        raise ValueError(f"a row accepts {sorted(accepted)}, which is not among {list(order)}")
    return tuple(name for name in order if name in accepted)


def _texts(rule: Rule, findings: Findings) -> dict[str, tuple[str, ...]]:
    """The inputs that hold a text, and what it may be."""
    texts: dict[str, tuple[str, ...]] = {FIRST_ANSWER: FIRST_ANSWERS}
    names = threshold_names(rule, findings)
    for word in input_names(rule).values():
        texts[word + SHOWS], texts[word + THRESHOLDS] = SHOWN, names
    return texts


def _head(rule: Rule, findings: Findings) -> list[str]:
    """Caution, price and origin: what must travel with the table."""
    case = findings.case
    return [
        *cautions(case.question.stakes),
        f"A rule for {case.agents[rule.agent].name} ({rule.agent}), form {rule.form}; case"
        f" {case.name}, digest {findings.digest}; thumbwright {findings.version}.",
        *_price(rule, findings),
        "The figures hold for this very table: price it again after any change.",
    ]


def _price(rule: Rule, findings: Findings) -> tuple[str, ...]:
    results: list[FormResult] = [r for r in findings.forms.values() if r.rule is rule]
    return price_tag(findings, results[0]) if results else ()


def _what(rule: Rule, findings: Findings, valued: bool) -> str:
    question = findings.case.question
    said = ["The first row that holds decides; where none holds there is no result."]
    if valued:
        said.append(
            "nats: what the situation adds to the agent's log-odds for plus (natural logarithm),"
            " a level and not a change. Belief = prior log-odds"
            f" {_figure(findings.prior)} + the agent's own log-likelihood ratios, summed +"
            f" nats; the agent answers minus at {_figure(findings.bounds[0])} or less, plus"
            f" at {_figure(findings.bounds[1])} or more, give or take {plain_decimal(TIE)}."
        )
        if any(row.value is not None and math.isinf(row.value) for row in rule.rows):
            said.append(f"{BEYOND} and -{BEYOND} stand for worths without bound.")
    else:
        said.append(
            f"plus: “{question.plus}”; minus: “{question.minus}”; undecided: go on observing. Once"
            " it has answered, an agent is asked no more."
        )
    return " ".join(said)


def _meaning(word: str, rule: Rule, findings: Findings) -> str:
    """What one input is, and in which unit."""
    case = findings.case
    if word == STEP:
        label = f" One step: {case.time.step_label}." if case.time.step_label else ""
        return "The agent's own observations so far, this one included." + label
    if word == TALLY:
        return "The sum of the agent's own observations." + _moves(findings)
    if word in NUMBERS:
        return number_means(word)[0].upper() + number_means(word)[1:] + "."
    if word == FIRST_ANSWER:
        return "Which answer a seen agent gave first; nobody: none yet; both: at the same moment."
    for agent, short in input_names(rule).items():
        if word == short + SHOWS:
            words = case.words
            return (
                f"What {case.agents[agent].name} shows: undecided ({words.shows_nothing}), plus"
                f" ({words.shows_plus}) or minus ({words.shows_minus})."
            )
        if word == short + THRESHOLDS:
            return f"The name of the thresholds of {case.agents[agent].name}."
    raise ValueError(f"no input is called {word}")


def _moves(findings: Findings) -> str:
    offsets = findings.value_offsets
    if offsets is None or len(offsets) != len(findings.labels):
        return ""
    each = (f"{label}: {move:+d}" for label, move in zip(findings.labels, offsets, strict=True))
    return f" What each observation adds: {'; '.join(each)}."


def _figure(number: float) -> str:
    """A computed figure to as many digits as do not differ from one machine to another."""
    return plain_decimal(float(f"{number:.{DIGITS}g}"))


def _quoted(text: str) -> str:
    """A text as FEEL, the language of the tables, quotes it."""
    return json.dumps(text, ensure_ascii=False)


def _child(parent: ET.Element, tag: str, text: str | None = None, **attributes: str) -> ET.Element:
    child = ET.SubElement(parent, tag, {key: _text(value) for key, value in attributes.items()})
    if text is not None:
        child.text = _text(text)
    return child


def _text(text: str) -> str:
    """The text with what XML cannot hold at all replaced; the library escapes the rest."""
    return _NOT_XML.sub("\N{REPLACEMENT CHARACTER}", text)
