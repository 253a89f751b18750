"""What the sheet and the files say of worlds in which the case is not right."""

from __future__ import annotations

import json
from dataclasses import replace

from tests.distill.sheet import sample_findings as samples
from tests.distill.sheet.markup import Page
from thumbwright.distill.doubts_text import doubts_text
from thumbwright.distill.exports import rule_json, sheet_html, sheet_md
from thumbwright.distill.findings import Doubted, Findings
from thumbwright.distill.sheet.fit import PAGE_HEIGHT, front_height
from thumbwright.distill.sheet.view import sheet


def doubt(name: str, kept: float | None, off_model: float = 0.0, how: str = "") -> Doubted:
    """A world in which the rule keeps so much."""
    rule = samples.figures(0.3, 0.25, 8.0, benefit_kept=kept, risk=0.4, off_model=off_model)
    exact = samples.figures(0.31, 0.24, 8.5, benefit_kept=0.5, risk=0.39)
    alone = samples.figures(0.2, 0.2, 12.25, benefit_kept=0.0, risk=0.35)
    return Doubted(name, f"{name} <fails>", how, rule, exact, alone)


def frost(*doubts: Doubted, left_out: tuple[str, ...] = ()) -> Findings:
    """The frost sample, doubted."""
    return replace(samples.frost(), doubts=doubts, not_doubted=left_out)


def test_three_ways_stand_in_each_cell() -> None:
    made = sheet(frost(doubt("lamp", 0.9, how="at dusk"))).modeller
    assert made.doubts is not None
    assert made.doubts.rows[0][0] == "as the case says"
    assert made.doubts.rows[1] == (
        "lamp <fails> (at dusk)",
        "0.300 / 0.310 / 0.200",
        "0.250 / 0.240 / 0.200",
        "8.000 / 8.500 / 12.2",
        "0.400 / 0.390 / 0.350",
        "0.900 / 0.500 / 0",
        "0 / 0 / 0",
    )


def test_ranges_are_over_all_worlds() -> None:
    notes = sheet(frost(doubt("a", 0.9), doubt("b", -0.25))).modeller.doubts_notes
    assert any("benefit kept −0.250 to 0.900 / 0.500 to 0.500" in note for note in notes)


def test_the_front_names_the_two_worst_worlds_in_which_looking_is_worse() -> None:
    doubts = (doubt("a", -0.1), doubt("b", 0.2), doubt("c", -0.9), doubt("d", -0.5))
    made = sheet(frost(*doubts))
    assert made.cost_note == "Better to look at nobody where c <fails>, or where d <fails>."
    assert any("where c <fails>; where d <fails>; where a" in n for n in made.modeller.doubts_notes)
    assert sheet(frost(doubt("b", 0.2), doubt("n", None))).cost_note == ""


def test_page_1_still_holds_what_it_must() -> None:
    long = doubt("a neighbour of a very long name, who stands quite far away up on the hill", -0.1)
    made = sheet(frost(long, replace(long, name="z")))
    assert front_height(made, made.example_on_front, made.tight) <= PAGE_HEIGHT


def test_what_was_read_off_model_is_not_called_exact() -> None:
    clean, odd = frost(doubt("a", 0.5)), frost(doubt("a", 0.5, off_model=0.1))
    assert not any("not exact" in note for note in sheet(clean).modeller.doubts_notes)
    assert any("not exact" in note for note in sheet(odd).modeller.doubts_notes)
    assert not any("*" in line for line in doubts_text(clean))
    assert any(line.endswith(" *") for line in doubts_text(odd))
    worlds = [json.loads(rule_json.rule_json(one))["doubts"]["worlds"]["a"] for one in (clean, odd)]
    assert [world["is_exact"] for world in worlds] == [True, False]
    assert worlds[0]["rule"]["wrong_given_plus"] == 0.3


def test_what_is_left_out_is_said_everywhere() -> None:
    found = frost(left_out=("The doubt “x” was not priced.",))
    assert sheet(found).modeller.doubts is None
    page = Page(str(sheet_html.render(found)["sheet.html"]))
    assert "The doubt “x” was not priced." in page.text("modeller")
    assert "“x” was not priced" in str(sheet_md.render(found)["sheet.md"])
    assert doubts_text(found) == ["The doubt “x” was not priced."]
    assert json.loads(rule_json.rule_json(found))["doubts"]["left_out"] == list(found.not_doubted)


def test_both_sheets_hold_the_table() -> None:
    found = frost(doubt("lamp", 0.9))
    page = Page(str(sheet_html.render(found)["sheet.html"]))
    assert "If an assumption is wrong" in page.text("modeller")
    assert "lamp <fails>" in page.text("modeller")
    markdown = str(sheet_md.render(found)["sheet.md"])
    assert "### If an assumption is wrong" in markdown
    assert "lamp \\<fails\\>" in markdown or "lamp &lt;fails" in markdown


def test_no_doubts_no_heading() -> None:
    page = Page(str(sheet_html.render(samples.frost())["sheet.html"]))
    assert "If an assumption is wrong" not in page.text("modeller")
