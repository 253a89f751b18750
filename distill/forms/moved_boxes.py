"""Rules of valued boxes that lie one move from others: a value, or a cut, moved.

A cut is a face that rows below and rows above share; where one row meets several across it, the
face is that of all of them. Moving it by some cells leaves boxes that still cover everything once.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence

import numpy as np

from thumbwright.distill.costs import Pricer
from thumbwright.distill.forms.axes import Axis
from thumbwright.distill.forms.boxes import Box, gain
from thumbwright.distill.forms.choosing import box_masses
from thumbwright.distill.forms.table import print_order
from thumbwright.distill.forms.valued import Bench, Valued
from thumbwright.distill.rules import NUMBERS, Row, Rule
from thumbwright.distill.tallies import Tally
from thumbwright.exact.arrays import FloatArray
from thumbwright.exact.walk import TIE

TRIED_AT_ONCE = 40
"""More action classes of a box than this are tried at growing distances from its value."""

NEAR = 2
"""So many action classes to either side are tried where each rule has to be played by itself."""

REACH = (1, 2, 4, 8, 16)
"""By so many cells a cut is moved; by one only where each rule has to be played by itself."""

NESTED = "tree"
"""The form whose rows are read in the order of its cuts, so that they must stay such."""


class BoxMoves:
    """Moves of the values and cuts of a rule of boxes."""

    def __init__(self, pricer: Pricer, inputs: Sequence[str], rule: Rule) -> None:
        self._bench = Bench(pricer, inputs, rule.form)
        self._pricer, self._form = pricer, rule.form
        self._classes: dict[Box, FloatArray] = {}
        self.together = self._bench.together
        boxes = tuple(box_of(pricer, self._bench.axes, row) for row in rule.rows)
        self.start = Valued(boxes, tuple(float(row.value or 0.0) for row in rule.rows))

    def tallies(self, many: Sequence[Valued]) -> list[Tally]:
        """How each turns out."""
        return self._bench.tallies(many)

    def moves(self, valued: Valued) -> Iterator[Valued]:
        """Every rule that is one move away."""
        for number, box in enumerate(valued.boxes):
            for value in self._values(box, valued.values[number]):
                yield valued.with_value(number, value)
        for boxes in moved_cuts(valued.boxes, REACH if self.together else REACH[:1]):
            if self._form != NESTED or in_order_of_cuts(boxes):
                yield Valued(boxes, valued.values)

    def tidied(self, valued: Valued) -> Valued:
        """The same: rows of equal values are left apart."""
        return valued

    def rule(self, valued: Valued) -> Rule:
        """As rows, in the order in which the form prints them."""
        pairs = list(zip(valued.boxes, valued.values, strict=True))
        if self._form != NESTED:
            pairs.sort(key=lambda pair: print_order(self._bench.axes, pair[0]))
        boxes, values = zip(*pairs, strict=True)
        return self._bench.rule(Valued(boxes, values))

    def information_kept(self, valued: Valued) -> float | None:
        """Share of information that the boxes keep, at their most informative values."""
        masses = box_masses(self._pricer, self._bench.axes, valued.boxes)
        return self._pricer.situations.information_kept(float(gain(*masses).sum()))

    def _values(self, box: Box, value: float) -> list[float]:
        """Other values of a box: all action classes where these are few, else near and far ones."""
        if box not in self._classes:
            self._classes[box] = self._bench.classes(box)
        classes = self._classes[box]
        picked = list(range(len(classes)))
        if not self.together or len(classes) > TRIED_AT_ONCE:
            below = int(np.searchsorted(classes, value - TIE)) - 1
            above = int(np.searchsorted(classes, value + TIE, side="right"))
            steps = [2**k - 1 for k in range(len(classes).bit_length() + 1)]
            far = steps if self.together else range(NEAR)
            picked = [k for d in far for k in (below - d, above + d) if 0 <= k < len(classes)]
        return [v for v in dict.fromkeys(float(classes[k]) for k in picked) if v != value]


def box_of(pricer: Pricer, axes: Sequence[Axis], row: Row) -> Box:
    """The cells of the grid in which a row holds."""
    return tuple(_cells_of(pricer, axis, row) for axis in axes)


def _cells_of(pricer: Pricer, axis: Axis, row: Row) -> tuple[int, int]:
    if axis.name == "step":
        return (row.step_from or 1) - 1, axis.cells if row.step_to is None else row.step_to
    if axis.name in NUMBERS:
        low, high = row.ranges.get(axis.name, (None, None))
        least = int(pricer.situations.number(axis.name).min())
        start = 0 if low is None else max(low - least, 0)
        return start, axis.cells if high is None else min(high - least + 1, axis.cells)
    # The rest have few cells: the one range that narrows the row to what it is already.
    parts = [(a, b) for a in range(axis.cells) for b in range(a + 1, axis.cells + 1)]
    parts.remove((0, axis.cells))
    return next((part for part in parts if axis.says(row, *part) == row), (0, axis.cells))


def moved_cuts(boxes: tuple[Box, ...], reach: Sequence[int]) -> Iterator[tuple[Box, ...]]:
    """The boxes with one face moved by some cells, as far as no box vanishes.

    Parameters
    ----------
    boxes : tuple of Box
        Boxes that cover a grid, each cell once.
    reach : sequence of int
        By how many cells.
    """
    for axis in range(len(boxes[0])):
        most = max(box[axis][1] for box in boxes)
        for at in sorted({box[axis][1] for box in boxes} - {most}):
            for below, above in _faces(boxes, axis, at):
                room = [
                    min(boxes[k][axis][1] - boxes[k][axis][0] for k in s) for s in (below, above)
                ]
                for by in reach:
                    if by < room[0]:
                        yield _moved(boxes, axis, (below, above), at - by)
                    if by < room[1]:
                        yield _moved(boxes, axis, (below, above), at + by)


def _faces(
    boxes: tuple[Box, ...], axis: int, at: int
) -> Iterator[tuple[frozenset[int], frozenset[int]]]:
    """The boxes that end and that begin there, in groups that meet each other only."""
    below = [k for k, box in enumerate(boxes) if box[axis][1] == at]
    left = {k for k, box in enumerate(boxes) if box[axis][0] == at}
    while below:
        group, others = {below.pop(0)}, set[int]()
        while True:
            others = {k for k in left if any(_meet(boxes[k], boxes[g], axis) for g in group)}
            more = {k for k in below if any(_meet(boxes[k], boxes[o], axis) for o in others)}
            if more <= group:
                break
            group |= more
        below = [k for k in below if k not in group]
        left -= others
        yield frozenset(group), frozenset(others)


def _meet(one: Box, other: Box, axis: int) -> bool:
    """Whether two boxes overlap on every other axis."""
    return all(
        a[0] < b[1] and b[0] < a[1]
        for k, (a, b) in enumerate(zip(one, other, strict=True))
        if k != axis
    )


def _moved(
    boxes: tuple[Box, ...], axis: int, sides: tuple[frozenset[int], frozenset[int]], to: int
) -> tuple[Box, ...]:
    below, above = sides
    made = []
    for number, box in enumerate(boxes):
        start, stop = box[axis]
        if number in below:
            stop = to
        elif number in above:
            start = to
        made.append((*box[:axis], (start, stop), *box[axis + 1 :]))
    return tuple(made)


def in_order_of_cuts(boxes: Sequence[Box]) -> bool:
    """Whether successive cuts lead to these boxes in this order, lower side first."""
    if len(boxes) == 1:
        return True
    for axis in range(len(boxes[0])):
        for k in range(1, len(boxes)):
            if max(b[axis][1] for b in boxes[:k]) <= min(b[axis][0] for b in boxes[k:]):
                return in_order_of_cuts(boxes[:k]) and in_order_of_cuts(boxes[k:])
    return False
