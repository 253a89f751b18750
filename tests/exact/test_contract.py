"""Contractions against one sum over everything, against enumeration, and where much is alike."""

from __future__ import annotations

import math
from collections.abc import Callable

import numpy as np
import pytest

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
from tests.exact.comparing import COIN, built, outcomes_apart, worths_apart
from tests.slow import group as slow
from tests.slow.enumerate import enumerate_group
from thumbwright.exact.arrays import FloatArray
from thumbwright.exact.contract import Contractions
from thumbwright.exact.engine import Solution, solve
from thumbwright.exact.group import Group
from thumbwright.exact.outcomes import outcomes
from thumbwright.exact.player import ExactReader
from thumbwright.exact.stage import Stage

GRID: Sees = [(1, 3), (0, 2, 4), (1, 5), (0, 4), (1, 3, 5), (2, 4)]
HIDDEN_HUB: Sees = [(), (0,), (0,), (0,), (1, 2, 3)]
MIXED: Sees = [(1, 2), (3,), (0, 3), (4,), (0,)]


def played(group: Group) -> Stage:
    """A stage after all steps, everything brought up to date."""
    stage = Stage(group, [ExactReader() for _ in group.agents])
    for step in range(1, group.horizon + 1):
        stage.step(step)
    return stage


def sum_over_everything(group: Group, stage: Stage, held: int) -> FloatArray:
    """Probability of what one agent has been shown: all weights in a single sum."""
    operands: list[object] = []
    given = len(group.agents)
    for j, display in enumerate(stage.contractions.displays):
        if j != held:
            axes = (j, *group.sees[j])
            where = tuple(0 if a == held else slice(None) for a in axes)
            operands += [
                display.weights().at(*map(np.arange, display.weights().array.shape[1:]))[
                    (slice(None), *where)
                ],
                [given, *(a for a in axes if a != held)],
            ]
    total: FloatArray = np.einsum(*operands, [given, *group.sees[held]], optimize="greedy")
    return total


@pytest.mark.parametrize(
    ("sees", "horizon", "exchange"),
    [
        (relay(5), 5, "once"),
        (relay(5), 4, "settle"),
        (tree(6), 3, "settle"),
        (chain(5), 4, "once"),
        (chain(4), 4, "settle"),
        (ring(4), 4, "settle"),
        (two_way_ring(4), 4, "settle"),
        (two_way_ring(5), 4, "once"),
        (two_way_ring(5), 3, "settle"),
        (two_way_ring(6), 3, "once"),
        (star(4), 4, "settle"),
        (crowd(4), 3, "settle"),
        (GRID, 3, "once"),
        (HIDDEN_HUB, 4, "settle"),
        (MIXED, 4, "settle"),
    ],
)
def test_what_is_renewed_piece_by_piece_equals_one_sum(
    sees: Sees, horizon: int, exchange: str
) -> None:
    group = network(sees, horizon, exchange, low=-1.5, high=2.3)
    stage = played(group)
    for i in range(len(sees)):
        got = np.exp(stage.contractions.log_shown(i))
        expected = sum_over_everything(group, stage, i)
        assert got.shape == expected.shape
        assert got == pytest.approx(expected, abs=1e-13)
        assert got.reshape(2, -1).sum(axis=1) == pytest.approx([1.0, 1.0], abs=1e-12)


@pytest.mark.parametrize(
    ("sees", "horizon"), [(chain(4), 3), (ring(4), 3), (star(4), 3), (tree(4), 4), (relay(4), 4)]
)
@pytest.mark.parametrize("exchange", ["once", "settle"])
def test_four_agents_agree_with_enumeration(sees: Sees, horizon: int, exchange: str) -> None:
    alpha = math.log(1.5)
    bars = (slow.Thresholds(-0.5 * alpha, 1.7 * alpha), slow.Thresholds(-1.2 * alpha, 0.7 * alpha))
    group = slow.Group(
        tuple(sees),
        (COIN,) * len(sees),
        tuple((bars[i % 2],) for i in range(len(sees))),
        horizon,
        exchange,
        0.45,
    )
    model, solution = enumerate_group(group), solve(built(group))
    assert outcomes_apart(model, solution) < 1e-12
    assert worths_apart(model, solution) < 1e-10


# --- long and alike ----------------------------------------------------------------------


def ends(solution: Solution, agent: int) -> list[float]:
    return [
        number
        for one in outcomes(solution)[agent]
        for number in (one.plus, one.minus, one.undecided, one.mean_steps)
    ]


def test_news_travels_one_link_a_step() -> None:
    """Further down a relay than there are steps, all fare alike: whatever its length."""
    horizon = 8
    long = solve(network(relay(40), horizon, "once"))
    deep = ends(long, horizon - 1)
    for agent in range(horizon, 40):
        assert ends(long, agent) == pytest.approx(deep, abs=1e-13)
    assert ends(long, 1) != pytest.approx(deep, abs=1e-4)
    # On a ring that is longer than there are steps nobody hears of itself.
    around = solve(network(ring(horizon + 1), horizon, "once"))
    assert ends(around, 0) == pytest.approx(deep, abs=1e-12)


def test_a_long_two_way_ring_is_the_middle_of_a_long_chain() -> None:
    horizon = 5
    middle = ends(solve(network(chain(2 * horizon + 1), horizon, "once")), horizon)
    assert ends(solve(network(two_way_ring(2 * horizon + 1), horizon, "once")), 0) == pytest.approx(
        middle, abs=1e-12
    )


@pytest.mark.parametrize("exchange", ["once", "settle"])
@pytest.mark.parametrize(
    ("shape", "size"), [(ring, 6), (two_way_ring, 5), (two_way_ring, 7), (crowd, 3)]
)
def test_round_a_ring_all_fare_alike(
    shape: Callable[[int], Sees], size: int, exchange: str
) -> None:
    solution = solve(network(shape(size), 5, exchange))
    for agent in range(1, size):
        assert ends(solution, agent) == pytest.approx(ends(solution, 0), abs=1e-12)


def test_a_mirrored_group_does_the_mirrored_things() -> None:
    """Thresholds turned round at even odds: plus and minus, and the two answers, change places."""
    one = solve(network(two_way_ring(6), 5, "settle", low=-2, high=3))
    other = solve(network(two_way_ring(6), 5, "settle", low=-3, high=2))
    plus, minus = outcomes(one)[0]
    mirrored = outcomes(other)[0]
    assert plus.plus == pytest.approx(mirrored[1].minus, abs=1e-12)
    assert minus.plus == pytest.approx(mirrored[0].minus, abs=1e-12)
    assert plus.mean_steps == pytest.approx(mirrored[1].mean_steps, abs=1e-12)


def test_another_agent_in_a_line_costs_the_same() -> None:
    """One sum more per link and direction, none of them wider than before."""
    for shape, most in ((relay, 2 * (10 + 10)), (chain, 2 * (100 + 2 * 10 + 2 * 100))):
        kept = []
        for size in (8, 9, 16):
            contractions = Contractions(network(shape(size), 4, "once"))
            kept.append(contractions.entries([10.0] * size))
        one_more = kept[1][0] - kept[0][0]
        assert kept[2][0] - kept[1][0] == pytest.approx(7 * one_more)
        assert one_more == most
        assert kept[0][1] == kept[2][1]
