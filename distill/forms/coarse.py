"""Axes with fewer cells, where a grid has too many boxes to be searched whole.

Steps, numbers of agents and times have cells in an order, and neighbouring ones can be put
together. Which ones is chosen for each axis by itself: the contiguous groups of its cells that keep
the most information.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from thumbwright.distill.forms.axes import Axis
from thumbwright.distill.forms.boxes import gain
from thumbwright.distill.rules import NUMBERS, Row
from thumbwright.exact.arrays import FloatArray, IntArray, sums

ORDERED = ("step", *NUMBERS)
"""Axes whose cells may be put together."""

LEAST = 6
"""No axis is made coarser than this."""


def boxes_of(axes: Sequence[Axis]) -> int:
    """Boxes of a grid."""
    return int(np.prod([axis.cells * (axis.cells + 1) // 2 for axis in axes], dtype=float))


def searchable(
    axes: Sequence[Axis], plus: FloatArray, minus: FloatArray, most: int
) -> tuple[list[Axis], tuple[str, ...]]:
    """Axes with at most ``most`` boxes where that can be, and what was put together.

    Parameters
    ----------
    axes : sequence of Axis
    plus, minus : ndarray of float, shape (R,)
        Masses of the situations.
    most : int

    Returns
    -------
    list of Axis
        Still with more boxes where no axis can be made coarser.
    tuple of str
        For the sheet; empty where nothing was put together.
    """
    cells = [axis.cells for axis in axes]
    while boxes_of([replace(a, cells=n) for a, n in zip(axes, cells, strict=True)]) > most:
        open_to = [k for k, a in enumerate(axes) if a.name in ORDERED and cells[k] > LEAST]
        if not open_to:
            break
        largest = max(open_to, key=lambda k: cells[k])
        cells[largest] = max(LEAST, cells[largest] * 9 // 10)
    made, said = [], []
    for axis, number in zip(axes, cells, strict=True):
        if number == axis.cells:
            made.append(axis)
            continue
        made.append(_coarse(axis, plus, minus, number))
        said.append(f"{axis.name} in {made[-1].cells} ranges instead of {axis.cells}")
    if not said:
        return made, ()
    return made, (
        f"There are too many boxes to search them all, so they are made of {', '.join(said)}, the "
        "ranges that by themselves keep most; other ranges could keep more, up to the ceiling.",
    )


def _coarse(axis: Axis, plus: FloatArray, minus: FloatArray, most: int) -> Axis:
    """The axis with its cells put together into at most ``most`` ranges."""
    up, down = (sums(axis.where, side, axis.cells) for side in (plus, minus))
    edges = best_ranges(up, down, most)

    def says(row: Row, start: int, stop: int) -> Row:
        return axis.says(row, int(edges[start]), int(edges[stop]))

    where = np.searchsorted(edges, axis.where, side="right") - 1
    return Axis(axis.name, len(edges) - 1, where, says)


def best_ranges(plus: FloatArray, minus: FloatArray, most: int) -> IntArray:
    """Where to cut a row of cells into at most ``most`` ranges that keep the most information.

    Returns
    -------
    ndarray of int
        Edges, from 0 to the number of cells, ascending.
    """
    count = len(plus)
    running = [np.concatenate([[0.0], np.cumsum(side)]) for side in (plus, minus)]
    # Gain of every range, start before stop.
    start, stop = np.meshgrid(np.arange(count), np.arange(1, count + 1), indexing="ij")
    span = [np.maximum(side[stop] - side[start], 0.0) for side in running]
    whole = np.where(start < stop, gain(*span), -np.inf)
    best, cuts = whole[0].copy(), []
    for _ in range(1, min(most, count)):
        # One range more: those before end where it starts.
        total = np.concatenate([[-np.inf], best[:-1]])[:, None] + whole
        cut = total.argmax(axis=0)
        better = total[cut, np.arange(count)] > best + 1e-15
        cuts.append(np.where(better, cut, -1))
        best = np.where(better, total[cut, np.arange(count)], best)
    edges, end = [count], count
    for cut in reversed(cuts):
        if cut[end - 1] > 0:
            end = int(cut[end - 1])
            edges.append(end)
    return np.array([*edges, 0][::-1], dtype=np.int64)
