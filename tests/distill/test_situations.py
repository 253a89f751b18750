"""Situations and their weights against walks done by hand, one history at a time."""

from __future__ import annotations

import math
from collections import defaultdict

import numpy as np
import pytest

from tests.distill.pricers import ALPHA, covering, one_way, pair
from tests.slow import pair_walk as walk
from thumbwright.distill.rules import Row, Rule
from thumbwright.distill.situations import situations_of, values_of

CODES = {"plus": 1, "minus": 2}

Key = tuple[int, int, int]
"""Step, round, code of the shown state."""


def by_hand(case: walk.Pair, rounds: dict[int, int]) -> dict[Key, list[tuple[float, float, float]]]:
    """(mass given plus, mass given minus, worth) of every history, by when and what is shown.

    For each history the observer's own walk is run against it with its exact decisions; omega is
    the mean over both answers of the chance of being still undecided before the round, shared
    among the rounds of the step.
    """
    rule, worths = walk.exact(case), walk.Worths(case)
    laws = [walk.watched_walk(case, answer) for answer in ("plus", "minus")]
    found: dict[Key, list[tuple[float, float, float]]] = defaultdict(list)
    for call in [None, *laws[0][0]]:
        chance = [law[0][call] if call else math.nan for law in laws]
        # Own mass by count, given plus and given minus, along this one history.
        walks: list[dict[int, float]] = [{0: 1.0}, {0: 1.0}]
        for step in range(1, case.horizon + 1):
            moved: list[dict[int, float]] = []
            for own, answer in zip(walks, ("plus", "minus"), strict=True):
                ahead: dict[int, float] = defaultdict(float)
                for count, mass in own.items():
                    for add, p in case.observer.masses(answer):
                        ahead[count + add] += mass * p
                moved.append(ahead)
            walks = moved
            for round_ in range(rounds[step]):
                known = step - 1 + min(round_, 1)  # nothing new can come after the second look
                shown = call if call is not None and call.step <= known else None
                omega = sum(math.fsum(own.values()) for own in walks) / 2 / rounds[step]
                shown_chance = chance if shown else [law[1][known] for law in laws]
                if (shown is not None or call is None) and max(shown_chance) > 0:
                    state = CODES[shown.answer] if shown else 0
                    worth = worths.of(shown, known)
                    masses = (omega * shown_chance[0], omega * shown_chance[1], worth)
                    found[(step, round_, state)].append(masses)
                # Silence that cannot be is never met, so nothing is decided there.
                if shown is not None or min(law[1][known] for law in laws) > 0:
                    walks = [
                        {c: m for c, m in own.items() if rule(step, known, shown, c) is None}
                        for own in walks
                    ]
    return found


@pytest.mark.parametrize("exchange", ["once", "settle"])
@pytest.mark.parametrize(("watched", "observer"), [((-2, 4), (-3, 3)), ((-1, 3), (-2, 5))])
def test_masses_and_worths(
    watched: tuple[int, int], observer: tuple[int, int], exchange: str
) -> None:
    pricer = one_way(watched, observer, 14, exchange)
    situations, track = pricer.situations, pricer.settings[0].solution.tracks[1]
    rounds = {moment.step: moment.round + 1 for moment in track.moments}
    assert set(rounds.values()) == ({1} if exchange == "once" else {1, 2, 3})
    expected = by_hand(pair(watched, observer, 14, exchange), rounds)
    got: dict[Key, list[tuple[float, float, float]]] = defaultdict(list)
    for i in range(len(situations.step)):
        key = (int(situations.step[i]), int(situations.round[i]), int(situations.states[i, 0]))
        got[key].append((situations.plus[i], situations.minus[i], situations.worth[i]))
    assert got.keys() == expected.keys()
    for key, entries in got.items():
        here, there = np.array(sorted(entries)), np.array(sorted(expected[key]))
        assert here == pytest.approx(there, abs=1e-12)


def test_settings_share_the_mass() -> None:
    several = covering({"x": (-2, 4), "y": (-3, 3), "z": (-4, 2)}, (-3, 3), 10).situations
    for number, watched in enumerate([(-2, 4), (-3, 3), (-4, 2)]):
        lone, here = one_way(watched, (-3, 3), 10).situations, several.setting == number
        assert several.plus[here] == pytest.approx(lone.plus / 3, rel=1e-12)
        assert several.minus[here] == pytest.approx(lone.minus / 3, rel=1e-12)


def test_the_value_of_a_row_is_the_best_one() -> None:
    """No other single value has a smaller weighted log loss on what the row lumps."""
    pricer = one_way((-2, 4), (-3, 3), 12)
    s = pricer.situations
    rule = Rule("table", "a1", ("a0",), (Row(step_to=6, value=0.0), Row(step_from=7, value=0.0)))
    row = s.rows_of(rule)
    values = values_of(*s.pooled(row, 2))

    def loss(value: float, number: int) -> float:
        plus, minus = s.plus[row == number].sum(), s.minus[row == number].sum()
        return float(plus * np.logaddexp(0, -value) + minus * np.logaddexp(0, value))

    for number in (0, 1):
        best = loss(values[number], number)
        for other in np.linspace(-4 * ALPHA, 4 * ALPHA, 41):
            assert best <= loss(float(other), number) + 1e-15
        # And it is not the mean of the exact worths.
        mean = np.average(s.worth[row == number], weights=(s.plus + s.minus)[row == number])
        assert abs(values[number] - mean) > 1e-3


def test_values_of_rows_that_never_apply_or_prove_something() -> None:
    got = values_of(np.array([0.0, 0.2, 0.0]), np.array([0.0, 0.0, 0.1]))
    assert got.tolist() == [0.0, math.inf, -math.inf]


def test_a_group_with_nobody_to_watch_has_one_situation_per_step() -> None:
    pricer = one_way((-2, 4), (-3, 3), 9)
    found = situations_of(pricer.settings, "a0")
    assert found.step.tolist() == list(range(1, 10))
    assert found.worth.tolist() == [0.0] * 9
    assert found.information_kept(found.everything) is None
