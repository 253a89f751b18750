"""The sheet of rules that count, that look at habits, and of a table where a count is kept."""

from __future__ import annotations

from dataclasses import replace

from tests.distill.sheet import more_findings as more, sample_findings as samples
from thumbwright.distill.sheet.parts import Sheet
from thumbwright.distill.sheet.view import sheet


def said(made: Sheet, lead: str) -> str:
    """Return the remark that opens with ``lead``."""
    return next(note.text for note in made.notes if note.lead.startswith(lead))


def test_a_rule_that_counts() -> None:
    made = sheet(more.counts())
    assert (made.owner, made.watching) == ("Post 1", "the 7 others")
    assert made.acts[0].text == "Lamps: how many dark, lit and blinking?"
    assert made.card.shown == "How many lamps"
    assert [line.heading for line in made.card.lines] == [
        "None lit; none blinking, check 1 to 4",
        "None lit; none blinking, check 5 on",
        "1 or 2 lit; none blinking",
        "3 or more lit; at most 6 checks from the first call to now, both counted; “frost tonight”"
        " was called first or both calls came first, at the same moment",
        "1 or more lit",
        "1 or more blinking",
    ]
    assert [line.note for line in made.card.lines[:2]] == [
        "or nobody on watch",
        "and known to be on watch",
    ]
    assert made.example is not None
    assert made.example.rows[-1][1] == "1 lit, 6 dark"
    assert made.modeller.rules[0].rows[3][2] == (
        "plus shown 3 or more; steps since first at most 6; first answer plus or both"
    )


def test_habits_are_explained_on_page_one() -> None:
    made = sheet(more.habits())
    assert "Habit “even”: calling at mild 3 or frost 3." in made.supposes
    assert "Habit “quick-to-stand-down”: calling at mild 2 or frost 4." in made.supposes
    assert made.card.lines[1].heading == "Dark, check 3 on (habit: even)"
    assert any("one of these habits, known to you" in said for said in made.supposes)


def test_a_table_where_a_count_could_be_kept() -> None:
    made = sheet(more.table_alone())
    assert said(made, "Why there is no card:").startswith("none was asked for.")
    assert made.acts[1].text == "Frost sign: peg one box right. Mild sign: peg one box left."
    assert (made.lookup.kind, made.lookup.fewer) == ("peg", "Mild sign: one left")
    assert said(sheet(samples.readings()), "Why there is no card:").startswith("what you see here")


def test_a_number_that_is_always_reached_is_any() -> None:
    sample = samples.lots()
    rule = samples.bars(
        (None, 10, [samples.QUIET], None, 2),
        (11, None, [samples.QUIET], 0, 3),
        (None, None, [samples.PLUS], None, 0),
        (None, None, [samples.MINUS], 1, 4),
        agent="second",
        seen=("first",),
    )
    forms = {"lines": samples.priced(rule, sample.exact)}
    made = sheet(replace(sample, forms=forms, example=()))
    assert made.card.blocks[1].rows == (("to 120", "never", "any"),)
    assert made.lookup.data["rows"][2]["then"] == (
        "Accept the lot: never; reject the lot: whatever your number."
    )
