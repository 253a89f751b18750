"""Probability of what an agent has been shown: contracting the display histories of the others.

Given the answer, the display histories of all agents factorise,

    P(h_1 ... h_N) = prod_j W_j[h_j, h_k for k in sees(j)],

where W_j is the probability that j shows h_j when those it sees are made to show theirs. What one
agent has been shown, itself held to showing undecided, is the product over all others with the
agent's own axis fixed and everything it does not see summed out. An agent that is not upstream of
what is seen sums to one and is left out beforehand; the rest is summed one agent at a time, the
last product of each sum as a batched matrix product.

Where nothing has to be summed the logarithms are added instead and nothing can underflow.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from thumbwright.exact.arrays import FloatArray
from thumbwright.exact.group import Group


@dataclass(frozen=True)
class Plan:
    """What enters the contraction for one agent, worked out once per network.

    Attributes
    ----------
    position : int
        The agent that is held to showing undecided.
    seen : tuple of int
        The axes of the result, in the agent's own order.
    factors : tuple of int
        The agents whose weights enter.
    summed : tuple of int
        Those of them whose display is summed out, in the order of summing.
    """

    position: int
    seen: tuple[int, ...]
    factors: tuple[int, ...]
    summed: tuple[int, ...]


def plan(group: Group, position: int) -> Plan:
    """The contraction for one agent; the order of summing keeps the intermediates small."""
    factors = group.sources(position)
    seen = group.sees[position]
    scopes = [frozenset((j, *group.sees[j])) - {position} for j in sorted(factors)]
    waiting, order = set(factors) - set(seen), []
    while waiting:
        # Summing v joins all factors that mention v: take the v whose join is narrowest.
        joined = {v: frozenset().union(*(s for s in scopes if v in s)) for v in waiting}
        best = min(sorted(waiting), key=lambda v: len(joined[v]))
        scopes = [s for s in scopes if best not in s] + [joined[best] - {best}]
        waiting.remove(best)
        order.append(best)
    return Plan(position, seen, tuple(sorted(factors)), tuple(order))


def log_shown(group: Group, recipe: Plan, log_weights: Sequence[FloatArray]) -> FloatArray:
    """Log probability of every history that the agent may have been shown.

    Parameters
    ----------
    group : Group
    recipe : Plan
    log_weights : sequence of ndarray
        For each agent j an array of shape (2, n_j, n_k for k in sees(j)): the log weights given
        plus and given minus; entry 0 of every event axis is "undecided".

    Returns
    -------
    ndarray of float, shape (2, n_k for k in sees(agent))
        ``-inf`` for a history that is impossible under that answer.
    """
    parts = []
    for j in recipe.factors:
        axes = (j, *group.sees[j])
        array = log_weights[j]
        if recipe.position in axes:
            where = axes.index(recipe.position)
            array = np.take(array, 0, axis=where + 1)
            axes = axes[:where] + axes[where + 1 :]
        parts.append((array, axes))
    if not recipe.summed:
        total = np.zeros((2, *(1 for _ in recipe.seen)))
        for array, axes in parts:
            total = total + _spread(array, axes, recipe.seen)
        return total
    pieces = [(np.exp(array), axes) for array, axes in parts]
    for out in recipe.summed:
        touching = [piece for piece in pieces if out in piece[1]]
        rest = [piece for piece in pieces if out not in piece[1]]
        pieces = [*rest, _summed(touching, out)]
    product = np.ones((2, *(1 for _ in recipe.seen)))
    for array, axes in pieces:
        product = product * _spread(array, axes, recipe.seen)
    with np.errstate(divide="ignore"):
        return np.log(product)


Piece = tuple[FloatArray, tuple[int, ...]]


def _spread(array: FloatArray, axes: Sequence[int], wanted: Sequence[int]) -> FloatArray:
    """The array with its axes in the wanted order and axes of length 1 where it has none."""
    present = [axis for axis in wanted if axis in axes]
    turned = np.transpose(array, (0, *(axes.index(axis) + 1 for axis in present)))
    lengths = dict(zip(present, turned.shape[1:], strict=True))
    return turned.reshape(2, *(lengths.get(axis, 1) for axis in wanted))


def _summed(pieces: list[Piece], out: int) -> Piece:
    """The product of the pieces summed over one of their axes."""
    pieces = sorted(pieces, key=lambda piece: piece[0].size)
    left = pieces[0]
    for right in pieces[1:-1]:
        axes = tuple(dict.fromkeys((*left[1], *right[1])))
        left = (_spread(*left, axes) * _spread(*right, axes), axes)
    if len(pieces) == 1:
        array, axes = left
        where = axes.index(out)
        return array.sum(axis=where + 1), axes[:where] + axes[where + 1 :]
    return _matrix_product(left, pieces[-1], out)


def _matrix_product(left: Piece, right: Piece, out: int) -> Piece:
    """Sum over ``out`` of left times right, as one batched matrix product."""
    both = tuple(a for a in left[1] if a in right[1] and a != out)
    only_left = tuple(a for a in left[1] if a not in right[1])
    only_right = tuple(a for a in right[1] if a not in left[1])
    size = dict(zip(left[1], left[0].shape[1:], strict=True))
    size.update(zip(right[1], right[0].shape[1:], strict=True))

    def length(axes: Sequence[int]) -> int:
        return int(np.prod([size[a] for a in axes], dtype=np.int64))

    a = _spread(*left, (*both, *only_left, out)).reshape(2, length(both), length(only_left), -1)
    b = _spread(*right, (*both, out, *only_right)).reshape(2, length(both), size[out], -1)
    axes = (*both, *only_left, *only_right)
    return np.matmul(a, b).reshape(2, *(size[axis] for axis in axes)), axes
