"""The forecast refuses what is hopeless before any of it is allocated."""

from __future__ import annotations

import math
import tracemalloc

import pytest

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

    monkeypatch.setattr(engine, "run", begun)
    group = crowd(8, 200, "settle")
    tracemalloc.start()
    try:
        with pytest.raises(ModelError) as caught:
            solve(group)
        _, peak = tracemalloc.get_traced_memory()
    finally:
        tracemalloc.stop()
    assert peak < 5_000_000
    words = str(caught.value)
    assert "GB" in words
    assert "Ways out: a horizon below 200 steps" in words
    assert "letting agents see fewer others" in words
    assert "fewer agents" in words


def test_what_fits_is_let_through(monkeypatch: pytest.MonkeyPatch) -> None:
    refuse_too_large(crowd(2, 40))
    refuse_too_large(crowd(3, 10))
    # The same group is refused where less is free, and not where that is unknown.
    needed = forecast(crowd(3, 10)).memory
    for free, refused in ((2.1 * needed, False), (1.9 * needed, True), (None, False)):
        monkeypatch.setattr(forecast_module, "free_memory", lambda free=free: free)
        if refused:
            with pytest.raises(ModelError, match="more than half"):
                refuse_too_large(crowd(3, 10))
        else:
            refuse_too_large(crowd(3, 10))


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
    ("size", "horizon", "exchange"),
    [(2, 120, "once"), (2, 40, "settle"), (3, 16, "once"), (3, 10, "settle"), (4, 8, "once")],
)
def test_the_forecast_is_of_the_right_size(size: int, horizon: int, exchange: str) -> None:
    """It decides, so it must not fall short of what a run takes, nor lie far above."""
    group = crowd(size, horizon, exchange)
    tracemalloc.start()
    try:
        solve(group)
        _, peak = tracemalloc.get_traced_memory()
    finally:
        tracemalloc.stop()
    assert 0.05 < peak / forecast(group).memory < 1.5


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
