from __future__ import annotations

import codecs
from dataclasses import replace
from pathlib import Path

import pytest
from hypothesis import given, strategies as st

from tests.distill.exports import sample
from thumbwright.distill.exports.rule_csv import rule_csv
from thumbwright.distill.faults import Faults
from thumbwright.distill.rule_reading import read_rule
from thumbwright.distill.rules import SHOWN, Row, Rule

SEEN = ("upper", "lower")
NAMES = ("even", "early")
FOUND = sample.findings()

BARS = "step_from,step_to,upper_shows,minus_at_or_below,plus_at_or_above\n"


def read(folder: Path, content: str | bytes, alpha: float | None = None) -> Rule:
    path = folder / "mine.csv"
    path.write_bytes(content.encode() if isinstance(content, str) else content)
    return read_rule(path, seen=SEEN, threshold_names=NAMES, agent="mill", alpha=alpha)


def faults(folder: Path, content: str | bytes, alpha: float | None = None) -> list[str]:
    with pytest.raises(Faults) as caught:
        read(folder, content, alpha)
    return [message.replace(str(folder) + "/", "") for message in caught.value.messages]


def some(names: tuple[str, ...]) -> st.SearchStrategy[dict[str, frozenset[str]]]:
    accepted = st.sets(st.sampled_from(names), min_size=1).map(frozenset)
    return st.dictionaries(st.sampled_from(SEEN), accepted)


@st.composite
def rules(draw: st.DrawFn) -> Rule:
    """Draw a rule of bars or of worths; rows need not cover anything sensibly."""
    valued = draw(st.booleans())
    rows = []
    for _ in range(draw(st.integers(1, 5))):
        start = draw(st.none() | st.integers(1, 1000))
        end = draw(st.none() | st.integers(start or 1, 1000))
        minus = plus = None
        if not valued:
            minus = draw(st.none() | st.integers(-900, 900))
            plus = draw(st.none() | st.integers(-900 if minus is None else minus + 1, 901))
        rows.append(
            Row(
                step_from=start,
                step_to=end,
                shows=draw(some(SHOWN)),
                thresholds=draw(some(NAMES)),
                value=draw(st.floats(allow_nan=False)) if valued else None,
                minus_at=minus,
                plus_at=plus,
            )
        )
    return Rule("mine.csv", "mill", SEEN, tuple(rows))


@given(rules())
def test_written_and_read_is_the_same_rule(
    tmp_path_factory: pytest.TempPathFactory, rule: Rule
) -> None:
    text = rule_csv(rule, FOUND)
    assert read(tmp_path_factory.mktemp("rule"), text) == rule


def test_byte_order_mark_line_ends_blank_lines_and_blanks_in_cells(tmp_path: Path) -> None:
    plain = BARS + ",2,undecided|plus,-3,3\n3,,minus,,\n"
    untidy = (
        " step_from,step_to , upper_shows,minus_at_or_below,plus_at_or_above\r\n\r\n"
        ", 2,undecided | plus,\N{MINUS SIGN}3,+3\r\n  \r\n3,,minus,,\r\n\r\n"
    )
    rule = read(tmp_path, plain)
    assert rule.rows[0] == Row(
        step_to=2, shows={"upper": frozenset({"undecided", "plus"})}, minus_at=-3, plus_at=3
    )
    assert read(tmp_path, codecs.BOM_UTF8 + untidy.encode()) == rule
    assert (rule.form, rule.agent, rule.seen) == ("mine.csv", "mill", SEEN)


def test_columns_in_any_order_and_left_out_ones_are_blank(tmp_path: Path) -> None:
    rule = read(tmp_path, "nats,step_to\n0.25,7\n")
    assert rule.rows == (Row(step_to=7, value=0.25),)


def test_observations_are_worths_in_units_of_one_observation(tmp_path: Path) -> None:
    assert read(tmp_path, "observations\n-2\n", alpha=0.4).rows == (Row(value=-0.8),)
    assert faults(tmp_path, "observations\n-2\n") == [
        "mine.csv:1: observations: this case has no single worth of an observation (give nats)"
    ]


def test_every_fault_at_once_each_with_its_line(tmp_path: Path) -> None:
    text = BARS + (
        '5,2,undecided,-3,3\n\nx,,undecidd|lit,3,3\n0,,plus,1.5,1_0\n1,2,plus\n1,2,"plus",-1,2\n'
    )
    assert faults(tmp_path, text) == [
        "mine.csv:2: step_from: 5 is after step_to, 2",
        'mine.csv:4: step_from: "x" is not a whole number',
        'mine.csv:4: upper_shows: "undecidd" is unknown (allowed undecided, plus, minus;'
        " did you mean undecided)",
        'mine.csv:4: upper_shows: "lit" is unknown (allowed undecided, plus, minus)',
        "mine.csv:4: minus_at_or_below: 3 is not below plus_at_or_above, 3",
        "mine.csv:5: step_from: 0 is below 1, the first step",
        'mine.csv:5: minus_at_or_below: "1.5" is not a whole number',
        'mine.csv:5: plus_at_or_above: "1_0" is not a whole number',
        "mine.csv:6: 3 cells where the header has 5",
    ]


@pytest.mark.parametrize("text", ["", "much", "nan", "1e999", "1_0"])
def test_worths_that_are_no_numbers(tmp_path: Path, text: str) -> None:
    (message,) = faults(tmp_path, f"step_to,nats\n3,{text}\n")
    assert message.startswith("mine.csv:2: nats: ")
    assert "blank" in message if not text else "is not a number" in message


def test_thresholds_are_read_and_checked(tmp_path: Path) -> None:
    text = "lower_thresholds,nats\neven|early,1\nearl,2\n"
    assert faults(tmp_path, text) == [
        'mine.csv:3: lower_thresholds: "earl" is unknown (allowed even, early; did you mean early)'
    ]


@pytest.mark.parametrize(
    ("header", "expected"),
    [
        ("steps_from,nats", "steps_from: unknown column (allowed step_from, step_to,"),
        ("uper_shows,nats", "did you mean upper_shows"),
        ("nats,nats", "nats: column stands 2 times"),
        ("nats,minus_at_or_below,plus_at_or_above", "cannot stand together"),
        ("nats,observations", "cannot stand together"),
        ("step_from,step_to", "no column says what a row does"),
        ("minus_at_or_below", "plus_at_or_above: column is missing beside minus_at_or_below"),
        ("step_from;nats", "separated by commas"),
        ("nats,", "unknown column"),
    ],
)
def test_faults_of_the_header(tmp_path: Path, header: str, expected: str) -> None:
    messages = faults(tmp_path, header + "\n1,2\n", alpha=1.0)
    assert any(expected in message for message in messages), messages
    assert all(message.startswith("mine.csv:1: ") for message in messages)


def test_no_thresholds_column_where_the_case_has_none(tmp_path: Path) -> None:
    path = tmp_path / "mine.csv"
    path.write_text("upper_thresholds,nats\neven,1\n")
    with pytest.raises(Faults, match="unknown column"):
        read_rule(path, seen=SEEN)


@pytest.mark.parametrize(
    ("content", "expected"),
    [
        (b"", "mine.csv:1: empty file"),
        (b"\n \n", "mine.csv:1: empty file"),
        (b"nats\n", "mine.csv:1: a header but no rows"),
        (b"nats\n1\n\xe9\n", "mine.csv:3: byte 0xe9 is not UTF-8"),
        ("nats\n1\n".encode("utf-16"), "mine.csv:1: byte 0xff is not UTF-8"),
        (b'nats\n"1"2\n', "mine.csv:2: not CSV"),
        (b'nats\n"1\n', "mine.csv:2: not CSV"),
    ],
)
def test_files_that_are_no_table(tmp_path: Path, content: bytes, expected: str) -> None:
    (message,) = faults(tmp_path, content)
    assert message.startswith(expected)


def test_file_that_cannot_be_opened(tmp_path: Path) -> None:
    for path in (tmp_path / "none.csv", tmp_path):
        with pytest.raises(Faults) as caught:
            read_rule(path, seen=SEEN)
        assert str(path) in caught.value.messages[0]
        assert "exact, plain-count, alone" in caught.value.messages[0]


def test_a_corrupted_table_is_not_the_same_rule(tmp_path: Path) -> None:
    rule = replace(sample.rule_of_bars(), form="mine.csv")
    text = rule_csv(rule, FOUND)
    assert read(tmp_path, text.replace("-4", "-5")) != read(tmp_path, text)


def test_messages_stay_on_one_line(tmp_path: Path) -> None:
    messages = faults(tmp_path, 'nats,"a\x1b[31m\nb"\n1,2\n')
    assert all("\n" not in message and "\x1b" not in message for message in messages)
