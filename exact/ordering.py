"""In which order displays are summed out, so that no product grows wider than it must.

Summing out agent v joins all pieces that mention v: two at a time, narrowest first, the last two
in a matrix product. The next agent to be summed is the one whose joining costs least: first by
multiplications, then by the widest array on the way, then by leaving the thin axis alone, so that
the result can be kept and shared. Widths are counted in axes, all being about equally long, the
thin axis counting nothing.
"""

from __future__ import annotations

import heapq

from thumbwright.exact.alike import Likeness
from thumbwright.exact.expressions import Expression, Leaf, Pair, pair_axes
from thumbwright.exact.group import Group

Cost = tuple[int, int, bool, int]


class Ordering:
    """Plans the contractions of a group; equal expressions are planned once and have one number.

    Attributes
    ----------
    summed_over : set of int
        Agents whose weights enter some sum, or those of agents that they are worked out for.
    """

    def __init__(self, group: Group, likeness: Likeness) -> None:
        self._sees, self._likeness = group.sees, likeness
        self._sources = [group.sources(i) for i in range(len(group.agents))]
        self._widest = max(1 + len(seen) for seen in group.sees)
        self._known: dict[tuple[object, ...], Expression] = {}
        self._costs: dict[tuple[object, ...], Cost] = {}
        self._shared: dict[int, Pair] = {}
        self.summed_over: set[int] = set()

    def pieces(self, position: int, thin: int) -> list[Expression]:
        """What has to be multiplied for one agent, renewing the axis of the agent ``thin``."""
        pieces: dict[int, Expression] = {}
        mention: dict[int, set[int]] = {}

        def take_in(piece: Expression) -> None:
            pieces[piece.number] = piece
            for axis in piece.axes:
                mention.setdefault(axis, set()).add(piece.number)

        for j in sorted(self._sources[position]):
            take_in(self._leaf(j, position))
        waiting = self._sources[position] - set(self._sees[position])
        heap = [(self._cost(v, [pieces[n] for n in mention[v]], thin), v) for v in waiting]
        current = {v: cost for cost, v in heap}
        heapq.heapify(heap)
        while heap:
            cost, out = heapq.heappop(heap)
            if current.get(out) != cost:
                continue
            del current[out]
            touching = [pieces.pop(n) for n in sorted(mention.pop(out))]
            for piece in touching:
                for axis in {*piece.axes} - {out}:
                    mention[axis].discard(piece.number)
            joined = self._joined(touching, thin, out)
            take_in(joined)
            for v in joined.axes:
                if v in current:
                    current[v] = self._cost(v, [pieces[n] for n in mention[v]], thin)
                    heapq.heappush(heap, (current[v], v))
        for piece in pieces.values():
            self._note(piece, thin)
        return [pieces[n] for n in sorted(pieces)]

    def kept(self) -> list[Pair]:
        """Sums worth keeping: narrower than the widest weights; each after what it is made of."""
        return [self._shared[n] for n in sorted(self._shared)]

    def _note(self, piece: Expression, thin: int | None) -> None:
        """Mark what can be kept in an expression that is evaluated thin, and what is summed."""
        waiting: list[tuple[Expression, int | None]] = [(piece, thin)]
        top = piece
        while waiting:
            one, axis = waiting.pop()
            if isinstance(one, Leaf):
                if one is not top:
                    self.summed_over.add(one.agent)
                continue
            assert isinstance(one, Pair)
            if axis not in one.axes and one.out is not None and len(one.axes) < self._widest:
                if one.number in self._shared:
                    continue
                self._shared[one.number] = one
                axis = None  # it is renewed on every axis of its own, so what is in it is kept too
            waiting += [(one.left, axis), (one.right, axis)]

    def _leaf(self, agent: int, held: int) -> Expression:
        axes = (agent, *self._likeness.seen[agent])
        where: tuple[slice | int, ...] = ()
        if held in axes:
            where = (*(slice(None),) * (1 + axes.index(held)), 0)
        key = ("leaf", agent, held if where else None)
        if key not in self._known:
            left_open = tuple(a for a in axes if a != held)
            lead = self._likeness.lead[agent]
            self._known[key] = Leaf(len(self._known), left_open, frozenset((agent,)), lead, where)
        return self._known[key]

    def _pair(self, one: Expression, other: Expression, out: int | None) -> Expression:
        """The narrower comes on the left: a product keeps the layout of the wider."""
        left, right = sorted((one, other), key=lambda p: (len(p.axes), p.number))
        key = ("pair", left.number, right.number, out)
        if key not in self._known:
            axes, factors = pair_axes(left, right, out), left.factors | right.factors
            self._known[key] = Pair(len(self._known), axes, factors, left, right, out)
        return self._known[key]

    def _joined(self, pieces: list[Expression], thin: int, out: int) -> Expression:
        assert len(pieces) > 1, "whoever is summed over is seen by somebody in the sum"
        while len(pieces) > 2:
            _, i, j = _narrowest([p.axes for p in pieces], thin)
            pair = self._pair(pieces[i], pieces[j], None)
            pieces = [*(p for k, p in enumerate(pieces) if k not in (i, j)), pair]
        return self._pair(pieces[0], pieces[1], out)

    def _cost(self, out: int, pieces: list[Expression], thin: int) -> Cost:
        touches = any(thin in p.axes for p in pieces)
        key = (out, tuple(sorted(p.number for p in pieces)), thin if touches else None)
        if key not in self._costs:
            scopes = [p.axes for p in sorted(pieces, key=lambda p: p.number)]
            union = {a for scope in scopes for a in scope} - {thin}
            widest = len(union - {out})
            while len(scopes) > 2:
                width, i, j = _narrowest(scopes, thin)
                pair = tuple({*scopes[i], *scopes[j]})
                scopes = [*(s for k, s in enumerate(scopes) if k not in (i, j)), pair]
                widest = max(widest, width)
            self._costs[key] = (len(union), widest, touches, out)
        return self._costs[key]


def _narrowest(scopes: list[tuple[int, ...]], thin: int) -> tuple[int, int, int]:
    """Width of the narrowest product of two, and which two."""
    return min(
        (len({*scopes[i], *scopes[j]} - {thin}), i, j) for j in range(len(scopes)) for i in range(j)
    )
