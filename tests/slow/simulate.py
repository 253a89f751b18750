"""Seeded simulation, agent by agent: every run draws its observations and plays them out.

Runs are rows of arrays, agents are columns. Agents decide by *players*, functions of what an
agent can know; nothing here reasons. Estimates come with their standard errors.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from tests.slow.enumerate import Enumeration
from tests.slow.group import Event, Group

TIE = 1e-9
UNDECIDED, PLUS, MINUS = 0, 1, 2
ANSWERS = ("", "plus", "minus")

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]


class Seen(NamedTuple):
    """What one seen agent shows, one entry per run: state, and when it committed (else 0)."""

    state: Ints
    step: Ints
    round: Ints


Player = Callable[[int, int, Sequence[Seen], Floats, Ints], Ints]
"""(step, round, seen agents, own tally in nats, own count) -> state wanted, per run."""


@dataclass(frozen=True)
class Value:
    """One value of the evidence: its masses, and what it adds to the count."""

    plus: float
    minus: float
    count: int


COIN_COUNTS, SIGN_COUNTS = (1, -1), (1, 0)


class Estimate(NamedTuple):
    """A sample mean and its standard error."""

    value: float
    error: float

    def off(self, truth: float) -> float:
        """Return the distance from ``truth`` in standard errors; infinite if wrong for sure."""
        gap = abs(self.value - truth)
        if gap <= 1e-12:
            return 0.0
        return gap / self.error if self.error > 0.0 else math.inf


@dataclass(frozen=True)
class Estimates:
    """Of one agent given one answer; ``mean_step`` counts undecided runs with the horizon."""

    plus: Estimate
    minus: Estimate
    undecided: Estimate
    mean_step: Estimate
    mean_step_if_decided: Estimate


@dataclass(frozen=True)
class Runs:
    """The raw end states, shape (runs, agents): state codes, and step of commitment or 0."""

    state: Ints
    step: Ints
    horizon: int

    def of(self, agent: int) -> Estimates:
        """Return the estimates for one agent."""
        state, step = self.state[:, agent], self.step[:, agent]
        return Estimates(
            _mean((state == PLUS).astype(float)),
            _mean((state == MINUS).astype(float)),
            _mean((state == UNDECIDED).astype(float)),
            _mean(np.where(state == UNDECIDED, self.horizon, step).astype(float)),
            _mean(step[state != UNDECIDED].astype(float)),
        )


def _mean(sample: Floats) -> Estimate:
    if sample.size < 2:
        return Estimate(math.nan, math.nan)
    return Estimate(float(sample.mean()), float(sample.std(ddof=1) / math.sqrt(sample.size)))


def values(masses: Sequence[tuple[float, float]], counts: Sequence[int]) -> tuple[Value, ...]:
    """Return evidence from (mass under plus, mass under minus) and counts."""
    return tuple(Value(up, down, add) for (up, down), add in zip(masses, counts, strict=True))


def simulate(
    sees: Sequence[Sequence[int]],
    evidence: Sequence[Sequence[Value]],
    players: Sequence[Player],
    horizon: int,
    answer: str,
    runs: int,
    seed: int,
    rounds: Sequence[int] | None = None,
) -> Runs:
    """Play ``runs`` independent runs with ``answer`` true.

    ``rounds`` is the number of rounds held in each step; left out, one (exchange "once").
    """
    draw = np.random.default_rng(seed)
    agents = len(sees)
    state = np.zeros((runs, agents), dtype=np.int64)
    when = np.zeros((runs, agents), dtype=np.int64)
    at_round = np.zeros((runs, agents), dtype=np.int64)
    tally = np.zeros((runs, agents))
    count = np.zeros((runs, agents), dtype=np.int64)
    for step in range(1, horizon + 1):
        for agent in range(agents):
            masses = [v.plus if answer == "plus" else v.minus for v in evidence[agent]]
            drawn = draw.choice(len(masses), size=runs, p=masses)
            llr = np.array([math.log(v.plus / v.minus) for v in evidence[agent]])
            add = np.array([v.count for v in evidence[agent]])
            waiting = state[:, agent] == UNDECIDED
            tally[waiting, agent] += llr[drawn[waiting]]
            count[waiting, agent] += add[drawn[waiting]]
        for round_ in range(1 if rounds is None else rounds[step - 1]):
            # All decide on what was shown before this round, then all show at once.
            wanted = np.stack(
                [
                    players[agent](
                        step,
                        round_,
                        [Seen(state[:, k], when[:, k], at_round[:, k]) for k in sees[agent]],
                        tally[:, agent],
                        count[:, agent],
                    )
                    for agent in range(agents)
                ],
                axis=1,
            )
            new = (state == UNDECIDED) & (wanted != UNDECIDED)
            state = np.where(new, wanted, state)
            when[new], at_round[new] = step, round_
    return Runs(state, when, horizon)


def by_belief(
    prior: float,
    bars: tuple[float, float],
    worth: Callable[[int, int, Sequence[Seen]], Floats | float],
) -> Player:
    """Return a player with thresholds (minus, plus) on prior + tally + worth, nats."""

    def player(step: int, round_: int, seen: Sequence[Seen], tally: Floats, count: Ints) -> Ints:
        belief = prior + tally + worth(step, round_, seen)
        return np.where(
            belief >= bars[1] - TIE, PLUS, np.where(belief <= bars[0] + TIE, MINUS, UNDECIDED)
        )

    return player


def alone(prior: float, bars: tuple[float, float]) -> Player:
    """Return a player that does not look."""
    return by_belief(prior, bars, lambda step, round_, seen: 0.0)


def plain_count(
    prior: float, bars: tuple[float, float], seen_bars: Sequence[tuple[float, float]]
) -> Player:
    """Return a player that takes a call at its threshold's worth and silence as nothing."""

    def worth(step: int, round_: int, seen: Sequence[Seen]) -> Floats | float:
        parts = [
            np.array([0.0, high - prior, low - prior])[one.state]
            for one, (low, high) in zip(seen, seen_bars, strict=True)
        ]
        return np.sum(parts, axis=0) if parts else 0.0

    return by_belief(prior, bars, worth)


def by_count(
    bars: Callable[[int, tuple[str, ...]], tuple[float, float]],
) -> Player:
    """Return a player with bars (minus at or below, plus at or above) on its own count.

    ``bars(step, shown)`` gets the shown states of the seen agents, ``""`` for undecided; an
    infinite bar is never reached.
    """

    def player(step: int, round_: int, seen: Sequence[Seen], tally: Floats, count: Ints) -> Ints:
        wanted = np.zeros(count.shape, dtype=np.int64)
        joint = np.stack([one.state for one in seen], axis=1)
        for states in np.unique(joint, axis=0):
            low, high = bars(step, tuple(ANSWERS[code] for code in states))
            here = (joint == states).all(axis=1)
            wanted[here & (count >= high)] = PLUS
            wanted[here & (count <= low)] = MINUS
        return wanted

    return player


def exact(group: Group, model: Enumeration, agent: int) -> Player:
    """Return the exact player of an enumerated group; its thresholds must be known."""
    (bars,) = group.thresholds[agent]
    tables = model.tables

    def worth(step: int, round_: int, seen: Sequence[Seen]) -> Floats:
        index = tables.moments.index((step, round_))
        size = seen[0].state.shape[0] if seen else 1
        label = np.zeros(size, dtype=np.int64)  # one number per joint history
        for one in seen:
            for column, base in ((one.state, 3), (one.step, group.horizon + 1), (one.round, 64)):
                label = label * base + column
        out = np.zeros(size)
        _, firsts, where = np.unique(label, return_index=True, return_inverse=True)
        for number, first in enumerate(firsts):
            history = tuple(
                None
                if one.state[first] == UNDECIDED
                else Event(int(one.step[first]), int(one.round[first]), ANSWERS[one.state[first]])
                for one in seen
            )
            out[where == number] = tables.read(agent, index, history)[1]
        return out

    return by_belief(group.prior, (bars.minus, bars.plus), worth)
