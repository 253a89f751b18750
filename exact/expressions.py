"""Sums and products of display weights, as they are needed and no further.

An expression stands for an array with one axis per agent whose display is left open, after a first
axis for the answer that is given. It is evaluated either in full, or *thin*: on one axis only for a
few chosen entries. What does not involve the thin axis is evaluated in full, once a round.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING

import numpy as np

from thumbwright.exact.arrays import FloatArray, IntArray
from thumbwright.exact.store import Store, along

if TYPE_CHECKING:
    from thumbwright.exact.contract import Display


@dataclass(frozen=True)
class Expression:
    """What all expressions have.

    Attributes
    ----------
    number : int
        Different for different expressions of a group.
    axes : tuple of int
        The agents whose display is left open, in the order of the axes.
    factors : frozenset of int
        The agents whose weights enter.
    """

    number: int
    axes: tuple[int, ...]
    factors: frozenset[int]


@dataclass(frozen=True)
class Leaf(Expression):
    """The weights of one agent; where it sees the agent that is held, that one is undecided.

    ``agent`` is whoever was worked out: the agent itself, or one that it is like.
    """

    agent: int
    where: tuple[slice | int, ...]


@dataclass(frozen=True)
class Pair(Expression):
    """The product of two expressions, summed over the agent ``out`` unless that is None."""

    left: Expression
    right: Expression
    out: int | None

    @cached_property
    def shares(self) -> tuple[tuple[int, ...], tuple[int, ...], tuple[int, ...]]:
        """The axes that both have and that stay, those of the left only, of the right only."""
        assert self.out is not None, "asked of sums only"
        return _shares(self.left, self.right, self.out)


class Workspace:
    """Evaluates expressions from the displays of the moment.

    Parameters
    ----------
    displays : sequence of Display
        Per agent the weights of what it may have shown.
    kept : mapping of int to Store
        By number, the expressions whose full arrays are kept up to date by somebody else.
    """

    def __init__(self, displays: Sequence[Display], kept: Mapping[int, Store]) -> None:
        self._displays = displays
        self._kept = kept
        self._full: dict[int, FloatArray] = {}

    def forget(self) -> None:
        """Weights have changed: what was evaluated in full no longer holds."""
        self._full.clear()

    def laid_out(
        self, expression: Expression, thin: int, entries: IntArray, axes: Sequence[int]
    ) -> FloatArray:
        """Evaluate thin, with axes as asked, of length 1 where the expression has none."""
        return _spread(self._value(expression, thin, entries), expression.axes, axes)

    def renewed(self, pair: Pair, thin: int, entries: IntArray) -> FloatArray:
        """Evaluate thin what is itself kept, from what it is made of."""
        return self._combined(pair, thin, entries)

    def laid_out_log(
        self, leaf: Leaf, thin: int, entries: IntArray, axes: Sequence[int]
    ) -> FloatArray:
        """As :meth:`laid_out`, but the log weights of a leaf."""
        log = self._displays[leaf.agent].log
        assert log is not None, "an agent whose logarithms are added has them"
        return _spread(_thinned(log.array[leaf.where], leaf, thin, entries), leaf.axes, axes)

    def largest(self, expression: Expression, lengths: Sequence[float], thin: int) -> float:
        """Entries, given one answer, of the largest array that an evaluation makes."""
        if isinstance(expression, Leaf) or expression.number in self._kept:
            return math.prod(lengths[a] for a in expression.axes) if thin in expression.axes else 0
        assert isinstance(expression, Pair)
        return max(
            math.prod(lengths[a] for a in expression.axes),
            self.largest(expression.left, lengths, thin),
            self.largest(expression.right, lengths, thin),
        )

    def _value(self, expression: Expression, thin: int | None, entries: IntArray) -> FloatArray:
        if isinstance(expression, Leaf):
            store = self._displays[expression.agent].linear
            assert store is not None, "an agent that is summed over has linear weights"
            return _thinned(store.array[expression.where], expression, thin, entries)
        assert isinstance(expression, Pair)
        if expression.number in self._kept:
            return _thinned(self._kept[expression.number].array, expression, thin, entries)
        if thin in expression.axes:
            return self._combined(expression, thin, entries)
        if expression.number not in self._full:
            self._full[expression.number] = self._combined(expression, None, entries)
        return self._full[expression.number]

    def _combined(self, pair: Pair, thin: int | None, entries: IntArray) -> FloatArray:
        left = self._value(pair.left, thin, entries)
        right = self._value(pair.right, thin, entries)
        if pair.out is None:
            product: FloatArray = _spread(left, pair.left.axes, pair.axes) * _spread(
                right, pair.right.axes, pair.axes
            )
            return product
        return _matrix_product(left, right, pair)


def _thinned(
    array: FloatArray, expression: Expression, thin: int | None, entries: IntArray
) -> FloatArray:
    if thin is None or thin not in expression.axes:
        return array
    axis = expression.axes.index(thin)
    if len(entries) == 1:
        return array[along(axis, slice(entries[0], entries[0] + 1))]
    return array[along(axis, entries)]


def _spread(array: FloatArray, axes: Sequence[int], wanted: Sequence[int]) -> FloatArray:
    """The array with its axes in the wanted order and axes of length 1 where it has none."""
    if tuple(axes) == tuple(wanted):
        return array
    turned = np.transpose(array, (0, *(axes.index(axis) + 1 for axis in wanted if axis in axes)))
    return turned[(slice(None), *(slice(None) if a in axes else None for a in wanted))]


def pair_axes(left: Expression, right: Expression, out: int | None) -> tuple[int, ...]:
    """Axes of the product of two expressions, in the order in which it is computed."""
    if out is None:
        return tuple(dict.fromkeys((*right.axes, *left.axes)))
    both, only_left, only_right = _shares(left, right, out)
    return (*both, *only_left, *only_right)


def _shares(
    left: Expression, right: Expression, out: int
) -> tuple[tuple[int, ...], tuple[int, ...], tuple[int, ...]]:
    return (
        tuple(a for a in right.axes if a in left.axes and a != out),
        tuple(a for a in left.axes if a not in right.axes),
        tuple(a for a in right.axes if a not in left.axes),
    )


def _matrix_product(left: FloatArray, right: FloatArray, pair: Pair) -> FloatArray:
    """Sum over ``pair.out`` of left times right, as one batched matrix product."""
    assert pair.out is not None
    both, only_left, only_right = pair.shares
    a = _spread(left, pair.left.axes, (*both, *only_left, pair.out))
    b = _spread(right, pair.right.axes, (*both, pair.out, *only_right))
    batch = a.shape[: 1 + len(both)]
    shape = (*batch, *a.shape[len(batch) : -1], *b.shape[len(batch) + 1 :])
    if len(only_left) != 1:
        a = a.reshape(*batch, -1, a.shape[-1])
    if len(only_right) != 1:
        b = b.reshape(*batch, b.shape[len(batch)], -1)
    return multiply(a, b).reshape(shape)


def multiply(a: FloatArray, b: FloatArray) -> FloatArray:
    """Batched matrix product, (..., m, k) times (..., k, n)."""
    product: FloatArray = np.matmul(_ready(a), _ready(b))
    return product


def _ready(matrices: FloatArray) -> FloatArray:
    """The same matrices with rows or columns in one piece, as fast matrix products need them."""
    if matrices.itemsize in matrices.strides[-2:]:
        return matrices
    return np.ascontiguousarray(matrices)
