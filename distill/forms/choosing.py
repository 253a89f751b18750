"""What forms of valued boxes share: rows from boxes, and how many rows to take."""

from __future__ import annotations

from collections.abc import Callable, Sequence

import numpy as np

from thumbwright.distill.costs import Pricer
from thumbwright.distill.forms import Wanted
from thumbwright.distill.forms.axes import Axis
from thumbwright.distill.forms.boxes import Box, Partition
from thumbwright.distill.forms.enough import Enough
from thumbwright.distill.rules import Row, Rule
from thumbwright.exact.arrays import BoolArray, FloatArray

DIGITS = 10
"""Significant digits of a value: far more than matter, and the same on every machine."""

ROUNDED = 12
"""Decimals beyond which a value is rounding only."""


def valued_row(axes: Sequence[Axis], box: Box, value: float) -> Row:
    """A box of the grid as a row that is worth so much (nats)."""
    row = Row(value=float(f"{round(value, ROUNDED):.{DIGITS}g}"))
    for axis, (start, stop) in zip(axes, box, strict=True):
        row = axis.says(row, start, stop)
    return row


def inside(axes: Sequence[Axis], box: Box) -> BoolArray:
    """Which situations lie in a box, shape (R,)."""
    here = np.ones(axes[0].where.shape, dtype=bool)
    for axis, (start, stop) in zip(axes, box, strict=True):
        here &= (axis.where >= start) & (axis.where < stop)
    return here


def box_masses(
    pricer: Pricer, axes: Sequence[Axis], boxes: Sequence[Box]
) -> tuple[FloatArray, FloatArray]:
    """Masses of the situations in each box, given plus and given minus."""
    situations = pricer.situations
    masks = [inside(axes, box) for box in boxes]
    return (
        np.array([situations.plus[mask].sum() for mask in masks]),
        np.array([situations.minus[mask].sum() for mask in masks]),
    )


def of_every_size(partitions: Sequence[Partition]) -> list[Partition]:
    """Partitions with ever more boxes, each number of boxes once."""
    return list({len(one.boxes): one for one in reversed(partitions)}.values())[::-1]


def chosen(
    pricer: Pricer,
    wanted: Wanted,
    partitions: Sequence[Partition],
    rule_of: Callable[[Partition], Rule],
    noun: str,
    best: str = "this is the most informative one",
) -> tuple[Partition, tuple[str, ...]]:
    """Of partitions with ever more boxes the largest, or the first that loses little enough.

    Returns it with a sentence on the choice, where there is something to say.
    """
    largest = partitions[-1]
    if wanted.limited:
        enough = Enough(pricer, wanted)
        for partition in partitions:
            if enough(pricer.rule_tally(rule_of(partition))):
                said = (f"The fewest rows that {enough.they}.",) if enough.they else ()
                return partition, (*said, *enough.notes)
        return largest, (f"No {noun} of up to {wanted.rows} rows {enough.it}; {best}.",)
    if len(largest.boxes) < wanted.rows:
        return largest, (
            f"{len(largest.boxes)} rows already say all that a {noun} of these inputs can say.",
        )
    return largest, ()
