"""Crowds: groups in which everybody sees everybody, their members sorted into kinds.

Members of one kind have the same evidence, the same thresholds (or the same spread of possible
ones) and the same timetable. While they are undecided nothing tells them apart, so a crowd is
described by how many of each kind show what.
"""

from __future__ import annotations

import math
from collections.abc import Hashable
from dataclasses import dataclass

from thumbwright.exact.errors import ModelError
from thumbwright.exact.evidence.base import Evidence
from thumbwright.exact.group import EXCHANGES, Agent, Group, Thresholds


@dataclass(frozen=True)
class Kind:
    """Members of a crowd that nothing tells apart.

    Attributes
    ----------
    evidence : Evidence
    thresholds : tuple of (share, Thresholds)
        As for :class:`Agent`: one entry of share 1, or several possibilities, each member having
        its own, known to itself alone and independent of the others'.
    members : tuple of str
        Ids, each once.
    looks : tuple of int, or None
        Private observations at each step, as for :class:`Agent`; None is one at every step.
    """

    evidence: Evidence
    thresholds: tuple[tuple[float, Thresholds], ...]
    members: tuple[str, ...]
    looks: tuple[int, ...] | None = None

    def __post_init__(self) -> None:
        if not self.members:
            raise ModelError("a kind needs at least one member")
        # The agent that stands for all of them checks thresholds and timetable.
        _ = self.agent

    @property
    def size(self) -> int:
        """Number of members."""
        return len(self.members)

    @property
    def agent(self) -> Agent:
        """One member, without those it sees."""
        return Agent(self.members[0], self.evidence, self.thresholds, (), self.looks)


@dataclass(frozen=True)
class Crowd:
    """A group in which every agent sees all others.

    Attributes
    ----------
    kinds : tuple of Kind
    """

    kinds: tuple[Kind, ...]

    def __post_init__(self) -> None:
        members = [member for kind in self.kinds for member in kind.members]
        if not members:
            raise ModelError("a crowd needs at least one member")
        if len(set(members)) != len(members):
            raise ModelError("two members of a crowd have the same id")

    @property
    def members(self) -> tuple[str, ...]:
        """Ids of all, kind by kind."""
        return tuple(member for kind in self.kinds for member in kind.members)

    @property
    def size(self) -> int:
        """Number of agents."""
        return sum(kind.size for kind in self.kinds)


def kinds_of(group: Group) -> Crowd | None:
    """The crowd that a group is, its members sorted into kinds in order of first appearance.

    Returns None where somebody does not see somebody else.
    """
    if any(len(agent.sees) != len(group.agents) - 1 for agent in group.agents):
        return None
    found: dict[Hashable, list[Agent]] = {}
    for agent in group.agents:
        key = (_same_evidence(agent.evidence), agent.thresholds, agent.looks)
        found.setdefault(key, []).append(agent)
    return Crowd(
        tuple(
            Kind(a[0].evidence, a[0].thresholds, tuple(one.id for one in a), a[0].looks)
            for a in found.values()
        )
    )


def check_play(crowd: Crowd, prior: float, horizon: int, exchange: str) -> None:
    """Refuse a prior, horizon or exchange that :class:`Group` would refuse.

    Raises
    ------
    ModelError
    """
    if horizon < 1:
        raise ModelError(f"the horizon must be at least 1 step, not {horizon}")
    if not math.isfinite(prior):
        raise ModelError("the prior must leave both answers possible")
    if exchange not in EXCHANGES:
        raise ModelError(f"exchange must be one of {', '.join(EXCHANGES)}, not {exchange}")
    for kind in crowd.kinds:
        if kind.looks is not None and len(kind.looks) != horizon:
            raise ModelError(
                f"the kind of {kind.members[0]} has {len(kind.looks)} entries in its timetable of "
                f"observations, but there are {horizon} steps"
            )


def _same_evidence(evidence: Evidence) -> Hashable:
    """Equal for evidence of equal numbers, whatever it is called."""
    return (
        evidence.plus.tobytes(),
        evidence.minus.tobytes(),
        evidence.offsets.shape,
        evidence.offsets.tobytes(),
        evidence.alpha.tobytes(),
        evidence.beta,
        evidence.certain_plus,
        evidence.certain_minus,
    )
