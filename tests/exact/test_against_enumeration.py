"""The engine against the enumeration of all observation sequences, and against fixed values."""

from __future__ import annotations

import json
import math
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from hypothesis import assume, event, example, given, settings

from tests.exact.comparing import COIN, UNSURE, built, gap, groups, outcomes_apart, worths_apart
from tests.slow import group as slow
from tests.slow.enumerate import Enumeration, enumerate_group
from thumbwright.exact.engine import solve
from thumbwright.exact.jumps import jumps
from thumbwright.exact.outcomes import outcomes

REFERENCE = Path(__file__).parents[1] / "reference" / "small_networks.json"
NETWORKS: list[dict[str, Any]] = json.loads(REFERENCE.read_text())


@pytest.mark.parametrize("entry", NETWORKS, ids=lambda e: f"{e['name']}, {e['exchange']}")
def test_the_engine_meets_the_reference(entry: dict[str, Any]) -> None:
    group = slow.from_reference(entry)
    solution = solve(built(group))
    for agent, expected in enumerate(entry["agents"]):
        for got, name in zip(outcomes(solution)[agent], ("given_plus", "given_minus"), strict=True):
            for key, value in expected[name].items():
                assert gap(getattr(got, key), value) < 1e-10, (agent, name, key)
        first_rounds = [m for m in solution.tracks[agent].moments if m.round == 0]
        silent = (0,) * len(group.sees[agent])
        for moment, value in zip(
            first_rounds, expected["social_when_nobody_has_committed"], strict=True
        ):
            if value is not None:
                assert float(moment.value[silent]) == pytest.approx(value, abs=2e-12)
    assert solution.near_tie_mass == pytest.approx(0.0, abs=1e-300)


@pytest.mark.parametrize("entry", NETWORKS, ids=lambda e: f"{e['name']}, {e['exchange']}")
def test_the_engine_knows_every_history_of_the_reference(entry: dict[str, Any]) -> None:
    group = slow.from_reference(entry)
    model, solution = enumerate_group(group), solve(built(group))
    assert outcomes_apart(model, solution) < 1e-12
    assert worths_apart(model, solution) < 1e-10


# --- random groups -----------------------------------------------------------------------


@settings(max_examples=100)
@given(groups())
@example(slow.Group(((1,), (0,)), (COIN, COIN), (UNSURE, UNSURE), 6, "settle", 0.6))
@example(slow.Group(((1, 2), (2,), (0,)), (COIN,) * 3, (UNSURE,) * 3, 4, "once", 0.5))
def test_random_groups_agree_with_enumeration(group: slow.Group) -> None:
    model = enumerate_group(group)
    # A belief on the very edge of the tie rule is decided by rounding: not a fair comparison.
    event(f"{len(group.sees)} agents, branches 10^{len(str(len(model.branches))) - 1}")
    assume(model.narrowest > 1e-11)
    assume(not any(mass for near in model.near_tie for mass in near))
    solution = solve(built(group))
    assert outcomes_apart(model, solution) < 1e-10
    assert worths_apart(model, solution) < 1e-9
    assert solution.near_tie_mass == pytest.approx(0.0, abs=1e-300)


def test_near_ties_are_reported_with_their_mass() -> None:
    alpha = math.log(1.5)
    prior = math.log(0.3 / 0.7)
    for short in (5e-10, -5e-10):
        bars = ((slow.Thresholds(prior - 2 * alpha, prior + 2 * alpha + short),),)
        group = slow.Group(((),), (COIN,), bars, 4, "once", 0.3)
        model, solution = enumerate_group(group), solve(built(group))
        plus, minus = model.near_tie[0]
        assert plus == pytest.approx(0.36 + 0.48 * 0.36, abs=1e-12)
        assert solution.near_tie_mass == pytest.approx(0.3 * plus + 0.7 * minus, abs=1e-12)
        assert outcomes_apart(model, solution) < 1e-12


def test_the_comparison_can_fail() -> None:
    """A slightly different group is told apart in outcomes and in worths."""
    bars = ((slow.Thresholds(-0.5, 1.0),), (slow.Thresholds(-0.8, 1.2),))
    group = slow.Group(((1,), (0,)), (COIN, COIN), bars, 5)
    other = slow.Group(((), (0,)), (COIN, COIN), bars, 5)
    loose = slow.Group(((1,), (0,)), (COIN, ((0.601, 0.4), (0.399, 0.6))), bars, 5)
    model = enumerate_group(group)
    assert worths_apart(model, solve(built(group))) < 1e-10
    for wrong in (other, loose):
        assert outcomes_apart(model, solve(built(wrong))) > 1e-5
        assert worths_apart(model, solve(built(wrong))) > 1e-5


@pytest.mark.parametrize("values", [((1.0, 0.0), (0.0, 1.0)), ((0.0, 0.3), (1.0, 0.7))])
def test_certain_evidence_agrees_with_enumeration(values: tuple[tuple[float, float], ...]) -> None:
    """Values impossible under one answer, alone and beside uncertain ones, in company."""
    bars = (slow.Thresholds(-0.6, 0.9),)
    group = slow.Group(((), (0,)), (values, COIN), (bars, bars), 4, "settle", 0.4)
    model, solution = enumerate_group(group), solve(built(group))
    assert outcomes_apart(model, solution) < 1e-12
    assert worths_apart(model, solution) < 1e-10


def leanings(group: slow.Group, model: Enumeration, agent: int) -> np.ndarray[Any, Any]:
    """Of those undecided at the horizon: favouring plus, minus, neither; given plus, minus."""
    found = np.zeros((3, 2))
    index = len(model.tables.moments) - 1
    last = model.tables.moments[index]
    for branch in model.branches:
        if branch.shown[agent] is None:
            seen = tuple(
                event if event is not None and event.moment < last else None
                for event in model.tables.seen(agent, branch.shown)
            )
            belief = group.prior + branch.tally[agent] + model.tables.read(agent, index, seen)[1]
            row = 2 if abs(belief) <= 1e-9 else 0 if belief > 0 else 1
            found[row] += branch.plus, branch.minus
    return found


@pytest.mark.parametrize("entry", NETWORKS, ids=lambda e: f"{e['name']}, {e['exchange']}")
def test_what_the_undecided_favour(entry: dict[str, Any]) -> None:
    group = slow.from_reference(entry)
    model, solution = enumerate_group(group), solve(built(group))
    for agent, track in enumerate(solution.tracks):
        assert track.leaning == pytest.approx(leanings(group, model, agent), abs=1e-12)


@pytest.mark.parametrize("entry", NETWORKS[1:], ids=lambda e: f"{e['name']}, {e['exchange']}")
def test_the_table_of_jumps(entry: dict[str, Any]) -> None:
    """Every line against the enumeration, and every history that can be met has a line."""
    group = slow.from_reference(entry)
    model = enumerate_group(group)
    lines = {}
    for line in jumps(solve(built(group))).to_dict("records"):
        agent = int(line["agent"].removeprefix("a"))
        seen = tuple(
            None
            if line[f"a{k}_shows"] == "undecided"
            else slow.Event(line[f"a{k}_step"], line[f"a{k}_round"], line[f"a{k}_shows"])
            for k in group.sees[agent]
        )
        lines[(agent, line["step"], line["round"], seen)] = line
    moments = model.tables.moments
    for key, worth in model.worths.items():
        if worth.reached_plus == worth.reached_minus == 0.0:
            continue
        line = lines[key]
        assert line["worth"] == pytest.approx(worth.worth, abs=1e-10)
        for side in ("plus", "minus"):
            shown = getattr(worth, f"shown_{side}")
            assert line[f"shown_{side}"] == pytest.approx(shown, abs=1e-12)
            still = getattr(worth, f"reached_{side}") / shown
            assert line[f"still_{side}"] == pytest.approx(still, abs=1e-10)
        index = moments.index((key[1], key[2]))
        earlier = 0.0
        if index > 0:
            last = moments[index - 1]
            before = tuple(e if e is not None and e.moment < last else None for e in key[3])
            known = model.worth(key[0], *last, before)
            assert known is not None
            earlier = known
        assert line["jump"] == pytest.approx(worth.worth - earlier, abs=1e-10)
