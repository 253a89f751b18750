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

from dataclasses import dataclass, fields
from typing import Any

import numpy as np
from numpy.typing import NDArray

from thumbwright.exact.arrays import BoolArray, FloatArray, IntArray
from thumbwright.exact.crowd_kinds import Crowd
from thumbwright.exact.player import leanings
from thumbwright.exact.walk import NEAR, TIE, Walk

_ROUNDING = 1e-14
"""What rounding may add to a belief per member of the crowd (nats); no near tie below that."""


@dataclass
class Record:
    """What has happened so far in each of H public histories; the last axis is the history.

    Attributes
    ----------
    label : ndarray of int, shape (H,)
        Number of the sampled history; 0 where histories are enumerated.
    log_weight : ndarray of float, shape (2, H)
        Log probability given plus and given minus; not kept up where histories are sampled.
    plus, minus : ndarray of int, shape (K, H)
        Members of each kind that have committed.
    steps : ndarray of int, shape (K, H)
        Sum of the steps at which they did.
    first, first_round, last : ndarray of int, shape (H,)
        Step and round of the first commitment and step of the last so far; 0 where there is none.
    followers : ndarray of int, shape (H,)
        Commitments in the step of the first, after its round.
    first_plus, first_minus : ndarray of int, shape (H,)
        Commitments to plus and to minus at the very moment of the first.
    origin : ndarray of int, shape (H,)
        Where the history, or the one it goes on from, stood when this was last written down.
    near : ndarray of float, shape (2, H)
        Expected number of members decided by the tie rule and no clear margin, given the history.
    lean : ndarray of float, shape (K, 3, 2, H)
        Expected number undecided at the horizon whose belief favours plus, minus, neither; given
        plus and given minus.
    ratio : ndarray of float, shape (H,)
        Log ratio (nats) of the probability given plus and given minus, once the history is over.
    """

    label: IntArray
    log_weight: FloatArray
    plus: IntArray
    minus: IntArray
    steps: IntArray
    first: IntArray
    first_round: IntArray
    last: IntArray
    followers: IntArray
    first_plus: IntArray
    first_minus: IntArray
    origin: IntArray
    near: FloatArray
    lean: FloatArray
    ratio: FloatArray

    @classmethod
    def blank(cls, kinds: int, label: IntArray) -> Record:
        """Nothing has happened yet."""
        size = len(label)
        sizes = {"plus": (kinds, size), "minus": (kinds, size), "steps": (kinds, size)}
        names = ("first", "first_round", "last", "followers", "first_plus", "first_minus", "origin")
        times = dict.fromkeys(names, (size,))
        whole = {name: np.zeros(shape, dtype=np.int64) for name, shape in (sizes | times).items()}
        return cls(
            label=label,
            log_weight=np.zeros((2, size)),
            near=np.zeros((2, size)),
            lean=np.zeros((kinds, 3, 2, size)),
            ratio=np.zeros(size),
            **whole,
        )

    def take(self, index: IntArray | BoolArray) -> Record:
        """The chosen histories, some perhaps several times."""
        return Record(**{name: array[..., index] for name, array in self.arrays().items()})

    def note(
        self, columns: IntArray, plus: IntArray, minus: IntArray, step: int, round_: int
    ) -> None:
        """Count commitments, shape (K, number of columns), of one round."""
        self.plus[:, columns] += plus
        self.minus[:, columns] += minus
        self.steps[:, columns] += step * (plus + minus)
        total = (plus + minus).sum(axis=0)
        moved, number = columns[total > 0], total[total > 0]
        new = self.first[moved] == 0
        at_once = ~new & (self.first[moved] == step)
        self.followers[moved[at_once]] += number[at_once]
        self.first[moved[new]], self.first_round[moved[new]] = step, round_
        for came, said in ((self.first_plus, plus), (self.first_minus, minus)):
            came[moved[new]] = said.sum(axis=0)[total > 0][new]
        self.last[moved] = step

    def arrays(self) -> dict[str, NDArray[Any]]:
        """All of them by name."""
        return {field.name: getattr(self, field.name) for field in fields(self)}

    @staticmethod
    def join(records: list[Record]) -> Record:
        """All histories of several records."""
        parts = [record.arrays() for record in records]
        return Record(
            **{name: np.concatenate([part[name] for part in parts], axis=-1) for name in parts[0]}
        )


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
    ) -> None:
        self._agents = [kind.agent for kind in crowd.kinds]
        self._prior, self.horizon, self.held = prior, horizon, held
        self._lasting = lasting and held is not None
        self._near = max(NEAR, _ROUNDING * crowd.size)
        kinds, size = len(crowd.kinds), len(labels)
        self._walks = [
            Walk(agent.evidence, agent.thresholds, agent.observed_by(horizon))
            for agent in self._agents
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
        for k, (walk, agent) in enumerate(zip(self._walks, self._agents, strict=True)):
            for _ in range(agent.looks_at(step)):
                certain = walk.observe()
                if agent.evidence.certain_plus or agent.evidence.certain_minus:
                    met = self._certain[k]
                    self._certain[k] = certain if met is None else np.logaddexp(met, certain)

    def decide(self, columns: IntArray) -> Choice:
        """Cut what commits, in the chosen histories, and say what may happen there.

        Everybody decides on what was shown before, so all worths are taken first.
        """
        kinds, size = len(self._walks), len(columns)
        log_share = np.full((kinds, 3, 2, size), -np.inf)
        log_share[:, 2] = 0.0
        ratio = np.full((kinds, 2, size), np.nan)
        undecided = (self.free[:, columns] + self._aside) > 0
        able = told = np.ones(size, dtype=bool)
        if self.held is not None:
            possible = np.isfinite(self.log_left[self.held][:, columns]).any(axis=0)
            able, told = (able, possible) if self._lasting else (possible, told)
        for k in range(kinds):
            value = self.worth(k, columns)
            self._value[k, columns] = np.where(told, value, self._value[k, columns])
        for k in range(kinds):
            divided = self._cut(k, columns, undecided[k])
            if divided is None:
                continue
            with np.errstate(invalid="ignore"):
                share = divided - self.log_left[k][:, columns]
                ratio[k] = divided[:2, 0] - divided[:2, 1]
            log_share[k] = np.where(np.isnan(share), -np.inf, share)
            self.log_left[k][:, columns] = divided[2]
        committing = np.isfinite(log_share[:, :2]).any(axis=(1, 2)) & undecided
        return Choice(columns, log_share, ratio, committing.any(axis=0) & able)

    def _cut(self, k: int, columns: IntArray, undecided: BoolArray) -> FloatArray | None:
        """Log weights (3, 2, A) of committing now to plus, to minus, of going on; None if none."""
        walk, certain = self._walks[k], self._certain[k]
        self._certain[k] = None
        if not undecided.any() or not walk.observed:
            return None
        value, own = self._value[k, columns], self._prior + walk.tally
        bars = (walk.high - own)[:, None], (walk.low - own)[:, None]
        plus = (value[None, :] >= bars[0] - TIE) & undecided
        minus = (value[None, :] <= bars[1] + TIE) & undecided
        if certain is None and not plus.any() and not minus.any():
            return None
        some = columns if len(columns) < len(self) else None
        for mask, bar in ((plus, bars[0]), (minus, bars[1])):
            gap = np.abs(value[None, :] - bar)
            near = mask & (gap <= TIE) & (gap > self._near)
            if near.any():
                with np.errstate(invalid="ignore"):
                    share = walk.log_where(near, some) - self.log_left[k][:, columns]
                number = np.exp(np.where(np.isnan(share), -np.inf, share)) * self.free[k, columns]
                self.record.near[:, columns] += number
        divided = walk.divide(plus, minus, some)
        if certain is not None:
            divided[:2] = np.logaddexp(divided[:2], certain[..., columns])
        return divided

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
