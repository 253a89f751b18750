"""The card: scale, zones, numbers and blocks."""

from __future__ import annotations

from dataclasses import replace

import pytest
from hypothesis import given, strategies as st

from tests.distill.sheet import sample_findings as samples
from thumbwright.distill.findings import Findings
from thumbwright.distill.rules import Row
from thumbwright.distill.sheet.card import (
    MOST_BOXES,
    at_or_above,
    at_or_below,
    card,
    scale,
    zones,
)
from thumbwright.distill.sheet.parts import Card
from thumbwright.distill.sheet.voice import counting, voice
from thumbwright.distill.sheet.words import width


def made(findings: Findings) -> Card:
    words = voice(findings)
    return card(findings, words, counting(findings, words))


def test_frost_strips_are_those_of_the_rule() -> None:
    found = made(samples.frost())
    assert found.kind == "strips"
    assert [peg.figure for peg in found.pegs] == [
        *("8", "7", "6", "5", "4", "3", "2", "1", "0", "1", "2", "3", "4", "5", "6")
    ]
    assert (found.left, found.left_boxes) == ("more mild signs", 8)
    assert (found.right, found.right_boxes) == ("more frost signs", 7)
    assert found.shown == "Upper field: lamp"
    lines = [
        (line.letter, line.heading, line.note, [(z.kind, z.boxes, z.label) for z in line.zones])
        for line in found.lines
    ]
    watch = "keep watching"
    assert lines == [
        (
            "A",
            "Dark, check 1 or 2",
            "or nobody on watch",
            [("minus", 6, "stand down"), ("watch", 5, watch), ("plus", 4, "light")],
        ),
        (
            "B",
            "Dark, check 3 on",
            "and known to be on watch",
            [("minus", 5, "stand down"), ("watch", 6, watch), ("plus", 4, "light")],
        ),
        (
            "C",
            "Lit",
            "(says: frost tonight)",
            [("minus", 2, "down"), ("watch", 5, watch), ("plus", 8, "light the lamp")],
        ),
        (
            "D",
            "Blinking",
            "(says: no frost tonight)",
            [("minus", 8, "stand down"), ("watch", 5, watch), ("plus", 2, "light")],
        ),
    ]
    assert all(line.below == () for line in found.lines)


bar = st.one_of(st.none(), st.integers(-12, 12))


@given(st.lists(st.tuples(bar, bar), min_size=1, max_size=6))
def test_zones_fill_the_scale_and_agree_with_the_bars(pairs: list[tuple]) -> None:
    rows = tuple(
        Row(minus_at=low, plus_at=high)
        for low, high in pairs
        if low is None or high is None or low < high
    )
    low, high = scale(rows)
    assert low <= 0 <= high
    for row in rows:
        found = zones(row, low, high)
        kinds = [kind for kind, boxes in found for _ in range(boxes)]
        assert len(kinds) == high - low + 1
        for count, kind in zip(range(low, high + 1), kinds, strict=True):
            minus = row.minus_at is not None and count <= row.minus_at
            plus = row.plus_at is not None and count >= row.plus_at
            assert kind == ("minus" if minus else "plus" if plus else "watch")
        assert all(boxes >= 2 for kind, boxes in found if kind != "watch")


def test_labels_fit_their_zones_or_stand_below() -> None:
    words = samples.FROST["words"] | {
        "do_plus": "summarise observations",
        "do_minus": "disestablish watchkeeping",
    }
    findings = samples.frost(words=words)
    found = made(findings)
    for line in found.lines:
        for zone in line.zones:
            if zone.label and zone.kind != "watch":
                assert width(zone.label) <= zone.boxes * 31.0 / len(found.pegs)
            elif not zone.label:
                assert zone.spoken in line.below
    assert found.lines[2].below == ("mild 7 or more: disestablish watchkeeping",)


def test_long_scale_has_two_numbers_a_line_and_no_minus_sign() -> None:
    found = made(samples.long_scale())
    assert (found.kind, found.pegs) == ("numbers", ())
    assert [(line.minus_at, line.plus_at) for line in found.lines] == [
        ("mild 9 or more", "frost 9 or more"),
        ("mild 12 or more", "frost 9 or more"),
        ("mild 21 or more", "mild 3 or further right"),
        ("0 or any mild", "frost 14 or more"),
    ]
    assert all(line.zones == () for line in found.lines)


def test_boxes_end_at_fifteen() -> None:
    sample = samples.frost()
    for plus_at, kind in ((5, "strips"), (6, "numbers")):
        rule = samples.bars(
            (None, None, [samples.QUIET], -7, plus_at), agent="mill", seen=("upper",)
        )
        forms = {"lines": samples.priced(rule, sample.exact)}
        found = made(replace(sample, forms=forms))
        assert found.kind == kind
        assert len(found.pegs) <= MOST_BOXES


@pytest.mark.parametrize(
    ("count", "below", "above"),
    [
        (-3, "mild 3 or more", "mild 3 or further right"),
        (0, "0 or any mild", "0 or any frost"),
        (2, "frost 2 or further left", "frost 2 or more"),
        (None, "never", "never"),
    ],
)
def test_bars_in_words(count: int | None, below: str, above: str) -> None:
    words = voice(samples.frost())
    assert at_or_below(count, words) == below
    assert at_or_above(count, words) == above


def test_lots_make_one_block_for_each_shown_state() -> None:
    found = made(samples.lots())
    assert found.kind == "blocks"
    assert (found.few, found.many) == ("accept at … or fewer", "reject at … or more")
    assert [(block.letter, block.heading, block.note) for block in found.blocks] == [
        ("A", "No tag yet", "and known to be on watch"),
        ("B", "Red tag", "(says: bad lot)"),
        ("C", "Green tag", "(says: good lot)"),
        ("D", "Nobody on watch", "or you are not sure"),
    ]
    assert found.alone == "D"
    assert found.blocks[0].rows[:3] == (
        ("to 1", "never", "never"),
        ("to 19", "never", "2"),
        ("to 23", "never", "3"),
    )
    assert found.blocks[3].rows[-1] == ("to 120", "3", "6")
    assert set(found.letter_of_row) == {"A", "B", "C"}
    assert found.letter_of_row[0] == "A"


def test_a_block_that_equals_being_alone_serves_for_it() -> None:
    sample = samples.lots()
    quiet = {"first": samples.QUIET}
    rows = tuple(replace(row, shows=quiet) for row in samples.LOTS_ALONE)
    rule = replace(sample.forms["lines"].rule, rows=rows)
    found = made(replace(sample, forms={"lines": samples.priced(rule, sample.exact)}))
    assert [(block.heading, block.note) for block in found.blocks] == [
        ("No tag yet", "or nobody on watch")
    ]
    assert found.blocks[0].rows[0] == ("1 to 19", "never", "2")
    assert found.alone == "A"


def test_lines_for_nobody_on_watch_are_added_where_none_serves() -> None:
    alone = (Row(None, 9, minus_at=-4, plus_at=4), Row(10, None, minus_at=-3, plus_at=4))
    found = made(replace(samples.frost(), alone_rows=alone))
    assert [(line.letter, line.heading, line.note) for line in found.lines[4:]] == [
        ("E", "Nobody on watch, check 1 to 9", "or you are not sure"),
        ("F", "Nobody on watch, check 10 on", "or you are not sure"),
    ]
    assert found.lines[0].note == "and known to be on watch"
    assert found.alone == "lines E to F"
    assert found.letter_of_row == ("A", "B", "C", "D")


def test_bars_for_nobody_on_watch_that_take_too_much_room_are_left_out() -> None:
    alone = tuple(Row(step, step, minus_at=step - 9, plus_at=step) for step in range(1, 41))
    assert made(replace(samples.frost(), alone_rows=alone)).alone == ""
    assert made(replace(samples.lots(), alone_rows=alone)).alone == ""
    assert len(made(replace(samples.lots(), alone_rows=alone)).blocks) == 3


def test_counting_signs_for_minus_turns_the_numbers_round() -> None:
    sample = samples.lots()
    rule = samples.bars((None, None, [samples.QUIET], -4, -1), agent="second", seen=("first",))
    turned = replace(
        sample,
        alone_rows=(),
        value_offsets=(-1, 0),
        forms={"lines": samples.priced(rule, sample.exact)},
    )
    found = made(turned)
    assert (found.few, found.many) == ("reject at … or fewer", "accept at … or more")
    assert found.blocks[0].rows == (("1 to 120", "1", "4"),)


def test_without_a_count_there_is_a_table_in_words() -> None:
    found = made(samples.readings())
    assert found.kind == "table"
    assert found.strengths is not None
    assert found.strengths.rows == (
        ("A. Dark, check 1 or 2; and known to be on watch", "says nothing either way"),
        ("B. Dark, check 3 on; and known to be on watch", "about 15 to 10 for “frost tonight”"),
        ("C. Lit (says: frost tonight)", "about 51 to 10 for “frost tonight”"),
        ("D. Blinking (says: no frost tonight)", "about 22 to 10 for “no frost tonight”"),
    )


def test_situations_of_several_agents() -> None:
    words = voice(samples.three())
    lit, dark = samples.PLUS, samples.QUIET
    assert words.situation(dict.fromkeys(words.seen, lit)) == "All lit"
    assert words.situation({}) == "Whatever is shown"
    assert words.situation({"north": lit, "east": dark | lit, "west": lit}) == (
        "North gate and West gate: lit; East gate: dark or lit"
    )


@pytest.mark.parametrize(
    ("first", "last", "expected"),
    [
        (None, None, ""),
        (1, 40, ""),
        (1, 1, "check 1"),
        (1, 2, "check 1 or 2"),
        (3, 8, "check 3 to 8"),
        (3, None, "check 3 on"),
        (40, 40, "check 40"),
        (39, 40, "check 39 on"),
    ],
)
def test_ranges_of_checks(first: int | None, last: int | None, expected: str) -> None:
    assert voice(samples.frost()).checks(first, last) == expected
