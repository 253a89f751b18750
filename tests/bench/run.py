"""Times, ratios and memory of the exact engine: ``python -m tests.bench.run [NAME ...]``.

Times are the best of several runs on whatever machine this is; what carries over to another are
the ratios, all of which are taken within one run.
"""

from __future__ import annotations

import sys
import time
import tracemalloc
from collections.abc import Callable
from unittest.mock import patch

import numpy as np

from tests.bench.networks import (
    chain,
    crowd,
    network,
    relay,
    ring,
    star,
    two_way_ring,
    unlike,
)
from tests.bench.rules import pricing
from tests.slow import group as slow
from tests.slow.enumerate import enumerate_group
from thumbwright.exact import expressions
from thumbwright.exact.engine import Solution, solve
from thumbwright.exact.forecast import forecast
from thumbwright.exact.group import Group


def best(work: Callable[[], object], times: int = 5) -> float:
    """Seconds that the work takes, the best of several runs."""
    found = []
    for _ in range(times):
        begin = time.perf_counter()
        work()
        found.append(time.perf_counter() - begin)
    return min(found)


def say(what: str, seconds: float, more: str = "") -> None:
    """Print one line."""
    print(f"  {what:<48} {seconds:9.4f} s  {more}", flush=True)  # noqa: T201


def head(title: str) -> None:
    """Print a heading."""
    print(f"\n{title}")  # noqa: T201


def bare_products(group: Group) -> tuple[float, float]:
    """Seconds of the matrix products that a run makes, and of all that it could have made.

    The first are those of the run itself, of the same shapes. The second are for a two-way ring
    of five: what it would take to compute the probability of every history anew at every round,
    one product per agent of n x n matrices for each of n histories of a hidden agent.
    """
    shapes = []

    def noting(a: np.ndarray, b: np.ndarray) -> np.ndarray:  # type: ignore[type-arg]
        shapes.append((a.shape, b.shape))
        return np.matmul(a, b)

    with patch.object(expressions, "multiply", noting):
        solution = solve(group)
    most = max(int(np.prod(shape)) for pair in shapes for shape in pair)
    numbers = np.random.default_rng(1).random(2 * most)

    def product(one: tuple[int, ...], other: tuple[int, ...]) -> None:
        a, b = (numbers[: int(np.prod(shape))].reshape(shape) for shape in (one, other))
        np.matmul(a, b)

    def same() -> None:
        for pair in shapes:
            product(*pair)

    lengths = [moment.value.shape[0] for moment in solution.tracks[0].moments]
    numbers = np.random.default_rng(1).random(max(2 * most, 2 * max(lengths) ** 3))

    def anew() -> None:
        for n in lengths:
            for _ in solution.tracks:
                product((2, n, n, n), (2, n, n, n))

    return best(same, 3), best(anew, 1)


def products(tiny: bool) -> None:
    """The engine against bare matrix products."""
    head("Two-way ring of five, -2 and +4 observations, settle: against bare matrix products")
    alike = network(two_way_ring(5), 3 if tiny else 12, "settle")
    for name, group in (("all alike", alike), ("no two alike", unlike(alike))):
        seconds = best(lambda g=group: solve(g))
        same, anew = bare_products(group)
        say(f"{name}, engine", seconds)
        say("its matrix products, bare", same, f"engine / bare = {seconds / same:.2f}")
        say("products of all histories anew, bare", anew, f"engine / bare = {seconds / anew:.2f}")


def enumeration(tiny: bool) -> None:
    """The engine against the enumeration of all observation sequences."""
    head("Against the enumeration of all sequences of observations")
    coin = ((0.6, 0.4), (0.4, 0.6))
    for name, sees, horizon in (("mutual pair", crowd(2), 7), ("two-way chain of 3", chain(3), 5)):
        steps = 2 if tiny else horizon
        bars = (slow.Thresholds(-2 * np.log(1.5), 4 * np.log(1.5)),)
        small = slow.Group(
            tuple(sees), (coin,) * len(sees), (bars,) * len(sees), steps, "settle", 0.5
        )
        slowly = best(lambda g=small: enumerate_group(g), 1)
        quickly = best(lambda s=sees, t=steps: solve(network(s, t, "settle")))
        say(f"{name}, {steps} steps, engine", quickly)
        say(f"{name}, {steps} steps, enumeration", slowly, f"{slowly / quickly:.0f} times")


def growth(tiny: bool) -> None:
    """How the time grows with the horizon and with the number of agents."""
    head("Growth with the horizon: mutual pair, -4 and +8 observations")
    for exchange in ("once", "settle"):
        for name in ("alike", "not alike"):
            first = 0.0
            for horizon in (5, 10) if tiny else (40, 80, 160):
                group = network(crowd(2), horizon, exchange, -4, 8)
                group = group if name == "alike" else unlike(group)
                seconds = best(lambda g=group: solve(g), 5 if horizon > 40 else 20)
                first = first or seconds
                more = f"{seconds / first:.1f} times the first"
                say(f"{exchange}, {name}, {horizon} steps", seconds, more)
    head("Growth with the number of agents")
    for name, shape, exchange, horizon, sizes in (
        ("relay", relay, "once", 40, (50, 100, 200)),
        ("relay", relay, "settle", 20, (5, 10, 20)),
        ("two-way chain", chain, "once", 10, (10, 20, 40)),
        ("ring", ring, "once", 20, (5, 10, 20)),
        ("two-way ring", two_way_ring, "once", 12, (5, 6, 7, 8)),
    ):
        for size in sizes[:2] if tiny else sizes:
            group = network(shape(size), 3 if tiny else horizon, exchange)
            seconds = best(lambda g=group: solve(g), 2)
            say(f"{name} of {size}, {exchange}", seconds, f"{1e3 * seconds / size:.2f} ms an agent")
    head("Crowd of three through tensors, 20 steps")
    for exchange in ("once", "settle"):
        alike = network(crowd(3), 3 if tiny else 20, exchange)
        for name, group in (("all alike", alike), ("no two alike", unlike(alike))):
            say(f"{exchange}, {name}", best(lambda g=group: solve(g), 3))


def memory(tiny: bool) -> None:
    """The forecast against the measured peak of memory."""
    head("Memory: forecast against measured peak; time: forecast against measured")
    for name, sees, horizon, exchange in (
        ("mutual pair", crowd(2), 160, "settle"),
        ("relay of 10", relay(10), 40, "settle"),
        ("two-way ring of 5", two_way_ring(5), 12, "settle"),
        ("crowd of 3", crowd(3), 20, "settle"),
        ("star of 4", star(4), 10, "settle"),
        ("two-way chain of 5", chain(5), 12, "settle"),
    ):
        group = network(sees, min(horizon, 4) if tiny else horizon, exchange)
        expected = forecast(group)
        seconds = best(lambda g=group: solve(g), 2)
        peak = peak_memory(group)
        say(
            name,
            seconds,
            f"forecast {expected.seconds:.3f} s, {expected.memory / 1e6:.1f} MB; "
            f"peak {peak / 1e6:.1f} MB, forecast / peak = {expected.memory / peak:.2f}",
        )


def peak_memory(group: Group) -> int:
    """Bytes allocated at the peak of a run."""
    solve(network(relay(2), 2, "once"))  # what is allocated once and for all
    tracemalloc.start()
    try:
        kept: Solution = solve(group)
        peak = tracemalloc.get_traced_memory()[1]
    finally:
        tracemalloc.stop()
    del kept
    return peak


def rules(tiny: bool) -> None:
    """Pricing rules against the exact beliefs."""
    head("Pricing rules for a pair; the target for one rule after the first is 10 ms")
    pricing(tiny, best, say)


BENCHMARKS = {
    "products": products,
    "enumeration": enumeration,
    "growth": growth,
    "memory": memory,
    "rules": rules,
}


def main(names: list[str], tiny: bool = False) -> None:
    """Run the benchmarks of these names, or all."""
    for name in names or BENCHMARKS:
        BENCHMARKS[name](tiny)


if __name__ == "__main__":
    main(sys.argv[1:])
