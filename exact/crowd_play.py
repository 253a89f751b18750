"""Public histories of a crowd, many side by side, with the beliefs along each of them exact.

Everybody sees everybody, so given the answer and what has been shown, every member's own
observations are independent of everybody else's, and the probability of a public history is a
product with one factor per member. With L = ln(w+/w-) of the factor of each commitment, C their
sum, and U_k that log ratio for a member of kind k that still shows undecided, what an undecided
member of kind k has been shown is worth

    C + sum over kinds k' of n_k' U_k'  -  U_k,

n_k' the number undecided of each kind: its own factor is left out. All undecided members of a kind
share one walk, which has one column per public history here.

A settle step ends, in the model, after the first round in which nobody could have committed in any
history. Here it ends for each public history after the first round in which nobody could have
committed in that history: what is shown is public, so nothing whatever has changed for anybody
then, and in rounds that the model still holds for the sake of other histories the same members go
on showing the same. Play and probabilities are the same; only idle rounds are missing.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from thumbwright.exact.arrays import BoolArray, FloatArray, IntArray
from thumbwright.exact.crowd_kinds import Crowd
from thumbwright.exact.crowd_policy import CrowdPolicy, InPublic, reached, value_of
from thumbwright.exact.crowd_record import Record
from thumbwright.exact.evidence.law import Law
from thumbwright.exact.play import Act
from thumbwright.exact.player import leanings
from thumbwright.exact.walk import NEAR, TIE, Walk

_ROUNDING = 1e-14
"""What rounding may add to a belief per member of the crowd (nats); no near tie below that."""


@dataclass(frozen=True)
class Choice:
    """What may happen in a round, in each of A histories; one member at a time.

    Attributes
    ----------
    columns : ndarray of int, shape (A,)
        Which histories.
    log_share : ndarray of float, shape (K, 3, 2, A)
        Log probability that an undecided member of each kind commits to plus, to minus, goes on;
        given plus and given minus.
    ratio : ndarray of float, shape (K, 2, A)
        Log ratio (nats) of the whole weight of having shown undecided until now and now plus, now
        minus; nan where that is impossible.
    open : ndarray of bool, shape (A,)
        Whether anybody could commit.
    """

    columns: IntArray
    log_share: FloatArray
    ratio: FloatArray
    open: BoolArray


class Histories:
    """A batch of H public histories of one crowd.

    Parameters
    ----------
    crowd : Crowd
    prior : float
        Log-odds of plus (nats).
    horizon : int
    labels : ndarray of int, shape (H,)
        A number for each history.
    held : int, optional
        Kind of which one member is made to show undecided: others read it as they would, but it
        never commits and no history contains a factor of its.
    lasting : bool
        Whether the member that is held goes on showing undecided where the others' model says it
        cannot. To them its silence is no news then: what they have been shown is worth what it was.
    policies : sequence of (callable or None), optional
        Per kind what its members go by, ``policy(in_public) -> act``; None is exact play. All know
        what all go by, so exact members reason by what the others do.
    laws : sequence of (Law or None), optional
        Per kind what its observations are really like; None is what they are taken for.

    Attributes
    ----------
    record : Record
    horizon : int
    free : ndarray of int, shape (K, H)
        Undecided members of each kind, the one that is held left out.
    """

    def __init__(
        self,
        crowd: Crowd,
        prior: float,
        horizon: int,
        labels: IntArray,
        held: int | None = None,
        lasting: bool = False,
        policies: Sequence[CrowdPolicy | None] | None = None,
        laws: Sequence[Law | None] | None = None,
    ) -> None:
        self._agents = [kind.agent for kind in crowd.kinds]
        self._prior, self.horizon, self.held = prior, horizon, held
        self._lasting = lasting and held is not None
        self._policies = [None] * len(crowd.kinds) if policies is None else [*policies]
        self.by_policies = all(policy is not None for policy in self._policies)
        # Who reads what is shown by a model.
        self.reads: BoolArray = np.full(len(crowd.kinds), not self.by_policies)
        self._near = max(NEAR, _ROUNDING * crowd.size)
        kinds, size = len(crowd.kinds), len(labels)
        self._walks = [
            Walk(agent.evidence, agent.thresholds, agent.observed_by(horizon), law)
            for agent, law in zip(self._agents, laws or [None] * kinds, strict=True)
        ]
        for walk in self._walks:
            walk.mass = np.repeat(walk.mass, size, axis=1)
            walk.log_scale = np.zeros(size)
        self._aside = np.zeros((kinds, 1), dtype=np.int64)
        if held is not None:
            self._aside[held] = 1
        numbers = np.array([[kind.size] for kind in crowd.kinds])
        self.free: IntArray = np.repeat(numbers - self._aside, size, axis=1)
        self.record = Record.blank(kinds, labels)
        # Log weight of still showing undecided, per kind, given plus and given minus.
        self.log_left: FloatArray = np.zeros((kinds, 2, size))
        self._said: FloatArray = np.zeros(size)
        self._value: FloatArray = np.zeros((kinds, size))
        self._certain: list[FloatArray | None] = [None] * kinds
        self._step = 0

    def __len__(self) -> int:
        return len(self._said)

    def worth(self, kind: int, columns: IntArray) -> FloatArray:
        """What an undecided member of a kind has been shown is worth (nats), shape (A,)."""
        others = self.free[:, columns] + self._aside
        others[kind] = np.maximum(others[kind] - 1, 0)
        with np.errstate(invalid="ignore"):
            return np.asarray(
                self._said[columns] + times(others, self._silence(columns)).sum(axis=0)
            )

    def log_ratio(self) -> FloatArray:
        """Log ratio of the probability of each history given plus and given minus, shape (H,)."""
        with np.errstate(invalid="ignore"):
            silence = times(self.free, self._silence(np.arange(len(self))))
            return np.asarray(self._said + silence.sum(axis=0))

    def _silence(self, columns: IntArray) -> FloatArray:
        left = self.log_left[..., columns]
        with np.errstate(invalid="ignore"):
            ratio: FloatArray = left[:, 0] - left[:, 1]
        return ratio

    def observe(self, step: int) -> None:
        """The private observations of a step."""
        self._step = step
        for k, (walk, agent) in enumerate(zip(self._walks, self._agents, strict=True)):
            for _ in range(agent.looks_at(step)):
                certain = walk.observe()
                if agent.evidence.certain_plus or agent.evidence.certain_minus:
                    met = self._certain[k]
                    self._certain[k] = certain if met is None else np.logaddexp(met, certain)

    def decide(self, columns: IntArray, round_: int = 0) -> Choice:
        """Cut what commits, in the chosen histories, and say what may happen there.

        Everybody decides on what was shown before, so all worths are taken first.
        """
        kinds, size = len(self._walks), len(columns)
        able = told = np.ones(size, dtype=bool)
        if self.held is not None:
            possible = np.isfinite(self.log_left[self.held][:, columns]).any(axis=0)
            able, told = (able, possible) if self._lasting else (possible, told)
        for k in range(kinds):
            value = self.worth(k, columns)
            self._value[k, columns] = np.where(told, value, self._value[k, columns])
        choice = self._choice(columns, round_)
        return replace(choice, open=choice.open & able)

    def _choice(self, columns: IntArray, round_: int) -> Choice:
        """Cut what commits, all worths being taken; open where anybody could commit."""
        kinds, size = len(self._walks), len(columns)
        log_share = np.full((kinds, 3, 2, size), -np.inf)
        log_share[:, 2] = 0.0
        ratio = np.full((kinds, 2, size), np.nan)
        undecided = (self.free[:, columns] + self._aside) > 0
        acts = self._acts(columns, round_)
        for k in range(kinds):
            divided = self._cut(k, columns, undecided[k], acts[k])
            if divided is None:
                continue
            with np.errstate(invalid="ignore"):
                share = divided - self.log_left[k][:, columns]
                ratio[k] = divided[:2, 0] - divided[:2, 1]
            log_share[k] = np.where(np.isnan(share), -np.inf, share)
            self.log_left[k][:, columns] = divided[2]
        committing = np.isfinite(log_share[:, :2]).any(axis=(1, 2)) & undecided
        return Choice(columns, log_share, ratio, committing.any(axis=0))

    def allowed(self, choice: Choice, kind: int) -> BoolArray:
        """Whether others expect a member to say plus, to say minus now, shape (2, A)."""
        if self.by_policies:
            return np.ones((2, len(choice.columns)), dtype=bool)
        return np.asarray(np.isfinite(choice.log_share[kind, :2]).any(axis=1))

    def _acts(self, columns: IntArray, round_: int) -> list[Act | None]:
        """What the policies of kinds make of the chosen histories."""
        if all(policy is None for policy in self._policies):
            return [None] * len(self._policies)
        record = self.record
        seen = InPublic(
            self._step,
            round_,
            record.plus[:, columns],
            record.minus[:, columns],
            record.first[columns],
            record.last[columns],
            record.first_plus[columns],
            record.first_minus[columns],
        )
        acts = [None if policy is None else policy(seen) for policy in self._policies]
        for k, act in enumerate(acts):
            if act is not None:
                self._value[k, columns] = value_of(act, len(columns))
        return acts

    def _cut(
        self, k: int, columns: IntArray, undecided: BoolArray, act: Act | None
    ) -> FloatArray | None:
        """Log weights (3, 2, A) of committing now to plus, to minus, of going on; None if none."""
        walk, certain = self._walks[k], self._certain[k]
        self._certain[k] = None
        if not undecided.any() or not walk.observed:
            return None
        some = columns if len(columns) < len(self) else None
        value = self._value[k, columns]
        plus, minus = reached(walk, self._prior, act or Act(value), len(columns))
        plus, minus = plus & undecided, minus & undecided
        if certain is None and not plus.any() and not minus.any():
            return None
        if act is None:
            self._note_near_ties(k, columns, (plus, minus), some)
        divided = walk.divide(plus, minus, some)
        if certain is not None:
            divided[:2] = np.logaddexp(divided[:2], certain[..., columns])
        return divided

    def _note_near_ties(
        self, k: int, columns: IntArray, masks: tuple[BoolArray, BoolArray], some: IntArray | None
    ) -> None:
        """Count members that the tie rule decides, and no clear margin."""
        walk = self._walks[k]
        value, own = self._value[k, columns], self._prior + walk.tally
        for mask, bar in zip(masks, (walk.high - own, walk.low - own), strict=True):
            gap = np.abs(value[None, :] - bar[:, None])
            near = mask & (gap <= TIE) & (gap > self._near)
            if near.any():
                with np.errstate(invalid="ignore"):
                    share = walk.log_where(near, some) - self.log_left[k][:, columns]
                number = np.exp(np.where(np.isnan(share), -np.inf, share)) * self.free[k, columns]
                self.record.near[:, columns] += number

    def show(
        self,
        choice: Choice,
        at: IntArray,
        columns: IntArray,
        commits: tuple[IntArray, IntArray],
        step: int,
        round_: int,
    ) -> None:
        """Let members commit.

        Parameters
        ----------
        choice : Choice
        at : ndarray of int, shape (B,)
            Which entry of the choice each of these histories goes on from.
        columns : ndarray of int, shape (B,)
            Where they are now.
        commits : two ndarrays of int, shape (K, B)
            How many members of each kind commit to plus and to minus.
        step, round_ : int
        """
        plus, minus = commits
        news = times(plus, choice.ratio[:, 0, at]) + times(minus, choice.ratio[:, 1, at])
        with np.errstate(invalid="ignore"):
            self._said[columns] += news.sum(axis=0)
        self.free[:, columns] -= plus + minus
        self.record.note(columns, plus, minus, step, round_)

    def take(self, index: IntArray | BoolArray) -> None:
        """Go on with the chosen histories, some perhaps several times."""
        for walk in self._walks:
            walk.mass, walk.log_scale = walk.mass[:, index], walk.log_scale[index]
        self.record = self.record.take(index)
        self.free, self._said = self.free[:, index], self._said[index]
        self.log_left, self._value = self.log_left[..., index], self._value[:, index]

    def over(self, index: IntArray | BoolArray) -> Record:
        """What happened in histories that are over."""
        self.record.ratio[:] = self.log_ratio()
        return self.record.take(index)

    def going_on(self) -> BoolArray:
        """Where somebody is undecided; with one held, where its own walk could have got there."""
        if self._lasting:
            return np.ones(len(self), dtype=bool)
        if self.held is None:
            return np.asarray((self.free > 0).any(axis=0))
        return np.asarray(np.isfinite(self.log_left[self.held]).any(axis=0))

    def lean(self) -> None:
        """Note which answer those favour that are undecided at the horizon."""
        for k, walk in enumerate(self._walks):
            belief = (self._prior + walk.tally)[:, None] + self._value[k]
            for sign, mask in enumerate(leanings(belief)):
                with np.errstate(invalid="ignore"):
                    share = walk.log_where(mask) - self.log_left[k]
                number = np.exp(np.where(np.isnan(share), -np.inf, share))
                self.record.lean[k, sign] = times(self.free[k], number)


def times(number: IntArray, value: FloatArray) -> FloatArray:
    """Product in which nothing of anything is nothing, be it infinite or impossible."""
    with np.errstate(invalid="ignore"):
        product: FloatArray = np.where(number != 0, number * value, 0.0)
    return product
