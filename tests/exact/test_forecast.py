"""The forecast refuses what is hopeless before any of it is allocated."""

from __future__ import annotations

import math
import tracemalloc
from dataclasses import replace

import pytest

from tests.bench import networks as shapes
from thumbwright.exact import engine, forecast as forecast_module
from thumbwright.exact.engine import solve
from thumbwright.exact.errors import ModelError
from thumbwright.exact.evidence.binary import coin
from thumbwright.exact.forecast import forecast, free_memory, refuse_too_large
from thumbwright.exact.group import Agent, Group, Thresholds, same_thresholds


def crowd(size: int, horizon: int, exchange: str = "once") -> Group:
    """Everybody sees everybody."""
    bars = same_thresholds(Thresholds(-1.0, 1.0))
    names = [f"a{k}" for k in range(size)]
    agents = [Agent(n, coin(0.6), bars, tuple(m for m in names if m != n)) for n in names]
    return Group(tuple(agents), 0.0, horizon, exchange)


def test_a_hopeless_group_is_refused_before_it_is_begun(monkeypatch: pytest.MonkeyPatch) -> None:
    def begun(*_: object) -> None:
        raise AssertionError("the run was begun")

    monkeypatch.setattr(engine, "Stage", begun)
    group = crowd(8, 200, "settle")
    tracemalloc.start()
    try:
        with pytest.raises(ModelError) as caught:
            solve(group, memory=4e9)
        _, peak = tracemalloc.get_traced_memory()
    finally:
        tracemalloc.stop()
    assert peak < 50_000_000  # its first steps are played, as far as they are small
    words = str(caught.value)
    assert "over 1000 TB of memory, more than the 4 GB that are allowed" in words
    assert "Ways out: a horizon of 4 steps (about" in words
    assert "agents that see at most 1 other (about" in words
    assert "only the first 2 agents (about" in words


def test_every_way_out_fits_and_the_next_larger_does_not() -> None:
    """The three ways out are taken at their word."""
    group = crowd(4, 12, "settle")
    allowed = forecast(group).memory / 20
    with pytest.raises(ModelError) as caught:
        refuse_too_large(group, allowed)
    words = str(caught.value).split("Ways out: ")[1].split("; ")
    assert len(words) == 3
    steps = int(words[0].removeprefix("a horizon of ").split()[0])
    assert forecast(replace(group, horizon=steps)).memory <= 1.05 * allowed
    assert forecast(replace(group, horizon=steps + 1)).memory > 0.95 * allowed
    assert words[1].startswith('exchange "once" instead of "settle"')
    refuse_too_large(replace(group, exchange="once"), allowed)
    count = int(words[2].removeprefix("agents that see at most ").split()[0])
    for seen, fits in ((count, True), (count + 1, False)):
        agents = tuple(replace(agent, sees=agent.sees[:seen]) for agent in group.agents)
        assert (forecast(replace(group, agents=agents)).memory <= allowed) is fits


def test_no_way_out_is_invented() -> None:
    with pytest.raises(ModelError, match="No smaller version of it fits"):
        refuse_too_large(crowd(3, 10), 100.0)


def test_what_fits_is_let_through(monkeypatch: pytest.MonkeyPatch) -> None:
    refuse_too_large(crowd(2, 40))
    refuse_too_large(crowd(3, 10))
    # The same group is refused where less is free, and not where that is unknown.
    needed = forecast(crowd(3, 10)).memory
    for free, refused in ((2.1 * needed, False), (1.9 * needed, True), (None, False)):
        monkeypatch.setattr(forecast_module, "free_memory", lambda free=free: free)
        if refused:
            with pytest.raises(ModelError, match="half of what is free"):
                refuse_too_large(crowd(3, 10))
            refuse_too_large(crowd(3, 10), 1.1 * needed)
        else:
            refuse_too_large(crowd(3, 10))
            with pytest.raises(ModelError, match="that are allowed"):
                refuse_too_large(crowd(3, 10), 0.9 * needed)


def test_more_of_anything_never_needs_less() -> None:
    for one, other in (
        (crowd(2, 40), crowd(2, 80)),
        (crowd(2, 40), crowd(3, 40)),
        (crowd(3, 20), crowd(3, 20, "settle")),
    ):
        small, large = forecast(one), forecast(other)
        assert small.memory < large.memory
        assert small.seconds < large.seconds
        assert small.events <= large.events
    assert math.isfinite(forecast(crowd(12, 1000)).memory)


@pytest.mark.parametrize(
    ("sees", "horizon", "exchange"),
    [
        (shapes.crowd(2), 160, "settle"),
        (shapes.crowd(2), 120, "once"),
        (shapes.relay(10), 40, "settle"),
        (shapes.two_way_ring(5), 12, "settle"),
        (shapes.two_way_ring(6), 8, "settle"),
        (shapes.crowd(3), 20, "settle"),
        (shapes.crowd(4), 8, "once"),
        (shapes.star(4), 10, "settle"),
        (shapes.chain(5), 12, "settle"),
        (shapes.tree(7), 8, "settle"),
    ],
)
def test_the_forecast_is_within_twice_the_peak(
    sees: shapes.Sees, horizon: int, exchange: str
) -> None:
    group = shapes.network(sees, horizon, exchange)
    expected = forecast(group)
    solve(shapes.network(sees, 2, exchange))  # what is allocated once and for all
    tracemalloc.start()
    try:
        solution = solve(group)
        _, peak = tracemalloc.get_traced_memory()
    finally:
        tracemalloc.stop()
    assert 0.5 < expected.memory / peak < 2.0
    assert expected.events == pytest.approx(max(len(t.events) for t in solution.tracks), rel=0.2)


def test_the_forecast_is_the_same_every_time() -> None:
    group = shapes.network(shapes.two_way_ring(5), 30, "settle")
    assert forecast(group) == forecast(group)


def test_the_forecast_waits_for_thresholds_that_are_far_off() -> None:
    """Nothing is shown for 30 steps; what comes then is counted all the same."""
    group = shapes.network(shapes.crowd(2), 80, "once", low=-30, high=30)
    events = max(len(track.events) for track in solve(group).tracks)
    assert forecast(group).events == pytest.approx(events, rel=0.2)


def test_the_widest_agent_is_named() -> None:
    bars = same_thresholds(Thresholds(-1.0, 1.0))
    agents = (
        Agent("quiet", coin(0.6), bars),
        Agent("other", coin(0.6), bars),
        Agent("looks", coin(0.6), bars, ("quiet", "other")),
    )
    assert forecast(Group(agents, 0.0, 20)).widest == "looks"


def test_free_memory_is_a_number_of_bytes_here() -> None:
    free = free_memory()
    assert free is None or free > 1e6
