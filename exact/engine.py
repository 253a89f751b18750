"""The exact engine: plays a whole group, round by round, over all display histories at once.

At every round each undecided agent forms its belief, for every history it may have been shown, as
b0 + own tally + value of the history; what is at or beyond a threshold is cut from its walk and
becomes the weight of a new event (step, round, sign) of its display history. An event depends only
on what was shown before it, so when a seen agent gains an event, that slice starts as a copy of
its "undecided" slice.

Who decides what a history is worth is left to a *reader* per agent. The reader of an agent that
plays exactly takes the log ratio of the probabilities of the history with the agent held to
showing undecided, which is the contraction of everybody else's weights; readers for rules and for
exact agents among rule users are in ``play``.
"""

from __future__ import annotations

from abc import ABC, abstractmethod
from collections.abc import Callable, Sequence
from dataclasses import dataclass, field

import numpy as np

from thumbwright.exact.arrays import BoolArray, FloatArray, IntArray
from thumbwright.exact.contract import Plan, log_shown, plan
from thumbwright.exact.forecast import refuse_too_large
from thumbwright.exact.group import MINUS, PLUS, Agent, Group
from thumbwright.exact.walk import NEAR, TIE, Walk, grown

Progress = Callable[[str, int, int], None]


@dataclass
class Events:
    """The display events of one agent so far; entry 0 is "undecided up to now"."""

    state: list[int] = field(default_factory=lambda: [0])
    step: list[int] = field(default_factory=lambda: [0])
    round: list[int] = field(default_factory=lambda: [0])

    def __len__(self) -> int:
        return len(self.state)

    def add(self, state: int, step: int, round_: int) -> None:
        """Append the commitment to ``state`` shown at this step and round."""
        self.state.append(state)
        self.step.append(step)
        self.round.append(round_)


@dataclass(frozen=True)
class Moment:
    """What holds for one agent at one round, for every history it may have been shown.

    Arrays have one axis per seen agent, in its own order; index 0 is "undecided so far", the
    others count that agent's events.

    Attributes
    ----------
    step, round : int
    value : ndarray of float
        What was added to prior and tally (nats); ``nan`` where the history is impossible.
    log_shown : ndarray of float, shape (2, ...)
        Log probability of the history given plus, given minus, the agent held to undecided.
    log_before, log_after : ndarray of float, shape (2, ...)
        Log probability that the agent is still undecided, before and after this round.
    """

    step: int
    round: int
    value: FloatArray
    log_shown: FloatArray
    log_before: FloatArray
    log_after: FloatArray


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
    compared : bool
        Whether the masks came from comparing that value with the thresholds, so that near ties
        are to be reported.
    """

    plus: BoolArray
    minus: BoolArray
    value: FloatArray
    compared: bool
    row: IntArray | None = None


class Reader(ABC):
    """Says which rows and columns of a walk commit, given what has been shown."""

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


@dataclass
class Track:
    """All that a run keeps of one agent.

    ``answers`` has shape (2, 2, T + 1): axis 0 to plus, to minus; axis 1 given plus, given minus;
    the probability of committing at each step. ``leaning`` has shape (3, 2): of those undecided at
    the horizon, the probability that the belief favours plus, favours minus, or neither.
    ``log_weights`` has shape (2, events, events of each seen agent): the log weight of each display
    event at the horizon, given plus and given minus, when those seen are made to show theirs.
    """

    agent: Agent
    events: Events
    moments: list[Moment]
    answers: FloatArray
    leaning: FloatArray
    near_tie: float = 0.0
    log_weights: FloatArray = field(default_factory=lambda: np.zeros((2, 1)))

    @property
    def undecided(self) -> FloatArray:
        """Probability of being undecided at the horizon, given plus and given minus."""
        total: FloatArray = self.leaning.sum(axis=0)
        return total


@dataclass(frozen=True)
class Solution:
    """The exact play of a group: a track per agent, in the group's order."""

    group: Group
    tracks: tuple[Track, ...]

    @property
    def near_tie_mass(self) -> float:
        """Probability, summed over agents, decided by the tie rule and by no clear margin."""
        return sum(track.near_tie for track in self.tracks)


class ExactReader(Reader):
    """Bayesian belief: the history is worth the log ratio of its probabilities."""

    def read(self, scene: Scene) -> Reading:
        """What reaches a threshold with the exact worth of every history."""
        return by_value(scene, worth(scene.log_shown).ravel())


def worth(log_probability: FloatArray) -> FloatArray:
    """Log ratio of the first axis; nan where impossible under both answers, else maybe +-inf."""
    with np.errstate(invalid="ignore"):
        ratio: FloatArray = log_probability[0] - log_probability[1]
    return ratio


def by_value(scene: Scene, value: FloatArray) -> Reading:
    """Commit where the belief with these values, shape (C,), is at or beyond a threshold.

    A belief within TIE of a threshold has reached it. Nothing commits where the value is nan.
    """
    walk, own = scene.walk, scene.prior + scene.walk.tally
    plus = value[None, :] >= (walk.high - own - TIE)[:, None]
    minus = value[None, :] <= (walk.low - own + TIE)[:, None]
    return Reading(plus, minus, value, compared=True)


def solve(group: Group, progress: Progress | None = None) -> Solution:
    """Play the group exactly.

    Returns
    -------
    Solution
        Exact up to floating point: nothing is dropped, sampled or split beyond what the
        evidence says of itself.

    Raises
    ------
    ModelError
        Before anything is allocated, where the run would need more than half of the free memory.
    """
    refuse_too_large(group)
    return Solution(group, tuple(run(group, [ExactReader() for _ in group.agents], progress)))


def run(
    group: Group, readers: Sequence[Reader], progress: Progress | None = None
) -> tuple[Track, ...]:
    """Play the group with one reader per agent and return their tracks."""
    stage = _Stage(group, readers)
    for step in range(1, group.horizon + 1):
        if progress:
            progress("exact beliefs", step - 1, group.horizon)
        stage.step(step)
    if progress:
        progress("exact beliefs", group.horizon, group.horizon)
    return stage.finish()


class Player:
    """One agent on stage: its walk, its reader, its display weights and its track."""

    def __init__(self, group: Group, position: int, reader: Reader) -> None:
        agent = group.agents[position]
        self.prior, self.horizon = group.prior, group.horizon
        self.prior_plus = group.prior_plus
        self.reader = reader
        self.walk = Walk(agent.evidence, agent.thresholds, group.horizon)
        self.shape: tuple[int, ...] = tuple(1 for _ in agent.sees)
        self.track = Track(
            agent, Events(), [], np.zeros((2, 2, group.horizon + 1)), np.zeros((3, 2))
        )
        self._certain: FloatArray | None = None

    def observe(self) -> None:
        """One private observation."""
        self._certain = self.walk.observe()

    def decide(
        self, step: int, round_: int, seen: tuple[Events, ...], log_probability: FloatArray
    ) -> FloatArray:
        """Cut what commits in this round; returns its log weights, shape (2, 2, histories...)."""
        scene = Scene(step, round_, seen, log_probability, self.walk, self.prior)
        log_before = self.walk.log_undecided()
        if self._certain is not None:
            log_before = np.logaddexp(log_before, self._certain.max(axis=0))
        reading = self.reader.read(scene)
        flat = log_probability.reshape(2, -1)
        if reading.compared:
            self._note_near_ties(reading, flat)
        gone = self.walk.cut(reading.plus, reading.minus)
        if self._certain is not None:
            gone = np.logaddexp(gone, self._certain)
            self._certain = None
        log_after = self.walk.log_undecided()
        happened = np.exp(gone + flat)
        self.track.answers[:, :, step] += happened.sum(axis=2)
        self.reader.tell(scene, reading, happened.sum(axis=0), np.exp(log_before + flat))
        self.track.moments.append(
            Moment(
                step,
                round_,
                reading.value.reshape(self.shape),
                log_probability,
                log_before.reshape(2, *self.shape),
                log_after.reshape(2, *self.shape),
            )
        )
        if step == self.horizon:
            self._lean(reading.value, flat)
        return gone.reshape(2, 2, *self.shape)

    def _note_near_ties(self, reading: Reading, flat: FloatArray) -> None:
        belief = (self.prior + self.walk.tally)[:, None] + reading.value[None, :]
        for mask, threshold in ((reading.plus, self.walk.high), (reading.minus, self.walk.low)):
            gap = np.abs(belief - threshold[:, None])
            near = mask & (gap > NEAR) & (gap <= TIE)
            if near.any():
                mass = np.exp(self.walk.log_where(near) + flat).sum(axis=1)
                self.track.near_tie += float(
                    self.prior_plus * mass[0] + (1.0 - self.prior_plus) * mass[1]
                )

    def _lean(self, value: FloatArray, flat: FloatArray) -> None:
        """Of those still undecided: which answer does the belief favour at this round?"""
        belief = (self.prior + self.walk.tally)[:, None] + value[None, :]
        self.track.leaning[:] = [
            np.exp(self.walk.log_where(mask) + flat).sum(axis=1) for mask in leanings(belief)
        ]

    def grow(self, axis: int, extra: int) -> None:
        """The seen agent on this axis gained ``extra`` events."""
        self.walk.grow(self.shape, axis, extra)
        self.reader.grow(axis, extra)
        self.shape = (*self.shape[:axis], self.shape[axis] + extra, *self.shape[axis + 1 :])


def leanings(belief: FloatArray) -> tuple[BoolArray, BoolArray, BoolArray]:
    """Where a belief favours plus, where minus, and where neither."""
    even = ~(np.abs(belief) > TIE)
    return (belief > 0) & ~even, (belief < 0) & ~even, even


class _Stage:
    """All players together, and the weights of their display histories so far."""

    def __init__(self, group: Group, readers: Sequence[Reader]) -> None:
        self._group = group
        self._plans: list[Plan] = [plan(group, i) for i in range(len(group.agents))]
        self.players = [Player(group, i, reader) for i, reader in enumerate(readers)]
        self._log_weights: list[FloatArray] = [
            np.zeros((2, 1, *player.shape)) for player in self.players
        ]

    def finish(self) -> tuple[Track, ...]:
        """The tracks of all players, with the weights of their displays."""
        for player, weights in zip(self.players, self._log_weights, strict=True):
            player.track.log_weights = weights
        return tuple(player.track for player in self.players)

    def step(self, step: int) -> None:
        """Observe, then one round, or rounds until no agent could commit any more."""
        for player in self.players:
            player.observe()
        round_ = 0
        while self._round(step, round_) and self._group.exchange == "settle":
            round_ += 1

    def _round(self, step: int, round_: int) -> bool:
        """One round; returns whether any agent could have committed in it."""
        weights = [self._decision(i, step, round_) for i in range(len(self.players))]
        gained = [self._show(i, step, round_, *news) for i, news in enumerate(weights)]
        for i, player in enumerate(self.players):
            for axis, other in enumerate(self._group.sees[i]):
                if gained[other]:
                    self._log_weights[i] = grown(self._log_weights[i], axis + 2, gained[other])
                    player.grow(axis, gained[other])
        return any(gained)

    def _decision(self, i: int, step: int, round_: int) -> tuple[FloatArray, FloatArray]:
        shown = log_shown(self._group, self._plans[i], self._log_weights)
        seen = tuple(self.players[other].track.events for other in self._group.sees[i])
        return shown, self.players[i].decide(step, round_, seen, shown)

    def _show(self, i: int, step: int, round_: int, shown: FloatArray, gone: FloatArray) -> int:
        """Turn what was cut into display events; those impossible under both answers vanish."""
        track = self.players[i].track
        weights = [track.moments[-1].log_after[:, None], self._log_weights[i][:, 1:]]
        gained = 0
        for sign, state in enumerate((PLUS, MINUS)):
            if np.isfinite(gone[sign] + shown).any():
                track.events.add(state, step, round_)
                weights.append(gone[sign][:, None])
                gained += 1
        self._log_weights[i] = np.concatenate(weights, axis=1)
        return gained
