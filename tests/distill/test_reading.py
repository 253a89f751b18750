from __future__ import annotations

import re
from pathlib import Path

import pytest
from hypothesis import given, strategies as st

from thumbwright.distill.faults import Faults
from thumbwright.distill.reading import (
    LARGEST_FILE,
    case_from_bytes,
    case_from_text,
    read_case,
    slug,
    starter_names,
    starter_text,
)

FROST = starter_text("frost-watch")


@pytest.mark.parametrize(
    ("data", "message"),
    [
        (b"", "t.toml:1: the file is empty"),
        (b" \n\n", "t.toml:1: the file is empty"),
        (b"title = 'a'\n\nx = '\xff'", "t.toml:3: byte 0xFF is not UTF-8"),
        (b"\xff\xfet\0", "t.toml:1: the file is not UTF-8 but UTF-16"),
        (
            b"title = 'a'\nplus frost\n",
            "t.toml:2: not TOML: a key must be followed by = (column 6)",
        ),
        (b"title = 'a'\nx = frost\n", "t.toml:2: not TOML: this is no value"),
        (b"title = 'a'\n\nx = 'abc", "t.toml:3: not TOML: "),
        (b"title = 'a'\ntitle = 'b'\n", "t.toml:2: not TOML: this key is written twice"),
        (b"x = " + b"[" * 9999, "t.toml:1: lists or tables are nested too deeply"),
        (b"x = " + b"9" * 9999, "t.toml:1: not TOML: a number has too many digits"),
    ],
)
def test_files_that_cannot_be_read_on_give_one_fault(data: bytes, message: str) -> None:
    with pytest.raises(Faults) as caught:
        case_from_bytes(data, "t", "t.toml")
    assert len(caught.value.messages) == 1
    assert caught.value.messages[0].startswith(message)


def test_a_byte_order_mark_is_reported_along_with_the_rest() -> None:
    data = b"\xef\xbb\xbf" + FROST.replace("p = 0.6", "p = 7").encode()
    with pytest.raises(Faults) as caught:
        case_from_bytes(data, "t", "t.toml")
    assert "byte order mark" in caught.value.messages[0]
    assert "evidence.p: 7 is out of range" in caught.value.messages[1]
    assert len(caught.value.messages) == 2


def test_paths_that_lead_nowhere(tmp_path: Path) -> None:
    (tmp_path / "large.toml").write_bytes(b"#" * (LARGEST_FILE + 1))
    for path, says in (
        (str(tmp_path), "is a folder, not a case file"),
        (str(tmp_path / "none.toml"), "no such file, and no starter of this name (starters: flock"),
        ("frost-wach", "did you mean frost-watch"),
        ("a\0b\n", "a\\x00b\\n: "),
        (str(tmp_path / ("x" * 300)), "cannot be read"),
        (str(tmp_path / "large.toml"), "more than 1000000 bytes"),
    ):
        with pytest.raises(Faults) as caught:
            read_case(path)
        (message,) = caught.value.messages
        assert says in message


def test_a_case_file_is_read_from_its_path(tmp_path: Path) -> None:
    path = tmp_path / "My Orchard_2.toml"
    path.write_text(FROST, encoding="utf-8")
    for source in (path, str(path)):
        case = read_case(source)
        assert (case.name, case.source) == ("my-orchard-2", str(path))
        assert case.digest == read_case("frost-watch").digest
    path.write_bytes(FROST.replace("\n", "\r\n").encode())
    assert read_case(path).digest == case.digest


def test_starters() -> None:
    assert starter_names() == ("flock-alarm", "frost-watch", "lot-inspection")
    with pytest.raises(Faults, match=r"no starter of this name \(allowed flock-alarm, frost-w"):
        starter_text("frost")
    for name in starter_names():
        assert all(len(line) <= 100 for line in starter_text(name).splitlines())


@pytest.mark.parametrize(
    ("path", "name"), [("a/B c.toml", "b-c"), ("é.toml", "case"), ("..", "case"), ("x", "x")]
)
def test_slugs(path: str, name: str) -> None:
    assert slug(path) == name


LINES = FROST.splitlines()
JUNK = st.sampled_from(
    [
        "",
        "[agents]",
        "[rule]",
        "x = 1",
        "plus = []",
        "sees = 3",
        "= ",
        "[[time]]",
        "kind = { a = 1 }",
        "[agents.upper.evidence]",
        "evidence.p = 2",
        "[network]",
        "thresholds = [{ unknown = 3 }]",
        "rule = 1979-05-27",
        '"" = ""',
    ]
)


@given(st.lists(st.tuples(st.integers(0, len(LINES) - 1), JUNK), min_size=1, max_size=5))
def test_however_a_file_is_mangled_it_is_read_or_refused_in_plain_words(
    changes: list[tuple[int, str]],
) -> None:
    lines = list(LINES)
    for place, junk in changes:
        lines[place] = junk
    try:
        case_from_text("\n".join(lines), name="t", file="t.toml")
    except Faults as faults:
        for message in faults.messages:
            assert re.match(r"t\.toml:[1-9][0-9]*: ", message)
            assert int(message.split(":")[1]) <= len(lines) + 1
            assert not re.search(r"pydantic|Input should|not what belongs", message)
