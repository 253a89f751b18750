"""Faults in what a user wrote: collected, put in plain words, and raised all at once.

A fault reads ``FILE:LINE: key: what is wrong (allowed …; did you mean …)``. Whatever comes from
the file is quoted, shortened and freed of control characters before it is repeated, so that a
message stays on one line and cannot disturb a terminal.
"""

from __future__ import annotations

import difflib
import math
import re
import unicodedata
from collections.abc import Iterable, Sequence
from typing import Any

Key = tuple[str | int, ...]
"""Where something stands in a document: table names and keys, and positions in lists from 0."""

_LONGEST_SHOWN = 60
_BARE_KEY = re.compile(r"[A-Za-z0-9_-]+")


class Faults(Exception):
    """Everything that is wrong with one input, in the order in which a reader meets it.

    Attributes
    ----------
    messages : tuple of str
        One line each, never empty.
    """

    messages: tuple[str, ...]

    def __init__(self, messages: Iterable[str]) -> None:
        self.messages = tuple(messages)
        if not self.messages:
            raise ValueError("Faults needs at least one message")
        super().__init__("\n".join(self.messages))


def fault_line(file: str, line: int | None, key: str, text: str) -> str:
    """Put one fault into its printed form.

    ``line`` counts from 1; ``None`` leaves the place out, for a file that could not be opened.
    An empty ``key`` leaves the key out.
    """
    place = clean(file) if line is None else f"{clean(file)}:{line}"
    return ": ".join(part for part in (place, key, text) if part)


def key_text(key: Key) -> str:
    """Write a key as TOML does, list positions counting from 1: ``agents.mill.sees[1]``."""
    written = ""
    for part in key:
        if isinstance(part, int):
            written += f"[{part + 1}]"
        else:
            bare = _BARE_KEY.fullmatch(part) is not None
            written += ("." if written else "") + (part if bare else quoted(part))
    return written


def close_match(word: str, allowed: Iterable[str]) -> str | None:
    """Return the allowed word that ``word`` was probably meant to be, or ``None``."""
    by_small = {name.lower(): name for name in allowed}
    found = difflib.get_close_matches(word.lower(), list(by_small), n=1, cutoff=0.6)
    return by_small[found[0]] if found else None


def hint(word: Any, allowed: Sequence[str]) -> str:
    """Return `` (allowed a, b; did you mean a)``, with a leading blank, or nothing to say."""
    if not allowed:
        return ""
    names = ", ".join(clean(name) for name in allowed)
    close = close_match(word, allowed) if isinstance(word, str) else None
    meant = f"; did you mean {clean(close)}" if close is not None and close != word else ""
    return f" (allowed {names}{meant})"


def shown(value: Any) -> str:
    """Describe a value from a file in one short, harmless phrase."""
    if isinstance(value, str):
        return quoted(value)
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, int):
        return str(value) if abs(value) < 10**30 else "a very large number"
    if isinstance(value, float):
        return repr(value) if math.isfinite(value) else "a number that is not finite"
    if isinstance(value, list | tuple):
        return "a list"
    if isinstance(value, dict):
        return "a table"
    return "a date or time"


def quoted(text: str) -> str:
    """Quote a text for a message: one line, shortened, control characters written as escapes."""
    if len(text) > _LONGEST_SHOWN:
        text = text[: _LONGEST_SHOWN - 1] + "…"
    return '"' + clean(text) + '"'


def clean(text: str) -> str:
    """Write control characters, line ends and text-direction marks as escapes."""
    return "".join(
        char.encode("unicode_escape").decode("ascii") if is_control(char) else char for char in text
    )


def is_control(char: str) -> bool:
    """Whether a character is invisible machinery: control, line end, direction mark, surrogate."""
    if unicodedata.category(char) in {"Cc", "Zl", "Zp", "Cs"}:
        return True
    # Embedding, override and isolate marks can make a text read differently from what it is.
    return "\u202a" <= char <= "\u202e" or "\u2066" <= char <= "\u2069"
