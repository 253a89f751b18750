"""Probability of what an agent has been shown: contracting the display histories of the others.

Given the answer, the display histories of all agents factorise,

    P(h_1 ... h_N) = prod_j W_j[h_j, h_k for k in sees(j)],

where W_j is the probability that j shows h_j when those it sees are made to show theirs. What one
agent has been shown, itself held to showing undecided, is the product over all others with the
agent's own axis fixed and everything it does not see summed out. An agent that is not upstream of
what is seen sums to one and is left out beforehand; the rest is summed one agent at a time, each
sum ending in one batched matrix product.

What has been shown does not become more or less likely afterwards: an entry of a result, or of a
sum on the way to it, all of whose agents committed before this round, stays as it is. So after a
round only the entries are computed anew where some agent is still undecided or has just committed,
one axis at a time: on that axis a handful of entries, on the others all. Sums that do not
involve that axis are kept from round to round, brought up to date in the same way, and shared by
all agents: along a relay one short sum per link.

Where nothing has to be summed the logarithms are added instead and nothing can underflow.
"""

from __future__ import annotations

import math
from collections.abc import Sequence, Set
from dataclasses import dataclass

import numpy as np

from thumbwright.exact.alike import Likeness, each_for_itself
from thumbwright.exact.arrays import FloatArray, IntArray
from thumbwright.exact.expressions import Expression, Leaf, Pair, Workspace
from thumbwright.exact.group import Group
from thumbwright.exact.ordering import Ordering
from thumbwright.exact.store import Store, Weights, along

_THIN = 4.0
"""About how many entries of the thin axis a round renews."""


class Display:
    """The weights of what one agent may have shown, given what those it sees have shown.

    Attributes
    ----------
    log, linear : Store or None
        The weights as logarithms, where some contraction adds them, and as probabilities, where
        some contraction sums over them; axes (own event, event of each seen agent).
    events : int
        Own display events so far, "undecided" included.
    """

    def __init__(self, axes: int, added: bool, summed: bool) -> None:
        self.linear = Store(axes, 1.0) if summed else None
        self.log = Store(axes, 0.0) if added or not summed else None
        self.events = 1

    def show(self, undecided: FloatArray, events: Sequence[FloatArray]) -> None:
        """Set the log weight of still showing undecided, and append those of new events."""
        before, self.events = self.events, self.events + len(events)
        entries = [0, *range(before, self.events)]
        for store in self.stores():
            store.grow(0, len(events))
            for entry, weight in zip(entries, (undecided, *events), strict=True):
                if store is self.linear:
                    np.exp(weight, out=store.array[:, entry])
                else:
                    store.array[:, entry] = weight

    def grow(self, axis: int, extra: int) -> None:
        """The seen agent on this axis gained ``extra`` events."""
        for store in self.stores():
            store.grow(axis + 1, extra)

    def weights(self) -> Weights:
        """The weights as they are now, for reading."""
        store = self.linear or self.log
        assert store is not None, "a display has one of the two, if not both"
        return Weights(store.array, logarithms=store is self.log)

    def stores(self) -> list[Store]:
        """Those of the two that there are."""
        return [store for store in (self.log, self.linear) if store]


@dataclass(frozen=True)
class Kept:
    """A sum that is kept up to date from round to round."""

    sum: Pair
    store: Store


@dataclass(frozen=True)
class Result:
    """The log probability of every history that one agent may have been shown.

    Attributes
    ----------
    axes : tuple of int
        The agents it sees: the axes of ``store``.
    factors : frozenset of int
        The agents whose weights enter.
    store : Store
    sums : tuple of tuple of Expression
        Per axis that is renewed, the sums that are multiplied.
    leaves : tuple of Leaf
        Weights over which nothing is summed; their logarithms are added.
    """

    axes: tuple[int, ...]
    factors: frozenset[int]
    store: Store
    sums: tuple[tuple[Expression, ...], ...]
    leaves: tuple[Leaf, ...]


class Contractions:
    """All contractions of a group, planned once, shared where they can be, kept up to date.

    Parameters
    ----------
    group : Group
    likeness : Likeness, optional
        Who is worked out for whom; if None, everybody for itself.

    Attributes
    ----------
    displays : list of Display
        Per agent the weights of its display histories; agents that are worked out together have
        one in common, whose axes are in the order that the likeness gives.
    """

    def __init__(self, group: Group, likeness: Likeness | None = None) -> None:
        alike = likeness or each_for_itself(group)
        ordering = Ordering(group, alike)
        self._results = {i: _result(group, ordering, i) for i in alike.leads}
        self._kept = [Kept(pair, Store(len(pair.axes), 1.0)) for pair in ordering.kept()]
        added = {leaf.agent for result in self._results.values() for leaf in result.leaves}
        own = {
            j: Display(1 + len(group.sees[j]), j in added, j in ordering.summed_over)
            for j in alike.leads
        }
        self.displays = [own[lead] for lead in alike.lead]
        self._workspace = Workspace(self.displays, {k.sum.number: k.store for k in self._kept})

    def log_shown(self, position: int) -> FloatArray:
        """Log probability of every history that an agent may have been shown.

        Only for agents that are worked out themselves.

        Returns
        -------
        ndarray of float, shape (2, n_k for k in sees(agent))
            Given plus and given minus; entry 0 of every other axis is "undecided so far";
            ``-inf`` for a history that is impossible under that answer. To be read before the
            displays change.
        """
        return self._results[position].store.array

    def entries(self, events: Sequence[float]) -> tuple[float, float]:
        """How much the contractions hold, given both answers, if agents have so many events.

        Returns
        -------
        tuple of two floats
            Entries of all results and sums that are kept, and of the largest one in passing.
        """
        held = sum(2.0 * math.prod(events[a] for a in kept.sum.axes) for kept in self._kept)
        passing = 0.0
        for result in self._results.values():
            held += 2.0 * math.prod(events[a] for a in result.axes)
            for axis, thin in enumerate(result.axes):
                lengths = [*events]
                lengths[thin] = min(_THIN, events[thin])
                for one in result.sums[axis]:
                    passing = max(passing, 2.0 * self._workspace.largest(one, lengths, thin))
        return held, passing

    def renew(self, gained: Sequence[int], changed: Set[int]) -> None:
        """Take in what a round added to the displays.

        Parameters
        ----------
        gained : sequence of int
            Per agent the number of events that it gained.
        changed : set of int
            The agents whose weights changed otherwise than by growing with others.
        """
        fresh = [
            np.array([0, *range(display.events - g, display.events)])
            for display, g in zip(self.displays, gained, strict=True)
        ]
        self._workspace.forget()
        for kept in self._kept:
            _grow(kept.store, kept.sum.axes, gained)
            if not kept.sum.factors.isdisjoint(changed):
                for axis, thin in enumerate(kept.sum.axes):
                    block = self._workspace.renewed(kept.sum, thin, fresh[thin])
                    kept.store.array[along(axis, fresh[thin])] = block
        for result in self._results.values():
            _grow(result.store, result.axes, gained)
            if not result.factors.isdisjoint(changed):
                for axis, thin in enumerate(result.axes):
                    block = self._block(result, axis, fresh[thin])
                    result.store.array[along(axis, fresh[thin])] = block

    def _block(self, result: Result, axis: int, entries: IntArray) -> FloatArray:
        """The result for a few entries of one axis."""
        thin = result.axes[axis]
        terms = [
            self._workspace.laid_out_log(leaf, thin, entries, result.axes) for leaf in result.leaves
        ]
        if result.sums[axis]:
            product = math.prod(
                self._workspace.laid_out(one, thin, entries, result.axes)
                for one in result.sums[axis]
            )
            with np.errstate(divide="ignore"):
                terms.append(np.log(product))
        total: FloatArray = sum(terms[1:], terms[0])
        return total


def _result(group: Group, ordering: Ordering, position: int) -> Result:
    seen = group.sees[position]
    leaves: tuple[Leaf, ...] = ()
    sums = []
    for thin in seen:
        pieces = ordering.pieces(position, thin)
        # Whatever the order of summing, what no sum touches is the same.
        leaves = tuple(piece for piece in pieces if isinstance(piece, Leaf))
        sums.append(tuple(piece for piece in pieces if not isinstance(piece, Leaf)))
    return Result(seen, group.sources(position), Store(len(seen), 0.0), tuple(sums), leaves)


def _grow(store: Store, axes: Sequence[int], gained: Sequence[int]) -> None:
    for axis, agent in enumerate(axes):
        store.grow(axis, gained[agent])
