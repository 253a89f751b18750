"""Playing any rule exactly: one agent uses it, the others stay exact and take it for exact.

The agent that uses the rule decides by what the rule says of the histories it is shown. Until it
answers it shows "undecided", and others read that as they would of an exact agent; what it ends up
doing therefore follows from the probabilities of the exact solution, in which it is held to showing
undecided, even where what it shows can come back to it. The exception is a silence that the exact
solution calls impossible: then the whole group is played again, with the actual weights of this
play, while the exact agents go on reading what they see by the exact solution. The whole play also
says how often others were shown what their model calls impossible.

How the others read what the exact solution calls impossible is in ``among``; how often it happened
is reported.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

import numpy as np

from thumbwright.exact.among import AmongOthersReader
from thumbwright.exact.arrays import BoolArray, FloatArray, IntArray
from thumbwright.exact.engine import (
    Events,
    Moment,
    Player,
    Reader,
    Reading,
    Scene,
    Solution,
    Track,
    by_value,
    run,
)
from thumbwright.exact.evidence.law import Law
from thumbwright.exact.group import Group

NEVER = np.int64(1) << 40
"""A bar this high (or, negative, this low) is never reached."""


@dataclass(frozen=True)
class Situation:
    """What a policy may look at, for all histories that may have been shown at once.

    Attributes
    ----------
    step, round : int
        Own observations so far, this one included; round within the step.
    states, shown_steps, shown_rounds : tuple of ndarray of int
        Per seen agent, in the agent's own order, the code of the shown state (0 undecided, 1
        plus, 2 minus) and the step and round of its commitment (0 while undecided). The array of
        seen agent k varies along axis k only, so the arrays broadcast to all joint histories.
    """

    step: int
    round: int
    states: tuple[IntArray, ...]
    shown_steps: tuple[IntArray, ...]
    shown_rounds: tuple[IntArray, ...]

    @property
    def shape(self) -> tuple[int, ...]:
        """Number of histories per seen agent."""
        return np.broadcast_shapes(*(array.shape for array in self.states)) if self.states else ()


@dataclass(frozen=True)
class Act:
    """What a policy makes of a situation; arrays broadcast to the situation's shape.

    Attributes
    ----------
    value : ndarray of float
        Worth of each history in nats, in place of the exact one. A policy with bars gives its
        value too: it says which answer an agent favours that is undecided at the horizon.
    minus_at, plus_at : ndarray of int or None
        Bars on the own count; None for both means that the value decides.
    row : ndarray of int or None
        Which line of the rule applies, for counting how often each is used; negative for none.
    """

    value: FloatArray
    minus_at: IntArray | None = None
    plus_at: IntArray | None = None
    row: IntArray | None = None


Policy = Callable[[Situation], Act]


@dataclass(frozen=True)
class Play:
    """How one agent fares with a policy.

    Attributes
    ----------
    track : Track
        The agent's own track.
    off_model : float
        Expected number of times that an exact agent, still undecided, was shown something that
        the exact solution calls impossible.
    usage : ndarray of float, shape (rows, 2) or None
        Per line of the rule: mean steps per outing at which it was in force, and the share of
        outings that were decided under it; averaged over the prior.
    """

    track: Track
    off_model: float
    usage: FloatArray | None


def situation_of(
    step: int, round_: int, events: tuple[Events, ...], shape: tuple[int, ...]
) -> Situation:
    """The situations of a round as broadcastable arrays."""
    columns: list[list[IntArray]] = [[], [], []]
    for axis, (one, length) in enumerate(zip(events, shape, strict=True)):
        turned = tuple(length if k == axis else 1 for k in range(len(shape)))
        for column, numbers in zip(columns, (one.state, one.step, one.round), strict=True):
            column.append(np.array(numbers[:length], dtype=np.int64).reshape(turned))
    return Situation(step, round_, *(tuple(column) for column in columns))


class RuleReader(Reader):
    """Decides by a policy; counts how often each line is used if told how many there are."""

    def __init__(self, policy: Policy, prior_plus: float = 0.5, rows: int = 0) -> None:
        self._policy = policy
        self._prior = np.array([prior_plus, 1.0 - prior_plus])
        self.usage: FloatArray | None = np.zeros((rows, 2)) if rows else None

    def read(self, scene: Scene) -> Reading:
        """What the policy decides."""
        shape = scene.log_shown.shape[1:]
        act = self._policy(situation_of(scene.step, scene.round, scene.seen, shape))
        value = np.broadcast_to(np.asarray(act.value, dtype=float), shape).ravel()
        if act.minus_at is None or act.plus_at is None:
            reading = by_value(scene, value)
        else:
            count = scene.walk.count[:, None]
            low, high = (np.broadcast_to(x, shape).ravel() for x in (act.minus_at, act.plus_at))
            reading = Reading(count >= high, count <= low, value)
        row = None if act.row is None else np.broadcast_to(act.row, shape).ravel()
        return replace(reading, row=row)

    def tell(self, scene: Scene, reading: Reading, calls: FloatArray, inside: FloatArray) -> None:
        """Count in which line's force the agent was, once a step, and answered."""
        if self.usage is None or reading.row is None:
            return
        used = reading.row >= 0
        np.add.at(self.usage[:, 1], reading.row[used], (self._prior @ calls)[used])
        if scene.round == 0:
            np.add.at(self.usage[:, 0], reading.row[used], (self._prior @ inside)[used])


class DifferenceReader(Reader):
    """Lets an agent leave as soon as two policies would act differently.

    What leaves "to plus" is the probability that the two ever differ on the same observations;
    what leaves "to minus" was answered the same way by both.
    """

    def __init__(self, one: Policy, other: Policy) -> None:
        self._readers = RuleReader(one), RuleReader(other)

    def read(self, scene: Scene) -> Reading:
        """Masks of what differs and of what is answered alike."""
        one, other = (reader.read(scene) for reader in self._readers)
        differs = (one.plus != other.plus) | (one.minus != other.minus)
        return Reading(differs, (one.plus | one.minus) & ~differs, one.value)


def silence_is_possible(solution: Solution, position: int) -> bool:
    """Whether others always have a reading for this agent's silence, however long it lasts.

    They have unless exact play leaves it no chance of being undecided after some history in which
    somebody who sees it may still be undecided himself.
    """
    group = solution.group
    watchers = [k for k, seen in enumerate(group.sees) if position in seen]
    axes = [group.sees[position].index(k) for k in watchers if k in group.sees[position]]
    all_seen = len(axes) == len(watchers)
    for moment in solution.tracks[position].moments:
        met = np.isfinite(moment.log_shown).any(axis=0)
        left = np.isfinite(moment.log_after).any(axis=0)
        lost: BoolArray = np.asarray(met & ~left)
        waiting = any(np.take(lost, 0, axis=axis).any() for axis in axes)
        if lost.any() and (waiting or not all_seen):
            return False
    return True


def adopt(
    solution: Solution, agent: str, policy: Policy, rows: int = 0, whole: bool = True
) -> Play:
    """One agent plays by a policy, the others stay exact and take it for exact.

    Parameters
    ----------
    solution : Solution
        The exact play of the group.
    agent : str
        Id of the agent that uses the policy.
    policy : callable
        ``policy(situation) -> act``.
    rows : int
        If above 0, usage is counted for this many lines.
    whole : bool
        Whether to play the whole group where the agent can change what it is shown. Without, and
        where exact play leaves it a chance of silence after every history, the agent's figures
        are the same but ``off_model`` is not counted.
    """
    reader = RuleReader(policy, solution.group.prior_plus, rows)
    track, off_model = _play(solution, solution.group.index[agent], reader, whole)
    return Play(track, off_model, reader.usage)


def difference(solution: Solution, agent: str, one: Policy, other: Policy) -> float:
    """Probability that an agent ever acts differently by two policies, on the same observations."""
    reader = DifferenceReader(one, other)
    track, _ = _play(solution, solution.group.index[agent], reader, whole=False)
    group = solution.group
    ever = track.answers[0].sum(axis=1)
    return float(group.prior_plus * ever[0] + (1.0 - group.prior_plus) * ever[1])


def _play(solution: Solution, position: int, reader: Reader, whole: bool) -> tuple[Track, float]:
    group = solution.group
    alone = not group.influences(position)
    if alone or (not whole and silence_is_possible(solution, position)):
        return against(group, solution.tracks, position, reader), 0.0
    readers: list[Reader] = [AmongOthersReader(solution, i) for i in range(len(group.agents))]
    readers[position] = reader
    track = run(group, readers)[position]
    return track, sum(r.off_model for r in readers if isinstance(r, AmongOthersReader))


def against(
    group: Group,
    tracks: Sequence[Track],
    position: int,
    reader: Reader,
    law: Law | None = None,
) -> Track:
    """Play one agent against displays that it cannot change.

    Parameters
    ----------
    group : Group
    tracks : sequence of Track
        One per agent, of a play of the whole group.
    position : int
    reader : Reader
    law : Law, optional
        Of what the agent really observes, where that is not what it takes it for.
    """
    player = Player(group, position, reader, law)
    seen = tuple(tracks[other].events for other in group.sees[position])
    step = 0
    for moment in tracks[position].moments:
        _grow_to(player, moment)
        if moment.step != step:
            player.observe()
            step = moment.step
        player.decide(moment.step, moment.round, seen, moment.log_shown)
    player.lean()
    return player.track


def _grow_to(player: Player, moment: Moment) -> None:
    for axis, length in enumerate(moment.log_shown.shape[1:]):
        extra = length - player.shape[axis]
        if extra:
            player.grow(axis, extra)


def exact_policy(solution: Solution, agent: str) -> Policy:
    """The exact worths as a policy: for agents that cannot change what they are shown."""
    moments = {(m.step, m.round): m for m in solution.tracks[solution.group.index[agent]].moments}

    def policy(situation: Situation) -> Act:
        return Act(moments[situation.step, situation.round].value)

    return policy
