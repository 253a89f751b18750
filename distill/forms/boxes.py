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

from thumbwright.exact.arrays import FloatArray, IntArray

_ROUNDING = 1e-13

Box = tuple[tuple[int, int], ...]
"""Half-open range of cells on each axis."""


def gain(plus: FloatArray, minus: FloatArray) -> FloatArray:
    """G of groups with these masses; zero masses give zero."""
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
    alone = gain(_interval_sums(plus), _interval_sums(minus))
    # best[k - 1] over all boxes; choice holds the axis + 1 (0: uncut), the cut, and how many
    # boxes lie below it.
    best = np.broadcast_to(alone, (most, *counts)).copy()
    choice = np.zeros((3, most, *counts), dtype=np.int16)
    for lengths in sorted(product(*(range(1, n + 1) for n in shape)), key=sum):
        useful = min(most, int(np.prod(lengths)))
        if useful > 1:
            here = tuple(
                np.arange(base[length], base[length] + n - length + 1, dtype=np.int64)
                for base, length, n in zip(bases, lengths, shape, strict=True)
            )
            _cut(best, choice, bases, here, lengths, useful)
    whole = tuple(base[n] for base, n in zip(bases, shape, strict=True))
    return tuple(
        Partition(
            tuple(_trace(choice, bases, k, tuple((0, n) for n in shape))),
            float(best[(k, *whole)]),
        )
        for k in range(most)
    )


def _cut(
    best: FloatArray,
    choice: NDArray[np.int16],
    bases: list[list[int]],
    here: tuple[IntArray, ...],
    lengths: tuple[int, ...],
    useful: int,
) -> None:
    """Find the best cuts of all boxes of one size, into 2 .. ``useful`` boxes each."""
    room = tuple(len(index) for index in here)
    top = best[0][np.ix_(*here)]
    found = np.broadcast_to(top, (useful, *room)).copy()
    codes = np.zeros((3, useful, *room), dtype=np.int16)
    for axis, length in enumerate(lengths):
        if length == 1:
            continue
        base, cuts = bases[axis], np.arange(1, length)
        starts = np.arange(room[axis])
        # Boxes below and above every cut: axes (boxes, cut, position on each axis).
        lows = np.array(base)[cuts][:, None] + starts
        highs = np.array(base)[length - cuts][:, None] + cuts[:, None] + starts
        below = _gathered(best[: useful - 1], here, axis, lows)
        above = _gathered(best[: useful - 1], here, axis, highs)
        for k in range(1, useful):
            sums = (below[:k] + above[k - 1 :: -1]).reshape(k * len(cuts), *room)
            value = sums.max(axis=0)
            # Of cuts that are equal but for rounding the first counts, so that ties are stable.
            first = (sums >= value - _ROUNDING * np.abs(value)).argmax(axis=0)
            better = value > found[k] + _ROUNDING * np.abs(found[k])
            found[k] = np.where(better, value, found[k])
            fresh = (np.full_like(first, axis + 1), cuts[first % len(cuts)], first // len(cuts))
            for code, number in zip(codes, fresh, strict=True):
                code[k] = np.where(better, number, code[k])
    for k in range(1, useful):
        same = found[k - 1] >= found[k] - _ROUNDING * np.abs(found[k])
        found[k] = np.where(same, found[k - 1], found[k])
        codes[:, k] = np.where(same, codes[:, k - 1], codes[:, k])
    # More boxes than cells are never needed.
    boxes = np.ix_(*here)
    for k in range(1, len(best)):
        best[k][boxes] = found[min(k, useful - 1)]
        for row in range(3):
            choice[row, k][boxes] = codes[row, min(k, useful - 1)]


def _gathered(
    best: FloatArray, here: tuple[IntArray, ...], axis: int, rows: IntArray
) -> FloatArray:
    """``best`` of the boxes at ``rows`` (cut, position) on one axis and ``here`` on the others."""
    picked = best
    for other, index in enumerate(here):
        if other != axis:
            picked = np.take(picked, index, axis=other + 1)
    return np.moveaxis(np.take(picked, rows, axis=axis + 1), axis + 1, 1)


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
    """The boxes into which a box is best cut when k cuts may be made."""
    index = tuple(
        base[stop - start] + start for base, (start, stop) in zip(bases, box, strict=True)
    )
    axis, cut, part = (int(choice[(row, k, *index)]) for row in range(3))
    if axis == 0:
        return [box]
    start, stop = box[axis - 1]
    below = (*box[: axis - 1], (start, start + cut), *box[axis:])
    above = (*box[: axis - 1], (start + cut, stop), *box[axis:])
    # k cuts leave one for this, "part" for below and the rest for above.
    return _trace(choice, bases, part, below) + _trace(choice, bases, k - 1 - part, above)
