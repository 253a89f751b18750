"""Agents that start later, skip steps or look several times, against the enumeration."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest
from hypothesis import assume, given, settings, strategies as st

from tests.exact.comparing import (
    COIN,
    UNSURE,
    built,
    groups,
    outcomes_apart,
    track_apart,
    worths_apart,
)
from tests.exact.test_together import apart, counted
from tests.slow import group as slow
from tests.slow.enumerate import enumerate_group, play_rule
from thumbwright.exact.alone import alone
from thumbwright.exact.engine import solve
from thumbwright.exact.errors import ModelError
from thumbwright.exact.evidence.binary import bernoulli, coin
from thumbwright.exact.evidence.listed import listed
from thumbwright.exact.group import (
    Agent,
    Group,
    Thresholds,
    replace_thresholds,
    same_thresholds,
)
from thumbwright.exact.outcomes import outcomes
from thumbwright.exact.play import Act, Situation, adopt
from thumbwright.exact.together import together

ALPHA = math.log(1.5)
BARS = same_thresholds(Thresholds(-2 * ALPHA, 2 * ALPHA))


@st.composite
def timed_groups(draw: st.DrawFn) -> slow.Group:
    """Random groups whose agents look 0 to 2 times a step, few enough times to enumerate."""
    group = draw(groups())
    most = {1: 6, 2: 4, 3: 3}[len(group.sees)]
    tables = []
    for _ in group.sees:
        table = draw(
            st.lists(st.sampled_from([0, 1, 1, 2]), min_size=group.horizon, max_size=group.horizon)
        )
        while sum(table) > most:
            table[max(range(len(table)), key=lambda k: table[k])] -= 1
        assume(any(table))
        tables.append(tuple(table))
    return replace(group, looks=tuple(tables))


@settings(max_examples=80)
@given(timed_groups())
def test_random_timetables_agree_with_enumeration(group: slow.Group) -> None:
    model = enumerate_group(group)
    assume(model.narrowest > 1e-11)
    assume(not any(mass for near in model.near_tie for mass in near))
    solution = solve(built(group))
    assert outcomes_apart(model, solution) < 1e-10
    assert worths_apart(model, solution) < 1e-9
    assert apart(together(solution), counted(model, group.horizon)) < 1e-10


def belief_shift(step: int, states: tuple[int, ...]) -> float:
    """Worth (nats) that the rule of the test below gives to what is shown."""
    return 0.37 * (-1) ** step + sum((0.0, 0.83, -0.71)[state] for state in states)


@settings(max_examples=60)
@given(timed_groups(), st.integers(0, 2))
def test_rules_of_agents_with_timetables_agree_with_enumeration(
    group: slow.Group, adopter: int
) -> None:
    adopter %= len(group.sees)
    bars = list(group.thresholds)
    bars[adopter] = (bars[adopter][0]._replace(share=1.0),)
    group = replace(group, thresholds=tuple(bars))
    low, high = bars[adopter][0].minus, bars[adopter][0].plus
    margins = [math.inf]

    def rule(
        step: int, _round: int, seen: slow.Shown, tally: float, _own: tuple[int, ...]
    ) -> str | None:
        states = tuple(0 if e is None else {"plus": 1, "minus": 2}[e.answer] for e in seen)
        belief = group.prior + tally + belief_shift(step, states)
        margins.extend((abs(belief - low - 1e-9), abs(belief - high + 1e-9)))
        return "plus" if belief >= high - 1e-9 else "minus" if belief <= low + 1e-9 else None

    def policy(situation: Situation) -> Act:
        values = np.zeros(situation.shape)
        states = [np.broadcast_to(s, situation.shape) for s in situation.states]
        for index in np.ndindex(*situation.shape):
            values[index] = belief_shift(situation.step, tuple(int(s[index]) for s in states))
        return Act(values)

    here = built(group)
    # What others make of odd commitments is another matter, tested elsewhere.
    assume(not here.influences(adopter))
    model = enumerate_group(group)
    played = play_rule(group, model, adopter, rule, rounds="actual")
    assume(min(model.narrowest, played.narrowest, *margins) > 1e-11)
    play = adopt(solve(here), f"a{adopter}", policy)
    assert track_apart(played, adopter, play.track) < 1e-10


@pytest.mark.parametrize("exchange", ["once", "settle"])
def test_a_late_starter_waits_for_its_first_observation(exchange: str) -> None:
    """However much it is shown; with its first observation it may be far beyond its threshold."""
    sure = (slow.Thresholds(-0.1, 0.1),)
    group = slow.Group(
        ((), (0,), (0, 1)),
        (COIN,) * 3,
        (sure, sure, UNSURE),
        4,
        exchange,
        0.6,
        ((1, 1, 0, 0), (0, 0, 1, 0), (0, 2, 0, 1)),
    )
    model, solution = enumerate_group(group), solve(built(group))
    assert outcomes_apart(model, solution) < 1e-12
    assert worths_apart(model, solution) < 1e-10
    answers = solution.tracks[1].answers
    assert not answers[:, :, :3].any()
    assert answers[:, 0, 3].sum() > 0.5


@pytest.mark.parametrize(
    "evidence", [coin(0.6), bernoulli(0.3, 0.1), listed([0.5, 0.3, 0.2], [0.25, 0.3, 0.45])]
)
def test_one_look_at_every_step_is_the_ordinary_timetable(evidence: object) -> None:
    agents = Agent("a", evidence, BARS), Agent("b", evidence, BARS, ("a",))  # type: ignore[arg-type]
    plain = solve(Group(agents, 0.1, 6, "settle"))
    spelt = tuple(replace(agent, looks=(1,) * 6) for agent in agents)
    for one, other in zip(plain.tracks, solve(Group(spelt, 0.1, 6, "settle")).tracks, strict=True):
        assert np.array_equal(one.answers, other.answers)


def test_idle_steps_stretch_time_and_double_looks_are_pairs_of_signs() -> None:
    """Alone, looking every third step is the ordinary law, three times as slow."""
    laws = alone(coin(0.6), BARS[0][1], 0.0, 4)
    every = Agent("a", coin(0.6), BARS, (), (1, 0, 0) * 4)
    track = solve(Group((every,), 0.0, 12)).tracks[0]
    assert track.answers[:, :, 1::3] == pytest.approx(laws.answers[:, :, 1:], abs=1e-14)
    assert not track.answers[:, :, 2::3].any()
    # Two signs at once: +2, 0 or -2, as evidence of three values.
    twice = Agent("a", coin(0.6), BARS, (), (2,) * 5)
    pairs = Agent("a", listed([0.36, 0.48, 0.16], [0.16, 0.48, 0.36]), BARS)  # type: ignore[arg-type]
    got, expected = (outcomes(solve(Group((a,), 0.0, 5)))[0][0] for a in (twice, pairs))
    assert got.plus == pytest.approx(expected.plus, abs=1e-14)
    assert got.mean_steps == pytest.approx(expected.mean_steps, abs=1e-13)


def test_certain_evidence_in_either_of_two_looks() -> None:
    values = ((0.5, 0.0), (0.5, 0.6), (0.0, 0.4))
    bars = (slow.Thresholds(-3.0, 3.0),)
    group = slow.Group(
        ((), (0,)), (values, COIN), (bars, bars), 3, "settle", 0.4, ((0, 2, 1), (1, 1, 2))
    )
    model, solution = enumerate_group(group), solve(built(group))
    assert outcomes_apart(model, solution) < 1e-12
    assert worths_apart(model, solution) < 1e-10


def test_the_drift_counts_observations_and_not_steps() -> None:
    agent = Agent("a", bernoulli(0.3, 0.1), BARS, (), (0, 2, 0, 1))
    assert [agent.looks_at(step) for step in (1, 2, 3, 4)] == [0, 2, 0, 1]
    assert [agent.observed_by(step) for step in range(5)] == [0, 0, 2, 2, 3]
    plain = Agent("a", coin(0.6), BARS)
    assert (plain.looks_at(7), plain.observed_by(7)) == (1, 7)


def test_timetables_that_cannot_be() -> None:
    for looks, says in (
        ((1, -1), "whole number, 0 or more"),
        ((1, 0.5), "whole number, 0 or more"),
        ((0, 0), "can never commit"),
    ):
        with pytest.raises(ModelError, match=says):
            Agent("a", coin(0.6), BARS, (), looks)  # type: ignore[arg-type]
    with pytest.raises(ModelError, match=r"has 2 entries .* but there are 3 steps"):
        Group((Agent("a", coin(0.6), BARS, (), (1, 1)),), 0.0, 3)


def test_known_thresholds_leave_the_timetable_alone() -> None:
    group = Group((Agent("a", coin(0.6), BARS, (), (0, 1)),), 0.0, 2)
    other = Thresholds(-1.0, 1.0)
    (agent,) = replace_thresholds(group, {"a": other}).agents
    assert (agent.thresholds, agent.looks) == (same_thresholds(other), (0, 1))
