"""Every way of running a rule answers alike, and a spoilt file is noticed."""

from __future__ import annotations

import json
from dataclasses import replace
from functools import cache
from pathlib import Path
from typing import Any

import pytest

from tests.distill.exports import agreement, code_engines, dmn_engines, hand_built
from tests.distill.exports.agreement import Answers, Asked, Engine, Spoil
from thumbwright.distill.code.inputs import Part
from thumbwright.distill.exports import render_all
from thumbwright.distill.findings import Findings
from thumbwright.distill.rule_reading import read_rule
from thumbwright.distill.rules import Row


def by_hand(_folder: Path, findings: Findings, asked: Asked) -> Answers:
    """The rule read row by row with nothing but comparisons."""
    value, decide = asked.parts.value, asked.parts.decide
    rows = [agreement.first_row(decide.rule, s.given) for s in asked.situations]
    return Answers(
        None
        if value is None
        else [
            None if row is None else row.value
            for row in (agreement.first_row(value.rule, s.given) for s in asked.situations)
        ],
        [
            None if row is None else agreement.answer(decide, row, s.tally, findings)
            for row, s in zip(rows, asked.situations, strict=True)
        ],
    )


def from_csv(folder: Path, findings: Findings, asked: Asked) -> Answers:
    """``rule.csv`` read again."""
    names = tuple(findings.case.thresholds)
    rule = read_rule(folder / "rule.csv", seen=findings.seen, threshold_names=names)
    parts = replace(asked.parts, decide=replace(asked.parts.decide, rule=rule), value=None)
    said = agreement.in_memory(folder, findings, replace(asked, parts=parts))
    if not asked.parts.decide.valued:
        return said
    part = Part(rule, asked.parts.decide.inputs)
    worths = agreement.in_memory(folder, findings, replace(asked, parts=replace(parts, value=part)))
    return replace(said, values=worths.values)


def from_json(folder: Path, findings: Findings, asked: Asked) -> Answers:
    """``rule.json`` read again, without any code of ours that reads rules."""
    forms = json.loads((folder / "rule.json").read_text("utf-8"))["forms"]
    rules = {name: [_json_row(record) for record in forms[name]["rows"]] for name in forms}

    def part_of(part: Part) -> Part:
        rule = part.rule
        return replace(part, rule=replace(rule, rows=tuple(rules[rule.form])))

    parts = replace(
        asked.parts,
        decide=part_of(asked.parts.decide),
        value=None if asked.parts.value is None else part_of(asked.parts.value),
    )
    return by_hand(folder, findings, replace(asked, parts=parts))


def _json_row(record: dict[str, Any]) -> Row:
    worth = record.get("nats")
    return Row(
        step_from=record["step_from"],
        step_to=record["step_to"],
        shows={agent: frozenset(states) for agent, states in record["shows"].items()},
        thresholds={a: frozenset(names) for a, names in record.get("thresholds", {}).items()},
        value=float(worth.lower()) if isinstance(worth, str) else worth,
        minus_at=record.get("minus_at_or_below"),
        plus_at=record.get("plus_at_or_above"),
        ranges={name: tuple(ends) for name, ends in record.get("ranges", {}).items()},
        first_answer=frozenset(record["first_answer"]) if "first_answer" in record else None,
    )


ENGINES = (
    Engine("by hand", "", by_hand),
    Engine(
        "CSV",
        "rule.csv",
        from_csv,
        (
            Spoil("a number", r"(?m)^,2,undecided", ",3,undecided"),
            Spoil("a state", r"(?m)^,2,undecided", ",2,minus"),
        ),
    ),
    Engine(
        "JSON",
        "rule.json",
        from_json,
        (
            Spoil("a number", r'"plus_at_or_above": 3', '"plus_at_or_above": 4'),
            Spoil("a state", r'\[\s*"undecided"\s*\]', '["minus"]'),
        ),
    ),
    *dmn_engines.SHARED,
    *code_engines.ENGINES,
)


@cache
def prepared(name: str) -> tuple[Findings, dict[str, str], Asked, Answers]:
    """Findings, their files, what is asked and what the rule itself answers."""
    findings = hand_built.FINDINGS[name]()
    files = {k: v for k, v in render_all(findings).items() if isinstance(v, str)}
    asked = agreement.asked_of(findings)
    return findings, files, asked, agreement.in_memory(Path(), findings, asked)


def put(files: dict[str, str], folder: Path) -> Path:
    """Write the files of an export."""
    for name, text in files.items():
        (folder / name).write_text(text, "utf-8")
    return folder


def ready(engine: Engine) -> None:
    """Skip where the machine lacks what the engine needs."""
    if engine.missing():
        pytest.skip(engine.missing())


@pytest.mark.parametrize("engine", ENGINES, ids=lambda engine: engine.name)
@pytest.mark.parametrize("name", hand_built.FINDINGS)
def test_answers_are_the_same(name: str, engine: Engine, tmp_path: Path) -> None:
    ready(engine)
    if name in engine.skips:
        return
    findings, files, asked, expected = prepared(name)
    got = engine.run(put(files, tmp_path), findings, asked)
    found = agreement.disagreements(expected, got, asked, engine)
    assert not found, "\n".join([f"{len(found)} differ", *found[:5]])


SPOILT = [(engine, spoil) for engine in ENGINES for spoil in engine.spoils]


@pytest.mark.parametrize(
    ("engine", "spoil"), SPOILT, ids=[f"{engine.name}, {spoil.what}" for engine, spoil in SPOILT]
)
def test_a_spoilt_file_is_noticed(engine: Engine, spoil: Spoil, tmp_path: Path) -> None:
    ready(engine)
    findings, files, asked, expected = prepared(spoil.on)
    spoilt = {**files, engine.file: spoil.applied(files[engine.file])}
    got = engine.run(put(spoilt, tmp_path), findings, asked)
    assert agreement.disagreements(expected, got, asked, engine)


def test_every_file_that_is_read_is_spoilt() -> None:
    read = {engine.name for engine in ENGINES if engine.file}
    assert read == {engine.name for engine, _ in SPOILT}


def test_the_situations_hold_what_they_should() -> None:
    findings, _, asked, expected = prepared("frost-watch")
    steps = {s.given["step"] for s in asked.situations}
    horizon = findings.case.time.horizon
    assert {1, 2, 3, 4, horizon, horizon + 1} <= steps
    assert max(steps) > horizon + 1
    assert len(asked.situations) > agreement.RANDOM
    assert expected.answers is not None
    assert set(expected.answers) == {"plus", "minus", "undecided"}
    assert {None, "plus", "minus", "undecided"} == set(prepared("bars")[3].answers or ())
    rows = prepared("frost-watch")[2].parts.value
    assert rows is not None
    assert {row.value for row in rows.rule.rows} == set(expected.values or ())


@pytest.mark.parametrize("name", hand_built.FINDINGS)
def test_every_distinct_situation_is_asked(name: str) -> None:
    _, _, asked, expected = prepared(name)
    assert asked.complete == (name != "odd ids")
    for part, said in ((asked.parts.value, expected.values), (asked.parts.decide, None)):
        if part is not None and said is not None:
            assert {row.value for row in part.rule.rows} <= set(said)
