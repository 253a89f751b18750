"""Times of the crowd engine: ``python -m tests.bench.crowd [NAME ...]``.

What carries over to another machine are the ratios, all of which are taken within one run.
"""

from __future__ import annotations

import sys

from tests.bench.networks import crowd as everybody, network
from tests.bench.run import best, head, say
from thumbwright.exact.crowd import (
    Crowd,
    Kind,
    enumerate_crowd,
    enumerate_situations,
    kinds_of,
    sample_crowd,
    sample_situations,
)
from thumbwright.exact.engine import solve
from thumbwright.exact.errors import ModelError
from thumbwright.exact.evidence.base import Evidence
from thumbwright.exact.evidence.binary import bernoulli, coin
from thumbwright.exact.group import Thresholds, same_thresholds

EVEN = same_thresholds(Thresholds(-3.0, 3.0))
UNKNOWN = ((0.3, Thresholds(-1.0, 1.0)), (0.3, Thresholds(-2.0, 2.0)), (0.4, Thresholds(-0.5, 3.0)))


def alike(
    size: int, evidence: Evidence, levels: tuple[tuple[float, Thresholds], ...] = EVEN
) -> Crowd:
    """A crowd of one kind."""
    return Crowd((Kind(evidence, levels, tuple(f"a{k}" for k in range(size))),))


def sampled(tiny: bool) -> None:
    """A crowd of 1,000 against a crowd of 10, per sampled history."""
    number, horizon = (200, 5) if tiny else (2000, 100)
    head(f"{number:,} sampled histories of {horizon} steps: a crowd of 1,000 against one of 10")
    for name, evidence, levels in (
        ("coin(0.6), -3 and 3 nats", coin(0.6), EVEN),
        ("coin(0.51), unknown thresholds", coin(0.51), UNKNOWN),
        ("bernoulli(0.02, 0.01), -3 and 3 nats", bernoulli(0.02, 0.01), EVEN),
    ):
        for exchange in ("once", "settle"):
            seconds = {}
            for size in (10, 1000):
                one = alike(size, evidence, levels)
                seconds[size] = best(
                    lambda c=one, e=exchange: sample_crowd(c, 0.0, horizon, e, number, 1), 2
                )
            say(
                f"{name}, {exchange}",
                seconds[1000],
                f"{1e3 * seconds[1000] / number:.3f} ms a history, "
                f"1,000 / 10 = {seconds[1000] / seconds[10]:.2f}",
            )
    head("The same, situations of a member that is made to show undecided, crowd of 1,000")
    one = alike(1000, coin(0.51), UNKNOWN)
    for exchange in ("once", "settle"):
        say(
            f"coin(0.51), unknown thresholds, {exchange}",
            best(lambda e=exchange: sample_situations(one, 0, 0.0, horizon, e, number, 1), 1),
        )


def growth(tiny: bool) -> None:
    """How the time of sampling grows with the size of the crowd and the number of histories."""
    head("Growth of sampling: coin(0.51), unknown thresholds, settle, 100 steps")
    horizon, first = 5 if tiny else 100, 0.0
    for size in (3, 10, 30, 100, 300, 1000):
        one = alike(size, coin(0.51), UNKNOWN)
        seconds = best(lambda c=one: sample_crowd(c, 0.0, horizon, "settle", 400, 1), 2)
        say(f"crowd of {size}, 400 histories", seconds)
    for number in (400, 1600) if tiny else (1000, 4000, 16000):
        seconds = best(
            lambda n=number: sample_crowd(one, 0.0, horizon, "settle", n, 1), 1 if tiny else 2
        )
        first = first or seconds
        say(f"crowd of 1000, {number} histories", seconds, f"{seconds / first:.1f} times the first")


def enumerated(tiny: bool) -> None:
    """Count histories: how many, how long, and what is dropped."""
    horizon = 4 if tiny else 30
    head(f"Enumerated count histories: coin(0.6), -3 and 3 observations, {horizon} steps")
    evidence = coin(0.6)
    bar = 3 * float(evidence.alpha[0])
    levels = same_thresholds(Thresholds(-bar, bar))
    for size in (3, 5, 8, 12, 20):
        one = alike(size, evidence, levels)
        for exchange in ("once", "settle"):
            for drop in (0.0, 1e-9, 1e-6):
                try:
                    play = enumerate_crowd(one, 0.0, horizon, exchange, drop)
                except ModelError:
                    continue  # too many to hold
                seconds = best(
                    lambda c=one, e=exchange, d=drop: enumerate_crowd(c, 0.0, horizon, e, d), 1
                )
                say(
                    f"crowd of {size}, {exchange}, below {drop:g} dropped",
                    seconds,
                    f"{play.histories:,} histories, dropped mass {play.dropped_mass:.2g}",
                )


def tensors(tiny: bool) -> None:
    """The same crowds through tensors."""
    head("Enumerated crowd against the tensor engine: coin(0.6), -2 and 4 observations")
    for size, horizon in ((3, 4), (4, 3)) if tiny else ((3, 20), (4, 8)):
        for exchange in ("once", "settle"):
            group = network(everybody(size), horizon, exchange)
            one = kinds_of(group)
            assert one is not None
            whole = best(lambda g=group: solve(g), 2)
            counts = best(lambda c=one, h=horizon, e=exchange: enumerate_crowd(c, 0.0, h, e), 2)
            held = best(
                lambda c=one, h=horizon, e=exchange: enumerate_situations(c, 0, 0.0, h, e), 1
            )
            say(
                f"crowd of {size}, {horizon} steps, {exchange}",
                counts,
                f"tensors {whole:.3f} s, {whole / counts:.1f} times; situations {held:.3f} s",
            )


BENCHMARKS = {
    "sampled": sampled,
    "growth": growth,
    "enumerated": enumerated,
    "tensors": tensors,
}


def main(names: list[str], tiny: bool = False) -> None:
    """Run the benchmarks of these names, or all."""
    for name in names or BENCHMARKS:
        BENCHMARKS[name](tiny)


if __name__ == "__main__":
    main(sys.argv[1:])
