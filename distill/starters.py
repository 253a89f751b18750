"""Handing out the starter cases that come with the program."""

from __future__ import annotations

import tomllib
from pathlib import Path

from thumbwright.distill.faults import Faults, fault_line
from thumbwright.distill.reading import starter_names, starter_text
from thumbwright.distill.writing import write_new_file


def listing() -> str:
    """Return one line per starter: its name and title."""
    names = starter_names()
    width = max(map(len, names))
    return "\n".join(f"{n:{width}}  {tomllib.loads(starter_text(n))['title']}" for n in names)


def write_starter(name: str, file: Path) -> Path:
    """Write starter ``name`` to ``file``, which must not exist yet; return ``file``.

    Raises
    ------
    Faults
        If there is no such starter, or ``file`` exists.
    OSError
        If the file cannot be written.
    """
    text = starter_text(name)
    try:
        return write_new_file(file, text)
    except FileExistsError:
        way_out = f"name another file: thumbwright starter {name} FILE, or move this one away"
        raise Faults([fault_line(str(file), None, "", f"exists already ({way_out})")]) from None
