"""Rules played by the engine against the enumeration, the pair walk and the simulation."""

from __future__ import annotations

import dataclasses
import math
from functools import cache

import numpy as np
import pytest
from hypothesis import assume, event, given, settings, strategies as st

from tests.exact.comparing import COIN, built, groups, track_apart
from tests.slow import group as slow, pair_walk as walk
from tests.slow.enumerate import Enumeration, enumerate_group, play_rule
from thumbwright.exact.engine import Solution, Track, solve
from thumbwright.exact.evidence.binary import coin
from thumbwright.exact.group import Agent, Group, Thresholds, same_thresholds
from thumbwright.exact.outcomes import outcome
from thumbwright.exact.play import (
    NEVER,
    Act,
    Policy,
    Situation,
    adopt,
    difference,
    exact_policy,
)

ALPHA = math.log(1.5)
CODES = {None: 0, "plus": 1, "minus": 2}


class Whim:
    """A rule with a random value for every step and shown state, in both forms.

    Values come from a seed, so the engine and the enumeration are given the same rule.
    """

    def __init__(self, group: slow.Group, adopter: int, seed: int) -> None:
        self._prior = group.prior
        (self._bars,) = group.thresholds[adopter]
        self._seed = seed
        self.narrowest = math.inf

    @cache  # noqa: B019 - lives as long as one example
    def value(self, step: int, states: tuple[int, ...]) -> float:
        """Nats."""
        return float(np.random.default_rng([self._seed, step, *states]).normal(0.0, 0.8))

    def policy(self, situation: Situation) -> Act:
        values = np.zeros(situation.shape)
        states = [np.broadcast_to(s, situation.shape) for s in situation.states]
        for index in np.ndindex(*situation.shape):
            values[index] = self.value(situation.step, tuple(int(s[index]) for s in states))
        return Act(values)

    def rule(
        self, step: int, _round: int, seen: slow.Shown, tally: float, _own: tuple[int, ...]
    ) -> str | None:
        states = tuple(0 if e is None else CODES[e.answer] for e in seen)
        belief = self._prior + tally + self.value(step, states)
        low, high = self._bars.minus + 1e-9, self._bars.plus - 1e-9
        self.narrowest = min(self.narrowest, abs(belief - low), abs(belief - high))
        return "plus" if belief >= high else "minus" if belief <= low else None


def off_model(played: Enumeration, group: slow.Group) -> float:
    """Expected number of odd commitments met, averaged over the prior."""
    plus, minus = played.odd_commitments
    return group.prior_plus * plus + (1.0 - group.prior_plus) * minus


@st.composite
def adoptions(draw: st.DrawFn) -> tuple[slow.Group, int, int]:
    """A random group, one of its agents with known thresholds, and a seed for its rule."""
    group = draw(groups())
    adopter = draw(st.integers(0, len(group.sees) - 1))
    bars = list(group.thresholds)
    bars[adopter] = (bars[adopter][0]._replace(share=1.0),)
    return dataclasses.replace(group, thresholds=tuple(bars)), adopter, draw(st.integers(0, 999))


@settings(max_examples=60)
@given(adoptions())
def test_random_rules_agree_with_enumeration(case: tuple[slow.Group, int, int]) -> None:
    group, adopter, seed = case
    model = enumerate_group(group)
    whim = Whim(group, adopter, seed)
    played = play_rule(group, model, adopter, whim.rule, rounds="actual")
    assume(min(model.narrowest, played.narrowest, whim.narrowest) > 1e-11)
    here = built(group)
    play = adopt(solve(here), f"a{adopter}", whim.policy)
    odd = off_model(played, group) > 0.0
    event(f"{len(group.sees)} agents, influences {here.influences(adopter)}, odd {odd}")
    # How several agents' odd commitments are read together is settled for pairs only.
    assume(len(group.sees) < 3 or not odd or not here.influences(adopter))
    assert track_apart(played, adopter, play.track) < 1e-10
    # Whoever is misled without reaching the adopter is not followed by the engine.
    expected = off_model(played, group) if here.influences(adopter) else 0.0
    assert play.off_model == pytest.approx(expected, abs=1e-10)


def coin_group(
    bars: list[tuple[float, float]], sees: list[tuple[int, ...]], horizon: int
) -> slow.Group:
    """Coin 0.6, thresholds in its steps."""
    thresholds = tuple((slow.Thresholds(low * ALPHA, high * ALPHA),) for low, high in bars)
    return slow.Group(tuple(sees), (COIN,) * len(bars), thresholds, horizon)


def at_once(situation: Situation) -> Act:
    """Answer plus whatever happens."""
    return Act(np.full(situation.shape, 99.0))


def test_an_odd_commitment_beside_another_one_is_counted() -> None:
    """The adopter answers at step 1, too early for its thresholds, and so does a third agent."""
    group = coin_group([(-2, 2), (-3, 3), (-1, 1)], [(1,), (0, 2), ()], 3)
    played = play_rule(group, enumerate_group(group), 0, lambda *_: "plus")
    assert off_model(played, group) == pytest.approx(1.0, abs=1e-12)
    assert adopt(solve(built(group)), "a0", at_once).off_model == pytest.approx(1.0, abs=1e-12)


def test_an_odd_commitment_before_certain_evidence_is_counted() -> None:
    """The watcher is shown it while undecided, whatever it observes in the next step."""
    sure = ((0.5, 0.0), (0.5, 1.0))
    bars = ((slow.Thresholds(-2 * ALPHA, 2 * ALPHA),), (slow.Thresholds(-3.0, 3.0),))
    group = slow.Group(((1,), (0,)), (COIN, sure), bars, 3)
    played = play_rule(group, enumerate_group(group), 0, lambda *_: "plus")
    assert off_model(played, group) == pytest.approx(0.75, abs=1e-12)
    assert adopt(solve(built(group)), "a0", at_once).off_model == pytest.approx(0.75, abs=1e-12)


def test_commitments_of_the_same_moment_are_read_together() -> None:
    """Two agents always answer at step 1; whoever sees both must not take either for odd.

    The adopter watches the one who sees them, and repeats its answer.
    """
    group = coin_group([(-9, 9), (-2, 2), (-1, 1), (-1, 1)], [(1,), (0, 2, 3), (), ()], 4)

    def policy(situation: Situation) -> Act:
        return Act(np.array([0.0, 99.0, -99.0])[situation.states[0]])

    def rule(_step: int, _round: int, seen: slow.Shown, *_: object) -> str | None:
        return None if seen[0] is None else seen[0].answer

    model = enumerate_group(group)
    played = play_rule(group, model, 0, rule)
    assert played.given_plus[1].plus == pytest.approx(model.given_plus[1].plus, abs=1e-12)
    play = adopt(solve(built(group)), "a0", policy)
    assert track_apart(played, 0, play.track) < 1e-12
    assert play.off_model == pytest.approx(0.0, abs=1e-300)


@pytest.mark.parametrize("call_at", [1, 3, 5])
def test_the_answer_to_an_odd_commitment_comes_back(call_at: int) -> None:
    """A mutual pair: the adopter waits for an answer to what it would not exactly have shown."""
    group = coin_group([(-2, 2), (-3, 3)], [(1,), (0,)], 7)

    def rule(step: int, _round: int, seen: slow.Shown, tally: float, _own: object) -> str | None:
        if seen[0] is not None:
            return seen[0].answer
        return "plus" if step == call_at and tally > -ALPHA / 2 else None

    def policy(situation: Situation) -> Act:
        state = situation.states[0]
        plus = np.where(state == 1, -NEVER, NEVER)
        plus = np.where((state == 0) & (situation.step == call_at), 0, plus)
        return Act(np.zeros(situation.shape), np.where(state == 2, NEVER, -NEVER), plus)

    model = enumerate_group(group)
    played = play_rule(group, model, 0, rule)
    agents = [
        Agent(f"a{k}", coin(0.6), same_thresholds(Thresholds(t.minus, t.plus)), (f"a{1 - k}",))
        for k, (t,) in enumerate(group.thresholds)
    ]
    play = adopt(solve(Group(tuple(agents), 0.0, 7)), "a0", policy)
    assert track_apart(played, 0, play.track) < 1e-12
    assert play.off_model == pytest.approx(off_model(played, group), abs=1e-12)


# --- one-way pairs over long horizons -----------------------------------------------------------


def pair_case(
    watched: tuple[int, int], observer: tuple[int, int], horizon: int, exchange: str = "once"
) -> tuple[walk.Pair, Solution]:
    """The same one-way pair for the walk and for the engine; agent ``b`` watches ``a``."""
    bars = [Thresholds(low * ALPHA, high * ALPHA) for low, high in (watched, observer)]
    pair = walk.Pair(
        walk.coin(0.6),
        (bars[0].minus, bars[0].plus),
        walk.coin(0.6),
        (bars[1].minus, bars[1].plus),
        horizon,
        exchange,
    )
    agents = (
        Agent("a", coin(0.6), same_thresholds(bars[0])),
        Agent("b", coin(0.6), same_thresholds(bars[1]), ("a",)),
    )
    return pair, solve(Group(agents, 0.0, horizon, exchange))


CARD = {0: (-4, 3), 1: (-7, -1), 2: (-1, 5)}
"""Bars by shown state; undecided in the first two steps is -3 instead."""


def card_rule(step: int, shown: walk.Call | None, count: int) -> str | None:
    low, high = CARD[CODES[shown.answer if shown else None]]
    low = -3 if shown is None and step <= 2 else low
    return "plus" if count >= high else "minus" if count <= low else None


def card_policy(situation: Situation) -> Act:
    state = situation.states[0]
    low = np.array([CARD[code][0] for code in (0, 1, 2)])[state]
    low = np.where((state == 0) & (situation.step <= 2), -3, low)
    high = np.array([CARD[code][1] for code in (0, 1, 2)])[state]
    row = np.array([1, 2, 3])[state]
    row = np.where((state == 0) & (situation.step <= 2), 0, row)
    return Act(np.array([0.3, 1.6, -0.8])[state], low, high, row)


def plain_policy(watched: tuple[int, int]) -> Policy:
    """A call is worth the watched agent's threshold, silence nothing."""
    values = np.array([0.0, watched[1] * ALPHA, watched[0] * ALPHA])
    return lambda situation: Act(values[situation.states[0]])


def pair_apart(pair: walk.Pair, rule: walk.LookRule, play_track: Track) -> float:
    """Largest difference between the walk's result and a track, in any outcome."""
    worst = 0.0
    for got, side in zip(outcome(play_track), ("plus", "minus"), strict=True):
        expected = walk.play(pair, rule, side)
        for name, other in (
            ("plus", "plus"),
            ("minus", "minus"),
            ("undecided", "undecided"),
            ("mean_steps", "mean_step"),
        ):
            worst = max(worst, abs(getattr(got, name) - getattr(expected, other)))
    return worst


@pytest.mark.parametrize("exchange", ["once", "settle"])
@pytest.mark.parametrize(
    ("watched", "observer"), [((-2, 4), (-3, 3)), ((-2, 6), (-3, 3)), ((-3, 2), (-2, 5))]
)
def test_long_pairs_agree_with_the_walk(
    watched: tuple[int, int], observer: tuple[int, int], exchange: str
) -> None:
    pair, solution = pair_case(watched, observer, 60, exchange)
    exact, card, plain = walk.exact(pair), walk.reading(card_rule), walk.plain_count(pair)
    assert pair_apart(pair, exact, solution.tracks[1]) < 1e-12
    played = adopt(solution, "b", exact_policy(solution, "b"))
    assert pair_apart(pair, exact, played.track) < 1e-12
    assert pair_apart(pair, card, adopt(solution, "b", card_policy).track) < 1e-12
    by_count = adopt(solution, "b", plain_policy(watched))
    assert pair_apart(pair, plain, by_count.track) < 1e-12
    # And the comparison can fail: another rule's figures are not met.
    assert pair_apart(pair, card, by_count.track) > 1e-3


def test_the_probability_of_ever_acting_differently() -> None:
    pair, solution = pair_case((-2, 4), (-3, 3), 40)
    rules = [
        (walk.exact(pair), exact_policy(solution, "b")),
        (walk.reading(card_rule), card_policy),
        (walk.plain_count(pair), plain_policy((-2, 4))),
    ]
    for first, one in rules:
        for second, other in rules:
            given = [walk.differ(pair, first, second, side) for side in ("plus", "minus")]
            got = difference(solution, "b", one, other)
            assert got == pytest.approx(sum(given) / 2, abs=1e-12)
    assert difference(solution, "b", rules[0][1], rules[2][1]) > 0.1


def test_how_often_each_line_is_used() -> None:
    """Counted in the enumeration branch by branch: who was where at the start of each step."""
    group = coin_group([(-2, 4), (-3, 3)], [(), (0,)], 7)
    model = enumerate_group(group)

    def rule(step: int, _round: int, seen: slow.Shown, _tally: float, own: object) -> str | None:
        assert isinstance(own, tuple)
        shown = None if seen[0] is None else walk.Call(seen[0].step, seen[0].answer)
        return card_rule(step, shown, len(own) - 2 * sum(own))

    used = np.zeros((4, 2))
    for branch in play_rule(group, model, 1, rule).branches:
        mass = (branch.plus + branch.minus) / 2
        watched, own = branch.shown
        for step in range(1, (own.step if own else 7) + 1):
            seen = watched if watched is not None and watched.step < step else None
            line = {"plus": 2, "minus": 3}[seen.answer] if seen else (0 if step <= 2 else 1)
            used[line, 0] += mass
            if own is not None and own.step == step:
                used[line, 1] += mass
    _, solution = pair_case((-2, 4), (-3, 3), 7)
    usage = adopt(solution, "b", card_policy, rows=4).usage
    assert usage is not None
    assert usage == pytest.approx(used, abs=1e-12)
    assert (used[1:] > 0.01).all()
