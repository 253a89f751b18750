"""The chart of sizes and its figures."""

from __future__ import annotations

import re
from dataclasses import replace

from tests.distill.sheet import sample_findings as samples
from thumbwright.distill.exports.sheet_html import render as html_of
from thumbwright.distill.exports.sheet_md import render as md_of
from thumbwright.distill.findings import Findings, Size
from thumbwright.distill.sheet.costs import cost_note
from thumbwright.distill.sheet.sizes import sizes_chart
from thumbwright.distill.sheet.voice import voice


def size(rows: int, kept: float | None, lost: float = 0.01) -> Size:
    cost = samples.figures(0.2, 0.2, 7.0, benefit_kept=kept, accuracy_lost=lost)
    risk = None if kept is None else 0.35 - 0.05 * kept
    return Size(rows, replace(cost, risk=risk), 0.5)


def with_sizes(lines: tuple[Size, ...], table: tuple[Size, ...] = ()) -> Findings:
    findings = samples.frost()
    forms = {
        "lines": replace(findings.forms["lines"], sizes=lines),
        "table": replace(findings.forms["table"], sizes=table),
    }
    return replace(findings, forms=forms, alone=replace(findings.alone, risk=0.35))


def numbers(path: str) -> list[float]:
    return [float(number) for number in re.findall(r"-?[\d.]+", path)]


def test_heights_follow_the_benefit_and_a_shorter_form_goes_on_level() -> None:
    findings = with_sizes((size(1, 0.0), size(2, 0.5)), tuple(size(k, k / 4) for k in range(1, 5)))
    chart = sizes_chart(findings)
    assert chart is not None
    lines, table = (numbers(curve.path) for curve in chart.curves)
    assert lines[::2] == table[::2]
    assert lines[::2] == [46.0, 181.3, 316.7, 452.0]
    assert lines[1::2] == [256.0, 134.0, 134.0, 134.0]
    assert table[1::2] == [195.0, 134.0, 73.0, 12.0]
    assert [mark.figure for mark in chart.across] == ["1", "2", "3", "4"]
    assert chart.up_title == "benefit kept (share)"
    assert chart.figures.rows[0] == ("1", "0", "0.010000", "0.25000", "0.010000")
    assert chart.figures.rows[3] == ("4", "", "", "1.0000", "0.010000")


def test_what_is_far_below_is_not_drawn_but_told() -> None:
    chart = sizes_chart(with_sizes((size(1, -4.5), size(2, -0.1), size(3, 0.9))))
    assert chart is not None
    (curve,) = chart.curves
    assert numbers(curve.path)[::2] == [249.0, 452.0]
    assert chart.figures.rows[0][1] == "−4.5000"
    assert "less than −0.5 of the benefit are not drawn" in chart.reading
    assert "Worse than ignoring the neighbours: lines with at most 1 and 2 rows." in chart.reading
    assert "Other forms (table) by size" in chart.reading


def test_without_costs_it_is_accuracy_lost() -> None:
    chart = sizes_chart(with_sizes((size(1, None, 0.04), size(2, None, 0.0))))
    assert chart is not None
    assert chart.up_title == "accuracy lost against exact"
    assert chart.figures.head == ("rows", "lines: accuracy lost")
    heights = numbers(chart.curves[0].path)[1::2]
    assert heights[0] < heights[1]


def test_there_is_none_without_sizes_or_of_one_row_only() -> None:
    assert sizes_chart(samples.frost()) is None
    assert sizes_chart(with_sizes((size(1, 0.5),))) is None
    assert "What each number of rows keeps" not in str(md_of(samples.frost())["sheet.md"])


def test_both_charts_stand_on_the_page_each_with_ids_of_its_own() -> None:
    findings = with_sizes((size(1, 0.0), size(2, 0.5)))
    page = str(html_of(findings)["sheet.html"])
    ids = re.findall(r'\bid="([^"]+)"', page)
    assert len(ids) == len(set(ids))
    assert {"chart-title", "sizes-title"} <= set(ids)
    for names in re.findall(r'aria-labelledby="([^"]+)"', page):
        assert set(names.split()) <= set(ids)
    text = str(md_of(findings)["sheet.md"])
    assert "### What each number of rows keeps" in text
    assert "| 2    | 0.50000" in text


def test_a_polish_is_not_in_the_sizes_and_that_is_said() -> None:
    findings = with_sizes((size(1, 0.0), size(2, 0.5)))
    rule = findings.case.rule.model_copy(update={"polish": True})
    polished = replace(findings, case=findings.case.model_copy(update={"rule": rule}))
    for one, said in ((findings, False), (polished, True)):
        chart = sizes_chart(one)
        assert chart is not None
        assert ("before the polish" in chart.reading) is said


def test_a_card_worse_than_not_watching_is_called_so_on_the_front() -> None:
    findings = samples.frost()
    assert cost_note(findings, voice(findings)) == ""
    bad = replace(findings.forms["lines"].figures, risk=0.5)
    forms = findings.forms | {"lines": replace(findings.forms["lines"], figures=bad)}
    worse = replace(findings, forms=forms)
    assert cost_note(worse, voice(worse)) == "This card is worse than ignoring everybody."
