"""A group in a world that is not what everybody in it believes.

Everybody takes the group for what it is said to be, and all reason by its exact solution: what an
observation is worth, what somebody's answer or silence is worth. The world is another: observations
follow another law, somebody's thresholds are others, somebody sees more than is known, or does not
reason at all. Displays then come about by the world, while every agent goes on reading them by what
it believes.

What an agent is shown that its solution calls impossible it reads as the same answer at the latest
earlier moment at which the solution allowed it, or as no news (see ``among``); how often that
happened is counted. It never happens where only the laws of observations differ, as long as what
was possible stays possible: then everything is exact.

An agent's own thresholds do not bear on what it makes of others, since its reading is about what
they show while it is undecided. One whose thresholds are not what others take them for therefore
reads as it would otherwise. Whom an agent sees does bear on it: one that sees others than is known
reads by the solution of a group in which that is so and known.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from enum import Enum

import numpy as np

from thumbwright.exact.among import AmongOthersReader
from thumbwright.exact.engine import Reader, Reading, Scene, Solution, Track, by_value, run
from thumbwright.exact.errors import ModelError
from thumbwright.exact.evidence.law import Law, nothing
from thumbwright.exact.forecast import refuse_too_large
from thumbwright.exact.group import Group, Thresholds
from thumbwright.exact.play import Policy, RuleReader, against


class Habit(Enum):
    """Ways of an agent that makes nothing of what it is shown."""

    ALONE = "goes by its own observations only"
    SILENT = "never answers"


@dataclass(frozen=True)
class World:
    """What is really so.

    Attributes
    ----------
    group : Group
        The real thresholds, and who really sees whom. The evidence of an agent is what it takes
        its observations for.
    minds : tuple of Solution or Habit
        Per agent, by which solution it reads what it sees. There it must see the same agents in
        the same order as in ``group``.
    laws : tuple of Law or None
        Per agent, what its observations are really like; None is as it takes them.

    Raises
    ------
    ModelError
        Where a mind is of another group, or sees others than the agent really does.
    """

    group: Group
    minds: tuple[Solution | Habit, ...]
    laws: tuple[Law | None, ...]

    def __post_init__(self) -> None:
        group = self.group
        if not len(self.minds) == len(self.laws) == len(group.agents):
            raise ModelError("a world needs a mind and a law, or None, for every agent")
        for agent, mind in zip(group.agents, self.minds, strict=True):
            if isinstance(mind, Habit):
                continue
            other = mind.group
            if other.index != group.index or other.horizon != group.horizon:
                raise ModelError("everybody in a world must reason about the same agents and steps")
            if other.agents[other.index[agent.id]].sees != agent.sees:
                raise ModelError(
                    f"agent {agent.id} must reason by a group in which it sees whom it really sees"
                )


@dataclass(frozen=True)
class Fate:
    """What becomes of one agent in a world.

    Attributes
    ----------
    track : Track
    off_model : float
        Expected number of commitments that undecided agents were shown and had to read as
        something else, averaged over the prior.
    """

    track: Track
    off_model: float


def as_believed_by(solution: Solution) -> World:
    """The world in which everybody is right."""
    size = len(solution.group.agents)
    return World(solution.group, (solution,) * size, (None,) * size)


def with_laws(world: World, laws: dict[str, Law]) -> World:
    """The same world with the observations of some agents following these laws."""
    index = world.group.index
    changed = [laws.get(agent, law) for agent, law in zip(index, world.laws, strict=True)]
    return replace(world, laws=tuple(changed))


def with_thresholds(world: World, agent: str, real: tuple[tuple[float, Thresholds], ...]) -> World:
    """The same world with other thresholds of one agent; in several possibilities with shares."""
    agents = [replace(a, thresholds=real) if a.id == agent else a for a in world.group.agents]
    return replace(world, group=replace(world.group, agents=tuple(agents)))


def with_habit(world: World, agent: str, habit: Habit) -> World:
    """The same world with an agent that makes nothing of others; it sees nobody."""
    if habit is Habit.SILENT:
        # Proof would make it answer.
        own = world.group.agents[world.group.index[agent]]
        world = with_laws(world, {agent: nothing(own.evidence)})
    return _with_mind(world, agent, (), habit)


def with_links(world: World, agent: str, mind: Solution) -> World:
    """The same world with an agent that sees whom it sees in a solution, and reads by that."""
    return _with_mind(world, agent, mind.group.agents[mind.group.index[agent]].sees, mind)


def _with_mind(world: World, agent: str, sees: tuple[str, ...], mind: Solution | Habit) -> World:
    agents = [replace(a, sees=sees) if a.id == agent else a for a in world.group.agents]
    minds = [
        mind if a == agent else other
        for a, other in zip(world.group.index, world.minds, strict=True)
    ]
    group = replace(world.group, agents=tuple(agents))
    return replace(world, group=group, minds=tuple(minds))


def fates(
    world: World,
    agent: str,
    policies: Sequence[Policy | None],
    memory: float | None = None,
) -> list[Fate]:
    """What becomes of one agent by several ways of playing, the others playing by their minds.

    Parameters
    ----------
    world : World
    agent : str
        Id of the agent.
    policies : sequence of callable or None
        ``policy(situation) -> act``; None is to play by its mind.
    memory : float, optional
        Bytes that a play may take; if None, half of what is free.

    Returns
    -------
    list of Fate
        One per policy, in the same order. Exact up to floating point, apart from what
        ``off_model`` counts.

    Raises
    ------
    ModelError
        Where a play would need more memory than it may take.
    """
    position, group = world.group.index[agent], world.group
    refuse_too_large(group, memory)
    own = [_reader(world, position) if p is None else RuleReader(p) for p in policies]
    # Under "settle" the agent's own answers decide how many rounds a step has.
    if group.influences(position) or group.exchange == "settle":
        return [_played(world, position, reader)[0] for reader in own]
    # What the agent shows cannot come back to it: the others are played once.
    first, tracks, others = _played(world, position, own[0])
    found = [first]
    for reader in own[1:]:
        track = against(group, tracks, position, reader, world.laws[position])
        found.append(Fate(track, others + _misread(reader)))
    return found


def _played(world: World, position: int, reader: Reader) -> tuple[Fate, tuple[Track, ...], float]:
    """Play the whole world; the agent's fate, all tracks, and what the others misread."""
    readers = [_reader(world, i) for i in range(len(world.minds))]
    readers[position] = reader
    tracks = run(world.group, readers, laws=world.laws)
    others = sum(_misread(one) for i, one in enumerate(readers) if i != position)
    return Fate(tracks[position], others + _misread(reader)), tracks, others


def _reader(world: World, position: int) -> Reader:
    mind = world.minds[position]
    if isinstance(mind, Solution):
        return AmongOthersReader(mind, position)
    return SilentReader() if mind is Habit.SILENT else AloneReader()


def _misread(reader: Reader) -> float:
    return reader.off_model if isinstance(reader, AmongOthersReader) else 0.0


class AloneReader(Reader):
    """Takes whatever it is shown for no news."""

    def read(self, scene: Scene) -> Reading:
        """What reaches a threshold by the own tally."""
        return by_value(scene, np.zeros(scene.log_shown[0].size))


class SilentReader(Reader):
    """Never commits."""

    def read(self, scene: Scene) -> Reading:
        """Nothing."""
        histories = scene.log_shown[0].size
        never = np.zeros((len(scene.walk.count), histories), dtype=bool)
        return Reading(never, never, np.zeros(histories))
