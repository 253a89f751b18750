"""Agreement of a rule with exact play: against all pairs of walks, and against simulation."""

from __future__ import annotations

import dataclasses

import numpy as np
import pytest

from tests.exact.comparing import COIN, built
from tests.exact.crowds import CERTAIN, bars, kind, network
from tests.exact.test_crowd_adopt import CROWDS, Card
from tests.exact.test_play_against_enumeration import ALPHA, coin_group
from tests.slow import pair_walk as walk, simulate as sim
from tests.slow.enumerate import enumerate_group
from thumbwright.exact.agreement import Agreement, agreement, crowd_agreement
from thumbwright.exact.arrays import FloatArray
from thumbwright.exact.crowd import (
    Crowd,
    Weights,
    enumerate_shown,
    exact_member,
    sample_shown,
)
from thumbwright.exact.engine import solve
from thumbwright.exact.group import Group
from thumbwright.exact.play import Act, Policy, Situation, exact_policy

CARD = {None: (-3, 2), "plus": (-4, 0), "minus": (-1, 4)}
RUNS = 40_000


def card(situation: Situation) -> Act:
    (state,) = situation.states
    low, high = np.array([CARD[None], CARD["plus"], CARD["minus"]]).T
    return Act(np.zeros(state.shape), low[state], high[state])


def by_card(_step: int, shown: walk.Call | None, count: int) -> str | None:
    low, high = CARD[None if shown is None else shown.answer]
    return "plus" if count >= high else "minus" if count <= low else None


@pytest.mark.parametrize("exchange", ["once", "settle"])
@pytest.mark.parametrize("horizon", [1, 9, 30])
def test_one_way_pairs_agree_with_the_walk_of_all_pairs(exchange: str, horizon: int) -> None:
    low, high = (-2 * ALPHA, 4 * ALPHA), (-3 * ALPHA, 3 * ALPHA)
    pair = walk.Pair(walk.coin(0.6), low, walk.coin(0.6), high, horizon, exchange)
    group = coin_group([(-2, 4), (-3, 3)], [(), (0,)], horizon)
    solution = solve(built(dataclasses.replace(group, exchange=exchange)))
    for policy, slow_rule in (
        (card, walk.reading(by_card)),
        (lambda _: Act(np.zeros(())), walk.alone(pair)),
    ):
        found = agreement(solution, "a1", policy)
        for given, answer in enumerate(("plus", "minus")):
            expected = walk.compare(pair, slow_rule, walk.exact(pair), answer)
            opposite = sum(
                mass for ends, mass in expected.ends.items() if set(ends) == {"plus", "minus"}
            )
            assert found.same[given, 0] == pytest.approx(expected.agreement, abs=1e-12)
            assert found.opposite[given, 0] == pytest.approx(opposite, abs=1e-12)
            assert found.steps_apart[given, 0] == pytest.approx(expected.step_gap, abs=1e-11)


def test_who_is_watched_agrees_with_simulation() -> None:
    """A mutual pair: the same draws played exactly and by the card, side by side."""
    group = coin_group([(-2, 4), (-3, 3)], [(1,), (0,)], 7)
    model, solution = enumerate_group(group), solve(built(group))
    found = agreement(solution, "a1", card)
    evidence = [sim.values(COIN, sim.COIN_COUNTS)] * 2
    exact = [sim.exact(group, model, agent) for agent in (0, 1)]
    by_rule = sim.by_count(lambda _step, shown: CARD[shown[0] or None])
    for given, answer in enumerate(("plus", "minus")):
        one, other = (
            sim.simulate(group.sees, evidence, players, 7, answer, RUNS, 11 + given)
            for players in (exact, [exact[0], by_rule])
        )
        same = (one.state[:, 1] == other.state[:, 1]).astype(float)
        used = [np.where(r.state[:, 1] == 0, 7, r.step[:, 1]) for r in (one, other)]
        apart = np.abs(used[0] - used[1]).astype(float)
        for sample, truth in ((same, found.same), (apart, found.steps_apart)):
            error = sample.std(ddof=1) / np.sqrt(RUNS)
            assert abs(sample.mean() - truth[given, 0]) < 4 * error
    assert 0.5 < found.same.min() < 0.99


def total(found: Agreement) -> FloatArray:
    return np.stack([found.same[:, 0], found.opposite[:, 0], found.steps_apart[:, 0]])


@pytest.mark.parametrize("exchange", ["once", "settle"])
@pytest.mark.parametrize("name", ["three alike", "two kinds", "own evidence", "certain evidence"])
def test_crowd_and_network_agree(name: str, exchange: str) -> None:
    crowd, prior = CROWDS[name]
    solution = solve(network(crowd, prior, 5, exchange))
    for number, one in enumerate(crowd.kinds):
        shown = enumerate_shown(crowd, number, prior, 5, exchange)
        by = Card(number, 5, crowd.size, by_value=number == 0)
        here = crowd_agreement(shown, by.of_crowd)
        there = agreement(solution, one.members[0], by.of_network)
        assert np.abs(total(here) - total(there)).max() < 1e-12


def test_exact_play_agrees_with_itself_and_certain_evidence_with_everybody() -> None:
    crowd = Crowd((kind(2, bars(-2, 3)), kind(1, bars(-2, 2.5), CERTAIN)))
    group: Group = network(crowd, 0.0, 5, "settle")
    solution = solve(group)
    for agent in group.agents:
        found = agreement(solution, agent.id, exact_policy(solution, agent.id))
        assert total(found) == pytest.approx(np.array([[1, 1], [0, 0], [0, 0]]), abs=1e-12)
    shown = enumerate_shown(crowd, 1, 0.0, 5, "settle")
    assert total(crowd_agreement(shown, exact_member)) == pytest.approx(
        np.array([[1, 1], [0, 0], [0, 0]]), abs=1e-12
    )
    # Proof of plus turns up in 0.3 of observations: by step 5 hardly anybody has missed it.
    stubborn: Policy = lambda _: Act(np.zeros(()), np.array(-99), np.array(99))  # noqa: E731
    here = agreement(solution, group.agents[2].id, stubborn)
    assert here.same[0, 0] + here.opposite[0, 0] >= 1 - 0.7**5 - 1e-12


def test_sampled_crowds_agree_within_their_errors() -> None:
    crowd = Crowd((kind(3, bars(-2, 3)), kind(2, bars(-3, 2))))
    by = Card(5, 6, 5, by_value=False)
    exact = crowd_agreement(enumerate_shown(crowd, 0, 0.1, 6, "once"), by.of_crowd)
    shown = sample_shown(crowd, 0, 0.1, 6, "once", 6000, 3)
    found = crowd_agreement(shown, by.of_crowd)
    assert shown.weight is not None
    weights = Weights(shown.weight, shown.half)
    for name in ("same", "opposite", "steps_apart"):
        value, error = weights.mean(getattr(found, name))
        assert (error > 0).all()
        assert (np.abs(value - getattr(exact, name)[:, 0]) < 4 * error).all(), name


def test_proof_of_the_other_answer_is_a_disagreement() -> None:
    """By hand: the rule says minus at once; the exact agent waits until it has proof of plus."""
    crowd = Crowd((kind(2, bars(-9, 9), CERTAIN),))
    at_once: Policy = lambda _: Act(np.zeros(()), np.array(99), np.array(999))  # noqa: E731
    found = agreement(solve(network(crowd, 0.0, 2, "once")), crowd.members[0], at_once)
    # Proof comes to 0.3 of observations given plus: at step 1 both say plus. At step 2 only one
    # does, by proof of its own or because the other member has had some at step 1.
    assert found.same[:, 0] == pytest.approx([0.3, 0.0], abs=1e-12)
    assert found.opposite[:, 0] == pytest.approx([0.7 * (1 - 0.7 * 0.7), 0.0], abs=1e-12)
    assert found.steps_apart[:, 0] == pytest.approx([0.7, 1.0], abs=1e-12)
