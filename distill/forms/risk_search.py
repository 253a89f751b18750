"""The search for valued boxes of least risk, by single steps from the most informative ones.

Steps are: a value to another action class, two boxes joined, a box cut in two, or a join and a cut
at once. Each is taken under exact pricing, the best first, and only where it lowers the risk.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from thumbwright.distill.forms.boxes import Box, best_partitions, gain
from thumbwright.distill.forms.exchanges import cut_in_two, cuts, merges
from thumbwright.distill.forms.table import cell_masses
from thumbwright.distill.forms.valued import Bench, Valued
from thumbwright.distill.situations import values_of
from thumbwright.exact.arrays import FloatArray
from thumbwright.exact.engine import Progress
from thumbwright.exact.walk import TIE

SETTLED = 3
"""The values of so many of the best tables are settled before one of them is taken."""

SMALL = 3
"""A table of at most so many boxes is grown, whatever larger ones are started from."""

MERGED, CUT = 6, 40
"""So many of the best joins, and of the most informative cuts of each, are priced."""

FEW = 4
"""So many where each has to be played by itself."""

MOST_PRICED, ONE_BY_ONE = 12_000, 250
"""A search ends after about so many tables; the second where each has to be played by itself."""

TRIED_AT_ONCE = 40
"""More action classes of a box than this are tried at growing distances from its value."""

SAME = 1e-12
"""Risks that differ by less are equal."""

Found = tuple[float, Valued]
"""A risk, and what has it."""


class Search:
    """Looks for valued boxes of least risk on the grid of a bench."""

    def __init__(self, bench: Bench, rows: int, progress: Progress | None = None) -> None:
        self._bench, self._progress = bench, progress
        self._plus, self._minus = cell_masses(bench.pricer, bench.axes)
        self._most = MOST_PRICED if bench.together else ONE_BY_ONE
        self._worths: dict[Box, float] = {}
        self._classes: dict[Box, FloatArray] = {}
        self._starts = self._informative(rows)

    def most_informative(self, rows: int) -> Valued:
        """The most informative boxes, at their best values."""
        return self._starts[min(rows, len(self._starts)) - 1]

    def best(self, rows: int) -> Found:
        """What is found of least risk with at most so many boxes."""
        stop = self._bench.priced + self._most
        priced = self._best_first([one for one in self._starts if len(one.boxes) <= rows])
        largest = [one for one in priced if one[1] == self.most_informative(rows)]
        small = [one for one in priced if len(one[1].boxes) <= SMALL]
        starts: dict[Valued, float] = {}
        for kind in (priced, largest, small):
            settled = [self._settled(*one, stop) for one in kind[:SETTLED]]
            risk, found = min(settled, key=lambda one: one[0])
            starts.setdefault(found, risk)
        moved = [self._moved(risk, one, rows, stop) for one, risk in starts.items()]
        return self._tidied(min(moved, key=lambda one: one[0]))

    def _informative(self, rows: int) -> list[Valued]:
        """The most informative boxes, from one to so many, over all axes and all but one."""
        found: dict[tuple[Box, ...], None] = {}
        dimensions = range(self._plus.ndim)
        dropped: list[int | None] = [None, *(dimensions if self._plus.ndim > 1 else [])]
        for axis in dropped:
            masses = self._plus, self._minus
            if axis is not None:
                masses = tuple(side.sum(axis=axis) for side in masses)
            for partition in best_partitions(*masses, rows):
                boxes = partition.boxes
                if axis is not None:
                    whole = (0, self._plus.shape[axis])
                    boxes = tuple((*box[:axis], whole, *box[axis:]) for box in boxes)
                found.setdefault(boxes)
        return [Valued(boxes, tuple(map(self._worth, boxes))) for boxes in found]

    def _worth(self, box: Box) -> float:
        if box not in self._worths:
            where = tuple(slice(start, stop) for start, stop in box)
            sides = (side[where].sum(keepdims=True) for side in (self._plus, self._minus))
            self._worths[box] = float(values_of(*sides).flat[0])
        return self._worths[box]

    def _best_first(self, tables: Sequence[Valued], most: int | None = None) -> list[Found]:
        """Price tables; those of least risk, or all."""
        risks = self._bench.risks(tables)
        order = sorted(range(len(tables)), key=lambda k: (risks[k], k))
        if self._progress:
            self._progress(self._bench.form, min(self._bench.priced, self._most), self._most)
        return [(risks[k], tables[k]) for k in order[:most]]

    def _settled(self, risk: float, valued: Valued, stop: int) -> Found:
        """Move values one at a time to other action classes while that lowers the risk."""
        while self._bench.priced < stop:
            candidates = [
                valued.with_value(number, value)
                for number, box in enumerate(valued.boxes)
                for value in self._tried(box, valued.values[number])
            ]
            best = self._best_first(candidates, 1)
            if not best or best[0][0] >= risk - SAME:
                break
            risk, valued = best[0]
        return risk, valued

    def _tried(self, box: Box, value: float, most: int = TRIED_AT_ONCE) -> list[float]:
        """Other values of a box: all action classes, or those at growing distances."""
        if box not in self._classes:
            self._classes[box] = self._bench.classes(box)
        classes = self._classes[box]
        picked = list(range(len(classes)))
        if len(classes) > most:
            below = int(np.searchsorted(classes, value - TIE)) - 1
            above = int(np.searchsorted(classes, value + TIE, side="right"))
            far = [2**k - 1 for k in range(len(classes).bit_length() + 1)]
            both = [k for d in far for k in (below - d, above + d)][:most]
            picked = [k for k in both if 0 <= k < len(classes)]
        best = self._worth(box)
        values = sorted((float(classes[k]) for k in picked), key=lambda v: (abs(v - best), v))
        return [other for other in dict.fromkeys([best, *values]) if other != value]

    def _near(self, box: Box, value: float) -> list[float]:
        return self._tried(box, value, 2 if self._bench.together else 0)

    def _moved(self, risk: float, valued: Valued, rows: int, stop: int) -> Found:
        """Join and cut boxes, values settled after each step, while that lowers the risk."""
        while self._bench.priced < stop:
            better = risk, valued
            if len(valued.boxes) < rows:
                better = self._best_cut([valued], stop, better)
            if better[0] >= risk - SAME:
                few = MERGED if self._bench.together else FEW
                joined = [one for _, one in self._best_first(self._merges(valued), few)]
                better = self._best_cut(joined, stop, better)
            if better[0] >= risk - SAME:
                break
            risk, valued = better
        return risk, valued

    def _best_cut(self, bases: Sequence[Valued], stop: int, known: Found) -> Found:
        """The best that one cut of one of these leads to, or what is known already."""
        priced = self._best_first([cut for base in bases for cut in self._cuts(base)])
        by_boxes: dict[frozenset[Box], Found] = {}
        for found in priced:
            by_boxes.setdefault(frozenset(found[1].boxes), found)
        few = SETTLED if self._bench.together else 1
        best = [self._settled(*found, stop) for found in list(by_boxes.values())[:few]]
        return min([known, *best], key=lambda found: found[0])

    def _merges(self, valued: Valued) -> list[Valued]:
        return list(merges(valued, self._worth))

    def _cuts(self, valued: Valued) -> list[Valued]:
        """The most informative cuts, with values near those of the boxes that are cut."""
        every = list(cuts(valued.boxes))
        gains = [self._gain(below) + self._gain(above) for _, below, above in every]
        gains = [g - self._gain(valued.boxes[n]) for g, (n, _, _) in zip(gains, every, strict=True)]
        order = sorted(range(len(every)), key=lambda k: (-gains[k], k))
        few = CUT if self._bench.together else FEW
        return [
            found
            for number, below, above in (every[k] for k in order[:few])
            for found in cut_in_two(valued, number, (below, above), self._worth, self._near)
        ]

    def _gain(self, box: Box) -> float:
        where = tuple(slice(start, stop) for start, stop in box)
        plus, minus = (np.array([side[where].sum()]) for side in (self._plus, self._minus))
        return float(gain(plus, minus)[0])

    def _tidied(self, found: Found) -> Found:
        """Join boxes as long as that loses nothing."""
        risk, valued = found
        while len(valued.boxes) > 1:
            best = self._best_first(self._merges(valued), 1)
            if not best or best[0][0] > risk + SAME:
                break
            risk, valued = best[0]
        return risk, valued
