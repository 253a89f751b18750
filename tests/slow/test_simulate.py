"""The simulation against the exact slow programs, within four standard errors."""

from __future__ import annotations

import pytest

from tests.slow import pair_walk as walk, simulate as sim
from tests.slow.enumerate import enumerate_group
from tests.slow.group import from_reference
from tests.slow.test_slow import COIN, NETWORKS, SIDES, coin_pair, ends

RUNS = 30_000


@pytest.mark.parametrize("number", [3, 5, 7, 15, 19, 20])
def test_simulated_exact_groups(number: int) -> None:
    group = from_reference(NETWORKS[number])
    model = enumerate_group(group)
    agents = range(len(group.sees))
    evidence = [sim.values(group.evidence[a], sim.COIN_COUNTS) for a in agents]
    players = [sim.exact(group, model, a) for a in agents]
    for seed, side in enumerate(SIDES):
        runs = sim.simulate(
            group.sees, evidence, players, group.horizon, side, RUNS, seed, model.rounds
        )
        for agent in agents:
            got, expected = runs.of(agent), ends(model, side)[agent]
            for name in ("plus", "minus", "undecided", "mean_step", "mean_step_if_decided"):
                assert getattr(got, name).off(getattr(expected, name)) < 4.0, (agent, side, name)


def test_simulated_rule_and_a_wrong_one() -> None:
    """The card in a long one-way pair; the same runs refuse the figures of another card."""
    pair = coin_pair((-2, 4), (-3, 3), 40)
    evidence = [sim.values(COIN, sim.COIN_COUNTS)] * 2

    def bars(step: int, shown: tuple[str, ...]) -> tuple[float, float]:
        return {"": (-4, 3), "plus": (-7, -1), "minus": (-1, 5)}[shown[0]]

    def rule(step: int, shown: walk.Call | None, count: int) -> str | None:
        low, high = bars(step, (shown.answer if shown else "",))
        return "plus" if count >= high else "minus" if count <= low else None

    players = [sim.alone(0.0, pair.watched_bars), sim.by_count(bars)]
    counting = sim.plain_count(0.0, pair.observer_bars, [pair.watched_bars])
    for seed, side in enumerate(SIDES, start=10):
        got = sim.simulate(((), (0,)), evidence, players, 40, side, RUNS, seed).of(1)
        truth = walk.play(pair, walk.reading(rule), side)
        other = walk.play(pair, walk.plain_count(pair), side)
        for name in ("plus", "minus", "undecided", "mean_step"):
            assert getattr(got, name).off(getattr(truth, name)) < 4.0, name
        assert got.plus.off(other.plus) > 4.0
        plain = sim.simulate(((), (0,)), evidence, [players[0], counting], 40, side, RUNS, seed).of(
            1
        )
        assert plain.plus.off(other.plus) < 4.0
        assert plain.mean_step.off(other.mean_step) < 4.0
