"""Layouts of lines for other groups: whole rules, mirrors, thresholds told apart, refusals."""

from __future__ import annotations

import itertools
import math
from typing import Any

import numpy as np
import pytest

from tests.distill.pricers import (
    ALPHA,
    EVEN,
    coin_group,
    covering,
    faults_of_cover,
    one_way,
    pricer_of_group,
)
from thumbwright.distill.forms import Wanted, lines
from thumbwright.distill.forms.batch import Batch
from thumbwright.distill.forms.runs import Layout, alone_rows, as_rule, exact_bars, lossless
from thumbwright.distill.network_pricer import NetworkPricer
from thumbwright.distill.rules import SHOWN, Rule
from thumbwright.exact.engine import solve
from thumbwright.exact.errors import ModelError
from thumbwright.exact.evidence.binary import bernoulli
from thumbwright.exact.group import Agent, Group, Thresholds, same_thresholds

INPUTS = ("step", "shown")


def every_cell_once(pricer: NetworkPricer, layout: Layout) -> None:
    assert faults_of_cover(pricer, as_rule(pricer, layout)) == 0


@pytest.mark.parametrize(
    ("bars", "sees", "exchange"),
    [
        ([(-2, 4), (-3, 2), (-3, 3)], [(), (), (0, 1)], "once"),
        ([(-2, 4), (-3, 3)], [(1,), (0,)], "once"),
        ([(-2, 4), (-3, 3)], [(1,), (0,)], "settle"),
    ],
    ids=["two neighbours", "mutual", "mutual, settle"],
)
def test_every_possible_situation_meets_exactly_one_line(
    bars: list[tuple[int, int]], sees: list[tuple[int, ...]], exchange: str
) -> None:
    group = coin_group(bars, sees, 7, exchange)
    pricer = pricer_of_group(group, f"a{len(bars) - 1}")
    layout, _ = lossless(pricer, INPUTS)
    every_cell_once(pricer, layout)
    for merged in itertools.islice(layout.merges(unnoticed=False), 0, None, 3):
        assert len(merged) < len(layout)
        every_cell_once(pricer, merged)
    for rows in (len(layout), 5, 3, 1):
        made = lines.distil(pricer, Wanted(rows, INPUTS))
        assert len(made.rule.rows) <= rows
        assert faults_of_cover(pricer, made.rule) == 0


def test_a_lossless_rule_for_two_neighbours_is_exact_play() -> None:
    """Calls are worth the same whenever they come, so bars by state and step lose nothing."""
    group = coin_group([(-2, 4), (-3, 2), (-3, 3)], [(), (), (0, 1)], 12)
    pricer = pricer_of_group(group, "a2")
    layout, mixed = lossless(pricer, INPUTS)
    assert mixed == 0
    figures = pricer.figures(pricer.rule_tally(as_rule(pricer, layout)))
    assert [figures.accuracy_lost, figures.delay_added] == pytest.approx([0, 0], abs=1e-12)


def test_lines_that_tell_thresholds_apart() -> None:
    named = {"even": (-3, 3), "quick": (-2, 4), "keen": (-4, 2)}
    pricer = covering(named, (-3, 3), 15)
    inputs = ("step", "shown", "thresholds")
    layout, mixed = lossless(pricer, inputs)
    assert mixed == 0
    figures = pricer.figures(pricer.rule_tally(as_rule(pricer, layout)))
    assert [figures.accuracy_lost, figures.delay_added] == pytest.approx([0, 0], abs=1e-12)
    merges = list(layout.merges(unnoticed=False))
    batch = Batch(pricer)
    together, changed = batch.tallies(merges), batch.changed(layout, merges)
    for merged, tally, changes in zip(merges, together, changed, strict=True):
        rule = as_rule(pricer, merged)
        expected = pricer.changed(as_rule(pricer, layout), rule)
        assert changes == pytest.approx(expected, abs=1e-12)
        assert faults_of_cover(pricer, rule) == 0
        assert pricer.objective(pricer.rule_tally(rule)) == pytest.approx(
            pricer.objective(tally), abs=1e-12
        )
    made = lines.distil(pricer, Wanted(6, inputs))
    assert len(made.rule.rows) <= 6
    assert faults_of_cover(pricer, made.rule) == 0


def test_thresholds_that_make_no_difference_are_not_told_apart() -> None:
    pricer = covering({"x": (-2, 4), "y": (-2, 4), "z": (-4, 2)}, (-3, 3), 12)
    layout, mixed = lossless(pricer, ("step", "shown", "thresholds"))
    assert mixed == 0
    rule = as_rule(pricer, layout)
    assert faults_of_cover(pricer, rule) == 0
    told = {frozenset(row.thresholds.get("a0", ())) for row in rule.rows}
    assert frozenset(["x", "y"]) in told
    assert not told & {frozenset("x"), frozenset("y")}


def test_lines_reach_to_the_horizon_even_where_nothing_can_be_shown_any_more() -> None:
    """The neighbour answers at its first step; silence after that has the line it had."""
    pricer = one_way((-1, 1), (-3, 3), 12)
    layout, _ = lossless(pricer, INPUTS)
    last = {row.shows["a0"]: row.step_to for row in as_rule(pricer, layout).rows}
    assert last == dict.fromkeys((frozenset([state]) for state in SHOWN), None)


@pytest.mark.parametrize("rows", [9, 4, 3, 2])
@pytest.mark.parametrize("watched", [(-2, 4), (-1, 3)])
def test_swapping_plus_and_minus_mirrors_the_lines(watched: tuple[int, int], rows: int) -> None:
    pricer = one_way(watched, (-3, 4), 16, losses=EVEN)
    other = one_way((-watched[1], -watched[0]), (-4, 3), 16, losses=EVEN)
    made, mirror = (lines.distil(p, Wanted(rows, INPUTS)).rule for p in (pricer, other))

    def bars(one: NetworkPricer, rule: Rule, sign: int) -> dict[tuple[int, int], Any]:
        s = one.situations
        row = s.rows_of(rule)
        found = {}
        for step, state, r in zip(s.step.tolist(), s.states[:, 0].tolist(), row, strict=True):
            pair_ = (rule.rows[r].minus_at, rule.rows[r].plus_at)
            if sign < 0:
                pair_ = tuple(None if b is None else -b for b in pair_[::-1])
                state = (0, 2, 1)[state]
            found[(step, state)] = pair_
        return found

    assert len(mirror.rows) == len(made.rows)
    objective = pricer.objective(pricer.rule_tally(made))
    assert other.objective(other.rule_tally(mirror)) == pytest.approx(objective, abs=1e-12)
    assert bars(other, mirror, -1) == bars(pricer, made, 1)


def test_drifting_evidence_gets_ranges_of_steps() -> None:
    """Alone: acceptance and rejection numbers at every step, straight from the thresholds."""
    evidence, bars = bernoulli(0.3, 0.1), Thresholds(-1.5, 1.5)
    agents = (
        Agent("a0", evidence, same_thresholds(bars)),
        Agent("a1", evidence, same_thresholds(bars), ("a0",)),
    )
    pricer = pricer_of_group(Group(agents, 0.0, 25), "a1")
    up, down = math.log(3.0), math.log(0.7 / 0.9)
    for row in alone_rows(pricer):
        for step in range(row.step_from or 1, (row.step_to or 25) + 1):
            tally = [x * up + (step - x) * down for x in range(-1, 40)]
            low = max((x - 1 for x, y in enumerate(tally) if y <= -1.5 + 1e-9), default=None)
            high = min((x - 1 for x, y in enumerate(tally) if y >= 1.5 - 1e-9), default=None)
            assert row.minus_at == (None if low is None or low < 0 else low)
            assert row.plus_at == (None if high is None or high > 25 else high)
    covered = [range(r.step_from or 1, (r.step_to or 25) + 1) for r in alone_rows(pricer)]
    assert sorted(step for part in covered for step in part) == list(range(1, 26))
    made = lines.distil(pricer, Wanted(8, INPUTS))
    assert faults_of_cover(pricer, made.rule) == 0


def test_exact_bars_are_where_the_belief_reaches_the_thresholds() -> None:
    pricer = one_way((-2, 4), (-3, 3), 12)
    worths = np.array([0.0, ALPHA, 0.4 * ALPHA, -2.0 * ALPHA, 60 * ALPHA, -60 * ALPHA])
    low, high = exact_bars(pricer, worths, np.ones(6, dtype=np.int64))
    assert low.tolist() == [-3, -4, -4, -1, -13, 12]
    assert high.tolist() == [3, 2, 3, 5, -12, 13]


def test_what_lines_cannot_be_made_for_is_refused() -> None:
    bars = same_thresholds(Thresholds(-1.0, 1.0))
    down = bernoulli(0.1, 0.3)
    watched = Agent("a0", down, bars)
    pricer = pricer_of_group(Group((watched, Agent("a1", down, bars, ("a0",))), 0.0, 5), "a1")
    with pytest.raises(ModelError, match="swap the two answers"):
        lines.distil(pricer, Wanted(6, INPUTS))
    group = coin_group([(-2, 2)] * 5, [(), (), (), (), (0, 1, 2, 3)], 3)
    assert solve(group)
    with pytest.raises(ModelError, match="81 joint states"):
        lines.distil(pricer_of_group(group, "a4"), Wanted(6, INPUTS))
