from __future__ import annotations

import datetime

import pytest
from hypothesis import given, strategies as st

from thumbwright.distill.faults import (
    Faults,
    clean,
    close_match,
    fault_line,
    hint,
    key_text,
    quoted,
    shown,
)


def test_faults_hold_all_messages_and_print_one_a_line() -> None:
    faults = Faults(["one", "two"])
    assert faults.messages == ("one", "two")
    assert str(faults) == "one\ntwo"
    with pytest.raises(ValueError, match="at least one"):
        Faults([])


def test_a_fault_reads_file_line_key_text() -> None:
    assert fault_line("a.toml", 3, "rule.agent", "is missing") == "a.toml:3: rule.agent: is missing"
    assert fault_line("a.toml", 3, "", "is empty") == "a.toml:3: is empty"
    assert fault_line("a.toml", None, "", "is a folder") == "a.toml: is a folder"


def test_keys_are_written_as_in_toml() -> None:
    assert key_text(("agents", "mill", "sees", 0)) == "agents.mill.sees[1]"
    assert key_text(("agents", "no good\n", "sees")) == 'agents."no good\\n".sees'
    assert key_text(()) == ""


def test_hints_name_the_allowed_and_the_likely() -> None:
    assert hint("onse", ("once", "settle")) == " (allowed once, settle; did you mean once)"
    assert hint("ONCE", ("once", "settle")) == " (allowed once, settle; did you mean once)"
    assert hint("zzz", ("once", "settle")) == " (allowed once, settle)"
    assert hint("once", ("once",)) == " (allowed once)"
    assert hint(3, ("once",)) == " (allowed once)"
    assert hint("x", ()) == ""
    assert close_match("thresholds", ("plus", "minus")) is None


@pytest.mark.parametrize(
    ("value", "phrase"),
    [
        ("text", '"text"'),
        (True, "true"),
        (3, "3"),
        (10**40, "a very large number"),
        pytest.param(int("f" * 9000, 16), "a very large number", id="too long to print"),
        (0.5, "0.5"),
        (float("nan"), "a number that is not finite"),
        ([1], "a list"),
        ({}, "a table"),
        (datetime.date(1979, 5, 27), "a date or time"),
    ],
)
def test_values_are_described_in_a_phrase(value: object, phrase: str) -> None:
    assert shown(value) == phrase


@given(st.text())
def test_no_text_breaks_the_line_or_reaches_the_terminal_as_a_command(text: str) -> None:
    for written in (quoted(text), clean(text), key_text(("a", text)), hint(text, (text,))):
        assert len(written.splitlines()) <= 1
        assert not any(ord(char) < 32 or 127 <= ord(char) < 160 for char in written)
    assert len(quoted("a" * 10_000)) < 70
