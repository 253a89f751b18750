"""Arrays over display histories that grow in place.

Every axis but the first counts the display events of one agent, entry 0 being "undecided so far".
When that agent gains events, the new entries start as copies of entry 0: whatever depends on them
depends only on what was shown before. Room is allotted ahead of need, so that a round touches what
is new and not the whole array.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from thumbwright.exact.arrays import FloatArray, IntArray

SPARE = 1.5
"""How much larger than what is in use an array may be, once it is not small."""

_SMALL = 2000
_SMALL_SPARE = 4


class Store:
    """A growing array of shape (2, n, n', ...): given plus and given minus, then event axes.

    Attributes
    ----------
    array : ndarray of float
        A view of what is in use; taken anew after every change of shape.
    """

    def __init__(self, axes: int, value: float) -> None:
        self._room: FloatArray = np.full((2, *(1,) * axes), value)
        self.array: FloatArray = self._room

    def grow(self, axis: int, extra: int) -> None:
        """Append ``extra`` copies of the undecided slice on an event axis (counted from 0)."""
        if not extra:
            return
        lengths = [*self.array.shape]
        used = lengths[axis + 1]
        lengths[axis + 1] += extra
        if lengths[axis + 1] > self._room.shape[axis + 1]:
            self._make_room(lengths)
        self.array = self._room[tuple([slice(length) for length in lengths])]
        turned = self.array.swapaxes(0, axis + 1)
        turned[used:] = turned[:1]

    def _make_room(self, lengths: list[int]) -> None:
        # All axes at once: they grow alike, and copying is what costs.
        spare = [n + _SMALL_SPARE for n in lengths[1:]]
        if math.prod(spare) > _SMALL:
            factor = SPARE ** (1.0 / len(spare))
            spare = [int(n * factor) for n in lengths[1:]]
        room = np.empty([2, *spare])
        room[tuple(slice(0, length) for length in self.array.shape)] = self.array
        self._room = room


@dataclass(frozen=True)
class Weights:
    """The weights of what one agent may have shown, for reading only.

    Attributes
    ----------
    array : ndarray of float, shape (2, own events, events of each seen agent)
        Given plus and given minus, the probability of each display event when those seen are made
        to show theirs.
    logarithms : bool
        Whether the array holds the logarithms of the probabilities.
    """

    array: FloatArray
    logarithms: bool

    def at(self, *entries: IntArray) -> FloatArray:
        """Probabilities, as a new array, of the chosen entries of each event axis."""
        chosen: FloatArray = self.array[np.ix_(np.arange(2), *entries)]
        return np.exp(chosen) if self.logarithms else chosen

    def turned(self, turn: tuple[int, ...]) -> Weights:
        """The same with the axes of the seen agents in another order."""
        axes = (0, 1, *(2 + axis for axis in turn))
        return Weights(np.transpose(self.array, axes), self.logarithms)


def along(axis: int, entries: IntArray | slice) -> tuple[IntArray | slice, ...]:
    """Index of some entries of an event axis (counted from 0), of everything on the axes before."""
    return (*(slice(None),) * (axis + 1), entries)


def shell(shape: tuple[int, ...], fresh: tuple[IntArray, ...]) -> IntArray:
    """Flat indices of the histories that have a fresh entry on any axis, ascending.

    Parameters
    ----------
    shape : tuple of int
    fresh : tuple of ndarray of int
        Per axis the entries that may have changed.
    """
    if len(shape) == 1:
        return fresh[0]
    touched = np.zeros(shape, dtype=bool)
    for axis, entries in enumerate(fresh):
        touched[along(axis - 1, entries)] = True
    return np.flatnonzero(touched)
