"""One agent watching another, followed by counts over long horizons with plain dictionaries.

The watched agent sees nobody, so its walk is its own; the observer's walk runs beside it. Given
the answer, the pair (what the watched agent has counted or called, what the observer has
counted) is a Markov chain, and its probabilities are carried in a dictionary from step to step.
Nothing is approximated, and nothing is shared with the engine.

A watched agent that sees nobody cannot be influenced, so holding the observer undecided changes
nothing, and the worth of what it shows is the plain log ratio of the probabilities of its own
walk: of a first passage at a step for a call, of no passage so far for silence.

In a settle step there is always one second look here. Where the model holds no second round the
watched agent cannot have called in that step, so the look shows nothing new and changes nothing
for a rule that reads step, shown state and count.
"""

from __future__ import annotations

import math
from collections import defaultdict
from collections.abc import Callable
from dataclasses import dataclass
from typing import NamedTuple

TIE = 1e-9
"""A belief this close to a threshold (nats) has reached it."""


class Call(NamedTuple):
    """A commitment as the observer sees it: step, and ``"plus"`` or ``"minus"``."""

    step: int
    answer: str


Rule = Callable[[int, Call | None, int], str | None]
"""(step, what the watched agent shows, own count) -> answer or ``None``."""


@dataclass(frozen=True)
class Source:
    """Evidence of two values: a sign for plus with probability ``p_plus`` or ``p_minus``.

    ``low`` is what the other value adds to the count: -1 for a coin, 0 for counted signs.
    """

    p_plus: float
    p_minus: float
    low: int

    def masses(self, answer: str) -> tuple[tuple[int, float], tuple[int, float]]:
        """Return (what is added to the count, probability) of both values."""
        p = self.p_plus if answer == "plus" else self.p_minus
        return (1, p), (self.low, 1.0 - p)

    def tally(self, count: int, step: int) -> float:
        """Return the evidence behind a count after so many observations, nats."""
        signs = (count - self.low * step) // (1 - self.low)
        up = math.log(self.p_plus / self.p_minus)
        down = math.log((1.0 - self.p_plus) / (1.0 - self.p_minus))
        return signs * up + (step - signs) * down


def coin(p: float) -> Source:
    """Return evidence of one count up or down, right with probability ``p``."""
    return Source(p, 1.0 - p, -1)


def bernoulli(p_plus: float, p_minus: float) -> Source:
    """Return evidence that counts signs."""
    return Source(p_plus, p_minus, 0)


@dataclass(frozen=True)
class Pair:
    """The observer watches one agent. Thresholds are (minus, plus) on the belief, nats."""

    watched: Source
    watched_bars: tuple[float, float]
    observer: Source
    observer_bars: tuple[float, float]
    horizon: int
    exchange: str = "once"
    prior: float = 0.0


def _answer(belief: float, bars: tuple[float, float]) -> str | None:
    if belief >= bars[1] - TIE:
        return "plus"
    return "minus" if belief <= bars[0] + TIE else None


def watched_walk(pair: Pair, answer: str) -> tuple[dict[Call, float], list[float]]:
    """Return the law of the watched agent's call, and P(no call by the end of step t), t >= 0."""
    calls: dict[Call, float] = {}
    silent = [1.0]
    walk = {0: 1.0}
    for step in range(1, pair.horizon + 1):
        ahead: dict[int, float] = defaultdict(float)
        for count, mass in walk.items():
            for add, p in pair.watched.masses(answer):
                ahead[count + add] += mass * p
        walk = {}
        for count, mass in ahead.items():
            belief = pair.prior + pair.watched.tally(count, step)
            said = _answer(belief, pair.watched_bars)
            if said is None:
                walk[count] = mass
            else:
                calls[Call(step, said)] = calls.get(Call(step, said), 0.0) + mass
        silent.append(math.fsum(walk.values()))
    return calls, silent


class Worths:
    """What the watched agent's state is worth to the observer, nats."""

    def __init__(self, pair: Pair) -> None:
        plus, silent_plus = watched_walk(pair, "plus")
        minus, silent_minus = watched_walk(pair, "minus")
        self.calls = {call: math.log(plus[call] / minus[call]) for call in plus}
        self.silence = [
            math.log(up / down) if up > 0.0 else math.nan
            for up, down in zip(silent_plus, silent_minus, strict=True)
        ]
        """By number of steps shown; not a number where silence has probability zero."""

    def of(self, shown: Call | None, steps_shown: int) -> float:
        """Return the worth of a state after so many shown steps."""
        return self.silence[steps_shown] if shown is None else self.calls[shown]


LookRule = Callable[[int, int, Call | None, int], str | None]
"""(step, steps shown, what the watched agent shows, own count) -> answer or ``None``."""


def exact(pair: Pair) -> LookRule:
    """Return the observer that reasons by Bayes' rule with its own thresholds."""
    worths = Worths(pair)

    def rule(step: int, steps_shown: int, shown: Call | None, count: int) -> str | None:
        belief = pair.prior + pair.observer.tally(count, step) + worths.of(shown, steps_shown)
        return _answer(belief, pair.observer_bars)

    return rule


def plain_count(pair: Pair) -> LookRule:
    """Return the observer that takes a call at its threshold's worth and silence as nothing."""

    def rule(step: int, steps_shown: int, shown: Call | None, count: int) -> str | None:
        news = 0.0
        if shown is not None:
            news = pair.watched_bars[shown.answer == "plus"] - pair.prior
        belief = pair.prior + pair.observer.tally(count, step) + news
        return _answer(belief, pair.observer_bars)

    return rule


def alone(pair: Pair) -> LookRule:
    """Return the observer that does not look."""

    def rule(step: int, steps_shown: int, shown: Call | None, count: int) -> str | None:
        return _answer(pair.prior + pair.observer.tally(count, step), pair.observer_bars)

    return rule


def valued(pair: Pair, value: Callable[[int, Call | None], float]) -> LookRule:
    """Return the observer that puts ``value(step, shown)`` nats in place of the exact worth."""

    def rule(step: int, steps_shown: int, shown: Call | None, count: int) -> str | None:
        belief = pair.prior + pair.observer.tally(count, step) + value(step, shown)
        return _answer(belief, pair.observer_bars)

    return rule


def reading(rule: Rule) -> LookRule:
    """Return a rule of step, shown state and count in the form that :func:`play` takes."""
    return lambda step, steps_shown, shown, count: rule(step, shown, count)


@dataclass(frozen=True)
class Result:
    """What the observer ends up doing given one answer (probabilities; steps).

    ``mean_step`` counts an undecided observer with the whole horizon. ``left`` is the mass of
    (shown at the end, own count) while undecided at the horizon.
    """

    plus: float
    minus: float
    undecided: float
    mean_step: float
    mean_step_if_decided: float | None
    left: dict[tuple[Call | None, int], float]


State = tuple[int | Call, int, str | None, str | None]
"""The watched agent's count or call, the observer's count, what two rules have answered."""


def _shown(watched: int | Call) -> Call | None:
    return watched if isinstance(watched, Call) else None


def _step(
    pair: Pair, answer: str, step: int, masses: dict[State, float], rules: tuple[LookRule, LookRule]
) -> dict[State, float]:
    """Carry the joint law through one step."""
    looks: dict[State, float] = defaultdict(float)
    for (watched, count, first, second), mass in masses.items():
        watched_moves: list[tuple[int | Call, float]] = [(watched, 1.0)]
        if not isinstance(watched, Call):
            watched_moves = []
            for add, p in pair.watched.masses(answer):
                belief = pair.prior + pair.watched.tally(watched + add, step)
                said = _answer(belief, pair.watched_bars)
                watched_moves.append((watched + add if said is None else Call(step, said), p))
        before = _shown(watched)
        for add, p in pair.observer.masses(answer):
            own = count + add
            one = first or rules[0](step, step - 1, before, own)
            two = second or rules[1](step, step - 1, before, own)
            for now, q in watched_moves:
                looks[(now, own, one, two)] += mass * p * q
    if pair.exchange == "once":
        return looks
    settled: dict[State, float] = defaultdict(float)
    for (watched, count, first, second), mass in looks.items():
        one = first or rules[0](step, step, _shown(watched), count)
        two = second or rules[1](step, step, _shown(watched), count)
        settled[(watched, count, one, two)] += mass
    return settled


def play(pair: Pair, rule: LookRule, answer: str) -> Result:
    """Return what an observer with this rule does when ``answer`` is true."""
    masses: dict[State, float] = {(0, 0, None, None): 1.0}
    said = {"plus": 0.0, "minus": 0.0}
    steps = 0.0
    for step in range(1, pair.horizon + 1):
        masses = _step(pair, answer, step, masses, (rule, lambda *_: None))
        waiting: dict[State, float] = {}
        for state, mass in masses.items():
            if state[2] is None:
                waiting[state] = mass
            else:
                said[state[2]] += mass
                steps += step * mass
        masses = waiting
    left: dict[tuple[Call | None, int], float] = defaultdict(float)
    for state, mass in masses.items():
        left[(_shown(state[0]), state[1])] += mass
    undecided = math.fsum(masses.values())
    decided = said["plus"] + said["minus"]
    return Result(
        said["plus"],
        said["minus"],
        undecided,
        steps + pair.horizon * undecided,
        steps / decided if decided > 0.0 else None,
        dict(left),
    )


@dataclass(frozen=True)
class Comparison:
    """Two rules on the same observations given one answer.

    ``ends`` is the joint law of their answers (``None``: undecided at the horizon);
    ``step_gap`` the mean absolute difference of their steps, undecided counted as the horizon.
    """

    ends: dict[tuple[str | None, str | None], float]
    step_gap: float

    @property
    def agreement(self) -> float:
        """Probability that both end the same way, both undecided included."""
        return math.fsum(mass for (one, two), mass in self.ends.items() if one == two)


def compare(pair: Pair, first: LookRule, second: LookRule, answer: str) -> Comparison:
    """Return how two observers that watch and observe the same differ."""
    masses: dict[State, float] = {(0, 0, None, None): 1.0}
    ends: dict[tuple[str | None, str | None], float] = defaultdict(float)
    gap = 0.0
    for step in range(1, pair.horizon + 1):
        masses = _step(pair, answer, step, masses, (first, second))
        waiting: dict[State, float] = {}
        for state, mass in masses.items():
            if state[2] is not None and state[3] is not None:
                ends[(state[2], state[3])] += mass
            else:
                waiting[state] = mass
        masses = waiting
        if step < pair.horizon:
            # The gap of two steps is the number of steps after which one has answered only.
            gap += math.fsum(m for s, m in masses.items() if (s[2] is None) != (s[3] is None))
    for state, mass in masses.items():
        ends[(state[2], state[3])] += mass
    return Comparison(dict(ends), gap)


def differ(pair: Pair, first: LookRule, second: LookRule, answer: str) -> float:
    """Return the probability that two observers with the same observations ever act differently.

    Within a settle step, answering at the first look or at the second counts as the same.
    """
    masses: dict[State, float] = {(0, 0, None, None): 1.0}
    apart = 0.0
    for step in range(1, pair.horizon + 1):
        masses = _step(pair, answer, step, masses, (first, second))
        apart += math.fsum(mass for state, mass in masses.items() if state[2] != state[3])
        masses = {s: mass for s, mass in masses.items() if s[2] is None and s[3] is None}
    return apart
