"""Agents that are alike are worked out once; that must change nothing, and find no likeness wrong.

The comparison is with the same engine in which everybody is worked out for itself.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import assume, given, settings, strategies as st

from tests.bench.networks import (
    Sees,
    chain,
    crowd,
    network,
    relay,
    ring,
    star,
    tree,
    two_way_ring,
)
from thumbwright.exact import alike
from thumbwright.exact.alike import each_for_itself, likeness
from thumbwright.exact.engine import ExactReader, Solution, Track, solve
from thumbwright.exact.evidence.binary import bernoulli, coin
from thumbwright.exact.group import Agent, Group, Thresholds, same_thresholds
from thumbwright.exact.stage import Stage

TWO_TRIANGLES: Sees = [(1, 2), (0, 2), (0, 1), (4, 5), (3, 5), (3, 4)]
HEXAGON_AND_TRIANGLES: Sees = [
    *two_way_ring(6),
    *(tuple(6 + k for k in seen) for seen in TWO_TRIANGLES),
]
# Agent 0 sees two agents that see the same third one, agent 5 two that see different ones.
ONE_SOURCE_OR_TWO: Sees = [(1, 2), (3,), (3,), (), (), (6, 7), (3,), (4,)]
BOTH_WAYS: Sees = [(1,), (0,), (3,), (2,)]


def apart(one: Track, other: Track) -> float:
    """Largest difference in anything that two tracks keep; infinite where they do not compare."""
    if one.events != other.events or one.agent is not other.agent:
        return np.inf
    times = [[(m.step, m.round) for m in track.moments] for track in (one, other)]
    if times[0] != times[1]:
        return np.inf
    pairs = [(one.answers, other.answers), (one.leaning, other.leaning)]
    pairs.append((np.array(one.near_tie), np.array(other.near_tie)))
    for a, b in zip(one.moments, other.moments, strict=True):
        pairs.append((a.value, b.value))
        pairs += [(a.log_shown, b.log_shown), (a.log_before, b.log_before)]
        pairs.append((a.log_after, b.log_after))
    assert one.weights is not None
    assert other.weights is not None
    everything = [np.arange(length) for length in other.weights.array.shape[1:]]
    pairs.append((one.weights.at(*everything), other.weights.at(*everything)))
    return max(_gap(a, b) for a, b in pairs)


def _gap(one: np.ndarray, other: np.ndarray) -> float:  # type: ignore[type-arg]
    if one.shape != other.shape:
        return np.inf
    with np.errstate(invalid="ignore"):
        gap = np.where(one == other, 0.0, np.abs(one - other))
    gap[np.isnan(one) & np.isnan(other)] = 0.0
    return float(np.nan_to_num(gap, nan=np.inf).max(initial=0.0))


def everybody(group: Group, drop: float = 0.0) -> Solution:
    """The exact play with nothing shared."""
    stage = Stage(group, [ExactReader() for _ in group.agents], drop)
    tracks = stage.play(None)
    doubtful = sum((player.doubtful for player in stage.players), np.zeros(2))
    dropped, doubts = (tuple(map(float, pair)) for pair in (stage.dropped, doubtful))
    return Solution(group, tracks, dropped, doubts)


def compare(group: Group, drop: float = 0.0) -> None:
    shared, plain = solve(group, drop=drop), everybody(group, drop)
    for one, other in zip(shared.tracks, plain.tracks, strict=True):
        assert apart(one, other) < 1e-12
    assert shared.dropped == pytest.approx(plain.dropped, abs=1e-12)
    assert shared.doubtful == pytest.approx(plain.doubtful, abs=1e-12)


def stirred(sees: Sees) -> Sees:
    """The same network, everybody naming those it sees in an order of its own."""
    return [
        tuple(sorted(seen, key=lambda k, i=i: ((k + 1) * (2 * i + 3)) % 7))
        for i, seen in enumerate(sees)
    ]


@pytest.mark.parametrize(
    ("sees", "number"),
    [
        (crowd(4), 1),
        (ring(7), 1),
        (two_way_ring(5), 1),
        (two_way_ring(6), 1),
        (star(5), 2),
        (chain(5), 3),
        (chain(6), 3),
        (tree(7), 3),
        (relay(6), 6),
        ([(), (), (0, 1)], 2),
        ([(1,), (0,), (1,)], 1 + 1),
        (BOTH_WAYS, 1),
        (TWO_TRIANGLES, 1),
        # Colour refinement alone takes all of these for alike.
        (HEXAGON_AND_TRIANGLES, 2),
        (ONE_SOURCE_OR_TWO, 4),
    ],
)
def test_how_many_are_worked_out(sees: Sees, number: int) -> None:
    for form in (sees, stirred(sees)):
        found = likeness(network(form, 3, "once"))
        assert len(found.leads) == number
        for i, seen in enumerate(found.seen):
            assert sorted(seen) == sorted(form[i])
            assert len(seen) == len(form[found.lead[i]])


def test_what_looks_alike_from_nearby_is_not_taken_for_alike() -> None:
    """The worths do differ: to take agents for alike that are not would show."""
    for sees, one, other in ((HEXAGON_AND_TRIANGLES, 0, 6), (ONE_SOURCE_OR_TWO, 0, 5)):
        group = network(sees, 4, "settle", -1.4, 2.3)
        found = likeness(group)
        assert found.lead[one] != found.lead[other]
        first, second = (solve(group).tracks[i].moments[-1].value for i in (one, other))
        assert first.shape != second.shape or np.nanmax(np.abs(first - second)) > 1e-3


@pytest.mark.parametrize(
    "change",
    [
        {"thresholds": same_thresholds(Thresholds(-0.8, 1.7))},
        {"evidence": coin(0.61)},
        {"evidence": bernoulli(0.6, 0.3)},
        {"looks": (1, 0, 2)},
        {"sees": ()},
    ],
)
def test_whoever_differs_is_worked_out_itself(change: dict[str, object]) -> None:
    group = network(crowd(3), 3, "settle")
    changed = replace(group.agents[2], **change)  # type: ignore[arg-type]
    group = replace(group, agents=(*group.agents[:2], changed))
    assert likeness(group).lead == (0, 0, 2)
    compare(group)


def test_those_seen_are_told_apart_by_what_they_are() -> None:
    """Two agents see a hasty and a patient one each, and name them in different orders."""
    group = network([(1, 2), (), (), (4, 5), (), ()], 6, "settle", -1.5, 2.3)
    hasty = same_thresholds(Thresholds(-0.5, 0.5))
    agents = [
        replace(agent, thresholds=hasty) if i in (1, 5) else agent
        for i, agent in enumerate(group.agents)
    ]
    group = replace(group, agents=tuple(agents))
    assert likeness(group).lead == (0, 1, 2, 0, 2, 1)
    assert likeness(group).seen[3] == (5, 4)
    compare(group)


@pytest.mark.parametrize("exchange", ["once", "settle"])
@pytest.mark.parametrize(
    ("sees", "horizon"),
    [
        (crowd(2), 12),
        (crowd(3), 5),
        (crowd(4), 3),
        (ring(4), 6),
        (two_way_ring(4), 4),
        (two_way_ring(5), 4),
        (two_way_ring(6), 3),
        (star(4), 4),
        (chain(5), 5),
        (tree(7), 3),
        (HEXAGON_AND_TRIANGLES, 3),
        (ONE_SOURCE_OR_TWO, 5),
        (BOTH_WAYS, 5),
        (relay(4), 5),
    ],
)
def test_sharing_changes_nothing(sees: Sees, horizon: int, exchange: str) -> None:
    """In whatever order those seen are named."""
    for form in (sees, stirred(sees)):
        compare(network(form, horizon, exchange, -1.5, 2.3))


@pytest.mark.parametrize(
    "sees", [crowd(2), crowd(3), star(3), stirred(chain(4)), stirred(two_way_ring(5))]
)
def test_nor_does_it_change_what_is_dropped(sees: Sees) -> None:
    group = network(sees, 6, "settle", -1.5, 2.3)
    assert sum(everybody(group, 1e-2).dropped) > 0.0
    compare(group, 1e-2)


KINDS = (
    (coin(0.6), same_thresholds(Thresholds(-0.7, 1.1)), None),
    (coin(0.6), ((0.3, Thresholds(-0.7, 1.1)), (0.7, Thresholds(-0.9, 0.9))), None),
    (bernoulli(0.9, 0.4), same_thresholds(Thresholds(-0.7, 1.1)), None),
    (coin(0.6), same_thresholds(Thresholds(-0.7, 1.1)), (0, 1, 2, 1)),
)


@st.composite
def networks(draw: st.DrawFn) -> Group:
    """Networks with symmetries, some of them broken by one agent, and arbitrary ones."""
    size = draw(st.integers(2, 5))
    if draw(st.booleans()):
        hops = draw(st.sets(st.integers(1, size - 1), min_size=1, max_size=2))
        seen = [{(i + hop) % size for hop in hops} for i in range(size)]
    else:
        half = [draw(st.sets(st.integers(0, 2), max_size=2)) for _ in range(3)]
        # Two copies of three agents, either of which may look at the other.
        across = draw(st.booleans())
        seen = [
            {(3 * (c ^ across) if k == 0 else 3 * c) + k for k in some if k != i or k == 0}
            for c in (0, 1)
            for i, some in enumerate(half)
        ]
        seen = [{k for k in some if k != i} for i, some in enumerate(seen)]
    kinds = [draw(st.integers(0, 3))] * len(seen)
    odd = draw(st.integers(0, len(seen) - 1))
    if draw(st.booleans()):
        kinds[odd] = draw(st.integers(0, 3))
    if draw(st.booleans()):
        seen[odd] = draw(st.sets(st.integers(0, len(seen) - 1), max_size=2)) - {odd}
    agents = []
    for i, (some, kind) in enumerate(zip(seen, kinds, strict=True)):
        evidence, thresholds, looks = KINDS[kind]
        sees = tuple(f"a{k}" for k in draw(st.permutations(sorted(some))))
        agents.append(Agent(f"a{i}", evidence, thresholds, sees, looks))
    exchange = draw(st.sampled_from(["once", "settle"]))
    return Group(tuple(agents), draw(st.sampled_from([0.0, 0.3])), 4, exchange)


@settings(max_examples=60)
@given(networks())
def test_sharing_changes_nothing_in_any_network(group: Group) -> None:
    assume(everybody(group).near_tie_mass == 0.0)
    compare(group)


def test_random_networks_have_likenesses_and_have_none() -> None:
    """The test above is about both."""
    shares = []

    @settings(max_examples=60, database=None)
    @given(networks())
    def note(group: Group) -> None:
        found = likeness(group)
        turned = any(
            i != lead and found.seen[i] != group.sees[i] for i, lead in enumerate(found.lead)
        )
        shares.append((len(found.leads) < len(group.agents), turned))

    note()
    assert sum(shared for shared, _ in shares) > 10
    assert sum(not shared for shared, _ in shares) > 10
    assert sum(turned for _, turned in shares) > 5


def test_a_search_that_takes_too_long_is_given_up(monkeypatch: pytest.MonkeyPatch) -> None:
    """Then agents that are alike are worked out one by one, with the same results."""
    large = network(ring(101), 2, "once")
    assert likeness(large) == each_for_itself(large)
    group = network(two_way_ring(6), 3, "settle")
    monkeypatch.setattr(alike, "_MOST_TRIES", 12)
    assert likeness(group).lead == (0, 0, 0, 3, 4, 5)
    compare(group)
