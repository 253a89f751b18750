"""The policy sheet as Markdown that reads well as it stands.

Every label of the case is escaped before it meets the template, so that none of them can start
a table, a link, code or HTML; tables are padded to equal widths.
"""

from __future__ import annotations

import dataclasses
import re
from typing import Any

from thumbwright.distill.findings import Findings
from thumbwright.distill.sheet.parts import Card, Grid
from thumbwright.distill.sheet.templates import rendered
from thumbwright.distill.sheet.view import sheet
from thumbwright.distill.sheet.words import told

NAME = "policy sheet as text"

_LIVE = re.compile(r"([\\`*_\[\]|~$])")
_LINE_START = re.compile(r"^(\d+)([.)])(?=\s|$)|^([#+=-])")
_ENTITY = re.compile(r"&(?=#?\w+;)")
_ADDRESS = re.compile(r"(?<=\w)://|(?<=\bwww)\.|@", re.IGNORECASE)


def render(findings: Findings) -> dict[str, str | bytes]:
    """Return ``sheet.md``."""
    made = sheet(findings)
    values = {"sheet": plain(made) | {"card_tables": plain(card_tables(made.card))}}
    return {"sheet.md": rendered("sheet.md.j2", values, autoescape=False)}


def card_tables(card: Card) -> tuple[Grid, ...]:
    """Return the card as tables of words: one for all lines, or one for each block."""
    if card.strengths is not None:
        return (card.strengths,)
    if card.kind == "blocks":
        return tuple(
            Grid(
                f"{block.letter}. {told(block.heading, block.note)}",
                (card.check, card.few, card.many),
                block.rows,
            )
            for block in card.blocks
        )
    rows = tuple(
        (line.letter, told(line.heading, line.note), line.minus_at, line.plus_at)
        for line in card.lines
    )
    return (Grid("", ("line", card.shown, card.few, card.many), rows),)


def escaped(text: str, at_start: bool = True) -> str:
    """Return ``text`` so that Markdown shows it as it is, on one line, with nothing live in it.

    ``at_start`` says that the text may begin a line, where some characters mean more.
    """
    line = " ".join(text.split())
    line = _LIVE.sub(r"\\\1", line)
    line = _ENTITY.sub("&amp;", line).replace("<", "&lt;").replace(">", "&gt;")
    line = _ADDRESS.sub(lambda found: "\\" + found.group(), line)
    return _LINE_START.sub(_quiet_start, line) if at_start else line


def _quiet_start(found: re.Match[str]) -> str:
    if found.group(1) is not None:
        return f"{found.group(1)}\\{found.group(2)}"
    return "\\" + found.group(3)


def plain(part: Any) -> Any:
    """Return parts of a sheet as dicts, tuples and numbers, with every text escaped.

    A table becomes its caption and its finished lines.
    """
    if isinstance(part, Grid):
        return {"caption": escaped(part.caption), "table": table(part)}
    if dataclasses.is_dataclass(part) and not isinstance(part, type):
        names = [field.name for field in dataclasses.fields(part)]
        return {name: plain(getattr(part, name)) for name in names}
    if isinstance(part, tuple):
        return tuple(plain(item) for item in part)
    return escaped(part) if isinstance(part, str) else part


def table(grid: Grid) -> str:
    """Return a Markdown table, cells padded to the width of their column."""
    rows = [[escaped(cell, at_start=False) for cell in row] for row in (grid.head, *grid.rows)]
    for place in grid.marked:
        rows[place + 1] = [f"**{cell}**" if cell else "" for cell in rows[place + 1]]
    widths = [max(3, *(len(row[column]) for row in rows)) for column in range(len(grid.head))]
    lines = [
        "| " + " | ".join(f"{cell:<{size}}" for cell, size in zip(row, widths, strict=True)) + " |"
        for row in rows
    ]
    rule = "| " + " | ".join("-" * size for size in widths) + " |"
    return "\n".join([lines[0], rule, *lines[1:]])
