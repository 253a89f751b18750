"""Several rule users among exact agents: against enumeration, and against simulation."""

from __future__ import annotations

import dataclasses

import numpy as np
import pytest
from hypothesis import assume, event, given, settings, strategies as st

from tests.exact.comparing import COIN, built, groups, track_apart
from tests.exact.test_play_against_enumeration import ALPHA, Whim, coin_group, off_model
from tests.slow import group as slow, simulate as sim
from tests.slow.enumerate import enumerate_group, play_rules
from thumbwright.exact.adopters import adopt_together
from thumbwright.exact.engine import solve
from thumbwright.exact.errors import ModelError
from thumbwright.exact.outcomes import outcome
from thumbwright.exact.play import Act, Situation, adopt


@st.composite
def sets(draw: st.DrawFn) -> tuple[slow.Group, tuple[int, ...], int]:
    """A random group, some of its agents with known thresholds, and a seed for their rules."""
    group = draw(groups())
    agents = range(len(group.sees))
    users = tuple(sorted(draw(st.sets(st.sampled_from(agents), min_size=1))))
    bars = [
        (own[0]._replace(share=1.0),) if agent in users else own
        for agent, own in enumerate(group.thresholds)
    ]
    return dataclasses.replace(group, thresholds=tuple(bars)), users, draw(st.integers(0, 999))


@settings(max_examples=50)
@given(sets())
def test_random_sets_agree_with_enumeration(case: tuple[slow.Group, tuple[int, ...], int]) -> None:
    group, users, seed = case
    model = enumerate_group(group)
    whims = {user: Whim(group, user, seed + user) for user in users}
    rules = {user: whim.rule for user, whim in whims.items()}
    played = play_rules(group, model, rules, rounds="actual")
    narrow = [model.narrowest, played.narrowest, *(whim.narrowest for whim in whims.values())]
    assume(min(narrow) > 1e-11)
    found = adopt_together(solve(built(group)), {f"a{u}": w.policy for u, w in whims.items()})
    odd = off_model(played, group) > 0.0
    event(f"{len(group.sees)} agents, {len(users)} rules, odd {odd}")
    # How several agents' odd commitments are read together is settled for pairs only.
    assume(len(group.sees) < 3 or not odd)
    for agent, track in enumerate(found.tracks):
        assert track_apart(played, agent, track) < 1e-10, agent
    assert found.off_model == pytest.approx(off_model(played, group), abs=1e-10)
    if len(users) == len(group.sees):
        assert found.off_model == 0.0


def test_one_adopter_is_a_set_of_one() -> None:
    group = coin_group([(-2, 2), (-3, 3)], [(1,), (0,)], 6)
    whim = Whim(group, 0, 5)
    solution = solve(built(group))
    alone, found = (
        adopt(solution, "a0", whim.policy, rows=1),
        adopt_together(solution, {"a0": whim.policy}, rows=1),
    )
    assert found.off_model == pytest.approx(alone.off_model, abs=1e-15)
    for one, other in zip(outcome(alone.track), outcome(found.tracks[0]), strict=True):
        assert one.plus == pytest.approx(other.plus, abs=1e-13)
        assert one.mean_steps == pytest.approx(other.mean_steps, abs=1e-12)


CARD = {"": (-2, 3), "plus": (-4, 0), "minus": (0, 4)}
RUNS = 40_000
NETWORKS = {
    "pair": [(1,), (0,)],
    "relay": [(), (0,), (1,), (2,)],
    "ring": [(3,), (0,), (1,), (2,)],
}


@pytest.mark.parametrize("name", NETWORKS)
def test_everybody_with_one_card_agrees_with_simulation(name: str) -> None:
    """Everyone that sees somebody keeps to the same bars; drawn observation by observation."""
    sees = NETWORKS[name]
    group = coin_group([(-3, 3)] * len(sees), sees, 12)
    users = [agent for agent, seen in enumerate(sees) if seen]

    def card(situation: Situation) -> Act:
        (state,) = situation.states
        low, high = np.array([CARD[""], CARD["plus"], CARD["minus"]]).T
        return Act(np.zeros(state.shape), low[state], high[state])

    found = adopt_together(solve(built(group)), {f"a{user}": card for user in users})
    by_card = sim.by_count(lambda _step, shown: CARD[shown[0]])
    by_own = sim.alone(0.0, (-3 * ALPHA, 3 * ALPHA))
    players = [by_card if seen else by_own for seen in sees]
    evidence = [sim.values(COIN, sim.COIN_COUNTS)] * len(sees)
    for side, answer in enumerate(("plus", "minus")):
        runs = sim.simulate(sees, evidence, players, 12, answer, RUNS, 3 + side)
        for agent in range(len(sees)):
            got, truth = runs.of(agent), outcome(found.tracks[agent])[side]
            for one, other in (
                (got.plus, truth.plus),
                (got.minus, truth.minus),
                (got.undecided, truth.undecided),
                (got.mean_step, truth.mean_steps),
            ):
                assert one.off(other) < 4.0, (name, agent, answer)


def test_a_stranger_cannot_adopt() -> None:
    group = coin_group([(-2, 2), (-3, 3)], [(1,), (0,)], 3)
    with pytest.raises(ModelError, match="no agent who"):
        adopt_together(solve(built(group)), {"who": lambda _: Act(np.zeros(()))})
