"""Whether page 1 holds what it must: an estimate of its printed height.

The print style sets A4 with 12 mm margins and text of 11 points (cautions 10). Heights here
follow that style, with words broken into lines by the usual letter widths of a plain sans-serif
face; they were held against a browser's and err on the high side. The card, its cautions and its
costs always stand on page 1; the example goes to the back where they leave it no room.
"""

from __future__ import annotations

import unicodedata
from collections.abc import Iterable, Sequence

from thumbwright.distill.sheet.card import ACROSS
from thumbwright.distill.sheet.parts import Card, Grid, Sheet

PAGE_HEIGHT = 773.0
PAGE_WIDTH = 527.0
"""Room on A4 within margins of 12 mm (points)."""

TEXT, SMALL = 11.0, 10.0
BOLD = 1.07
SPARE = 7.0
"""Room left over for faces that are a little wider or taller (points)."""

_WIDTHS = {
    letter: size
    for letters, size in (
        ("ijl'|‘’", 0.23),
        ("ft I!,./:;[]\\", 0.28),
        ('r()-“”"', 0.34),
        ("cksvxyzJ", 0.50),
        ("abdeghnopquL0123456789?", 0.56),
        ("FTZ", 0.61),
        ("ABEKPSVXY&", 0.67),
        ("CDHNRUw", 0.72),
        ("GOQ", 0.78),
        ("Mm", 0.84),
        ("W…", 0.97),
    )
    for letter in letters
}


def text_width(text: str, size: float = TEXT, bold: bool = False) -> float:
    """Estimate the width of ``text`` (points)."""
    ems = sum(
        _WIDTHS.get(letter, 1.0 if unicodedata.east_asian_width(letter) in "WF" else 0.6)
        for letter in text
    )
    return ems * size * (BOLD if bold else 1.0)


def lines_of(text: str, room: float, size: float = TEXT, bold: bool = False) -> int:
    """Count the lines of ``text`` in a column ``room`` points wide, breaking between words."""
    lines, used = 1, 0.0
    space = text_width(" ", size, bold)
    for word in text.split(" "):
        wide = text_width(word, size, bold)
        if used and used + space + wide > room:
            lines, used = lines + 1, 0.0
        used += wide + (space if used else 0.0)
        while used > room:
            lines, used = lines + 1, used - room
    return lines


def front_height(sheet: Sheet, with_example: bool, tight: bool = False) -> float:
    """Estimate the printed height of page 1 (points)."""
    line = TEXT * (1.14 if tight else 1.24)
    heading = 20.5 if tight else 25.0
    total = 26.0 * lines_of(sheet.title, PAGE_WIDTH - 150, 22.0, True)
    owner = f"{sheet.owner_lead} {sheet.owner}, watching {sheet.watching}."
    total += 15.5 * lines_of(owner, PAGE_WIDTH, 12.5)
    total += 14.0 + line * lines_of(sheet.override, PAGE_WIDTH - 16, bold=True)
    acts = [lines_of(f"{act.lead} {act.text}", 142.0, TEXT * 1.02) for act in sheet.acts]
    total += heading + 6.0 + line * max(acts)
    total += heading + _card_height(sheet.card, line, tight)
    total += 5.0 + _notes_height(sheet, line)
    for lead, sentences in (("", sheet.cautions), ("It supposes:", sheet.supposes)):
        text = " ".join([lead or sheet.caution_lead, *sentences])
        total += 2.0 + SMALL * (1.17 if tight else 1.2) * lines_of(text, PAGE_WIDTH - 15, SMALL)
    total += 11.0
    half = (PAGE_WIDTH - 15) / 2
    beside = with_example and sheet.example is not None
    first, room = (0.42, half) if beside else (0.26, PAGE_WIDTH)
    costs = _grid_height(sheet.costs, room, line, first)
    if sheet.cost_note:
        costs += line * lines_of(sheet.cost_note, half if beside else PAGE_WIDTH)
    if beside and sheet.example is not None:
        costs = max(costs, _grid_height(sheet.example, half, line))
    foot = 6.0 + 11.5 * lines_of(sheet.foot, PAGE_WIDTH, 9.0)
    return total + heading + costs + foot + SPARE


def _notes_height(sheet: Sheet, line: float) -> float:
    """Estimate two columns of remarks, none of them cut in two."""
    heights = [
        3.0 + line * lines_of(f"{note.lead} {note.text}", 244.0, TEXT * 1.01)
        for note in sheet.notes
    ]
    cuts = range(1, len(heights) + 1)
    return min(max(sum(heights[:cut]), sum(heights[cut:])) for cut in cuts)


def _card_height(card: Card, line: float, tight: bool) -> float:
    if card.kind == "strips":
        small = TEXT * (1.1 if tight else 1.15)
        pad = 2.0 if tight else 5.0
        rows = [
            pad
            + small
            * sum(
                lines_of(text, 141.0, bold=place == 0)
                for place, text in enumerate((line_.heading, line_.note, *line_.below))
                if text
            )
            for line_ in card.lines
        ]
        return 2 * line + 8.0 + sum(rows)
    if card.kind == "numbers":
        pad = 3.5 if tight else 8.0
        heights = [line + pad]
        for each in card.lines:
            told = line * (lines_of(each.heading, 172.0, bold=True) + bool(each.note))
            bars = (each.minus_at, each.plus_at)
            printed = max(16.0 * lines_of(bar, 144.0, 13.2, bold=True) for bar in bars)
            heights.append(pad + max(told, printed))
        return sum(heights)
    if card.kind == "blocks":
        count = min(ACROSS, max(3, len(card.blocks)))
        room = PAGE_WIDTH / count - 6.0
        tables = [
            8.0
            + line * lines_of(block.heading, room - 30.0, bold=True)
            + (line * lines_of(block.note, room - 14.0) if block.note else 0.0)
            + 12.7 * max(lines_of(text, room * 0.28, bold=True) for text in (card.few, card.many))
            + (line + (1.1 if tight else 2.1)) * len(block.rows)
            for block in card.blocks
        ]
        across = [tables[start : start + count] for start in range(0, len(tables), count)]
        return sum(max(some) + 8.0 for some in across) - 8.0
    return 0.0 if card.strengths is None else _grid_height(card.strengths, PAGE_WIDTH, line)


def _grid_height(grid: Grid, room: float, line: float, first: float | None = None) -> float:
    """Estimate a table; columns share the room by what their cells need.

    ``first`` is the share of the room that the first column is given in any case.
    """
    widths = _widths(grid, room)
    if first is not None:
        rest = Grid("", grid.head[1:], tuple(row[1:] for row in grid.rows))
        widths = [first * room - 7.0, *_widths(rest, (1.0 - first) * room)]
    rows = [_tallest(row, widths, place in grid.marked) for place, row in enumerate(grid.rows)]
    return line * _tallest(grid.head, widths, True) + 4.5 + sum(line * row + 4.0 for row in rows)


def _widths(grid: Grid, room: float) -> list[float]:
    """Estimate the widths of columns, without the room between them (points)."""
    columns = list(zip(grid.head, *grid.rows, strict=True))
    needs = [max(_longest_word(column), 14.0) + 7.0 for column in columns]
    wants = [max(text_width(cell, bold=True) for cell in column) + 7.0 for column in columns]
    spare = room - sum(needs)
    more = [want - need for want, need in zip(wants, needs, strict=True)]
    share = max(0.0, min(1.0, spare / sum(more))) if sum(more) > 0 else 0.0
    left = max(0.0, spare - sum(more)) / len(columns)
    return [need + share * extra + left - 7.0 for need, extra in zip(needs, more, strict=True)]


def _tallest(cells: Sequence[str], widths: Sequence[float], bold: bool) -> int:
    return max(lines_of(c, w + 0.5, bold=bold) for c, w in zip(cells, widths, strict=True))


def _longest_word(cells: Iterable[str]) -> float:
    words = (word for cell in cells for word in cell.split(" "))
    return max((text_width(word, bold=True) for word in words), default=0.0)
