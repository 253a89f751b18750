"""The form "lines": the card of the frost watch, and every merge against a walk by counts."""

from __future__ import annotations

import math
from functools import cache
from typing import Any

import pytest

from tests.distill.pricers import (
    ALPHA,
    as_slow,
    faults_of_cover,
    one_way,
    pair,
)
from tests.slow import pair_walk as walk
from thumbwright.distill.forms import Wanted, lines
from thumbwright.distill.forms.batch import Batch
from thumbwright.distill.forms.runs import Layout, as_rule, lossless
from thumbwright.distill.gather import pricer_of
from thumbwright.distill.network_pricer import NetworkPricer
from thumbwright.distill.reading import read_case
from thumbwright.distill.rules import Row, Rule
from thumbwright.distill.tallies import Tally

INPUTS = ("step", "shown")
SIDES = ("plus", "minus")
FROST = pair((-2, 4), (-3, 3), 40)
CARD = [
    (None, 2, ["undecided"], -3, 3, True),
    (3, None, ["undecided"], -4, 3, False),
    (None, None, ["plus"], -7, -1, False),
    (None, None, ["minus"], -1, 5, False),
]


@cache
def frost() -> NetworkPricer:
    return pricer_of(read_case("frost-watch"))[0]


def shown(row: Row) -> tuple[Any, ...]:
    (states,) = row.shows.values()
    return row.step_from, row.step_to, sorted(states), row.minus_at, row.plus_at, row.base


def four_lines() -> Layout:
    """The four lines of the card as a layout."""
    layout, mixed = lossless(frost(), INPUTS)
    assert mixed == 0
    (kept,) = (
        merged
        for merged in layout.merges(unnoticed=True)
        if [shown(row) for row in as_rule(frost(), merged).rows] == CARD
    )
    return kept


def test_frost_watch_comes_out_as_four_lines() -> None:
    made = lines.distil(frost(), Wanted(6, INPUTS))
    assert [shown(row) for row in made.rule.rows] == CARD
    assert any("1 merged away" in note for note in made.notes)


def test_without_merging_there_is_a_fifth_from_check_39_on() -> None:
    layout, _ = lossless(frost(), INPUTS)
    undecided = [shown(row) for row in as_rule(frost(), layout).rows][:3]
    assert undecided == [
        (None, 2, ["undecided"], -3, 3, True),
        (3, 38, ["undecided"], -4, 3, False),
        (39, None, ["undecided"], -4, 2, False),
    ]
    assert len(layout) == 5
    # It comes from the tie rule: silence is worth just short of one sign, but within the tie.
    short = 1.0 - walk.Worths(FROST).silence[38] / ALPHA
    assert 0.0 < short * ALPHA <= 1e-9
    assert 1.0 - walk.Worths(FROST).silence[37] / ALPHA > 1e-9 / ALPHA
    # The lossless layout acts as exact play does, and merging the fifth goes unnoticed.
    exact, slow = walk.exact(FROST), walk.reading(as_slow(as_rule(frost(), layout)))
    card = walk.reading(as_slow(as_rule(frost(), four_lines())))
    for side in SIDES:
        assert walk.differ(FROST, exact, slow, side) == 0.0
        assert 0.0 < walk.differ(FROST, exact, card, side) < 1e-4


def test_the_card_costs_next_to_nothing() -> None:
    pricer = frost()
    made = lines.distil(pricer, Wanted(6, INPUTS))
    card, exact = (pricer.figures(t) for t in (pricer.rule_tally(made.rule), pricer.exact_tally))
    assert card.risk is not None
    assert exact.risk is not None
    gaps = [
        card.accuracy_lost,
        card.delay_added,
        card.risk - exact.risk,
        card.wrong_given_plus - exact.wrong_given_plus,
        card.wrong_given_minus - exact.wrong_given_minus,
    ]
    for side in ("given_plus", "given_minus"):
        mine, theirs = getattr(card, side), getattr(exact, side)
        gaps += [mine[name] - theirs[name] for name in ("plus", "minus", "undecided", "steps")]
    assert max(map(abs, gaps)) < 1e-5
    assert card.benefit_kept == pytest.approx(1.0, abs=1e-5)


@pytest.mark.parametrize(
    ("watched", "observer"),
    [((-1, 6), (-1, 2)), ((-1, 6), (-2, 1)), ((-2, 5), (-1, 2)), ((-3, 4), (-3, 4))],
)
def test_with_rows_to_spare_only_the_unnoticed_is_merged(
    watched: tuple[int, int], observer: tuple[int, int]
) -> None:
    """Against exact play as walked by counts, on the same observations."""
    pricer, case = one_way(watched, observer, 40), pair(watched, observer, 40)
    made = lines.distil(pricer, Wanted(60, INPUTS))
    rule = walk.reading(as_slow(made.rule))
    assert sum(walk.differ(case, walk.exact(case), rule, side) for side in SIDES) / 2 < 1e-4


def apart(tally: Tally, case: walk.Pair, rule: walk.LookRule) -> float:
    """Largest difference between a tally and the walk by counts."""
    worst = 0.0
    for k, side in enumerate(SIDES):
        slow = walk.play(case, rule, side)
        for got, expected in (
            (tally.plus[k], slow.plus),
            (tally.minus[k], slow.minus),
            (tally.undecided[k], slow.undecided),
            (tally.steps[k], slow.mean_step),
        ):
            worst = max(worst, abs(float(got) - expected))
    return worst


def test_every_merge_of_the_card_costs_what_the_walk_says() -> None:
    """All layouts with a line fewer: what they do, and how often they do something else."""
    pricer, layout = frost(), four_lines()
    merges = list(layout.merges(unnoticed=False))
    # The two undecided lines with either lower bar; lit and stood down with either bar each, less
    # the pair in which the bars would meet.
    assert {len(merged) for merged in merges} == {3}
    assert len(merges) == 2 + 3
    batch = Batch(pricer)
    together, changed = batch.tallies(merges), batch.changed(layout, merges)
    card = walk.reading(as_slow(as_rule(pricer, layout)))
    unchanged = 0
    for merged, tally, changes in zip(merges, together, changed, strict=True):
        rule = as_rule(pricer, merged)
        assert faults_of_cover(pricer, rule) == 0
        slow = walk.reading(as_slow(rule))
        assert apart(tally, FROST, slow) < 1e-12
        assert apart(pricer.rule_tally(rule), FROST, slow) < 1e-12
        risk = risk_of(FROST, pricer, rule)
        for found in (tally, pricer.rule_tally(rule)):
            assert pricer.objective(found) == pytest.approx(risk, abs=1e-12)
        expected = sum(walk.differ(FROST, card, slow, side) for side in SIDES) / 2
        assert changes == pytest.approx(expected, abs=1e-12)
        assert pricer.changed(as_rule(pricer, layout), rule) == pytest.approx(expected, abs=1e-12)
        unchanged += changes == 0.0
    # Nobody can have counted to three by check 2, so the bar of 4 does for all checks.
    assert unchanged == 1
    assert min(change for change in changed if change) > 0.01


def risk_of(case: walk.Pair, pricer: NetworkPricer, rule: Rule) -> float:
    """Risk from the walk by counts; at the horizon the belief that the row's worth gives."""
    assert pricer.losses is not None
    s = pricer.situations
    row = s.rows_of(rule)
    total = 0.0
    for side in SIDES:
        slow = walk.play(case, walk.reading(as_slow(rule)), side)
        wrong = slow.minus if side == "plus" else slow.plus
        for (call, count), mass in slow.left.items():
            # What was shown in the last step comes too late for it.
            known = call if call is not None and call.step < case.horizon else None
            state = 0 if known is None else 1 + (known.answer == "minus")
            now = (s.step == case.horizon) & (s.states[:, 0] == state)
            here = row == row[now][0]
            belief = count * ALPHA + math.log(s.plus[here].sum() / s.minus[here].sum())
            if abs(belief) <= 1e-9:
                wrong += mass / 2
            elif (belief > 0) != (side == "plus"):
                wrong += mass
        loss = pricer.losses.false_minus if side == "plus" else pricer.losses.false_plus
        total += (loss * wrong + pricer.losses.per_step * slow.mean_step) / 2
    return total


@pytest.mark.parametrize("rows", [3, 2, 1])
def test_fewer_lines_cost_what_the_walk_says_and_are_the_best_merges(rows: int) -> None:
    pricer = frost()
    made = lines.distil(pricer, Wanted(rows, INPUTS))
    assert len(made.rule.rows) == rows
    tally = pricer.rule_tally(made.rule)
    assert apart(tally, FROST, walk.reading(as_slow(made.rule))) < 1e-12
    assert pricer.objective(tally) == pytest.approx(risk_of(FROST, pricer, made.rule), abs=1e-12)
    reachable = {four_lines()}
    for _ in range(4 - rows):
        reachable = {merged for layout in reachable for merged in layout.merges(unnoticed=False)}
    least = min(Batch(pricer).objectives(list(reachable)))
    assert pricer.objective(tally) <= least + 1e-12
    lost = pricer.objective(tally) - pricer.objective(pricer.exact_tally)
    assert (abs(lost) < 1e-5) if rows == 3 else (lost > 1e-3)


@pytest.mark.parametrize("exchange", ["once", "settle"])
@pytest.mark.parametrize(("watched", "observer"), [((-2, 6), (-3, 3)), ((-3, 2), (-2, 5))])
def test_other_pairs_cost_what_the_walk_says(
    watched: tuple[int, int], observer: tuple[int, int], exchange: str
) -> None:
    pricer, case = one_way(watched, observer, 25, exchange), pair(watched, observer, 25, exchange)
    layout, _ = lossless(pricer, INPUTS)
    assert apart(pricer.exact_tally, case, walk.exact(case)) < 1e-12
    for rows in (2, 4):
        made = lines.distil(pricer, Wanted(rows, INPUTS))
        assert faults_of_cover(pricer, made.rule) == 0
        slow = walk.reading(as_slow(made.rule))
        assert apart(pricer.rule_tally(made.rule), case, slow) < 1e-12
    merges = list(layout.merges(unnoticed=False))[::5]
    for merged, tally in zip(merges, Batch(pricer).tallies(merges), strict=True):
        assert apart(tally, case, walk.reading(as_slow(as_rule(pricer, merged)))) < 1e-12


def all_merges(layout: Layout) -> dict[int, set[Layout]]:
    """Every layout that any sequence of merges can reach, by number of lines."""
    levels = {len(layout): {layout}}
    while levels[min(levels)] and min(levels) > 1:
        smallest = min(levels)
        levels[smallest - 1] = {
            merged for one in levels[smallest] for merged in one.merges(unnoticed=False)
        }
    return levels


@pytest.mark.parametrize(
    ("watched", "horizon", "lost"),
    [
        ((-2, 4), 20, 0.0285),
        ((-2, 6), 20, 1e-9),
        ((-2, 4), 20, 1e-9),
        ((-2, 4), 20, 0.034),
        ((-1, 4), 20, 0.005),
        # No three lines lose so little, but two and even one do: slower, and more accurate.
        ((-2, 4), 40, 1e-9),
    ],
)
def test_the_fewest_lines_within_the_accuracy_that_may_be_lost(
    watched: tuple[int, int], horizon: int, lost: float
) -> None:
    pricer = one_way(watched, (-3, 3), horizon)
    made = lines.distil(pricer, Wanted(9, INPUTS, lost))
    assert pricer.figures(pricer.rule_tally(made.rule)).accuracy_lost <= lost
    exact = pricer.accuracy(pricer.exact_tally)
    for count, layouts in all_merges(lossless(pricer, INPUTS)[0]).items():
        if count < len(made.rule.rows):
            tallies = Batch(pricer).tallies(list(layouts))
            assert min(exact - pricer.accuracy(tally) for tally in tallies) > lost


def test_no_accuracy_at_all_may_be_lost() -> None:
    made = lines.distil(frost(), Wanted(6, INPUTS, 0.0))
    assert frost().figures(frost().rule_tally(made.rule)).accuracy_lost <= 1e-12


def test_what_cannot_be_met_is_said() -> None:
    made = lines.distil(frost(), Wanted(1, INPUTS, -1.0))
    assert len(made.rule.rows) == 1
    assert any(note.startswith("No rule of up to 1 lines") for note in made.notes)
