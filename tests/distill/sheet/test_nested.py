"""Rows as nested sentences: nothing lost, nothing said twice."""

from __future__ import annotations

from dataclasses import replace

import pytest

from tests.distill.sheet.sample_findings import frost
from thumbwright.distill.exports.sheet_html import render as html
from thumbwright.distill.exports.sheet_md import render as markdown
from thumbwright.distill.findings import Findings, FormResult, RowUse
from thumbwright.distill.rules import Row, Rule
from thumbwright.distill.sheet.nested import nested
from thumbwright.distill.sheet.voice import voice

QUIET, PLUS, MINUS = (frozenset({state}) for state in ("undecided", "plus", "minus"))


def with_tree(rows: tuple[Row, ...]) -> tuple[Findings, FormResult]:
    findings = frost()
    rule = Rule("tree", "mill", ("upper",), rows)
    uses = tuple(RowUse(1.0, 0.25) for _ in rows)
    result = replace(findings.forms["lines"], rule=rule, uses=uses)
    return replace(findings, forms={**findings.forms, "tree": result}), result


ROWS = (
    Row(shows={"upper": MINUS}, value=-0.8),
    Row(shows={"upper": QUIET}, step_to=2, value=0.0),
    Row(shows={"upper": QUIET}, step_from=3, step_to=9, value=0.2),
    Row(shows={"upper": QUIET}, step_from=10, value=0.4),
    Row(shows={"upper": PLUS}, value=1.6),
)


def test_cases_of_one_input_stand_side_by_side() -> None:
    findings, result = with_tree(ROWS)
    made = nested("The tree", result, findings, voice(findings))
    assert [s.text.split(":")[0] for s in made.sentences] == [
        "Where Upper field shows minus",
        "Where Upper field shows undecided",
        "Where Upper field shows plus",
    ]
    inner = made.sentences[1].inner
    assert [s.text.split(":")[0] for s in inner] == [
        "At steps 1 to 2",
        "At steps 3 to 9",
        "From step 10 on",
    ]
    assert inner[2].text == (
        "From step 10 on: worth 0.40000 nats, 0.98652 in units of the count "
        "(row 4; in force 1.0000 steps an outing, calls 0.25000)."
    )


def test_numbers_and_first_answers_are_said() -> None:
    findings, result = with_tree(
        (
            Row(ranges={"steps_since_first": (None, 0)}, value=0.1),
            Row(
                ranges={"steps_since_first": (1, None)},
                first_answer=frozenset({"minus"}),
                value=-1.0,
            ),
            Row(
                ranges={"steps_since_first": (1, None)},
                first_answer=frozenset({"plus", "both"}),
                value=1.0,
            ),
        )
    )
    made = nested("The tree", result, findings, voice(findings))
    texts = [s.text.split(":")[0] for s in made.sentences]
    assert texts == ["Steps since the first answer 0", "Steps since the first answer 1 or more"]
    assert [s.text.split(":")[0] for s in made.sentences[1].inner] == [
        "Where the first answer was minus",
        "Where the first answer was plus or both",
    ]


def test_one_row_is_always() -> None:
    findings, result = with_tree((Row(value=0.0),))
    (only,) = nested("The tree", result, findings, voice(findings)).sentences
    assert only.text.startswith("Always: worth 0 nats")


def test_rows_that_no_cuts_made_are_refused() -> None:
    findings, result = with_tree((Row(step_to=5, value=0.1), Row(step_from=5, value=0.2)))
    with pytest.raises(ValueError, match="successive cuts"):
        nested("The tree", result, findings, voice(findings))


def test_both_sheets_print_the_sentences_and_no_table_of_them() -> None:
    findings, _ = with_tree(ROWS)
    text = markdown(findings)["sheet.md"]
    assert isinstance(text, str)
    assert "\n- Where Upper field shows undecided:\n  - At steps 1 to 2: worth 0 nats" in text
    assert "\n- Where Upper field shows plus: worth 1.6" in text
    page = html(findings)["sheet.html"]
    assert isinstance(page, str)
    assert "<li>Where Upper field shows undecided:<ul>" in page
    assert page.count("Where Upper field shows") == 3
