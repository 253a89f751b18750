"""The most informative partition of a grid into boxes made by successive cuts.

Cells of a grid carry two masses, given plus and given minus. A group of cells is worth
g = sum over both answers of w ln(2 w / (w+ + w-)), w its masses added up: the log-loss that is
saved by valuing the group for itself rather than as even. Cutting a box in two along one axis never
lowers the sum of g. The best sum with k boxes, over everything that successive cuts can reach, is
found exactly by dynamic programming over all boxes, smaller ones first.
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import product

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]

Box = tuple[tuple[int, int], ...]
"""Half-open range of cells on each axis."""


def gain(plus: FloatArray, minus: FloatArray) -> FloatArray:
    """g of groups with these masses; zero masses give zero."""
    both = plus + minus
    total = np.zeros_like(both)
    for side in (plus, minus):
        ratio = np.divide(2.0 * side, both, out=np.ones_like(both), where=side > 0)
        total += side * np.log(ratio)
    return total


@dataclass(frozen=True)
class Partition:
    """Boxes that cover the grid, in the order of cutting, and their summed g."""

    boxes: tuple[Box, ...]
    gain: float


def best_partitions(plus: FloatArray, minus: FloatArray, most: int) -> tuple[Partition, ...]:
    """The best partition into at most k boxes, for every k from 1 to ``most``.

    Parameters
    ----------
    plus, minus : ndarray of float, shape (n_1, ..., n_D)
        Masses of the cells.
    most : int
        At least 1.

    Returns
    -------
    tuple of Partition
        Entry k - 1 is the best with at most k boxes; of equals the one with fewest boxes, then
        with the first axis and the earliest cut.
    """
    shape = plus.shape
    bases = [_bases(n) for n in shape]
    counts = tuple(n * (n + 1) // 2 for n in shape)
    best = np.full((most + 1, *counts), -np.inf)
    best[1:] = gain(_interval_sums(plus), _interval_sums(minus))
    # Which axis, where and how many boxes for the part below the cut; 0 axis code = no cut.
    choice = np.zeros((3, most + 1, *counts), dtype=np.int16)
    for lengths in sorted(product(*(range(1, n + 1) for n in shape)), key=sum):
        room = [n - length + 1 for n, length in zip(shape, lengths, strict=True)]
        here = tuple(
            slice(base[length], base[length] + r)
            for base, length, r in zip(bases, lengths, room, strict=True)
        )
        for axis, length in enumerate(lengths):
            for cut in range(1, length):
                below, above = list(here), list(here)
                base = bases[axis]
                below[axis] = slice(base[cut], base[cut] + room[axis])
                above[axis] = slice(
                    base[length - cut] + cut, base[length - cut] + cut + room[axis]
                )
                _try_cut(best, choice, here, tuple(below), tuple(above), axis, cut)
        _fewer_is_enough(best, choice, here)
    whole = tuple(base[n] for base, n in zip(bases, shape, strict=True))
    return tuple(
        Partition(
            tuple(_trace(choice, bases, k, tuple((0, n) for n in shape))),
            float(best[(k, *whole)]),
        )
        for k in range(1, most + 1)
    )


def _try_cut(
    best: FloatArray,
    choice: NDArray[np.int16],
    here: tuple[slice, ...],
    below: tuple[slice, ...],
    above: tuple[slice, ...],
    axis: int,
    cut: int,
) -> None:
    most = len(best) - 1
    for k in range(2, most + 1):
        target = best[(k, *here)]
        for part in range(1, k):
            value = best[(part, *below)] + best[(k - part, *above)]
            # A margin keeps rounding from preferring a cut that gains nothing.
            better = value > target + 1e-13 * np.abs(target) + 1e-300
            if better.any():
                target[better] = value[better]
                for row, code in enumerate((axis + 1, cut, part)):
                    choice[(row, k, *here)][better] = code


def _fewer_is_enough(
    best: FloatArray, choice: NDArray[np.int16], here: tuple[slice, ...]
) -> None:
    """Where k boxes gain nothing over k - 1, take over the cut of k - 1."""
    for k in range(2, len(best)):
        fewer, target = best[(k - 1, *here)], best[(k, *here)]
        same = fewer >= target - 1e-13 * np.abs(target)
        target[same] = fewer[same]
        for row in range(3):
            choice[(row, k, *here)][same] = choice[(row, k - 1, *here)][same]


def _bases(n: int) -> list[int]:
    """Where intervals of each length start in the list of all intervals, shorter ones first."""
    bases, position = [0], 0
    for length in range(1, n + 1):
        bases.append(position)
        position += n - length + 1
    return bases


def _interval_sums(cells: FloatArray) -> FloatArray:
    """Sums over all boxes: each axis of n cells becomes one of n (n + 1) / 2 intervals."""
    for axis, n in enumerate(cells.shape):
        running = np.cumsum(np.moveaxis(cells, axis, 0), axis=0)
        running = np.concatenate([np.zeros_like(running[:1]), running])
        sums = [running[length:] - running[:-length] for length in range(1, n + 1)]
        cells = np.moveaxis(np.concatenate(sums), 0, axis)
    return np.maximum(cells, 0.0)


def _trace(choice: NDArray[np.int16], bases: list[list[int]], k: int, box: Box) -> list[Box]:
    index = tuple(
        base[stop - start] + start for base, (start, stop) in zip(bases, box, strict=True)
    )
    axis, cut, part = (int(choice[(row, k, *index)]) for row in range(3))
    if axis == 0:
        return [box]
    start, stop = box[axis - 1]
    below = (*box[: axis - 1], (start, start + cut), *box[axis:])
    above = (*box[: axis - 1], (start + cut, stop), *box[axis:])
    return _trace(choice, bases, part, below) + _trace(choice, bases, k - part, above)
