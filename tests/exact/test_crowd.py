"""Crowds against the tensor engine and against the enumeration of observations."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest
from hypothesis import assume, example, given, settings, strategies as st

from tests.exact.comparing import COIN, UNSURE, built, evidence, gap, thresholds
from tests.exact.crowds import (
    ALPHA,
    BIASED,
    CERTAIN,
    OUTCOME,
    UNKNOWN,
    bars,
    even,
    kind,
    lumps_apart,
    lumps_of_crowd,
    lumps_of_network,
    network,
    play_apart,
)
from tests.exact.test_together import apart, counted
from tests.slow import group as slow
from tests.slow.enumerate import enumerate_group
from thumbwright.exact.arrays import FloatArray, IntArray
from thumbwright.exact.crowd import (
    Crowd,
    Kind,
    enumerate_crowd,
    enumerate_situations,
    kinds_of,
    sample_crowd,
)
from thumbwright.exact.crowd_play import Histories
from thumbwright.exact.engine import solve
from thumbwright.exact.evidence.binary import bernoulli, coin
from thumbwright.exact.group import (
    Thresholds,
    same_thresholds,
)


def test_a_crowd_is_recognised_and_sorted() -> None:
    one, other = bars(-2, 4), bars(-3, 3)
    crowd = Crowd(
        (kind(3, one), kind(2, other), Kind(bernoulli(0.6, 0.4), one, ("x",), (1, 0, 1, 1)))
    )
    group = network(crowd, 0.0, 4, "once")
    shuffled = replace(group, agents=tuple(group.agents[k] for k in (5, 0, 3, 1, 4, 2)))
    found = kinds_of(shuffled)
    assert found is not None
    assert [set(k.members) for k in found.kinds] == [
        {"x"},
        set(crowd.kinds[0].members),
        set(crowd.kinds[1].members),
    ]
    assert found.kinds[0].looks == (1, 0, 1, 1)
    assert found.size == 6
    # Equal numbers are equal evidence, whatever it is called and whoever built it.
    again = Crowd((Kind(coin(0.6), one, ("a",)), Kind(coin(0.6), one, ("b",))))
    merged = kinds_of(network(again, 0.0, 4, "once"))
    assert merged is not None
    assert [k.members for k in merged.kinds] == [("a", "b")]


def test_what_is_no_crowd() -> None:
    group = network(even(3), 0.0, 4, "once")
    blind = replace(group.agents[1], sees=group.agents[1].sees[:1])
    assert kinds_of(replace(group, agents=(group.agents[0], blind, group.agents[2]))) is None
    single = kinds_of(network(even(1), 0.0, 4, "once"))
    assert single is not None
    assert single.size == 1


# --- against the tensor engine -------------------------------------------------------------------

CROWDS = {
    "three alike": (Crowd((kind(3, bars(-2, 4)),)), 0.0, 9),
    "three alike, biased": (Crowd((kind(3, bars(-2, 3), BIASED),)), -0.6, 6),
    "three, unknown thresholds": (Crowd((kind(3, UNKNOWN),)), 0.25, 6),
    "two and one": (Crowd((kind(2, bars(-2, 3)), kind(1, bars(-3, 2), BIASED))), 0.4, 6),
    "one of each": (
        Crowd((kind(1, bars(-2, 3)), kind(1, bars(-3, 2), BIASED), kind(1, UNKNOWN))),
        -0.3,
        5,
    ),
    "certain evidence": (Crowd((kind(2, bars(-3, 3), CERTAIN), kind(1, bars(-2, 3)))), 0.2, 5),
    "timetables": (
        Crowd(
            (kind(2, bars(-2, 3), looks=(1, 1, 0, 2, 1)), kind(1, UNKNOWN, looks=(0, 0, 1, 1, 1)))
        ),
        0.1,
        5,
    ),
    "four alike": (Crowd((kind(4, bars(-2, 3)),)), 0.0, 5),
    "two and two": (Crowd((kind(2, bars(-2, 3)), kind(2, bars(-1, 2), BIASED))), 0.3, 4),
    "three and one unknown": (Crowd((kind(3, bars(-2, 2)), kind(1, UNKNOWN))), -0.2, 4),
}


@pytest.mark.parametrize("exchange", ["once", "settle"])
@pytest.mark.parametrize("name", CROWDS)
def test_a_small_crowd_agrees_with_the_tensor_engine(name: str, exchange: str) -> None:
    crowd, prior, horizon = CROWDS[name]
    solution = solve(network(crowd, prior, horizon, exchange))
    play = enumerate_crowd(crowd, prior, horizon, exchange)
    assert play_apart(play, solution) < 1e-10
    assert play.dropped == (0.0, 0.0)
    assert not play.sampled
    for number, one in enumerate(crowd.kinds):
        got = lumps_of_crowd(enumerate_situations(crowd, number, prior, horizon, exchange))
        expected = lumps_of_network(solution, one.members[0], crowd)
        assert lumps_apart(got, expected) < 1e-10


def test_near_ties_are_reported_with_their_mass() -> None:
    for short in (5e-10, -5e-10):
        crowd = Crowd((kind(3, same_thresholds(Thresholds(-0.9, 2 * ALPHA + short))),))
        solution = solve(network(crowd, 0.0, 5, "settle"))
        play = enumerate_crowd(crowd, 0.0, 5, "settle")
        assert solution.near_tie_mass > 0.1
        assert play_apart(play, solution) < 1e-10
        sampled = sample_crowd(crowd, 0.0, 5, "settle", 2000, 1)
        assert sampled.near_tie_mass == pytest.approx(play.near_tie_mass, rel=0.1)


def test_a_broken_belief_is_caught(monkeypatch: pytest.MonkeyPatch) -> None:
    """Whoever reads its own silence as evidence plays another game."""
    crowd, prior, horizon = CROWDS["two and one"]
    solution = solve(network(crowd, prior, horizon, "once"))
    right = Histories.worth

    def wrong(self: Histories, kind: int, columns: IntArray) -> FloatArray:
        left = self.log_left[kind][:, columns]
        own = np.where(self.free[kind, columns] > 0, left[0] - left[1], 0.0)
        return right(self, kind, columns) + own

    monkeypatch.setattr(Histories, "worth", wrong)
    assert play_apart(enumerate_crowd(crowd, prior, horizon, "once"), solution) > 1e-3
    broken = lumps_of_crowd(enumerate_situations(crowd, 0, prior, horizon, "once"))
    member = crowd.kinds[0].members[0]
    assert lumps_apart(broken, lumps_of_network(solution, member, crowd)) > 1e-3


# --- against the enumeration of observations -----------------------------------------------------


@st.composite
def small_crowds(draw: st.DrawFn) -> slow.Group:
    """Two or three who all see each other, of one or more kinds, few enough to enumerate."""
    size = draw(st.sampled_from([2, 3, 3]))
    longest = {2: 5, 3: 4}[size]
    prior_plus = draw(st.sampled_from([0.5, 0.3, 0.6, 0.85]))
    prior = math.log(prior_plus / (1.0 - prior_plus))
    kinds = []
    for _ in range(draw(st.sampled_from([1, 1, 2]))):
        masses = draw(evidence(2))
        kinds.append((masses, draw(thresholds(masses, prior))))
    chosen = [kinds[k % len(kinds)] for k in range(size)]
    return slow.Group(
        tuple(tuple(k for k in range(size) if k != i) for i in range(size)),
        tuple(masses for masses, _ in chosen),
        tuple(levels for _, levels in chosen),
        draw(st.integers(1, longest)),
        draw(st.sampled_from(["once", "settle"])),
        prior_plus,
    )


@settings(max_examples=60)
@given(small_crowds())
@example(slow.Group(((1, 2), (0, 2), (0, 1)), (COIN,) * 3, (UNSURE,) * 3, 4, "settle", 0.6))
@example(slow.Group(((1, 2), (0, 2), (0, 1)), (COIN,) * 3, (UNSURE,) * 3, 4, "once", 0.5))
def test_random_crowds_agree_with_enumeration(group: slow.Group) -> None:
    model = enumerate_group(group)
    assume(model.narrowest > 1e-11)
    assume(not any(mass for near in model.near_tie for mass in near))
    here = built(group)
    crowd = kinds_of(here)
    assert crowd is not None
    play = enumerate_crowd(crowd, here.prior, here.horizon, here.exchange)
    assert apart(play.together, counted(model, group.horizon)) < 1e-10
    for one, found in zip(crowd.kinds, play.kinds, strict=True):
        for member in one.members:
            sides = model.given_plus, model.given_minus
            for got, side in zip(found.given, sides, strict=True):
                expected = side[here.index[member]]
                for name in OUTCOME[:4]:
                    assert gap(getattr(got, name), getattr(expected, name)) < 1e-10
                assert gap(got.mean_steps, expected.mean_step) < 1e-10
