"""The form "table": the most informative table of k rows, with its values in nats.

Situations are laid on a grid of the inputs the rule may look at, and the grid is cut into boxes by
dynamic programming; each box is valued at the log ratio of its pooled masses, the best value blind
to the own tally. Beside what it keeps stands the ceiling: the most that any grouping of situations
into as many groups could keep, whatever it looks at.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np

from thumbwright.distill.costs import Pricer
from thumbwright.distill.forms import Distilled, Wanted
from thumbwright.distill.forms.boxes import Box, Partition, best_partitions
from thumbwright.distill.forms.grouping import best_groupings
from thumbwright.distill.rules import SHOWN, Row, Rule
from thumbwright.distill.situations import values_of
from thumbwright.exact.arrays import FloatArray, IntArray, sums
from thumbwright.exact.engine import Progress
from thumbwright.exact.errors import ModelError

NAME = "table"

MOST_BOXES = 3_000_000
"""More boxes than this times the rows wanted take too long to search exactly."""

DIGITS = 10
"""Significant digits of a value: far more than matter, and the same on every machine."""

ROUNDED = 12
"""Decimals beyond which a value is rounding only."""

_STATE_ORDER = ("minus", "undecided", "plus")


@dataclass(frozen=True)
class Axis:
    """One input of the grid: the cell of each situation, and how a row narrows to some cells."""

    name: str
    cells: int
    where: IntArray
    says: Callable[[Row, int, int], Row]


def distil(pricer: Pricer, wanted: Wanted, progress: Progress | None = None) -> Distilled:
    """The most informative table of at most ``wanted.rows`` rows.

    Raises ModelError where the grid of inputs is too large for the exact search.
    """
    axes = grid_axes(pricer, wanted.inputs)
    boxes = int(np.prod([axis.cells * (axis.cells + 1) // 2 for axis in axes], dtype=float))
    if boxes * wanted.rows > MOST_BOXES:
        raise ModelError(
            f"the table would be searched over {boxes:,} boxes of situations, which takes too "
            'long; look at fewer neighbours, shorten the horizon, drop "step" from the inputs or '
            'leave "table" out of the forms'
        )
    if progress:
        progress("table", 0, 1)
    plus, minus = cell_masses(pricer, axes)
    partitions = best_partitions(plus, minus, wanted.rows)
    situations = pricer.situations
    ceiling = best_groupings(situations.plus, situations.minus, wanted.rows)
    chosen, notes = _choose(pricer, wanted, axes, partitions, plus, minus)
    rule = as_rule(pricer, axes, chosen, plus, minus)
    if progress:
        progress("table", 1, 1)
    return Distilled(
        rule,
        situations.information_kept(chosen.gain),
        situations.information_kept(float(ceiling[len(chosen.boxes) - 1])),
        notes,
    )


def _choose(
    pricer: Pricer,
    wanted: Wanted,
    axes: list[Axis],
    partitions: tuple[Partition, ...],
    plus: FloatArray,
    minus: FloatArray,
) -> tuple[Partition, tuple[str, ...]]:
    """The most rows allowed, or the fewest within the accuracy that may be lost."""
    largest = partitions[-1]
    if wanted.max_accuracy_lost is not None:
        exact = pricer.accuracy(pricer.exact_tally)
        for partition in partitions:
            rule = as_rule(pricer, axes, partition, plus, minus)
            if exact - pricer.accuracy(pricer.rule_tally(rule)) <= wanted.max_accuracy_lost:
                return partition, ("The fewest rows within the accuracy that may be lost.",)
        return largest, (
            f"No table of up to {wanted.rows} rows stays within the accuracy that may be lost; "
            "this is the most informative one.",
        )
    if len(largest.boxes) < wanted.rows:
        return largest, (
            f"{len(largest.boxes)} rows already say all that a table of these inputs can say.",
        )
    return largest, ()


def grid_axes(pricer: Pricer, inputs: tuple[str, ...]) -> list[Axis]:
    """The axes of the grid, in the order in which the inputs are declared."""
    situations = pricer.situations
    axes: list[Axis] = []
    for name in inputs:
        if name == "step":
            horizon = pricer.group.horizon
            axes.append(Axis("step", horizon, situations.step - 1, _step_range(horizon)))
        elif name == "shown":
            code = np.array([_STATE_ORDER.index(state) for state in SHOWN])
            axes += [
                Axis(f"{agent} shown", 3, code[situations.states[:, k]], _states(agent))
                for k, agent in enumerate(situations.seen)
            ]
        elif name == "thresholds":
            axes += [_thresholds_axis(pricer, agent) for agent in situations.seen]
    return axes


def _step_range(horizon: int) -> Callable[[Row, int, int], Row]:
    def says(row: Row, start: int, stop: int) -> Row:
        return replace(
            row,
            step_from=None if start == 0 else start + 1,
            step_to=None if stop == horizon else stop,
        )

    return says


def _states(agent: str) -> Callable[[Row, int, int], Row]:
    def says(row: Row, start: int, stop: int) -> Row:
        if stop - start == len(_STATE_ORDER):
            return row
        return replace(row, shows={**row.shows, agent: frozenset(_STATE_ORDER[start:stop])})

    return says


def _thresholds_axis(pricer: Pricer, agent: str) -> Axis:
    """Named thresholds in the order of the sum of their two beliefs."""
    sums: dict[str, float] = {}
    for setting in pricer.settings:
        group = setting.solution.group
        bounds = group.agents[group.index[agent]].thresholds[0][1]
        sums[setting.names[agent]] = bounds.plus + bounds.minus
    order = sorted(sums, key=lambda name: sums[name])
    number = np.array([order.index(setting.names[agent]) for setting in pricer.settings])

    def says(row: Row, start: int, stop: int) -> Row:
        if stop - start == len(order):
            return row
        return replace(row, thresholds={**row.thresholds, agent: frozenset(order[start:stop])})

    return Axis(f"{agent} thresholds", len(order), number[pricer.situations.setting], says)


def cell_masses(pricer: Pricer, axes: list[Axis]) -> tuple[FloatArray, FloatArray]:
    """Masses of the situations in each cell of the grid, given plus and given minus."""
    shape = tuple(axis.cells for axis in axes)
    flat = np.ravel_multi_index(tuple(axis.where for axis in axes), shape)
    situations = pricer.situations
    size = int(np.prod(shape))
    plus, minus = (sums(flat, side, size) for side in (situations.plus, situations.minus))
    return plus.reshape(shape), minus.reshape(shape)


def as_rule(
    pricer: Pricer, axes: list[Axis], partition: Partition, plus: FloatArray, minus: FloatArray
) -> Rule:
    """A partition of the grid as rows with their best values."""
    rows = []
    for box in sorted(partition.boxes, key=lambda box: _print_order(axes, box)):
        where = tuple(slice(start, stop) for start, stop in box)
        value = values_of(plus[where].sum(keepdims=True), minus[where].sum(keepdims=True))
        rounded = round(float(value.flat[0]), ROUNDED)
        row = Row(value=float(f"{rounded:.{DIGITS}g}"))
        for axis, (start, stop) in zip(axes, box, strict=True):
            row = axis.says(row, start, stop)
        rows.append(row)
    return Rule(NAME, pricer.agent, pricer.seen, tuple(rows))


def _print_order(axes: list[Axis], box: Box) -> tuple[tuple[int, int], ...]:
    """Shown states before steps: rows are looked up by what is seen, then by when."""
    ranges = dict(zip((axis.name for axis in axes), box, strict=True))
    return tuple(ranges[name] for name in sorted(ranges, key=lambda name: name == "step"))
