"""From a case file, or the name of a starter, to a checked case.

Reading stops only where there is nothing to go on with (no file, no text, no TOML); every other
fault is collected, and all of them are raised together, in the order of their lines.
"""

from __future__ import annotations

import re
import tomllib
from collections.abc import Collection, Mapping
from importlib import resources
from pathlib import Path
from typing import Any

from pydantic import ValidationError

from thumbwright.distill.case import Case, CaseFile
from thumbwright.distill.crosschecks import contradictions
from thumbwright.distill.edges import read_edges
from thumbwright.distill.faults import Faults, Key, fault_line, hint, key_text, quoted
from thumbwright.distill.locate import line_of, locate
from thumbwright.distill.network import ENDINGS
from thumbwright.distill.plain import Plain
from thumbwright.distill.wording import structural_faults

LARGEST_FILE = 1_000_000
"""Bytes; a case file is a page or two of text."""

_BOM = b"\xef\xbb\xbf"
_UTF_16 = (b"\xff\xfe", b"\xfe\xff")
_PARSER_PLACE = re.compile(r"\s*\(at (?:line (\d+), column (\d+)|end of document)\)$")
_PARSER_WORDS = {
    "Cannot overwrite a value": "this key is written twice in its table",
    "Invalid value": "this is no value; texts stand in quotes, lists in [ ], and true or false "
    "in small letters",
    "Invalid statement": "this is neither a [section] nor key = value",
    "Expected '=' after a key in a key/value pair": "a key must be followed by =",
    "Expected newline or end of document after a statement": "only one key stands on a line, and "
    "nothing but a # comment after its value",
}


def starter_names() -> tuple[str, ...]:
    """Names of the starter cases that come with the program, sorted."""
    folder = resources.files("thumbwright.templates") / "starters"
    names = (entry.name for entry in folder.iterdir())
    return tuple(sorted(name.removesuffix(".toml") for name in names if name.endswith(".toml")))


def starter_text(name: str) -> str:
    """The TOML text of a starter.

    Raises
    ------
    Faults
        If there is no starter of that name; the message lists those there are.
    """
    if name not in starter_names():
        starters = hint(name, starter_names())
        raise Faults([fault_line(name, None, "", f"there is no starter of this name{starters}")])
    file = resources.files("thumbwright.templates") / "starters" / f"{name}.toml"
    return file.read_text(encoding="utf-8")


def read_case(source: str | Path) -> Case:
    """Read and check a case.

    Parameters
    ----------
    source : str or Path
        The name of a starter, or the path of a case file. A starter's name wins over a file
        of the same name without ending; write ``./NAME`` as text to reach such a file.

    Raises
    ------
    Faults
        With everything that is wrong, one ``FILE:LINE: key: text`` each, sorted by line.
    """
    typed = str(source)
    if typed in starter_names():
        return case_from_text(starter_text(typed), name=typed, file=typed)
    path = Path(source)
    data = _bytes_of(path, typed)
    return case_from_bytes(data, name=slug(typed), file=typed, folder=path.parent)


def case_from_bytes(data: bytes, name: str, file: str, folder: Path | None = None) -> Case:
    """Check the bytes of a case file; like :func:`case_from_text`, after decoding UTF-8.

    Raises
    ------
    Faults
    """
    if data.startswith(_UTF_16):
        text = "the file is not UTF-8 but UTF-16; save it as UTF-8"
        raise Faults([fault_line(file, 1, "", text)])
    found: list[tuple[int, Key, str]] = []
    if data.startswith(_BOM):
        data = data.removeprefix(_BOM)
        found.append((1, (), "the file starts with a byte order mark; save it as UTF-8 without"))
    try:
        text = data.decode("utf-8")
    except UnicodeDecodeError as error:
        line = data.count(b"\n", 0, error.start) + 1
        bad = f"byte 0x{data[error.start]:02X} is not UTF-8; save the file as UTF-8"
        raise _faults(file, [*found, (line, (), bad)]) from error
    return case_from_text(text, name=name, file=file, found=found, folder=folder)


def case_from_text(
    text: str,
    name: str,
    file: str,
    found: list[tuple[int, Key, str]] | None = None,
    folder: Path | None = None,
) -> Case:
    """Check the TOML text of a case.

    Parameters
    ----------
    text : str
        The case in TOML.
    name : str
        Becomes ``Case.name``.
    file : str
        What messages call the file; becomes ``Case.source``.
    found : list of (line, key, text), optional
        Faults found already, to be reported along with the rest.
    folder : Path, optional
        Where the case file lies, for a network file beside it.

    Raises
    ------
    Faults
    """
    found = list(found or [])
    if not text.strip():
        empty = f"the file is empty; start from a starter ({', '.join(starter_names())})"
        raise _faults(file, [*found, (1, (), empty)])
    document, lines = _parse(text, file, found)
    structural, faulty = structural_faults(document)
    members, outside = _members(document, faulty, file, folder, found, lines)
    across = contradictions(document, faulty, members)
    for key, words in dict.fromkeys([*structural, *across]):
        found.append((line_of(lines, key), key, words))
    if found or outside:
        raise _faults(file, found, outside)
    try:
        return CaseFile.model_validate(document).complete(name, file, members)
    except ValidationError as error:
        # Contradictions that show only once the gaps are filled, such as a default wording.
        for detail in error.errors(include_url=False):
            for key, words in detail.get("ctx", {}).get("found", [(detail["loc"], detail["msg"])]):
                found.append((line_of(lines, key), key, words))
        raise _faults(file, found) from error


def slug(path: str) -> str:
    """The name of a case: its file's name in small letters, digits and ``-``."""
    stem = re.sub(r"[^a-z0-9]+", "-", Path(path).stem.lower()).strip("-")
    return stem or "case"


def _bytes_of(path: Path, typed: str) -> bytes:
    try:
        if path.is_dir():
            raise Faults([fault_line(typed, None, "", "is a folder, not a case file")])
        if not path.exists():
            starters = hint(typed, starter_names()).replace("(allowed ", "(starters: ")
            text = f"there is no such file, and no starter of this name{starters}"
            raise Faults([fault_line(typed, None, "", text)])
        if not path.is_file():
            raise Faults([fault_line(typed, None, "", "is not a regular file")])
        if path.stat().st_size > LARGEST_FILE:
            text = f"has more than {LARGEST_FILE} bytes; this is no case file"
            raise Faults([fault_line(typed, None, "", text)])
        return path.read_bytes()
    except (OSError, ValueError) as error:
        # ValueError: a path that no system call accepts, such as one with a zero byte.
        why = getattr(error, "strerror", None) or "this is no usable path"
        raise Faults([fault_line(typed, None, "", f"cannot be read: {why}")]) from error


def _members(
    document: Mapping[str, Any],
    faulty: Collection[Key],
    file: str,
    folder: Path | None,
    found: list[tuple[int, Key, str]],
    lines: Mapping[Key, int],
) -> tuple[dict[str, list[str]] | None, tuple[str, ...]]:
    """Who sees whom by the network file, if the case names one; and what is wrong in that file.

    What is wrong with its name is added to ``found``.
    """
    key = ("network", "file")
    plain = Plain(document, faulty)
    typed = plain.text(*key)
    if typed is None or not typed.lower().endswith(ENDINGS) or plain.has("network", "shape"):
        return None, ()
    try:
        if folder is None:
            raise FileNotFoundError(0, "this case is in no folder")
        return read_edges(folder / typed, str(Path(file).parent / typed)), ()
    except Faults as faults:
        return None, faults.messages
    except (OSError, ValueError) as error:
        why = getattr(error, "strerror", None) or "this is no usable path"
        found.append((line_of(lines, key), key, f"{quoted(typed)} cannot be read: {why}"))
        return None, ()


def _parse(
    text: str, file: str, found: list[tuple[int, Key, str]]
) -> tuple[Mapping[str, Any], Mapping[Key, int]]:
    last_line = text.count("\n") + (not text.endswith("\n"))
    try:
        return tomllib.loads(text), locate(text)
    except RecursionError as error:
        fault = (1, (), "lists or tables are nested too deeply")
        raise _faults(file, [*found, fault]) from error
    except ValueError as error:
        # Not only TOMLDecodeError: a whole number of thousands of digits is a plain ValueError.
        place = _PARSER_PLACE.search(str(error))
        message = str(error)[: place.start()] if place else "a number has too many digits"
        words = _PARSER_WORDS.get(message, message[:1].lower() + message[1:])
        line = int(place[1]) if place and place[1] else last_line if place else 1
        column = f" (column {place[2]})" if place and place[2] else ""
        raise _faults(file, [*found, (line, (), f"not TOML: {words}{column}")]) from error


def _faults(file: str, found: list[tuple[int, Key, str]], outside: tuple[str, ...] = ()) -> Faults:
    ordered = sorted(found, key=lambda fault: fault[0])
    inside = (fault_line(file, line, key_text(key), text) for line, key, text in ordered)
    return Faults([*inside, *outside])
