"""The networks of the benchmarks, and of tests that need whole families of networks."""

from __future__ import annotations

from dataclasses import replace

from thumbwright.exact.evidence.binary import coin
from thumbwright.exact.group import Agent, Group, Thresholds, same_thresholds

Sees = list[tuple[int, ...]]


def network(
    sees: Sees,
    horizon: int,
    exchange: str,
    low: float = -2.0,
    high: float = 4.0,
    p: float = 0.6,
) -> Group:
    """Agents with a coin and thresholds in its observations, at even odds."""
    evidence = coin(p)
    alpha = float(evidence.alpha[0])
    bars = same_thresholds(Thresholds(low * alpha, high * alpha))
    agents = [
        Agent(f"a{i}", evidence, bars, tuple(f"a{k}" for k in seen)) for i, seen in enumerate(sees)
    ]
    return Group(tuple(agents), 0.0, horizon, exchange)


def unlike(group: Group) -> Group:
    """The same group, no two agents alike by a hair: nothing can be worked out for several."""
    agents = [
        replace(
            agent,
            thresholds=tuple(
                (share, Thresholds(bars.minus, bars.plus + 1e-6 * i))
                for share, bars in agent.thresholds
            ),
        )
        for i, agent in enumerate(group.agents)
    ]
    return replace(group, agents=tuple(agents))


def relay(size: int) -> Sees:
    """Everybody sees the one before."""
    return [(i - 1,) if i else () for i in range(size)]


def chain(size: int) -> Sees:
    """Everybody sees the neighbours on both sides."""
    return [tuple(k for k in (i - 1, i + 1) if 0 <= k < size) for i in range(size)]


def ring(size: int) -> Sees:
    """Everybody sees the one before, the first the last."""
    return [((i - 1) % size,) for i in range(size)]


def two_way_ring(size: int) -> Sees:
    """Everybody sees the neighbours on both sides, round a ring."""
    return [((i - 1) % size, (i + 1) % size) for i in range(size)]


def crowd(size: int) -> Sees:
    """Everybody sees everybody else."""
    return [tuple(k for k in range(size) if k != i) for i in range(size)]


def star(size: int) -> Sees:
    """The first sees all others, who see only the first."""
    return [tuple(range(1, size)), *((0,) for _ in range(1, size))]


def tree(size: int) -> Sees:
    """Everybody sees the two below: places 2i + 1 and 2i + 2."""
    return [tuple(k for k in (2 * i + 1, 2 * i + 2) if k < size) for i in range(size)]
