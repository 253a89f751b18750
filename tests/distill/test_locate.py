from __future__ import annotations

import json
import tomllib
from typing import Any

import pytest
from hypothesis import given, strategies as st

from thumbwright.distill.faults import Key
from thumbwright.distill.locate import line_of, locate
from thumbwright.distill.reading import starter_names, starter_text

EVERYTHING = '''# a comment with = and [brackets]
title = "with # no comment and \\" quote"

[a]  # after a header
b.c = 1
b.d = """
[not.a.header]
x = 1""" # closes here
'quoted key' = \'\'\'two
lines\'\'\'
"escaped \\u0041 \\"key" = [
  1, # one ]
  [2,
   3],
  { deep = "x, ] }", other.part = 5 },

]
[c.d.e]
date = 1979-05-27 07:32:00
[c]
f = {}
[[g]]
h = 1
[[g.i]]
j = """ends in quotes"""""
[[g]]
h = 2
[g.k]
last = true'''

EVERYTHING_LINES: dict[Key, int] = {
    ("title",): 2,
    ("a",): 4,
    ("a", "b"): 5,
    ("a", "b", "c"): 5,
    ("a", "b", "d"): 6,
    ("a", "quoted key"): 9,
    ("a", 'escaped A "key'): 11,
    ("a", 'escaped A "key', 0): 12,
    ("a", 'escaped A "key', 1): 13,
    ("a", 'escaped A "key', 1, 0): 13,
    ("a", 'escaped A "key', 1, 1): 14,
    ("a", 'escaped A "key', 2): 15,
    ("a", 'escaped A "key', 2, "deep"): 15,
    ("a", 'escaped A "key', 2, "other"): 15,
    ("a", 'escaped A "key', 2, "other", "part"): 15,
    ("c",): 20,
    ("c", "d"): 18,
    ("c", "d", "e"): 18,
    ("c", "d", "e", "date"): 19,
    ("c", "f"): 21,
    ("g",): 22,
    ("g", 0): 22,
    ("g", 0, "h"): 23,
    ("g", 0, "i"): 24,
    ("g", 0, "i", 0): 24,
    ("g", 0, "i", 0, "j"): 25,
    ("g", 1): 26,
    ("g", 1, "h"): 27,
    ("g", 1, "k"): 28,
    ("g", 1, "k", "last"): 29,
}


def keys_of(value: Any, key: Key = ()) -> set[Key]:
    """Every key and list position of a parsed document."""
    inner: list[tuple[str | int, Any]] = []
    if isinstance(value, dict):
        inner = list(value.items())
    elif isinstance(value, list):
        inner = list(enumerate(value))
    return {key} - {()} | {found for part, entry in inner for found in keys_of(entry, (*key, part))}


def test_every_construct_is_found_on_its_line() -> None:
    assert locate(EVERYTHING) == EVERYTHING_LINES
    assert keys_of(tomllib.loads(EVERYTHING)) == set(EVERYTHING_LINES)


def test_windows_line_ends_change_nothing() -> None:
    assert locate(EVERYTHING.replace("\n", "\r\n")) == EVERYTHING_LINES


@pytest.mark.parametrize("name", starter_names())
def test_starters_have_all_their_keys_found(name: str) -> None:
    text = starter_text(name)
    lines = locate(text)
    assert set(lines) == keys_of(tomllib.loads(text))
    # Every key of a starter stands on a line that begins with its last part or its header.
    for key, line in lines.items():
        if isinstance(key[-1], str):
            written = text.splitlines()[line - 1]
            assert written.startswith((f"{key[-1]} = ", "["))
            assert key[-1] in written


def test_what_is_missing_points_to_what_would_hold_it() -> None:
    lines = locate("a = 1\n\n[t.u]\nx = [1,\n2]\n")
    assert line_of(lines, ("t", "u", "missing")) == 3
    assert line_of(lines, ("t", "u", "x", 1)) == 5
    assert line_of(lines, ("t", "u", "x", 7)) == 4
    assert line_of(lines, ("t", "v")) == 3
    assert line_of(lines, ("missing",)) == 1
    assert line_of(lines, ()) == 1


@pytest.mark.parametrize("text", ["a", "[a", 'a = "x', "a = [1", "a = {b = 1", '"a', "a = '''x"])
def test_text_that_is_no_toml_ends_in_an_error_and_not_in_a_loop(text: str) -> None:
    with pytest.raises(ValueError):
        locate(text)


# Documents written at random, with the line of every key noted while writing.

KEYS = st.text(alphabet=st.sampled_from("ab-_1.\"'\\#=[]\nü "), min_size=1, max_size=4)
TEXTS = st.text(alphabet=st.sampled_from("ab\"'\\#=[]{},\nü "), max_size=8)
SCALARS = st.one_of(st.integers(-9, 9), st.booleans(), TEXTS)
VALUES = st.recursive(
    SCALARS,
    lambda inner: st.one_of(st.lists(inner, max_size=3), st.dictionaries(KEYS, inner, max_size=3)),
    max_leaves=6,
)
TABLES = st.recursive(
    st.dictionaries(KEYS, VALUES, max_size=3).map(lambda body: (body, {})),
    lambda inner: st.tuples(
        st.dictionaries(KEYS, VALUES, max_size=3), st.dictionaries(KEYS, inner, max_size=2)
    ),
    max_leaves=4,
)


class Writer:
    """Writes a document and notes the line on which each key begins."""

    def __init__(self, draw: Any) -> None:
        self.draw = draw
        self.text = ""
        self.lines: dict[Key, int] = {}

    def note(self, key: Key) -> None:
        self.lines.setdefault(key, self.text.count("\n") + 1)

    def name(self, name: str) -> str:
        literal = "'" not in name and "\n" not in name
        bare = name.replace("-", "").replace("_", "").isalnum() and name.isascii()
        choices = [json.dumps(name)] + [f"'{name}'"] * literal + [name] * bare
        return str(self.draw(st.sampled_from(choices)))

    def string(self, value: str) -> str:
        choices = [json.dumps(value)]
        if "'" not in value:
            choices.append(f"'''\n{value}'''")
            choices += [f"'{value}'"] * ("\n" not in value)
        if '"' not in value:
            body = value.replace("\\", "\\\\")
            choices.append(f'"""{body}"""')
            choices.append(f'"""\n{body}\\"\\""""')
        return str(self.draw(st.sampled_from(choices)))

    def gap(self) -> None:
        self.text += self.draw(st.sampled_from(["", " ", "\n", " # ] } \" '\n", "\n\n\t"]))

    def value(self, key: Key, value: Any, inline: bool = False) -> None:
        if isinstance(value, bool):
            self.text += str(value).lower()
        elif isinstance(value, int):
            self.text += str(value)
        elif isinstance(value, str):
            self.text += self.string(value)
        elif isinstance(value, list):
            self.text += "["
            for place, entry in enumerate(value):
                self.gap()
                self.note((*key, place))
                self.value((*key, place), entry)
                self.gap()
                self.text += ","
            self.gap()
            self.text += "]"
        else:
            self.text += "{ "
            for place, (name, entry) in enumerate(value.items()):
                self.text += ", " if place else ""
                self.note((*key, name))
                self.text += f"{self.name(name)} = "
                self.value((*key, name), entry)
            self.text += " }"

    def table(self, key: Key, header: str, body: dict[str, Any], inner: dict[str, Any]) -> None:
        if header and (body or not inner or self.draw(st.booleans())):
            self.gap_lines()
            for length in range(1, len(key) + 1):
                self.note(key[:length])
            self.lines[key] = self.text.count("\n") + 1
            self.text += f"[{header}] # ]\n"
        for name, entry in body.items():
            self.gap_lines()
            self.note((*key, name))
            self.text += f"{self.name(name)} = "
            self.value((*key, name), entry)
            self.text += self.draw(st.sampled_from(["\n", " # x = 1\n"]))
        for name, (below, further) in inner.items():
            if name not in body:
                longer = f"{header} . {self.name(name)}" if header else self.name(name)
                self.table((*key, name), longer, below, further)

    def gap_lines(self) -> None:
        self.text += self.draw(st.sampled_from(["", "\n", "# [c]\n", "  \n\t"]))


@given(st.data(), TABLES)
def test_random_documents_agree_with_the_parser_and_with_the_writer(
    data: st.DataObject, tables: tuple[dict[str, Any], dict[str, Any]]
) -> None:
    writer = Writer(data.draw)
    writer.table((), "", *tables)
    found = locate(writer.text)
    assert set(found) == keys_of(tomllib.loads(writer.text))
    assert found == writer.lines
