"""Who watches whom: agents, their thresholds and evidence, and the directed network.

A question has two answers, plus and minus, with prior log-odds b0. Every agent gathers private
evidence, holds a belief (posterior log-odds, nats) and commits to plus at its upper threshold, to
minus at its lower one. It sees only the shown states of the agents it sees. All of this is common
knowledge among the agents.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace
from functools import cached_property

from thumbwright.exact.errors import ModelError
from thumbwright.exact.evidence.base import Evidence

UNDECIDED, PLUS, MINUS = 0, 1, 2
"""Codes of the shown states, the same everywhere in the program."""

EXCHANGES = ("once", "settle")


@dataclass(frozen=True)
class Thresholds:
    """Beliefs (posterior log-odds, nats) at which an agent commits: at or below, at or above."""

    minus: float
    plus: float

    def __post_init__(self) -> None:
        if not (math.isfinite(self.minus) and math.isfinite(self.plus)):
            raise ModelError(
                f"thresholds must be finite, not {self.minus:g} and {self.plus:g} nats; an agent "
                "that never commits has no rule to distil"
            )
        if not self.minus < self.plus:
            raise ModelError(
                f"the lower threshold ({self.minus:g} nats) must lie below the upper one "
                f"({self.plus:g} nats)"
            )


@dataclass(frozen=True)
class Agent:
    """One watcher.

    Attributes
    ----------
    id : str
    evidence : Evidence
        What one private observation is like.
    thresholds : tuple of (share, Thresholds)
        What the others know of its thresholds: one entry of share 1, or several possibilities
        whose shares sum to 1; which of them holds is known to the agent alone and is independent
        of the answer and of everybody else's.
    sees : tuple of str
        Ids of the agents whose shown states it sees, each once, never itself.
    looks : tuple of int, or None
        How many private observations it makes at each step, from step 1 to the horizon; 0 is
        none. None stands for one at every step. Until its first observation an agent has not
        started: it shows undecided and cannot commit, whatever it is shown. Everybody knows.
    """

    id: str
    evidence: Evidence
    thresholds: tuple[tuple[float, Thresholds], ...]
    sees: tuple[str, ...] = ()
    looks: tuple[int, ...] | None = None

    def __post_init__(self) -> None:
        if not self.thresholds:
            raise ModelError(f"agent {self.id} has no thresholds")
        shares = [share for share, _ in self.thresholds]
        if min(shares) < 0 or abs(sum(shares) - 1.0) > 1e-9:
            raise ModelError(
                f"agent {self.id}: the shares of its possible thresholds must be probabilities "
                f"that sum to 1, not {sum(shares):g}"
            )
        if self.id in self.sees:
            raise ModelError(f"agent {self.id} cannot see itself")
        if len(set(self.sees)) != len(self.sees):
            raise ModelError(f"agent {self.id} sees somebody twice")
        if self.looks is not None:
            if any(number != int(number) or number < 0 for number in self.looks):
                raise ModelError(
                    f"agent {self.id}: the number of observations at a step must be a whole "
                    "number, 0 or more"
                )
            if not any(self.looks):
                raise ModelError(f"agent {self.id} makes no observation, so it can never commit")

    def looks_at(self, step: int) -> int:
        """Number of private observations at a step (from 1)."""
        return 1 if self.looks is None else self.looks[step - 1]

    def observed_by(self, step: int) -> int:
        """Number of private observations up to and including a step (from 0)."""
        return step if self.looks is None else sum(self.looks[:step])


@dataclass(frozen=True)
class Group:
    """A network of agents, the prior, the horizon and the mode of exchange.

    Attributes
    ----------
    agents : tuple of Agent
    prior : float
        Prior log-odds of plus (nats).
    horizon : int
        Number of steps T, at least 1.
    exchange : {"once", "settle"}
        Whether what is shown in a step is used from the next step on, or taken in at once, in
        rounds, until no agent could commit any more.
    """

    agents: tuple[Agent, ...]
    prior: float
    horizon: int
    exchange: str = "once"

    def __post_init__(self) -> None:
        ids = {agent.id for agent in self.agents}
        if not ids:
            raise ModelError("a group needs at least one agent")
        if len(ids) != len(self.agents):
            raise ModelError("two agents have the same id")
        for agent in self.agents:
            for other in agent.sees:
                if other not in ids:
                    raise ModelError(f"agent {agent.id} sees {other}, who is not in the group")
        if self.horizon < 1:
            raise ModelError(f"the horizon must be at least 1 step, not {self.horizon}")
        for agent in self.agents:
            if agent.looks is not None and len(agent.looks) != self.horizon:
                raise ModelError(
                    f"agent {agent.id} has {len(agent.looks)} entries in its timetable of "
                    f"observations, but there are {self.horizon} steps"
                )
        if not math.isfinite(self.prior):
            raise ModelError("the prior must leave both answers possible")
        if self.exchange not in EXCHANGES:
            raise ModelError(f"exchange must be one of {', '.join(EXCHANGES)}, not {self.exchange}")

    @cached_property
    def index(self) -> dict[str, int]:
        """Position of each agent id in :attr:`agents`."""
        return {agent.id: position for position, agent in enumerate(self.agents)}

    @cached_property
    def sees(self) -> tuple[tuple[int, ...], ...]:
        """For each agent the positions of the agents it sees, in its own order."""
        return tuple(tuple(self.index[other] for other in agent.sees) for agent in self.agents)

    @property
    def prior_plus(self) -> float:
        """Prior probability of plus."""
        return 1.0 / (1.0 + math.exp(-self.prior))

    def sources(self, position: int) -> frozenset[int]:
        """Every agent whose display can reach this one while it shows nothing itself.

        The agents it sees, those they see, and so on, the agent itself left out: it is held to
        showing undecided, so paths through it carry nothing.
        """
        found: set[int] = set()
        waiting = list(self.sees[position])
        while waiting:
            other = waiting.pop()
            if other != position and other not in found:
                found.add(other)
                waiting.extend(self.sees[other])
        return frozenset(found)

    def influences(self, position: int) -> bool:
        """Whether what this agent shows can change what it will be shown."""
        return any(position in self.sees[other] for other in self.sources(position))


def same_thresholds(thresholds: Thresholds) -> tuple[tuple[float, Thresholds], ...]:
    """Thresholds that everybody knows, in the form that :class:`Agent` takes."""
    return ((1.0, thresholds),)


def replace_thresholds(group: Group, known: dict[str, Thresholds]) -> Group:
    """The same group with the thresholds of some agents known to be these."""
    agents: Sequence[Agent] = [
        replace(a, thresholds=same_thresholds(known[a.id])) if a.id in known else a
        for a in group.agents
    ]
    return Group(tuple(agents), group.prior, group.horizon, group.exchange)
