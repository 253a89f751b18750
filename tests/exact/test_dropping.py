"""Rare display events left out on request, and what that can change."""

from __future__ import annotations

import numpy as np
import pytest

from tests.bench.networks import Sees, chain, crowd, network, relay, star, two_way_ring
from thumbwright.exact.engine import Solution, solve
from thumbwright.exact.errors import ModelError
from thumbwright.exact.play import adopt, exact_policy


def events(solution: Solution) -> int:
    return sum(len(track.events) for track in solution.tracks)


def apart(one: Solution, other: Solution) -> np.ndarray:  # type: ignore[type-arg]
    """Greatest difference in the probability of any set of ends of an agent, per answer."""
    worst = np.zeros(2)
    for a, b in zip(one.tracks, other.tracks, strict=True):
        ends = [
            np.concatenate([t.answers.transpose(1, 0, 2).reshape(2, -1), t.leaning.T], axis=1)
            for t in (a, b)
        ]
        gap = ends[0] - ends[1]
        for sign in (1, -1):
            worst = np.maximum(worst, np.maximum(sign * gap, 0.0).sum(axis=1))
    return worst


CASES: list[tuple[Sees, int, str, float]] = [
    (crowd(2), 40, "settle", 3e-4),
    (crowd(3), 10, "settle", 3e-3),
    (crowd(3), 12, "once", 1e-2),
    (star(3), 12, "settle", 1e-3),
    (relay(5), 16, "settle", 1e-5),
    (relay(5), 16, "settle", 1e-3),
    (chain(4), 8, "settle", 5e-3),
    (two_way_ring(5), 6, "settle", 1e-3),
]


@pytest.mark.parametrize(("sees", "horizon", "exchange", "drop"), CASES)
def test_what_is_dropped_bounds_what_changes(
    sees: Sees, horizon: int, exchange: str, drop: float
) -> None:
    group = network(sees, horizon, exchange)
    full, less = solve(group), solve(group, drop=drop)
    assert events(less) < events(full)
    assert less.dropped_mass > 0
    assert less.dropped_mass == pytest.approx(sum(less.dropped) / 2)
    bound = np.add(less.dropped, less.doubtful)
    assert (apart(full, less) <= bound + 1e-12).all()
    assert less.uncertainty == pytest.approx(min(1.0, bound.mean()))
    if all(set(seen) >= group.sources(i) for i, seen in enumerate(sees)):
        assert less.doubtful == (0.0, 0.0)


@pytest.mark.parametrize(("sees", "horizon", "exchange", "drop"), CASES[:4])
def test_where_all_is_seen_the_worth_of_what_is_kept_does_not_change(
    sees: Sees, horizon: int, exchange: str, drop: float
) -> None:
    group = network(sees, horizon, exchange)
    full, less = solve(group), solve(group, drop=drop)
    for one, other in zip(full.tracks, less.tracks, strict=True):
        moments = {(m.step, m.round): m for m in one.moments}
        for moment in other.moments:
            index = (0,) * moment.value.ndim
            before = moments[moment.step, moment.round]
            assert float(moment.value[index]) == pytest.approx(float(before.value[index]), abs=1e-9)


def test_nothing_is_dropped_unless_asked() -> None:
    for sees in (crowd(2), relay(4), two_way_ring(5)):
        group = network(sees, 6, "settle")
        plain, zero = solve(group), solve(group, drop=0.0)
        assert plain.dropped == zero.dropped == (0.0, 0.0)
        assert plain.doubtful == (0.0, 0.0)
        assert plain.dropped_mass == plain.uncertainty == 0.0
        assert events(plain) == events(zero)
        for one, other in zip(plain.tracks, zero.tracks, strict=True):
            assert np.array_equal(one.answers, other.answers)


def test_a_drop_below_everything_changes_nothing() -> None:
    group = network(relay(4), 10, "settle")
    full, less = solve(group), solve(group, drop=1e-30)
    assert events(full) == events(less)
    assert less.dropped_mass == 0.0
    assert (apart(full, less) == 0).all()


def test_the_more_is_dropped_the_fewer_events_are_kept() -> None:
    group = network(relay(6), 20, "settle")
    numbers = [events(solve(group, drop=drop)) for drop in (0.0, 1e-8, 1e-6, 1e-4, 1e-2)]
    assert numbers == sorted(numbers, reverse=True)
    assert numbers[-1] < numbers[0] / 2


@pytest.mark.parametrize("drop", [-1e-9, 1.0, float("nan")])
def test_a_drop_is_a_probability(drop: float) -> None:
    with pytest.raises(ModelError, match="from 0 to below 1"):
        solve(network(crowd(2), 3, "once"), drop=drop)


def test_rules_can_be_played_against_what_was_dropped() -> None:
    """The exact worths as a rule give back what the agent does, within what was dropped."""
    less = solve(network(relay(5), 12, "settle"), drop=1e-4)
    assert less.dropped_mass > 0
    play = adopt(less, "a4", exact_policy(less, "a4"))
    assert play.track.answers == pytest.approx(less.tracks[4].answers, abs=1e-12)
