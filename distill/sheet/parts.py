"""The parts of a sheet as plain data: what the templates loop over and nothing else.

Every field is text that is ready to print (not yet escaped), a whole number, or a tuple of
parts. The templates decide on markup only.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any


@dataclass(frozen=True)
class Act:
    """One numbered act of a check."""

    number: int
    lead: str
    text: str


@dataclass(frozen=True)
class Note:
    """A short remark with a lead in bold."""

    lead: str
    text: str


@dataclass(frozen=True)
class Grid:
    """A table: the first cell of each row is its header. ``marked`` rows stand out."""

    caption: str
    head: tuple[str, ...]
    rows: tuple[tuple[str, ...], ...]
    marked: frozenset[int] = frozenset()


@dataclass(frozen=True)
class Zone:
    """A run of boxes with one act. ``label`` is short and may be ""; ``spoken`` is in full."""

    kind: str
    boxes: int
    label: str
    spoken: str


@dataclass(frozen=True)
class Line:
    """One line of the card.

    ``zones`` is empty where the scale would be too long for boxes; then ``minus_at`` and
    ``plus_at`` are printed large. ``below`` holds what found no room in a zone.
    """

    letter: str
    heading: str
    note: str
    minus_at: str
    plus_at: str
    zones: tuple[Zone, ...]
    below: tuple[str, ...]


@dataclass(frozen=True)
class Peg:
    """One box of the scale: the figure printed, and its side in words ("" at the start)."""

    figure: str
    side: str


@dataclass(frozen=True)
class Block:
    """The line of one shown state where the numbers change as the checks go on.

    Each row is (range of checks, number for the act on few, number for the act on many).
    """

    letter: str
    heading: str
    note: str
    rows: tuple[tuple[str, str, str], ...]


@dataclass(frozen=True)
class Card:
    """What to read the act from.

    ``kind`` is "strips" (boxes), "numbers" (two large numbers per line), "blocks" (numbers by
    range of checks) or "table" (no card is possible; strengths in words).
    ``left_boxes`` and ``right_boxes`` split the scale before its start box; ``few`` and ``many``
    are the column heads for the two acts; ``letter_of_row`` is the letter under which each row
    of the rule is printed, ``alone`` that of what to use where nobody may be on watch ("" where
    the card has nothing for that).
    """

    kind: str
    heading: str
    shown: str
    left: str
    right: str
    left_boxes: int
    right_boxes: int
    pegs: tuple[Peg, ...]
    lines: tuple[Line, ...]
    blocks: tuple[Block, ...]
    few: str
    many: str
    check: str
    strengths: Grid | None
    letter_of_row: tuple[str, ...]
    alone: str


@dataclass(frozen=True)
class Mark:
    """A tick of an axis: place (user units) and its figure."""

    at: str
    figure: str


@dataclass(frozen=True)
class Curve:
    """One curve of the chart as SVG path data; ``label_y`` is where its name stands."""

    label: str
    path: str
    rule_path: str
    band: str
    dash: str
    end_y: str
    label_y: str


@dataclass(frozen=True)
class Chart:
    """A chart, in user units of its view box; ``key`` tells it from others on the page."""

    width: int
    height: int
    left: int
    right: int
    top: int
    bottom: int
    zero_y: str
    across: tuple[Mark, ...]
    up: tuple[Mark, ...]
    curves: tuple[Curve, ...]
    across_title: str
    up_title: str
    title: str
    description: str
    reading: str
    figures: Grid
    key: str = "chart"


@dataclass(frozen=True)
class Sentence:
    """A sentence, and those that hold under it."""

    text: str
    inner: tuple[Sentence, ...]


@dataclass(frozen=True)
class Nested:
    """A rule said in nested sentences."""

    caption: str
    sentences: tuple[Sentence, ...]


@dataclass(frozen=True)
class Modeller:
    """The back of the sheet."""

    intro: str
    chart: Chart | None
    rules: tuple[Grid, ...]
    said: tuple[Nested, ...]
    rule_notes: tuple[Note, ...]
    figures: Grid
    figure_notes: tuple[str, ...]
    losses: Grid
    doubts: Grid | None
    doubts_notes: tuple[str, ...]
    exactness: tuple[str, ...]
    settings: Grid
    sizes: Chart | None = None


@dataclass(frozen=True)
class Ask:
    """One thing that the look-up asks for: a whole number, or one of some options.

    ``options`` is empty for a number, which is then from ``least`` to ``most`` (None: open).
    """

    label: str
    options: tuple[str, ...] = ()
    least: int = 0
    most: int | None = None


@dataclass(frozen=True)
class Lookup:
    """The card as something to ask.

    ``asks`` come in the order of ``data["asks"]``; ``data`` is what the script reads, ready for
    JSON. The peg (``kind`` "peg") or the number (``kind`` "number") goes from ``least`` to
    ``most``; ``kind`` "worth" has one field for the reader's own evidence instead, and ``kind``
    "none" nothing. ``fewer`` and ``more`` are what the buttons beside the peg say.
    """

    heading: str
    intro: str
    asks: tuple[Ask, ...]
    kind: str
    own: str
    least: int
    most: int
    fewer: str
    more: str
    again: str
    data: Mapping[str, Any]


@dataclass(frozen=True)
class Sheet:
    """A whole sheet."""

    page_title: str
    title: str
    case_title: str
    owner_lead: str
    owner: str
    watching: str
    override: str
    caution_first: bool
    caution_lead: str
    cautions: tuple[str, ...]
    supposes: tuple[str, ...]
    acts_heading: str
    acts: tuple[Act, ...]
    card: Card
    notes: tuple[Note, ...]
    cost_heading: str
    costs: Grid
    cost_note: str
    example_heading: str
    example: Grid | None
    foot: str
    lookup: Lookup
    modeller: Modeller
    tight: bool = False
    example_on_front: bool = True
    long: bool = False
