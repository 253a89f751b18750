"""Pricing many rules of bars at once, for an agent that sees a single other.

A rule of bars that looks only at the step and at the shown state treats all histories alike in
which the seen agent shows the same state, whenever it committed. The agent's walks over those
histories can then be added up, each weighted with the probability of the commitment; three columns
per rule and answer are left instead of one per event, and the rules of a search share every array
operation. The figures are those of ``play.adopt``, summed in another order.
"""

from __future__ import annotations

from contextlib import AbstractContextManager
from dataclasses import dataclass
from functools import cache
from typing import cast

import numpy as np
from threadpoolctl import ThreadpoolController

from thumbwright.exact.arrays import BoolArray, FloatArray, IntArray
from thumbwright.exact.engine import Solution, leanings
from thumbwright.exact.evidence.base import Evidence
from thumbwright.exact.play import silence_is_possible


@dataclass(frozen=True)
class Bars:
    """B rules of bars.

    Attributes
    ----------
    minus_at, plus_at : ndarray of int, shape (B, T + 1, 3)
        Own counts at or below and at or above which the agent answers, per step (entry 0 is
        unused) and shown state (undecided, plus, minus).
    last_value : ndarray of float, shape (B, 3)
        Worth (nats) of the row in force at the horizon, per shown state: it decides which answer
        an agent favours that is still undecided then.
    """

    minus_at: IntArray
    plus_at: IntArray
    last_value: FloatArray


@dataclass(frozen=True)
class ManyTallies:
    """Outcomes of B rules, each array (B, 2), given plus and given minus.

    ``lean_plus`` and ``lean_minus`` split the undecided at the horizon by what their belief
    favours; one that favours neither counts half for each.
    """

    plus: FloatArray
    minus: FloatArray
    undecided: FloatArray
    steps: FloatArray
    lean_plus: FloatArray
    lean_minus: FloatArray


def fits(solution: Solution, position: int) -> bool:
    """Whether rules of this agent can be priced together.

    It must see a single other agent, observe once at every step, have thresholds that are known and
    keep a whole own count, and whoever sees it must have a reading for its silence. Certain
    evidence, which ends a walk by itself, is left to the general way of playing.
    """
    group = solution.group
    agent = group.agents[position]
    return (
        len(agent.sees) == 1
        and (not group.influences(position) or silence_is_possible(solution, position))
        and agent.evidence.on_ladder
        and agent.looks is None
        and not (agent.evidence.certain_plus or agent.evidence.certain_minus)
        and len(agent.thresholds) == 1
    )


def play_many(solution: Solution, position: int, bars: Bars) -> ManyTallies:
    """Play B rules of bars against the exact displays of the one agent that is seen."""
    with _one_thread():
        return _play_many(solution, position, bars)


def _play_many(solution: Solution, position: int, bars: Bars) -> ManyTallies:
    walk = _Columns(solution, position, bars)
    rules = len(bars.minus_at)
    plus, minus, steps = (np.zeros((rules, 2)) for _ in range(3))
    for index in range(len(walk.moments)):
        begins = walk.advance(index)
        if begins:
            steps += walk.undecided_before
        high, low = walk.at_or_above(bars.plus_at), walk.at_or_below(bars.minus_at)
        plus += walk.leave(high)
        minus += walk.leave(low)
    belief = solution.group.prior + walk.tally[:, None, None] + bars.last_value[None]
    lean = [walk.mass_where(mask) for mask in leanings(belief)]
    return ManyTallies(
        plus, minus, walk.undecided(), steps, lean[0] + lean[2] / 2, lean[1] + lean[2] / 2
    )


def changed_many(solution: Solution, position: int, reference: Bars, bars: Bars) -> FloatArray:
    """Probability that each rule ever acts differently from the one reference, shape (B, 2)."""
    with _one_thread():
        return _changed_many(solution, position, reference, bars)


def _changed_many(solution: Solution, position: int, reference: Bars, bars: Bars) -> FloatArray:
    walk = _Columns(solution, position, bars, also=reference)
    changed = np.zeros((len(bars.minus_at), 2))
    for index in range(len(walk.moments)):
        walk.advance(index)
        ours = walk.at_or_above(bars.plus_at), walk.at_or_below(bars.minus_at)
        theirs = walk.at_or_above(reference.plus_at), walk.at_or_below(reference.minus_at)
        changed += walk.leave((ours[0] != theirs[0]) | (ours[1] != theirs[1]))
        walk.leave(ours[0] | ours[1])
    return changed


@cache
def _threads() -> ThreadpoolController:
    return ThreadpoolController()


def _one_thread() -> AbstractContextManager[object]:
    """Many small matrix products go fastest on one thread, above all on a busy machine."""
    return cast("AbstractContextManager[object]", _threads().limit(limits=1))


def likely_counts(evidence: Evidence, horizon: int, leave: float = 1e-18) -> tuple[int, int]:
    """Lowest and highest own count by the horizon, but for tails of probability ``leave``.

    The distribution of the sum of all observations, under either answer, by repeated convolution.
    """
    moves = evidence.offsets[:, 0]
    step_low = int(moves.min())
    low, high = 0, 0
    for side in (evidence.plus, evidence.minus):
        one = np.zeros(int(moves.max()) - step_low + 1)
        one[moves - step_low] = side
        law, shift = np.ones(1), 0
        for _ in range(horizon):
            law, shift = np.convolve(law, one), shift + step_low
            kept = np.flatnonzero(law > leave)
            law, shift = law[kept[0] : kept[-1] + 1], shift + int(kept[0])
            low, high = min(low, shift), max(high, shift + len(law) - 1)
    return low, high


class _Columns:
    """Walks of B rules over a dense ladder; mass has axes (given, count, rule, shown state)."""

    def __init__(
        self, solution: Solution, position: int, bars: Bars, also: Bars | None = None
    ) -> None:
        group = solution.group
        self._evidence: Evidence = group.agents[position].evidence
        (other,) = group.sees[position]
        self._states = np.array(solution.tracks[other].events.state)
        self.moments = solution.tracks[position].moments
        self._horizon = group.horizon
        moves = self._evidence.offsets[:, 0]
        lowest, highest = likely_counts(self._evidence, group.horizon)
        every = [bars] if also is None else [bars, also]
        # Below the lowest bar and above the highest nobody is left after a cut.
        low = max(lowest, min(int(b.minus_at[:, 1:].min()) for b in every))
        high = min(highest, max(int(b.plus_at[:, 1:].max()) for b in every))
        low, high = min(low, 0), max(high, 0)
        self.count: IntArray = np.arange(
            low + min(0, int(moves.min(initial=0))), high + max(0, int(moves.max(initial=0))) + 1
        )
        self._mass = np.zeros((2, len(self.count), len(bars.minus_at), 3))
        self._mass[:, int(np.flatnonzero(self.count == 0)[0]), :, 0] = 1.0
        self._moves = self._move_matrices()
        self._step, self._known = 0, 1
        self._weight = np.ones((2, 3))
        self.undecided_before: FloatArray = np.ones((len(bars.minus_at), 2))

    def _move_matrices(self) -> FloatArray:
        """Probability of moving from count to count in one observation, shape (2, to, from)."""
        evidence, size = self._evidence, len(self.count)
        moves = np.zeros((2, size, size))
        start = np.arange(size)
        for move, *chance in zip(
            evidence.offsets[:, 0], evidence.plus, evidence.minus, strict=True
        ):
            # A cut leaves the outermost rows empty, or next to: what is pushed over the edge is
            # less than ``likely_counts`` leaves out.
            inside = start[(start + move >= 0) & (start + move < size)]
            moves[:, inside + move, inside] = np.array(chance)[:, None]
        return moves

    @property
    def tally(self) -> FloatArray:
        """Worth (nats) of each own count at the present step."""
        evidence = self._evidence
        tally: FloatArray = evidence.alpha[0] * self.count + evidence.beta * self._step
        return tally

    def advance(self, index: int) -> bool:
        """Take in what was shown and, at the start of a step, observe; says whether one began."""
        moment = self.moments[index]
        shown = np.exp(moment.log_shown)
        for state in (1, 2):
            fresh = [e for e in range(self._known, shown.shape[1]) if self._states[e] == state]
            if fresh:
                weight = shown[:, fresh].sum(axis=1)
                self._mass[..., state] += self._mass[..., 0] * weight[:, None, None]
        self._known = shown.shape[1]
        self._weight[:, 0] = shown[:, 0]
        begins = moment.step != self._step
        if begins:
            self.undecided_before = self.undecided()
            self._step = moment.step
            flat = self._mass.reshape(2, len(self.count), -1)
            self._mass = np.matmul(self._moves, flat).reshape(self._mass.shape)
        return begins

    def at_or_above(self, bar: IntArray) -> BoolArray:
        """Mask (count, rule, state) of what has reached the bar of the present step."""
        return np.asarray(self.count[:, None, None] >= bar[None, :, self._step])

    def at_or_below(self, bar: IntArray) -> BoolArray:
        """Mask (count, rule, state) of what has fallen to the bar of the present step."""
        return np.asarray(self.count[:, None, None] <= bar[None, :, self._step])

    def leave(self, mask: BoolArray) -> FloatArray:
        """Take the masked mass out; its probability per rule and given answer, shape (B, 2)."""
        gone = self.mass_where(mask)
        self._mass[:, np.broadcast_to(mask, self._mass.shape[1:])] = 0.0
        return gone

    def mass_where(self, mask: BoolArray) -> FloatArray:
        """Probability of the masked mass, shape (B, 2)."""
        mass = np.where(mask[None], self._mass, 0.0).sum(axis=1)
        return np.asarray(np.einsum("gbs,gs->bg", mass, self._weight))

    def undecided(self) -> FloatArray:
        """Probability of being still undecided, shape (B, 2)."""
        return np.asarray(np.einsum("gbs,gs->bg", self._mass.sum(axis=1), self._weight))
