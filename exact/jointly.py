"""Sums over the joint displays of a whole group.

Given the answer, the display histories of all agents factorise (see ``contract``). Here their
product, each agent's events weighted at will, is summed over all joint histories, one agent at a
time and never one history at a time.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from thumbwright.exact.arrays import IntArray
from thumbwright.exact.engine import Moment, Solution
from thumbwright.exact.errors import ModelError
from thumbwright.exact.group import Group

MOST_PRODUCTS = 3e10
"""Multiplications that the sums over a group may take: a minute or two."""

MOST_ENTRIES = 2e7
"""Entries of the largest array, per answer, that the sums may have to hold."""

_BOTH = np.arange(2)

_AT_ONCE = 2_000_000
"""Entries of the largest array, per answer, up to which several sums are taken at once."""

Piece = tuple[NDArray[Any], tuple[int, ...]]
"""An array of shape (batch, answer, one axis per agent named), the first two possibly of length 1,
and the positions of those agents, ascending."""


def displays(solution: Solution, step: int, picks: Sequence[IntArray]) -> list[Piece]:
    """The weights of what each agent has shown by the end of a step, for some events only.

    Parameters
    ----------
    solution : Solution
    step : int
        From 1 to the horizon.
    picks : sequence of ndarray of int
        Per agent the events to keep, in its own numbering, none later than the step; 0 is
        "undecided so far" and, where kept, comes first.
    """
    group = solution.group
    found: list[Piece] = []
    for j, (track, end) in enumerate(zip(solution.tracks, ends_of(solution, step), strict=True)):
        seen = [picks[k] for k in group.sees[j]]
        assert track.weights is not None, "the track of a whole run has them"
        weight = track.weights.at(picks[j], *seen)
        if len(picks[j]) and picks[j][0] == 0:
            # An event shown in the last round of the step was not known in it: still undecided.
            known = zip(seen, end.log_after.shape[1:], strict=True)
            before = [np.where(pick < length, pick, 0) for pick, length in known]
            weight[:, 0] = np.exp(end.log_after[np.ix_(_BOTH, *before)])
        axes = (j, *group.sees[j])
        turned = np.transpose(weight, (0, *(1 + np.argsort(axes))))
        found.append((turned[None], tuple(sorted(axes))))
    return found


def ends_of(solution: Solution, step: int) -> list[Moment]:
    """The last moment of a step, per agent."""
    moments = solution.tracks[0].moments
    last = max(i for i, moment in enumerate(moments) if moment.step == step)
    return [track.moments[last] for track in solution.tracks]


def elimination(group: Group) -> tuple[int, ...]:
    """The order in which agents are summed out: always the one whose join is narrowest."""
    scopes = [frozenset((j, *seen)) for j, seen in enumerate(group.sees)]
    waiting, order = set(range(len(scopes))), []
    while waiting:
        joined = {v: frozenset[int]().union(*(s for s in scopes if v in s)) for v in waiting}
        best = min(sorted(waiting), key=lambda v: len(joined[v]))
        scopes = [s for s in scopes if best not in s] + [joined[best] - {best}]
        waiting.remove(best)
        order.append(best)
    return tuple(order)


@dataclass(frozen=True)
class _Size:
    """What summing takes: entries of the largest array of one answer, products, widest agent."""

    entries: float
    products: float
    widest: int


def _size(scopes: Sequence[tuple[int, ...]], lengths: Sequence[int], order: Sequence[int]) -> _Size:
    """Go through the sums of :func:`total` without doing them."""
    entries, products, widest = 1.0, 0.0, order[0]
    held = list(scopes)
    for out in order:
        touching = sorted((s for s in held if out in s), key=lambda s: _count(lengths, s))
        left = set[int]().union(*touching[:-1])
        joined = left.union(touching[-1])
        largest = max(_count(lengths, left), _count(lengths, joined - {out}))
        if largest > entries:
            entries, widest = largest, out
        products += _count(lengths, joined)
        held = [s for s in held if out not in s] + [tuple(sorted(joined - {out}))]
    return _Size(entries, products, widest)


def _count(lengths: Sequence[int], axes: Iterable[int]) -> float:
    return math.prod(float(lengths[axis]) for axis in axes)


def refuse_too_wide(solution: Solution) -> None:
    """Raise ModelError where the joint displays of the group are too many to be summed."""
    group = solution.group
    lengths = [len(track.events) for track in solution.tracks]
    scopes = [(j, *seen) for j, seen in enumerate(group.sees)]
    size = _size(scopes, lengths, elimination(group))
    # A complex product counts as four; the sums over the counts outnumber those over the steps.
    products = 2.0 * 4.0 * size.products * (len(lengths) + 5)
    # Histories of the widest agent can be taken one at a time.
    held = size.entries / lengths[size.widest]
    if products > MOST_PRODUCTS or held > MOST_ENTRIES:
        raise ModelError(
            "what the whole group does together cannot be summed exactly: around agent "
            f"{group.agents[size.widest].id} the displays of several agents have to be held "
            f"jointly, {size.entries:.2g} of them, which takes {products:.2g} multiplications "
            f"(allowed {MOST_PRODUCTS:.2g}). Ways out: a horizon below {group.horizon} steps, "
            "letting agents see fewer others, or fewer agents; what each agent does by itself is "
            "not affected"
        )


def total(
    pieces: Sequence[Piece], weights: Sequence[NDArray[Any]], order: Sequence[int]
) -> NDArray[Any]:
    """Sum of the product of all pieces, each agent's events weighted, over all joint events.

    Parameters
    ----------
    pieces : sequence of Piece
        For example from :func:`displays`.
    weights : sequence of ndarray, shape (B, events of the agent)
        Per agent; real or complex.
    order : sequence of int
        In which agents are summed out; see :func:`elimination`.

    Returns
    -------
    ndarray, shape (B, 2)
        One sum per row of weights, given plus and given minus.
    """
    lengths = [weight.shape[1] for weight in weights]
    size = _size([axes for _, axes in pieces], lengths, order)
    events = lengths[size.widest]
    if size.entries > _AT_ONCE and events > 1:
        # The widest agent's events in portions: as many products, in arrays that much smaller.
        portion = max(1, int(events * _AT_ONCE // size.entries))
        blocks = np.split(np.arange(events), range(portion, events, portion))
        return sum(
            (total(*_only(pieces, weights, size.widest, block), order) for block in blocks),
            start=np.zeros((len(weights[0]), 2), dtype=weights[0].dtype),
        )
    rows = max(1, int(_AT_ONCE // size.entries))
    sums = []
    for start in range(0, len(weights[0]), rows):
        held: list[Piece] = [(w[start : start + rows, None], (j,)) for j, w in enumerate(weights)]
        held += pieces
        for out in order:
            touching = [piece for piece in held if out in piece[1]]
            held = [piece for piece in held if out not in piece[1]]
            held.append(_summed(touching, out))
        product = np.ones((len(weights[0][start : start + rows]), 2), dtype=weights[0].dtype)
        for array, _ in held:
            product = product * array
        sums.append(product)
    return np.concatenate(sums)


def _only(
    pieces: Sequence[Piece], weights: Sequence[NDArray[Any]], agent: int, events: IntArray
) -> tuple[list[Piece], list[NDArray[Any]]]:
    """Pieces and weights with only some events of one agent."""
    fewer = [
        (np.take(array, events, axis=2 + axes.index(agent)) if agent in axes else array, axes)
        for array, axes in pieces
    ]
    return fewer, [w[:, events] if j == agent else w for j, w in enumerate(weights)]


def _summed(pieces: list[Piece], out: int) -> Piece:
    """The product of two or more pieces summed over one axis, its last product by matrices."""
    pieces = sorted(pieces, key=lambda piece: piece[0].size)
    array, axes = pieces[0]
    for other, other_axes in pieces[1:-1]:
        wanted = tuple(sorted({*axes, *other_axes}))
        array = _spread(array, axes, wanted) * _spread(other, other_axes, wanted)
        axes = wanted
    return _matrix_product((array, axes), pieces[-1], out)


def _spread(array: NDArray[Any], axes: tuple[int, ...], wanted: tuple[int, ...]) -> NDArray[Any]:
    """The array with axes of length 1 for the agents it does not name; both are ascending."""
    lengths = dict(zip(axes, array.shape[2:], strict=True))
    return array.reshape(*array.shape[:2], *(lengths.get(axis, 1) for axis in wanted))


def _matrix_product(left: Piece, right: Piece, out: int) -> Piece:
    """Sum over one axis of left times right, as batched matrix products."""
    both = tuple(a for a in left[1] if a in right[1] and a != out)
    only = [
        tuple(a for a in one[1] if a not in other[1])
        for one, other in ((left, right), (right, left))
    ]
    size = dict(zip((*left[1], *right[1]), (*left[0].shape[2:], *right[0].shape[2:]), strict=True))

    def matrix(piece: Piece, *blocks: tuple[int, ...]) -> NDArray[Any]:
        where = [2 + piece[1].index(axis) for block in blocks for axis in block]
        turned = piece[0].transpose(0, 1, *where)
        lengths = [int(np.prod([size[a] for a in block], dtype=np.int64)) for block in blocks]
        return turned.reshape(*turned.shape[:2], *lengths)

    product = np.matmul(matrix(left, both, only[0], (out,)), matrix(right, both, (out,), only[1]))
    axes = (*both, *only[0], *only[1])
    full = product.reshape(*product.shape[:2], *(size[axis] for axis in axes))
    turned = full.transpose(0, 1, *(2 + np.argsort(axes, kind="stable")))
    return turned, tuple(sorted(axes))
