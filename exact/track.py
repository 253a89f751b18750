"""What a run keeps of one agent: its display events, its moments, and what it ends up doing."""

from __future__ import annotations

from dataclasses import dataclass, field, replace

import numpy as np

from thumbwright.exact.arrays import FloatArray
from thumbwright.exact.group import Agent
from thumbwright.exact.store import Weights


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

    def turned(self, turn: tuple[int, ...]) -> Moment:
        """The same with the axes of the seen agents in another order."""
        with_answer = (0, *(1 + axis for axis in turn))
        logs = (self.log_shown, self.log_before, self.log_after)
        return Moment(
            self.step,
            self.round,
            np.transpose(self.value, turn),
            *(np.transpose(log, with_answer) for log in logs),
        )


@dataclass
class Track:
    """All that a run keeps of one agent.

    ``answers`` has shape (2, 2, T + 1): axis 0 to plus, to minus; axis 1 given plus, given minus;
    the probability of committing at each step. ``leaning`` has shape (3, 2): of those undecided at
    the horizon, the probability that the belief favours plus, favours minus, or neither.
    ``weights`` holds the weight of each display event at the horizon; it is None before.
    """

    agent: Agent
    events: Events
    moments: list[Moment]
    answers: FloatArray
    leaning: FloatArray
    near_tie: float = 0.0
    weights: Weights | None = None

    @property
    def undecided(self) -> FloatArray:
        """Probability of being undecided at the horizon, given plus and given minus."""
        total: FloatArray = self.leaning.sum(axis=0)
        return total

    def turned(self, agent: Agent, turn: tuple[int, ...]) -> Track:
        """The same for an agent that is like this one.

        Parameters
        ----------
        agent : Agent
        turn : tuple of int
            Per agent that it sees, the axis of the one that stands for it here.
        """
        in_order = turn == tuple(range(len(turn)))
        return replace(
            self,
            agent=agent,
            moments=[*self.moments] if in_order else [one.turned(turn) for one in self.moments],
            answers=self.answers.copy(),
            leaning=self.leaning.copy(),
            weights=self.weights.turned(turn) if self.weights else None,
        )
