"""What the slow programs start from and give back: groups, worths of histories, outcomes."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import Any, NamedTuple

Moment = tuple[int, int]
"""Step (from 1) and round (from 0)."""


class Event(NamedTuple):
    """A commitment as shown: step, round, and ``"plus"`` or ``"minus"``."""

    step: int
    round: int
    answer: str

    @property
    def moment(self) -> Moment:
        """When it was made; it is visible from the next moment on."""
        return (self.step, self.round)


Shown = tuple[Event | None, ...]
"""One entry per agent; ``None`` is undecided."""
Rule = Callable[[int, int, Shown, float, tuple[int, ...]], str | None]
"""(step, round, seen history, own tally in nats, own observations as indices) -> answer."""


class Thresholds(NamedTuple):
    """One possibility for an agent's thresholds on its belief (nats), and its probability."""

    minus: float
    plus: float
    share: float = 1.0


@dataclass(frozen=True)
class Group:
    """A case for enumeration.

    Attributes
    ----------
    sees : per agent, the indices of the agents it sees.
    evidence : per agent, one (mass under plus, mass under minus) for each value.
    thresholds : per agent, its possible :class:`Thresholds`; shares sum to one, and only the
        agent itself knows which holds.
    horizon : number of steps.
    exchange : ``"once"`` or ``"settle"``.
    prior_plus : probability of plus.
    looks : per agent, how many observations it makes at each step; ``None``: one each.
    """

    sees: tuple[tuple[int, ...], ...]
    evidence: tuple[tuple[tuple[float, float], ...], ...]
    thresholds: tuple[tuple[Thresholds, ...], ...]
    horizon: int
    exchange: str = "once"
    prior_plus: float = 0.5
    looks: tuple[tuple[int, ...], ...] | None = None

    def __post_init__(self) -> None:
        if not len(self.sees) == len(self.evidence) == len(self.thresholds):
            raise ValueError("sees, evidence and thresholds need one entry per agent")
        if self.exchange not in ("once", "settle"):
            raise ValueError(f"exchange is {self.exchange!r}; allowed: once, settle")
        for agent, seen in enumerate(self.sees):
            if agent in seen or not set(seen) <= set(range(len(self.sees))):
                raise ValueError(f"agent {agent} cannot see {seen}")
            for side in (0, 1):
                if abs(sum(masses[side] for masses in self.evidence[agent]) - 1.0) > 1e-12:
                    raise ValueError(f"the evidence of agent {agent} does not sum to one")
            if abs(sum(t.share for t in self.thresholds[agent]) - 1.0) > 1e-12:
                raise ValueError(f"the threshold shares of agent {agent} do not sum to one")

    @property
    def prior(self) -> float:
        """Prior log-odds, nats."""
        return math.log(self.prior_plus / (1.0 - self.prior_plus))


@dataclass(frozen=True)
class Worth:
    """Of one seen history at one moment: its social value and the masses behind it.

    ``shown_*`` is the probability of the history with the agent made to show undecided;
    ``reached_*`` and ``left_*`` the joint probability, in actual play, of that history and of
    the agent being undecided just before and just after the decision of that moment.
    """

    worth: float
    shown_plus: float
    shown_minus: float
    reached_plus: float = 0.0
    reached_minus: float = 0.0
    left_plus: float = 0.0
    left_minus: float = 0.0


@dataclass(frozen=True)
class Outcome:
    """What one agent ends up doing given one answer (probabilities; steps)."""

    plus: float
    minus: float
    undecided: float
    mean_step_if_decided: float | None
    mean_step: float
    """An undecided agent counts with the whole horizon."""


def from_reference(entry: Mapping[str, Any]) -> Group:
    """Return the group of one entry of ``tests/reference/small_networks.json``."""
    values = tuple(zip(*(entry["evidence"][f"values_{a}"] for a in ("plus", "minus")), strict=True))
    return Group(
        sees=tuple(tuple(seen) for seen in entry["sees"]),
        evidence=(values,) * len(entry["sees"]),
        thresholds=tuple((Thresholds(low, high),) for low, high in entry["thresholds_nats"]),
        horizon=entry["horizon"],
        exchange=entry["exchange"],
        prior_plus=entry["prior_plus"],
    )
