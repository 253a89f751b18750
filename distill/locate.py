"""Line numbers for the keys of a TOML document.

The parser of the standard library gives values without places. This module reads the same
text once more, only for its layout: which line each table header, key and list entry stands
on. It expects text that the parser has accepted and judges nothing itself; grammar:
TOML v1.0.0 (the open standard at toml.io).
"""

from __future__ import annotations

import tomllib
from collections.abc import Mapping
from typing import Any

from thumbwright.distill.faults import Key

_BLANK = " \t"
_VALUE_ENDS = ",]}#\n"


def locate(text: str) -> dict[Key, int]:
    """Return the line, from 1, of every key, table and list entry of a TOML document.

    A table has the line of its header, or, without one, of the first header or key that
    implies it. Keys are tuples as in :data:`thumbwright.distill.faults.Key`; an array of
    tables counts its tables as list entries.

    Raises
    ------
    ValueError
        If the text is not TOML (``tomllib.TOMLDecodeError`` where a key cannot be read).
    """
    return _Scanner(text.replace("\r\n", "\n")).lines()


def line_of(lines: Mapping[Key, int], key: Key) -> int:
    """Return the line of ``key``, or, where it is missing, of what would hold it; else 1."""
    for length in range(len(key), 0, -1):
        if key[:length] in lines:
            return lines[key[:length]]
    return 1


class _Scanner:
    """One pass over the text; ``at`` is the position, ``found`` what was met so far."""

    def __init__(self, text: str) -> None:
        self.text = text
        self.at = 0
        self.line = 1
        self.counted_to = 0
        self.found: dict[Key, int] = {}
        self.explicit: set[Key] = set()
        self.lengths: dict[Key, int] = {}  # tables met so far in each array of tables

    def lines(self) -> dict[Key, int]:
        table: Key = ()
        while True:
            self.skip(_BLANK + "\n")
            if self.at >= len(self.text):
                return self.found
            if self.text.startswith("[[", self.at):
                table = self.header(opening=2)
            elif self.text[self.at] == "[":
                table = self.header(opening=1)
            else:
                self.pair(table)

    def header(self, opening: int) -> Key:
        """Read ``[a.b]`` or ``[[a.b]]`` and return the table that the next keys belong to."""
        line = self.line_here()
        self.at += opening
        names = self.key("]")
        self.at += opening
        key: Key = ()
        for name in names[:-1]:
            key = self.newest((*key, name))
            self.found.setdefault(key, line)
        key = (*key, names[-1])
        if opening == 2:
            self.found.setdefault(key, line)
            self.lengths[key] = self.lengths.get(key, 0) + 1
            key = self.newest(key)
        if key not in self.explicit:
            # A header of its own is a better place than the one that only implied the table.
            self.explicit.add(key)
            self.found[key] = line
        return key

    def newest(self, key: Key) -> Key:
        """Step into the last table where ``key`` names an array of tables."""
        if key not in self.lengths:
            return key
        self.found.setdefault(key, self.line_here())
        return (*key, self.lengths[key] - 1)

    def pair(self, table: Key) -> None:
        """Read ``key = value`` inside ``table``."""
        line = self.line_here()
        key = table
        for name in self.key("="):
            key = (*key, name)
            self.found.setdefault(key, line)
        self.at += 1
        self.skip(_BLANK)
        self.value(key)

    def key(self, end: str) -> tuple[str, ...]:
        """Read a bare, quoted or dotted key up to, not including, ``end``."""
        start = self.at
        while self.peek() != end:
            if self.peek() in ("", "\n"):
                raise ValueError(f"line {self.line_here()}: a key without its {end}")
            if self.peek() in "\"'":
                self.string()
            else:
                self.at += 1
        names: list[str] = []
        # The parser itself undoes quotes and escapes: one key, nested once per dot.
        inner: Any = tomllib.loads(f"{self.text[start : self.at]} = 0")
        while isinstance(inner, dict):
            [(name, inner)] = inner.items()
            names.append(name)
        return tuple(names)

    def value(self, key: Key) -> None:
        char = self.peek()
        if char and char in "\"'":
            self.string()
        elif char == "[":
            self.array(key)
        elif char == "{":
            self.inline_table(key)
        else:
            while self.peek() not in _VALUE_ENDS:  # the end of the text is in every string
                self.at += 1

    def array(self, key: Key) -> None:
        self.at += 1
        position = 0
        while True:
            self.skip(_BLANK + "\n")
            char = self.peek()
            if char == "]":
                self.at += 1
                return
            if char == "":
                raise ValueError(f"line {self.line_here()}: a list without its ]")
            if char == ",":
                self.at += 1
                continue
            entry = (*key, position)
            self.found[entry] = self.line_here()
            self.value(entry)
            position += 1

    def inline_table(self, key: Key) -> None:
        self.at += 1
        while True:
            self.skip(_BLANK + "\n")
            char = self.peek()
            if char == "}":
                self.at += 1
                return
            if char == "":
                raise ValueError(f"line {self.line_here()}: a table without its }}")
            if char == ",":
                self.at += 1
                continue
            self.pair(key)

    def string(self) -> None:
        """Step over a string of any of the four kinds."""
        quote = self.text[self.at]
        long = self.text.startswith(quote * 3, self.at)
        mark = quote * 3 if long else quote
        self.at += len(mark)
        while not self.text.startswith(mark, self.at):
            if self.at >= len(self.text):
                raise ValueError(f"line {self.line_here()}: a text without its closing quotes")
            self.at += 2 if quote == '"' and self.text[self.at] == "\\" else 1
        self.at += len(mark)
        if long:
            # Up to two quotes may stand before the three that close.
            for _ in range(2):
                if self.peek() == quote:
                    self.at += 1

    def skip(self, blanks: str) -> None:
        """Step over blanks and comments."""
        while (char := self.peek()) and (char in blanks or char == "#"):
            if char == "#":
                end = self.text.find("\n", self.at)
                self.at = len(self.text) if end < 0 else end
            else:
                self.at += 1

    def peek(self) -> str:
        """The next character, or an empty string at the end of the text."""
        return self.text[self.at : self.at + 1]

    def line_here(self) -> int:
        """The line, from 1, of the present position; counted on from where it was last asked."""
        self.line += self.text.count("\n", self.counted_to, self.at)
        self.counted_to = self.at
        return self.line
