"""Many rules of bars at once against the same rules played one by one."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest

from thumbwright.exact.arrays import IntArray
from thumbwright.exact.engine import Solution, solve
from thumbwright.exact.evidence.base import Evidence
from thumbwright.exact.evidence.binary import bernoulli, coin
from thumbwright.exact.evidence.counts import binomial
from thumbwright.exact.evidence.listed import listed
from thumbwright.exact.group import Agent, Group, Thresholds, same_thresholds
from thumbwright.exact.many import Bars, changed_many, fits, play_many
from thumbwright.exact.outcomes import outcome
from thumbwright.exact.play import Act, Policy, Situation, adopt, difference

KINDS: dict[str, Evidence] = {
    "coin": coin(0.6),
    "bernoulli": bernoulli(0.3, 0.1),
    "binomial": binomial(3, 0.5, 0.3),
}


def solved(evidence: Evidence, exchange: str, horizon: int = 12, prior: float = 0.2) -> Solution:
    watched = Agent("a", evidence, same_thresholds(Thresholds(-0.9, 1.3)))
    observer = Agent("b", evidence, same_thresholds(Thresholds(-1.5, 1.2)), ("a",))
    return solve(Group((watched, observer), prior, horizon, exchange))


def random_bars(seed: int, rules: int, horizon: int, evidence: Evidence) -> Bars:
    """Bars that jump about around the mean count, from step to step; some are never reached."""
    draw = np.random.default_rng(seed)
    shape = (rules, horizon + 1, 3)
    mean = float(evidence.offsets[:, 0] @ (evidence.plus + evidence.minus)) / 2.0
    middle = np.floor(mean * np.arange(horizon + 1))[None, :, None].astype(np.int64)
    minus = middle - draw.integers(0, 6, size=shape)
    plus = middle + draw.integers(1, 7, size=shape)
    low, high = np.append(evidence.offsets[:, 0], 0).min(), evidence.offsets[:, 0].max()
    minus[draw.random(shape) < 0.1] = low * horizon - 1
    plus[draw.random(shape) < 0.1] = high * horizon + 1
    return Bars(minus, plus, draw.normal(size=(rules, 3)))


def policy(bars: Bars, number: int) -> Policy:
    def act(situation: Situation) -> Act:
        (state,) = situation.states
        return Act(
            bars.last_value[number][state],
            bars.minus_at[number, situation.step][state],
            bars.plus_at[number, situation.step][state],
        )

    return act


@pytest.mark.parametrize("exchange", ["once", "settle"])
@pytest.mark.parametrize("kind", list(KINDS))
def test_outcomes_of_many(kind: str, exchange: str) -> None:
    evidence = KINDS[kind]
    solution = solved(evidence, exchange)
    bars = random_bars(1, 25, 12, evidence)
    found = play_many(solution, 1, bars)
    undecided = 0.0
    for number in range(25):
        track = adopt(solution, "b", policy(bars, number)).track
        for side, one in enumerate(outcome(track)):
            got = [getattr(found, n)[number, side] for n in ("plus", "minus", "undecided", "steps")]
            expected = [one.plus, one.minus, one.undecided, one.mean_steps]
            assert got == pytest.approx(expected, abs=1e-12)
            half = track.leaning[2, side] / 2
            leans = [found.lean_plus[number, side], found.lean_minus[number, side]]
            assert leans == pytest.approx(
                [track.leaning[0, side] + half, track.leaning[1, side] + half], abs=1e-12
            )
            undecided = max(undecided, one.undecided)
    assert undecided > 0.01


@pytest.mark.parametrize("exchange", ["once", "settle"])
@pytest.mark.parametrize("kind", list(KINDS))
def test_how_often_many_act_differently(kind: str, exchange: str) -> None:
    evidence = KINDS[kind]
    solution = solved(evidence, exchange)
    first = random_bars(2, 1, 12, evidence)
    others = random_bars(3, 12, 12, evidence)
    # Rules that differ in little, and one that does not differ at all.
    near = [first.plus_at[0] + (np.arange(13) == step)[:, None] for step in (3, 8, 0)]
    bars = Bars(
        np.concatenate([others.minus_at, np.repeat(first.minus_at, 3, axis=0)]),
        np.concatenate([others.plus_at, np.stack(near)]),
        np.zeros((15, 3)),
    )
    found = changed_many(solution, 1, first, bars)
    prior = np.array([solution.group.prior_plus, 1.0 - solution.group.prior_plus])
    for number in range(15):
        expected = difference(solution, "b", policy(first, 0), policy(bars, number))
        assert float(found[number] @ prior) == pytest.approx(expected, abs=1e-12)
    assert found[14] == pytest.approx([0.0, 0.0], abs=1e-300)
    assert found.max() > 0.1


def test_the_order_of_rules_and_their_number_do_not_matter() -> None:
    solution = solved(coin(0.6), "once")
    bars = random_bars(4, 9, 12, coin(0.6))
    order: IntArray = np.arange(9)[::-1]
    turned = Bars(bars.minus_at[order], bars.plus_at[order], bars.last_value[order])
    one, other = play_many(solution, 1, bars), play_many(solution, 1, turned)
    single = play_many(solution, 1, Bars(bars.minus_at[:1], bars.plus_at[:1], bars.last_value[:1]))
    for name in ("plus", "minus", "undecided", "steps", "lean_plus", "lean_minus"):
        assert getattr(other, name) == pytest.approx(getattr(one, name)[order], abs=1e-15)
        assert getattr(single, name)[0] == pytest.approx(getattr(one, name)[0], abs=1e-15)


def agents_with(**changes: Any) -> Group:
    """A pair that fits, but for what is changed in the observer."""
    bars = same_thresholds(Thresholds(-1.0, 1.0))
    observer: dict[str, Any] = {"evidence": coin(0.6), "thresholds": bars, "sees": ("a",)}
    group = (
        Agent("a", coin(0.6), bars, changes.pop("watched_sees", ())),
        Agent("b", **{**observer, **changes}),
        Agent("c", coin(0.6), bars),
    )
    return Group(group, 0.0, 5)


def test_which_groups_are_priced_together() -> None:
    assert fits(solve(agents_with()), 1)
    certain = listed([0.5, 0.5, 0.0], [0.3, 0.5, 0.2])
    four = listed([0.1, 0.2, 0.3, 0.4], [0.37, 0.31, 0.19, 0.13])
    # After a call of the one seen nobody stays undecided, and the one seen has no reading for it.
    narrow = same_thresholds(Thresholds(-0.1, 0.1))
    unsure = tuple((0.5, Thresholds(-m, m)) for m in (1.0, 2.0))
    assert isinstance(certain, Evidence)
    assert isinstance(four, Evidence)
    assert not four.on_ladder
    for changes in (
        {"sees": ()},
        {"sees": ("a", "c")},
        {"watched_sees": ("b",), "thresholds": narrow},
        {"evidence": certain},
        {"evidence": four},
        {"thresholds": unsure},
    ):
        assert not fits(solve(agents_with(**changes)), 1), changes
    # Being watched is no hindrance where silence always has a reading.
    assert fits(solve(agents_with(watched_sees=("b",))), 1)
    bars = same_thresholds(Thresholds(-1.0, 1.0))
    chain = Group(
        (
            Agent("a", coin(0.6), bars),
            Agent("b", coin(0.6), bars, ("a",)),
            Agent("c", coin(0.6), bars, ("b",)),
        ),
        0.0,
        5,
    )
    assert fits(solve(chain), 1)
    solution, bars_ = solve(chain), random_bars(5, 2, 5, coin(0.6))
    found, track = play_many(solution, 1, bars_), adopt(solution, "b", policy(bars_, 1)).track
    assert found.steps[1, 0] == pytest.approx(outcome(track)[0].mean_steps, abs=1e-12)
