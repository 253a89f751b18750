"""The form "table": the most informative table of k rows, with its values in nats.

Situations are laid on a grid of the inputs the rule may look at, and the grid is cut into boxes by
dynamic programming; each box is valued at the log ratio of its pooled masses, the best value blind
to the own tally. Beside what it keeps stands the ceiling: the most that any grouping of situations
into as many groups could keep, whatever it looks at.
"""

from __future__ import annotations

import numpy as np

from thumbwright.distill.costs import Pricer
from thumbwright.distill.forms import Distilled, Wanted
from thumbwright.distill.forms.axes import Axis, grid_axes
from thumbwright.distill.forms.boxes import Box, Partition, best_partitions
from thumbwright.distill.forms.choosing import chosen, of_every_size, valued_row
from thumbwright.distill.forms.coarse import boxes_of, searchable
from thumbwright.distill.forms.grouping import best_groupings
from thumbwright.distill.rules import Rule
from thumbwright.distill.situations import values_of
from thumbwright.exact.arrays import FloatArray, sums
from thumbwright.exact.engine import Progress
from thumbwright.exact.errors import ModelError

NAME = "table"

MOST_BOXES = 3_000_000
"""More boxes than this times the rows wanted take too long to search exactly."""


def distil(pricer: Pricer, wanted: Wanted, progress: Progress | None = None) -> Distilled:
    """The most informative table of at most ``wanted.rows`` rows.

    Raises ModelError where the grid of inputs is too large for the exact search.
    """
    situations = pricer.situations
    axes, coarser = searchable(
        grid_axes(pricer, wanted.inputs),
        situations.plus,
        situations.minus,
        MOST_BOXES // wanted.rows,
    )
    refuse_too_large(axes, wanted.rows, NAME)
    if progress:
        progress("table", 0, 1)
    plus, minus = cell_masses(pricer, axes)
    partitions = best_partitions(plus, minus, wanted.rows)
    ceiling = best_groupings(situations.plus, situations.minus, wanted.rows)
    picked, notes = chosen(
        pricer, wanted, partitions, lambda p: as_rule(pricer, axes, p, plus, minus), NAME
    )
    rule = as_rule(pricer, axes, picked, plus, minus)
    if progress:
        progress("table", 1, 1)
    sizes = [
        (as_rule(pricer, axes, one, plus, minus), situations.information_kept(one.gain))
        for one in (of_every_size(partitions) if wanted.every_size else ())
    ]
    return Distilled(
        rule,
        situations.information_kept(picked.gain),
        situations.information_kept(float(ceiling[len(picked.boxes) - 1])),
        (*notes, *coarser),
        tuple(sizes),
    )


def refuse_too_large(axes: list[Axis], rows: int, form: str) -> None:
    """Raise ModelError where the exact search over this grid would take too long."""
    boxes = boxes_of(axes)
    if boxes * rows > MOST_BOXES:
        raise ModelError(
            f"the {form} would be searched over {boxes:,} boxes of situations, which takes too "
            'long; look at fewer neighbours, shorten the horizon, drop "step" from the inputs or '
            f'leave "{form}" out of the forms'
        )


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
    for box in sorted(partition.boxes, key=lambda box: print_order(axes, box)):
        where = tuple(slice(start, stop) for start, stop in box)
        value = values_of(plus[where].sum(keepdims=True), minus[where].sum(keepdims=True))
        rows.append(valued_row(axes, box, float(value.flat[0])))
    return Rule(NAME, pricer.agent, pricer.seen, tuple(rows))


def print_order(axes: list[Axis], box: Box) -> tuple[tuple[int, int], ...]:
    """Shown states before steps: rows are looked up by what is seen, then by when."""
    ranges = dict(zip((axis.name for axis in axes), box, strict=True))
    return tuple(ranges[name] for name in sorted(ranges, key=lambda name: name == "step"))
