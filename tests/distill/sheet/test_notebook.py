"""Results in a notebook: tables, the picture, cautions, and labels as text."""

from __future__ import annotations

import re
from dataclasses import replace

import pytest

from tests.distill.sheet import more_findings as more, nasty, sample_findings as samples
from tests.distill.sheet.markup import Page
from thumbwright.distill.cautions import cautions
from thumbwright.distill.rules import Row, Rule
from thumbwright.distill.sheet.notebook import rule_grid


@pytest.mark.parametrize("name", list(more.EVERY))
def test_findings_show_tables_and_the_chart(name: str) -> None:
    findings = more.EVERY[name]()
    text = findings._repr_html_()
    page = Page(text)
    tags = [tag for tag, _ in page.tags]
    assert tags.count("table") == tags.count("caption") == 3 + len(findings.forms)
    assert tags.count("svg") == 1
    assert "style" not in tags
    said = " ".join(words for _, words in page.texts)
    for sentence in cautions(findings.case.question.stakes):
        assert sentence in said
    assert findings.digest in said
    for _, attrs in page.tags:
        for target in (attrs.get("aria-labelledby") or "").split():
            assert target in page.ids
    assert all(findings.digest in name for name in page.ids)


@pytest.mark.parametrize("label", nasty.LABELS)
def test_labels_are_text(label: str) -> None:
    plain = Page(samples.frost(**nasty.case_of("plain"))._repr_html_())
    page = Page(samples.frost(**nasty.case_of(label))._repr_html_())
    assert {tag for tag, _ in page.tags} == {tag for tag, _ in plain.tags}
    known = {(tag, name) for tag, attrs in plain.tags for name in attrs}
    assert {(tag, name) for tag, attrs in page.tags for name in attrs} == known


def test_a_rule_shows_the_columns_that_it_uses() -> None:
    grid = rule_grid(samples.frost().forms["lines"].rule)
    assert grid.head == ("row", "steps", "upper shows", "minus at or below", "plus at or above")
    assert grid.rows == (
        ("1", "1 to 2", "undecided", "-3", "3"),
        ("2", "3 on", "undecided", "-4", "3"),
        ("3", "1 on", "plus", "-7", "-1"),
        ("4", "1 on", "minus", "-1", "5"),
    )
    counts = rule_grid(more.counts().forms["lines"].rule)
    assert counts.head[2:6] == ("plus shown", "minus shown", "steps since first", "first answer")
    assert counts.rows[3][2:] == ("3 or more", "any", "at most 6", "plus or both", "never", "-2")
    habits = rule_grid(more.habits().forms["lines"].rule)
    assert habits.head[2:5] == ("upper shows", "upper thresholds", "minus shown")
    nats = rule_grid(Rule("<b>", "mill", ("upper",), (Row(value=0.5), Row(value=None))))
    assert nats.rows == (("1", "1 on", "0.50000"), ("2", "1 on", "none"))
    text = Rule("<b>", "mill", (), (Row(value=0.5),))._repr_html_()
    assert "&lt;b&gt;" in text
    assert "<b>" not in text


def test_two_results_on_one_page_share_no_name() -> None:
    one, other = samples.frost(), replace(samples.frost(), digest="0123456789ab")
    ids = re.findall(r' id="([^"]*)"', one._repr_html_() + other._repr_html_())
    assert len(ids) == len(set(ids)) == 4
