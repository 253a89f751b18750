"""Boxes with values, priced: many at once where the network allows it, else one by one.

On a ladder a value acts only through the bars it yields on the own count. All values between two
neighbouring points at which some bar moves act alike, so what is worth trying for a box is each of
these points and one value between each two: its action classes.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from thumbwright.distill.costs import Pricer
from thumbwright.distill.forms.axes import grid_axes
from thumbwright.distill.forms.boxes import Box
from thumbwright.distill.forms.cells import Cells
from thumbwright.distill.forms.choosing import inside, valued_row
from thumbwright.distill.forms.runs import count_range
from thumbwright.distill.rules import Rule
from thumbwright.distill.tallies import Tally
from thumbwright.exact.arrays import FloatArray

EVENLY = 25
"""So many values are tried for a box where there are no action classes."""


@dataclass(frozen=True)
class Valued:
    """Boxes that cover the grid, and what each is worth (nats)."""

    boxes: tuple[Box, ...]
    values: tuple[float, ...]

    def with_value(self, number: int, value: float) -> Valued:
        """The same with one value replaced."""
        return replace(self, values=(*self.values[:number], value, *self.values[number + 1 :]))


class Bench:
    """Prices boxes with values for the rule's agent; counts how many it has priced."""

    def __init__(self, pricer: Pricer, inputs: Sequence[str], form: str) -> None:
        self.pricer, self.form = pricer, form
        self.axes = grid_axes(pricer, inputs)
        self.priced = 0
        self._position = pricer.group.index[pricer.agent]
        self._cells = Cells.of(pricer, inputs)
        self.together = self._cells is not None
        if self._cells is not None:
            axes = self._cells.axes(inputs)
            shape = tuple(axis.cells for axis in axes)
            self._cell = np.ravel_multi_index(tuple(axis.where for axis in axes), shape)

    def rule(self, valued: Valued) -> Rule:
        """The boxes as rows, in their order."""
        pricer = self.pricer
        pairs = zip(valued.boxes, valued.values, strict=True)
        rows = tuple(valued_row(self.axes, box, value) for box, value in pairs)
        return Rule(self.form, pricer.agent, pricer.seen, rows)

    def tallies(self, candidates: Sequence[Valued]) -> list[Tally]:
        """How each turns out."""
        self.priced += len(candidates)
        cells = self._cells
        if cells is None:
            return [self.pricer.rule_tally(self.rule(one), whole=False) for one in candidates]
        values = (self._on_grid(one)[self._cell].reshape(cells.shape) for one in candidates)
        return cells.tallies([cells.of_values(value) for value in values])

    def risks(self, candidates: Sequence[Valued]) -> list[float]:
        """What a search minimises, for each."""
        return [self.pricer.objective(found) for found in self.tallies(candidates)]

    def _on_grid(self, valued: Valued) -> FloatArray:
        grid = np.zeros(tuple(axis.cells for axis in self.axes))
        for box, value in zip(valued.boxes, valued.values, strict=True):
            grid[tuple(slice(start, stop) for start, stop in box)] = value
        return grid.ravel()

    def classes(self, box: Box) -> FloatArray:
        """Values worth trying for a box (nats), ascending, within the exact worths it covers."""
        pricer, group = self.pricer, self.pricer.group
        here = inside(self.axes, box)
        agent = group.agents[self._position]
        bounds, evidence = agent.thresholds[0][1], agent.evidence
        if not evidence.on_ladder:
            worth = pricer.situations.worth[here]
            finite = worth[np.isfinite(worth)]
            return np.quantile(finite, np.linspace(0, 1, EVENLY)) if finite.size else np.zeros(1)
        unit = abs(float(evidence.alpha[0]))
        reach = max(map(abs, count_range(pricer))) + 1
        far = max(abs(bounds.minus), abs(bounds.plus)) + unit * reach + abs(group.prior)
        worth = np.clip(pricer.situations.worth[here], -far, far)
        if worth.size == 0:
            return np.zeros(1)
        low, high = float(worth.min()) - unit, float(worth.max()) + unit
        steps = np.unique(pricer.situations.step[here])[: None if evidence.beta else 1]
        points: list[FloatArray] = []
        # The last family is where the answer changes that the belief favours at the horizon.
        for level in (bounds.minus, bounds.plus, 0.0):
            start: FloatArray = np.asarray(level - group.prior - evidence.beta * steps)
            first = np.ceil((low - start.max()) / unit)
            grid: FloatArray = start[:, None] + unit * np.arange(
                first, first + _count(low, high, start, unit)
            )
            points.append(grid[(grid >= low) & (grid <= high)])
        corners = np.unique(np.round(np.concatenate(points), 9))
        corners = corners[np.concatenate([[True], np.diff(corners) > 2e-9])]
        if corners.size < 2:
            return corners if corners.size else np.array([(low + high) / 2])
        return np.sort(np.concatenate([corners, (corners[1:] + corners[:-1]) / 2]))


def _count(low: float, high: float, start: FloatArray, unit: float) -> int:
    return int(np.ceil((high - low + start.max() - start.min()) / unit)) + 2
