"""One member of a crowd plays by a rule; the others stay exact and take it for exact.

Until it answers, the member shows "undecided" and is read as an exact one would be. So it is met by
the histories that a member is shown that is held to showing undecided (``crowd_shown``), with the
same probabilities, whatever its rule; its own walk along them is all that differs.

Figures of sampled histories are means over histories, each with the probabilities of all that the
member's own observations can bring: only what others do is sampled.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from thumbwright.exact.arrays import FloatArray, IntArray
from thumbwright.exact.crowd_policy import CrowdPolicy, InPublic, reached, value_of
from thumbwright.exact.crowd_shown import Showing, Shown
from thumbwright.exact.play import Act
from thumbwright.exact.player import leanings
from thumbwright.exact.walk import Walk


@dataclass(frozen=True)
class CrowdAdoption:
    """How a member fares with a policy, by public history; H is 1 where they were enumerated.

    Attributes
    ----------
    plus, minus, undecided, steps : ndarray of float, shape (2, H)
        Probability of having said plus, minus, neither by the horizon, and mean number of steps
        used; given plus and given minus.
    leaning : ndarray of float, shape (3, 2, H)
        Probability of being undecided at the horizon with a belief that favours plus, minus,
        neither.
    off_model : ndarray of float, shape (2, H)
        Expected number of times that another, still undecided, was shown an answer of this member
        that its model calls impossible just then.
    usage : ndarray of float, shape (rows, 2, 2, H), or None
        Per line of the rule the mean number of steps in its force, and the probability of having
        answered by it; given plus and given minus.
    """

    plus: FloatArray
    minus: FloatArray
    undecided: FloatArray
    steps: FloatArray
    leaning: FloatArray
    off_model: FloatArray
    usage: FloatArray | None


def adopt_crowd(shown: Shown, policy: CrowdPolicy, rows: int = 0) -> CrowdAdoption:
    """Let the member play by a policy.

    Parameters
    ----------
    shown : Shown
    policy : callable
        ``policy(in_public) -> act``.
    rows : int
        If above 0, usage is counted for this many lines.

    Returns
    -------
    CrowdAdoption
        Sums over all histories where they are enumerated; one entry for each where sampled.
    """
    found = [_Adopter(shown, policy, rows).through(part) for part in shown.parts]
    if len(found) == 1:
        return found[0]
    names = ("plus", "minus", "undecided", "steps", "leaning", "off_model")
    joined = {n: np.concatenate([getattr(one, n) for one in found], axis=-1) for n in names}
    usage = [one.usage for one in found if one.usage is not None]
    return CrowdAdoption(**joined, usage=np.concatenate(usage, axis=-1) if usage else None)


def exact_member(in_public: InPublic) -> Act:
    """Exact play as a policy of the member that a :class:`Shown` is about."""
    assert isinstance(in_public, Showing)
    return Act(in_public.worth)


class _Adopter:
    """One walk along all histories of a part."""

    def __init__(self, shown: Shown, policy: CrowdPolicy, rows: int) -> None:
        agent, self._horizon = shown.member.agent, shown.horizon
        self._agent, self._policy, self._prior = agent, policy, shown.prior
        looks = agent.observed_by(shown.horizon)
        self._walk = Walk(agent.evidence, agent.thresholds, looks, shown.law)
        self._by_history = shown.sampled
        # Under "once" what is said at the horizon is shown to nobody.
        self._at_once = shown.exchange == "settle"
        self._certain: FloatArray | None = None
        self._rows, self._step = rows, 0

    def through(self, part: tuple[Showing, ...]) -> CrowdAdoption:
        """Play one part to its end."""
        size = len(part[0].parent) if self._by_history else 1
        shape = (2, size)
        plus, minus, steps, odd = (np.zeros(shape) for _ in range(4))
        usage = np.zeros((self._rows, 2, *shape)) if self._rows else None
        for showing in part:
            self._go_on(showing)
            before = self._weigh(showing, self._log_unanswered())
            if showing.round == 0:
                steps += self._summed(before)
            calls, row = self._decide(showing)
            plus += self._summed(calls[0])
            minus += self._summed(calls[1])
            if showing.step < self._horizon or self._at_once:
                impossible = (calls * ~showing.may[:, None]).sum(axis=0)
                odd += self._summed(impossible * showing.waiting)
            if usage is not None and row is not None:
                self._count(usage[:, 0], row, before if showing.round == 0 else None)
                self._count(usage[:, 1], row, calls.sum(axis=0))
        last = part[-1]
        undecided = self._summed(self._weigh(last, self._walk.log_undecided()))
        belief = self._prior + self._walk.tally[:, None] + self._value[None, :]
        lean = np.stack(
            [
                self._summed(self._weigh(last, self._walk.log_where(mask)))
                for mask in leanings(belief)
            ]
        )
        return CrowdAdoption(plus, minus, undecided, steps, lean, odd, usage)

    def _go_on(self, showing: Showing) -> None:
        """Follow every history to what came of it, and observe where a new step begins."""
        walk = self._walk
        walk.mass, walk.log_scale = walk.mass[:, showing.parent], walk.log_scale[showing.parent]
        if self._certain is not None:
            self._certain = self._certain[..., showing.parent]
        if showing.step == self._step:
            return
        self._step = showing.step
        evidence = self._agent.evidence
        for _ in range(self._agent.looks_at(showing.step)):
            certain = walk.observe()
            if evidence.certain_plus or evidence.certain_minus:
                met = self._certain
                self._certain = certain if met is None else np.logaddexp(met, certain)

    def _log_unanswered(self) -> FloatArray:
        """Log probability of not having answered yet, certain evidence just met included."""
        log = self._walk.log_undecided()
        if self._certain is None:
            return log
        return np.logaddexp(log, np.logaddexp(*self._certain))

    def _decide(self, showing: Showing) -> tuple[FloatArray, IntArray | None]:
        """Probabilities of answering plus and minus now, shape (2, 2, H), and each history's row.

        They are joint with the history where histories are enumerated.
        """
        size, walk = len(showing.parent), self._walk
        act = self._policy(showing)
        self._value = value_of(act, size)
        if not walk.observed:
            # Nobody answers before the first observation, whatever is shown.
            return np.zeros((2, 2, size)), None
        plus, minus = reached(walk, self._prior, act, size)
        row = None if act.row is None else np.broadcast_to(act.row, (size,))
        gone = walk.divide(plus, minus)[:2]
        if self._certain is not None:
            gone, self._certain = np.logaddexp(gone, self._certain), None
        return np.stack([self._weigh(showing, one) for one in gone]), row

    def _weigh(self, showing: Showing, log_own: FloatArray) -> FloatArray:
        return np.exp(log_own + showing.log_shown)

    def _summed(self, probability: FloatArray) -> FloatArray:
        return probability if self._by_history else probability.sum(axis=-1, keepdims=True)

    def _count(self, usage: FloatArray, row: IntArray, amount: FloatArray | None) -> None:
        """Add an amount, shape (2, H), to the row of each history."""
        if amount is None:
            return
        used = np.flatnonzero(row >= 0)
        if self._by_history:
            # Each history has one row, so no entry is met twice.
            usage[row[used], :, used] += amount[:, used].T
            return
        for given in (0, 1):
            usage[:, given, 0] += np.bincount(row[used], amount[given, used], len(usage))
