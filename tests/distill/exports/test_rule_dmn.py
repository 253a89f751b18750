from __future__ import annotations

import math
import random
from collections.abc import Mapping
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from hypothesis import HealthCheck, Phase, given, settings, strategies as st

from tests.distill.exports import sample
from tests.distill.exports.dmn_engines import ENGINES, feelin_all, spiff
from thumbwright.distill.cautions import cautions
from thumbwright.distill.exports import rule_dmn as export
from thumbwright.distill.rules import NUMBERS, SHOWN, Row, Rule
from thumbwright.distill.views import holds

FOUND = sample.findings()
SPACE = {"d": export.MODEL}


class Told:
    """A situation as a rule sees it, taken at its word: numbers need not fit the states."""

    def __init__(self, inputs: Mapping[str, Any], rule: Rule) -> None:
        self.inputs, self.words = inputs, export.input_names(rule)
        self.step = np.array(inputs["step"])
        self.names = {agent: inputs[f"{word}_thresholds"] for agent, word in self.words.items()}

    def state(self, agent: str) -> Any:
        return np.array(SHOWN.index(self.inputs[f"{self.words[agent]}_shows"]))

    def number(self, name: str) -> Any:
        return np.array(self.inputs[name])

    def first_answer(self) -> Any:
        return np.array(("nobody", "plus", "minus", "both").index(self.inputs["first_answer"]))


def expected(rule: Rule, inputs: Mapping[str, Any]) -> Any:
    """What the rule itself says: the first row that holds, and its worth or its bars."""
    row = next((row for row in rule.rows if holds(row, Told(inputs, rule)).all()), None)
    if row is None:
        return None
    if row.value is not None:
        return math.copysign(export.BEYOND, row.value) if math.isinf(row.value) else row.value
    if row.minus_at is not None and inputs["tally"] <= row.minus_at:
        return "minus"
    if row.plus_at is not None and inputs["tally"] >= row.plus_at:
        return "plus"
    return "undecided"


def situations(rule: Rule, count: int, seed: int) -> list[dict[str, Any]]:
    draw = random.Random(seed)
    made = []
    for _ in range(count):
        one: dict[str, Any] = {"step": draw.choice([1, 2, 3, 4, 40, 41, 1000])}
        one["tally"] = draw.choice([-900, -7, -5, -4, -3, -2, -1, 0, 1, 2, 3, 4, 5, 900])
        one["first_answer"] = draw.choice(["nobody", "plus", "minus", "both"])
        one |= {name: draw.choice([0, 1, 2, 3, 9]) for name in NUMBERS}
        for word in export.input_names(rule).values():
            one[f"{word}_shows"] = draw.choice(SHOWN)
            one[f"{word}_thresholds"] = draw.choice(["even", "early"])
        made.append(one)
    return made


@st.composite
def rules(draw: st.DrawFn) -> Rule:
    """Any rule the program can hold, overlaps and gaps included."""
    seen = ("upper", "lower")
    valued = draw(st.booleans())
    step = st.none() | st.sampled_from([1, 2, 3, 40])
    rows = []
    for _ in range(draw(st.integers(1, 5))):
        minus = draw(st.none() | st.integers(-5, 0))
        plus = draw(st.none() | st.integers(1, 5))
        some = st.sets(st.sampled_from(SHOWN), min_size=1).map(frozenset)
        names = st.sets(st.sampled_from(["even", "early"]), min_size=1).map(frozenset)
        ends = st.tuples(st.none() | st.integers(0, 2), st.none() | st.integers(1, 9))
        answers = st.sets(st.sampled_from(["nobody", "plus", "minus", "both"]), min_size=1)
        rows.append(
            Row(
                step_from=draw(step),
                step_to=draw(step),
                shows=draw(st.dictionaries(st.sampled_from(seen), some)),
                thresholds=draw(st.dictionaries(st.sampled_from(seen), names, max_size=1)),
                ranges=draw(st.dictionaries(st.sampled_from(NUMBERS), ends, max_size=2)),
                first_answer=draw(st.none() | answers.map(frozenset)),
                value=draw(st.floats(allow_nan=False)) if valued else None,
                minus_at=None if valued else minus,
                plus_at=None if valued else plus,
            )
        )
    return Rule("lines", "mill", seen, tuple(rows))


@given(rules(), st.integers(0, 999))
@settings(suppress_health_check=[HealthCheck.too_slow], max_examples=40)
def test_any_rule_says_the_same_in_one_engine(rule: Rule, seed: int) -> None:
    told = situations(rule, 20, seed)
    assert spiff(export.rule_dmn(rule, FOUND), told) == [expected(rule, one) for one in told]


@given(st.lists(rules(), min_size=20, max_size=20), st.integers(0, 999))
@settings(suppress_health_check=list(HealthCheck), max_examples=3, phases=[Phase.generate])
def test_any_rule_says_the_same_in_the_other_engine(some: list[Rule], seed: int) -> None:
    told = situations(some[0], 100, seed)
    found = feelin_all([(export.rule_dmn(rule, FOUND), told) for rule in some])
    assert found == [[expected(rule, one) for one in told] for rule in some]


@pytest.mark.parametrize("engine", ENGINES)
@pytest.mark.parametrize("make", [sample.rule_of_bars, sample.rule_of_worths])
def test_a_corrupted_table_is_found_out(engine: str, make: Any) -> None:
    rule = make()
    told = situations(rule, 300, 1)
    right = [expected(rule, one) for one in told]
    assert len(set(map(str, right))) >= 3
    xml = export.rule_dmn(rule, FOUND)
    assert ENGINES[engine](xml, told) == right
    for before, after in (
        ("&lt;= -4", "&lt;= -3"),
        ('>"plus"</text>', '>"minus"</text>'),
        ("0.30000000000000004", "0.3"),
    ):
        if before in xml:
            assert ENGINES[engine](xml.replace(before, after), told) != right


@pytest.mark.parametrize("make", [sample.rule_of_bars, sample.rule_of_worths])
def test_the_file_keeps_the_standard(make: Any) -> None:
    xml = export.rule_dmn(make(), FOUND)
    standard().assertValid(parsed(xml))
    assert not standard().validate(parsed(xml.replace('hitPolicy="FIRST"', 'hitPolicy="EITHER"')))
    assert not standard().validate(parsed(xml.replace('id="table"', 'id="output"')))


def parsed(xml: str) -> Any:
    from lxml import etree

    return etree.fromstring(xml.encode())


def standard() -> Any:
    """The schema of DMN 1.3 as it ships with SpiffWorkflow."""
    import SpiffWorkflow.dmn.parser
    from lxml import etree

    folder = Path(SpiffWorkflow.dmn.parser.__file__).parent / "schema"
    return etree.XMLSchema(etree.parse(str(folder / "DMN13.xsd")))


def test_tests_have_one_side_texts_stand_alone_and_numbers_have_no_exponent() -> None:
    for xml in export.render(FOUND).values():
        root = parsed(str(xml))
        for cell in root.iterfind(".//d:inputEntry/d:text", SPACE):
            assert cell.text is not None
            sides = (">= ", "<= ")
            assert (
                cell.text == "-"
                or cell.text.strip('"') in (*SHOWN, "even", "early")
                or (cell.text[:3] in sides and str(int(cell.text[3:])) == cell.text[3:])
            )
        assert "e-" not in "".join(t.text or "" for t in root.iterfind(".//d:outputEntry/*", SPACE))


def test_ranges_take_two_columns_and_unused_columns_are_left_out() -> None:
    row = Row(step_from=2, step_to=5, ranges={"plus_shown": (None, 3)}, value=1.0)
    rule = Rule("table", "mill", ("upper",), (row,))
    at_least, at_most = ">=", "<="
    assert [(c.input, c.test) for c in export.clauses_of(rule)] == [
        ("step", at_least),
        ("step", at_most),
        ("plus_shown", at_most),
    ]


def test_what_no_row_covers_has_no_result() -> None:
    rule = Rule("lines", "mill", ("upper",), (Row(step_from=3, minus_at=-1, plus_at=1),))
    xml = export.rule_dmn(rule, FOUND)
    told = [{"step": 2, "tally": 9}, {"step": 3, "tally": 9}]
    for engine in ENGINES.values():
        assert engine(xml, told) == [None, "plus"]


def test_one_file_for_each_form_with_caution_price_and_digest() -> None:
    files = export.render(FOUND)
    assert list(files) == ["rule.dmn", "rule-table.dmn"]
    for xml in files.values():
        said = parsed(str(xml)).findtext("d:description", "", SPACE)
        for sentence in (*cautions("property"), FOUND.digest, "mean step 7.250"):
            assert sentence in said


def test_names_that_engines_would_misread() -> None:
    rule = Rule(
        "table",
        "mill",
        ("a-b", "a_b", "not"),
        (
            Row(shows={"a-b": frozenset({"plus"}), "not": frozenset({"minus"})}, value=1.5),
            Row(shows={"a_b": frozenset({"plus"})}, value=2.5),
        ),
    )
    assert export.input_names(rule) == {"a-b": "a_b", "a_b": "a_b_2", "not": "not"}
    agents = {**FOUND.case.agents, **dict.fromkeys(rule.seen, FOUND.case.agents["upper"])}
    found = replace(FOUND, case=FOUND.case.model_copy(update={"agents": agents}))
    told = [
        {"step": 1, "a_b_shows": "plus", "a_b_2_shows": "plus", "not_shows": "minus"},
        {"step": 1, "a_b_shows": "minus", "a_b_2_shows": "plus", "not_shows": "minus"},
    ]
    for engine in ENGINES.values():
        assert engine(export.rule_dmn(rule, found), told) == [1.5, 2.5]


@pytest.mark.parametrize(
    "label",
    ["</description><decision/>", "&boom; <!--", "]]>", 'x" onload="y', "\ufffe\x00\x1b[0m"],
)
def test_labels_are_data(label: str) -> None:
    question = FOUND.case.question.model_copy(update={"plus": label})
    changed = FOUND.case.model_copy(update={"question": question, "title": label})
    xml = export.rule_dmn(sample.rule_of_bars(), replace(FOUND, case=changed))
    standard().assertValid(parsed(xml))
    root = parsed(xml)
    shape = [element.tag for element in root.iter()]
    plain = parsed(export.rule_dmn(sample.rule_of_bars(), FOUND))
    assert shape == [element.tag for element in plain.iter()]
    if label.isprintable():
        assert root.get("name") == label


@pytest.mark.parametrize(
    ("row", "message"),
    [
        (Row(value=1.0, plus_at=3), "not both"),
        (Row(value=1.0, shows={"upper": frozenset()}), "accepts"),
        (Row(value=1.0, shows={"upper": frozenset({"lit"})}), "accepts"),
        (Row(value=float("nan")), "not a number"),
    ],
)
def test_what_the_format_cannot_say_is_refused(row: Row, message: str) -> None:
    with pytest.raises(ValueError, match=message):
        export.rule_dmn(Rule("table", "mill", ("upper",), (row,)), FOUND)
