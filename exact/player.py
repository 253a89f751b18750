"""One agent on stage: what it may have been shown, its walk, and how it decides.

At every round an undecided agent forms its belief, for every history it may have been shown, as
b0 + own tally + value of the history; what is at or beyond a threshold is cut from its walk and
becomes the weight of a new event (step, round, sign) of its display history.

Who decides what a history is worth is left to a *reader* per agent.
"""

from __future__ import annotations

from abc import ABC, abstractmethod
from dataclasses import dataclass, replace

import numpy as np

from thumbwright.exact.arrays import BoolArray, FloatArray, IntArray
from thumbwright.exact.evidence.law import Law
from thumbwright.exact.group import Group
from thumbwright.exact.track import Events, Moment, Track
from thumbwright.exact.walk import NEAR, TIE, Walk, grown


@dataclass(frozen=True)
class Scene:
    """What a reader is given: where in time, what the seen agents may have shown, the chances."""

    step: int
    round: int
    seen: tuple[Events, ...]
    log_shown: FloatArray
    walk: Walk
    prior: float


@dataclass(frozen=True)
class Reading:
    """What a reader makes of a scene.

    Attributes
    ----------
    plus, minus : ndarray of bool, shape (R, C)
        Which rows (own counts) and columns (histories) commit.
    value : ndarray of float, shape (C,)
        What each history is worth to the belief (nats); nan where it says nothing.
    row : ndarray of int, shape (C,), or None
        Which line of a rule decided, for counting.
    near : ndarray of bool, shape (2, R, C), or None
        Where the belief is within TIE of the lower threshold and of the upper one, but not on it;
        None if nowhere, or if the masks did not come from comparing them.
    """

    plus: BoolArray
    minus: BoolArray
    value: FloatArray
    near: BoolArray | None = None
    row: IntArray | None = None


@dataclass(frozen=True)
class Calls:
    """What commits in a round; axis 0 is to plus, to minus, axis 1 given plus, given minus.

    Attributes
    ----------
    log_weights : ndarray of float, shape (2, 2, histories...)
        Log weight of committing after each history.
    chance : ndarray of float, shape (2, 2)
        Probability of committing.
    possible : tuple of two bools
        To plus, to minus: whether any history that can be met leads to it.
    """

    log_weights: FloatArray
    chance: FloatArray
    possible: tuple[bool, bool]


class Reader(ABC):
    """Says which rows and columns of a walk commit, given what has been shown.

    Attributes
    ----------
    steady : bool
        Whether what it makes of a history changes with the probability of that history only. Such
        a reader is asked about what has changed, and told nothing.
    """

    steady = False

    @abstractmethod
    def read(self, scene: Scene) -> Reading:
        """The decisions of this round."""

    def tell(self, scene: Scene, reading: Reading, calls: FloatArray, inside: FloatArray) -> None:
        """Told what came of a reading.

        ``calls`` and ``inside`` have shape (2, C): the probability, given plus and given minus,
        of having been shown each history and answering now, and of being undecided before.
        """

    def grow(self, axis: int, extra: int) -> None:
        """Told that the seen agent on this axis gained ``extra`` events."""


def worth(log_probability: FloatArray) -> FloatArray:
    """Log ratio of the first axis; nan where impossible under both answers, else maybe +-inf."""
    with np.errstate(invalid="ignore"):
        ratio: FloatArray = log_probability[0] - log_probability[1]
    return ratio


def by_value(scene: Scene, value: FloatArray) -> Reading:
    """Commit where the belief with these values, shape (C,), is at or beyond a threshold.

    A belief within TIE of a threshold has reached it. Nothing commits where the value is nan.
    """
    # What is wanted of the value is the same at all histories, so it is worked out per row first.
    gap = value - (scene.walk.bars - (scene.prior + scene.walk.tally))[:, :, None]
    plus, minus = gap[1] >= -TIE, gap[0] <= TIE
    distance = np.abs(gap, out=gap)
    near = (distance <= TIE) & (distance > NEAR)
    return Reading(plus, minus, value, near if np.count_nonzero(near) else None)


class ExactReader(Reader):
    """Bayesian belief: the history is worth the log ratio of its probabilities."""

    steady = True

    def read(self, scene: Scene) -> Reading:
        """What reaches a threshold with the exact worth of every history."""
        return by_value(scene, worth(scene.log_shown).ravel())


class Player:
    """One agent on stage: its walk, its reader and its track.

    Attributes
    ----------
    decisions : int
        Rounds in which it had to decide.
    doubtful : ndarray of float, shape (2,)
        Probability, given plus and given minus, of having been where a decision could have been
        another had nothing been dropped.
    """

    def __init__(self, group: Group, position: int, reader: Reader, law: Law | None = None) -> None:
        agent = group.agents[position]
        self.prior, self.horizon = group.prior, group.horizon
        self.prior_plus = group.prior_plus
        self.reader = reader
        self.walk = Walk(agent.evidence, agent.thresholds, agent.observed_by(group.horizon), law)
        self._step = 0
        self.shape: tuple[int, ...] = tuple(1 for _ in agent.sees)
        self.track = Track(
            agent, Events(), [], np.zeros((2, 2, group.horizon + 1)), np.zeros((3, 2))
        )
        self.decisions = 0
        self.doubtful: FloatArray = np.zeros(2)
        self._meets_proof = agent.evidence.certain_plus + agent.evidence.certain_minus > 0
        self._certain: FloatArray | None = None
        self._value: FloatArray = np.zeros(self.shape)
        self._log_undecided: FloatArray = np.zeros((2, *self.shape))

    def observe(self) -> None:
        """The private observations of the next step: one, unless the agent has a timetable."""
        self._step += 1
        for _ in range(self.track.agent.looks_at(self._step)):
            certain = self.walk.observe()
            if self._meets_proof:
                met = self._certain
                self._certain = certain if met is None else np.logaddexp(met, certain)

    def decide(
        self,
        step: int,
        round_: int,
        seen: tuple[Events, ...],
        log_probability: FloatArray,
        columns: IntArray | None = None,
        lost: FloatArray | None = None,
    ) -> Calls | None:
        """Cut what commits in this round and return it; None where nothing does.

        Parameters
        ----------
        step, round_ : int
        seen : tuple of Events
            What those it sees may have shown.
        log_probability : ndarray of float, shape (2, histories...)
            Log probability of every history; it is kept, so it must not be changed afterwards.
        columns : ndarray of int, shape (k,), optional
            Flat indices of the histories to decide on, where the reader is steady and nothing has
            changed for the others; else all.
        lost : ndarray of float, shape (2,), optional
            By how much those probabilities may fall short in sum, because rare events were
            dropped, given plus and given minus.
        """
        self.decisions += 1
        flat = log_probability.reshape(2, -1)
        part = flat if columns is None else flat[:, columns]
        shown = log_probability if columns is None else part
        scene = Scene(step, round_, seen, shown, self.walk, self.prior)
        reading = self.reader.read(scene)
        if not self.walk.observed:
            # Nobody commits before its first observation, whatever it is shown.
            nothing = np.zeros_like(reading.plus)
            reading, lost = replace(reading, plus=nothing, minus=nothing), None
        if lost is not None:
            self._note_doubts(reading, part, columns, lost)
        before, gone, result = self._log_undecided, None, None
        commits = np.count_nonzero(reading.plus) or np.count_nonzero(reading.minus)
        if commits or self._certain is not None:
            if reading.near is not None:
                self._note_near_ties(reading, reading.near, part, columns)
            divided = self.walk.divide(reading.plus, reading.minus, columns)
            gone = divided[:2]
            if self._certain is not None:
                gone = np.logaddexp(gone, self._certain)
                self._certain = None
            self._log_undecided = _updated(before, columns, divided[2])
            log_joint = gone + part
            happened = np.exp(log_joint)
            result = self._calls(gone, log_joint, happened.sum(axis=2), columns)
            self.track.answers[:, :, step] += result.chance
        if not self.reader.steady:
            calls = np.zeros_like(part) if gone is None else happened.sum(axis=0)
            self.reader.tell(scene, reading, calls, np.exp(before.reshape(2, -1) + flat))
        self._value = _updated(self._value, columns, reading.value)
        self.track.moments.append(
            Moment(step, round_, self._value, log_probability, before, self._log_undecided)
        )
        return result

    def _calls(
        self,
        gone: FloatArray,
        log_joint: FloatArray,
        chance: FloatArray,
        columns: IntArray | None,
    ) -> Calls:
        """Log weights and log probabilities, shape (2, 2, k), as calls after all histories."""
        if columns is None:
            everywhere = gone.reshape(2, 2, *self.shape)
        else:
            everywhere = np.full((2, 2, *self.shape), -np.inf)
            everywhere.reshape(2, 2, -1)[..., columns] = gone
        # The logarithm tells what is impossible from what is too rare for a float.
        plus, minus = log_joint.max(axis=(1, 2), initial=-np.inf)
        return Calls(everywhere, chance, (plus > -np.inf, minus > -np.inf))

    def wait(self, step: int, round_: int) -> None:
        """A round in which nothing has changed for the agent, whose reader is steady."""
        last = self.track.moments[-1]
        self.track.moments.append(
            replace(last, step=step, round=round_, log_before=self._log_undecided)
        )

    def _note_near_ties(
        self,
        reading: Reading,
        near: BoolArray,
        log_probability: FloatArray,
        columns: IntArray | None,
    ) -> None:
        for mask in (near[0] & reading.minus, near[1] & reading.plus):
            if mask.any():
                mass = np.exp(self.walk.log_where(mask, columns) + log_probability).sum(axis=1)
                self.track.near_tie += float(
                    self.prior_plus * mass[0] + (1.0 - self.prior_plus) * mass[1]
                )

    def _note_doubts(
        self,
        reading: Reading,
        log_probability: FloatArray,
        columns: IntArray | None,
        lost: FloatArray,
    ) -> None:
        """Where would the belief decide otherwise if the history were likelier by what is lost?"""
        with np.errstate(divide="ignore", invalid="ignore"):
            more = np.log(np.exp(log_probability) + lost[:, None])
            least = log_probability[0] - more[1]
            most = more[0] - log_probability[1]
        own = self.prior + self.walk.tally
        low, high = (self.walk.bars - own)[:, :, None] + np.array([TIE, -TIE])[:, None, None]
        unsure = (reading.plus != (most >= high)) | (reading.plus != (least >= high))
        unsure |= (reading.minus != (most <= low)) | (reading.minus != (least <= low))
        if unsure.any():
            mass = np.exp(self.walk.log_where(unsure, columns) + log_probability)
            self.doubtful += mass.sum(axis=1)

    def lean(self) -> None:
        """Note of those still undecided which answer the belief favours at the last round.

        To be called after it, and before the agent is told of what was shown in it.
        """
        flat = self.track.moments[-1].log_shown.reshape(2, -1)
        belief = (self.prior + self.walk.tally)[:, None] + self._value.ravel()
        self.track.leaning[:] = [
            np.exp(self.walk.log_where(mask) + flat).sum(axis=1) for mask in leanings(belief)
        ]

    def grow(self, axis: int, extra: int) -> None:
        """The seen agent on this axis gained ``extra`` events."""
        self.walk.grow(self.shape, axis, extra)
        self.reader.grow(axis, extra)
        self._value = grown(self._value, axis, extra)
        self._log_undecided = grown(self._log_undecided, axis + 1, extra)
        self.shape = (*self.shape[:axis], self.shape[axis] + extra, *self.shape[axis + 1 :])


def _updated(whole: FloatArray, columns: IntArray | None, part: FloatArray) -> FloatArray:
    """``whole`` with the histories in these columns replaced, all of them if None."""
    if columns is None:
        return part.reshape(whole.shape)
    result = whole.copy()
    # The histories are the last axes of the whole and the last axis of the part.
    result.reshape(*part.shape[:-1], -1)[..., columns] = part
    return result


def leanings(belief: FloatArray) -> tuple[BoolArray, BoolArray, BoolArray]:
    """Where a belief favours plus, where minus, and where neither."""
    even = ~(np.abs(belief) > TIE)
    return (belief > 0) & ~even, (belief < 0) & ~even, even
