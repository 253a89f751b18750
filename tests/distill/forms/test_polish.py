"""Polish: never a larger risk, no single move left that helps, and rows that still cover all."""

from __future__ import annotations

import itertools
from collections.abc import Iterator
from dataclasses import replace
from functools import cache

import numpy as np
import pytest

from tests.distill.forms.test_table import starter
from tests.distill.pricers import (
    as_slow,
    coin_group,
    covering,
    faults_of_cover,
    one_way,
    pair,
    pricer_of_group,
)
from tests.slow import pair_walk as walk
from thumbwright.distill.costs import Pricer
from thumbwright.distill.forms import Distilled, Wanted, form, polish
from thumbwright.distill.forms.axes import grid_axes
from thumbwright.distill.forms.boxes import Box
from thumbwright.distill.forms.exchanges import cuts
from thumbwright.distill.forms.moved_boxes import BoxMoves, box_of, in_order_of_cuts, moved_cuts
from thumbwright.distill.forms.moved_lines import layout_of
from thumbwright.distill.forms.polish import polished
from thumbwright.distill.forms.runs import as_rule, lossless
from thumbwright.distill.network_pricer import NetworkPricer
from thumbwright.distill.rules import Row, Rule
from thumbwright.exact.stopping import Losses

SHOWN = ("step", "shown")
UNEVEN = Losses(1.0, 1.3, 0.02)


def risk(pricer: Pricer, rule: Rule) -> float:
    return pricer.objective(pricer.rule_tally(rule))


def made(pricer: Pricer, name: str, wanted: Wanted) -> tuple[Distilled, Distilled]:
    """A form as it is distilled, and polished."""
    before: Distilled = form(name).distil(pricer, wanted)
    return before, polished(pricer, wanted, before)


@cache
def tiny() -> NetworkPricer:
    return one_way((-1, 3), (-2, 3), 7, losses=UNEVEN)


def bars_moved(rule: Rule) -> Iterator[Rule]:
    """Every rule with one bar, or one step between two lines, moved by one; row by row."""
    for number, row in enumerate(rule.rows):
        for name, by in itertools.product(("minus_at", "plus_at"), (-1, 1)):
            bar = getattr(row, name)
            if bar is not None:
                yield with_rows(rule, {number: replace(row, **{name: bar + by})})
    yield from steps_moved(rule)


def steps_moved(rule: Rule) -> Iterator[Rule]:
    for one, other in itertools.permutations(range(len(rule.rows)), 2):
        first, second = rule.rows[one], rule.rows[other]
        if first.step_to is None or second.step_from != first.step_to + 1:
            continue
        for by in (-1, 1):
            moved = {
                one: replace(first, step_to=first.step_to + by),
                other: replace(second, step_from=second.step_from + by),
            }
            yield with_rows(rule, moved)


def with_rows(rule: Rule, rows: dict[int, Row]) -> Rule:
    return replace(rule, rows=tuple(rows.get(k, row) for k, row in enumerate(rule.rows)))


def whole(pricer: NetworkPricer, rule: Rule) -> bool:
    """Whether the rule makes sense: rows of some length, bars apart, everything covered once."""
    last = pricer.group.horizon
    return faults_of_cover(pricer, rule) == 0 and all(
        (row.step_from or 1) <= (row.step_to or last)
        and (row.minus_at is None or row.plus_at is None or row.minus_at < row.plus_at)
        for row in rule.rows
    )


@pytest.mark.parametrize("rows", [2, 3, 5])
def test_no_single_move_of_a_bar_or_step_helps_lines(rows: int) -> None:
    """All moves made row by row here, priced by a walk that shares no code with the search."""
    # The walk does not say what belief favours at the horizon, so all undecided ends cost the same.
    priced = replace(tiny(), losses=replace(UNEVEN, undecided=0.6))
    case = pair((-1, 3), (-2, 3), 7)

    def slow_risk(rule: Rule) -> float:
        given = [walk.play(case, walk.reading(as_slow(rule)), side) for side in ("plus", "minus")]
        wrong = UNEVEN.false_minus * given[0].minus + UNEVEN.false_plus * given[1].plus
        late = sum(0.6 * one.undecided + UNEVEN.per_step * one.mean_step for one in given)
        return 0.5 * (wrong + late)

    before, after = made(priced, "lines", Wanted(rows, SHOWN))
    least = slow_risk(after.rule)
    assert least == pytest.approx(risk(priced, after.rule), abs=1e-12)
    moves = [rule for rule in bars_moved(after.rule) if whole(priced, rule)]
    assert len(moves) >= 4
    assert min(map(slow_risk, moves)) >= least - 1e-12
    assert least <= slow_risk(before.rule) + 1e-12


@pytest.mark.parametrize("name", ["table", "tree"])
@pytest.mark.parametrize("rows", [2, 3, 5])
def test_no_single_value_or_cut_helps_tables(name: str, rows: int) -> None:
    """Values are tried on a fine grid, which action classes know nothing of."""
    pricer = tiny()
    before, after = made(pricer, name, Wanted(rows, SHOWN))
    least = risk(pricer, after.rule)
    assert least <= risk(pricer, before.rule) + 1e-12
    worths = pricer.situations.worth
    held = pricer.situations.rows_of(after.rule)
    tried = [rule for rule in steps_moved(after.rule) if whole(pricer, rule)]
    for number, row in enumerate(after.rule.rows):
        here = worths[held == number]
        tried += [
            with_rows(after.rule, {number: replace(row, value=float(value))})
            for value in np.linspace(here.min(), here.max(), 60)
        ]
    assert min(risk(pricer, rule) for rule in tried) >= least - 1e-12


def spoilt(rule: Rule) -> Rule:
    """The rule with every bar two further out, or every value half as large."""
    if rule.has_bars:
        rows = [
            replace(
                row,
                minus_at=None if row.minus_at is None else row.minus_at - 2,
                plus_at=None if row.plus_at is None else row.plus_at + 2,
            )
            for row in rule.rows
        ]
    else:
        rows = [replace(row, value=0.5 * (row.value or 0.0)) for row in rule.rows]
    return replace(rule, rows=tuple(rows))


@pytest.mark.parametrize("name", ["lines", "table", "tree", "table-by-risk"])
def test_a_spoilt_rule_is_mended_and_the_note_says_by_how_much(name: str) -> None:
    pricer, wanted = one_way((-2, 4), (-3, 3), 12), Wanted(4, SHOWN)
    good: Distilled = form(name).distil(pricer, wanted)
    bad = replace(good, rule=spoilt(good.rule))
    mended = polished(pricer, wanted, bad)
    before, after = risk(pricer, bad.rule), risk(pricer, mended.rule)
    assert after < before - 1e-3
    assert f"risk {before:.6f} before, {after:.6f} after" in mended.notes[-1]
    assert faults_of_cover(pricer, mended.rule) == 0
    assert mended.rule.form == name
    assert mended.information_kept is not None
    assert 0.0 <= mended.information_kept <= 1.0 + 1e-12


def two_neighbours() -> NetworkPricer:
    """Every rule has to be played by itself."""
    group = coin_group([(-2, 3), (-3, 2), (-3, 3)], [(), (), (0, 1)], 6)
    return pricer_of_group(group, "a2", UNEVEN)


PRICERS = {
    "one way": lambda: one_way((-2, 5), (-3, 4), 14, losses=UNEVEN),
    "settle": lambda: one_way((-2, 5), (-3, 4), 14, "settle", losses=UNEVEN),
    "mutual": lambda: pricer_of_group(
        coin_group([(-2, 4), (-3, 3)], [(1,), (0,)], 10, "settle"), "a1", UNEVEN
    ),
    "named": lambda: covering({"x": (-2, 4), "y": (-4, 2)}, (-3, 3), 10, UNEVEN),
    "two neighbours": two_neighbours,
}


@pytest.mark.parametrize("name", ["lines", "table", "tree"])
@pytest.mark.parametrize("which", PRICERS)
def test_the_risk_is_never_larger_and_everything_stays_covered(which: str, name: str) -> None:
    pricer = PRICERS[which]()
    inputs = ("step", "shown", "thresholds") if which == "named" else SHOWN
    if which == "two neighbours":
        inputs = ("shown",)
    before, after = made(pricer, name, Wanted(4, inputs))
    assert risk(pricer, after.rule) <= risk(pricer, before.rule) + 1e-12
    assert len(after.rule.rows) <= len(before.rule.rows)
    assert faults_of_cover(pricer, after.rule) == 0
    if name == "tree":
        axes = grid_axes(pricer, inputs)
        assert in_order_of_cuts([box_of(pricer, axes, row) for row in after.rule.rows])


@pytest.mark.parametrize("name", ["lines", "table"])
def test_swapping_plus_and_minus_mirrors_it(name: str) -> None:
    one = one_way((-2, 5), (-3, 4), 12, losses=Losses(1.0, 1.4, 0.02))
    other = one_way((-5, 2), (-4, 3), 12, losses=Losses(1.4, 1.0, 0.02))
    here, there = (made(p, name, Wanted(4, SHOWN))[1] for p in (one, other))
    assert risk(one, here.rule) == pytest.approx(risk(other, there.rule), abs=1e-12)


def test_what_is_within_limits_stays_within() -> None:
    """Without the limit the polish gives up accuracy for time here."""
    pricer = one_way((-2, 4), (-3, 3), 16, losses=Losses(1.0, 1.0, 0.03))
    free = made(pricer, "table", Wanted(4, SHOWN))[1]
    assert pricer.figures(pricer.rule_tally(free.rule)).accuracy_lost > 0.01
    before, after = made(pricer, "table", Wanted(4, SHOWN, 0.01))
    assert pricer.figures(pricer.rule_tally(after.rule)).accuracy_lost <= 0.01
    assert risk(pricer, after.rule) <= risk(pricer, before.rule)


def test_a_search_that_is_cut_short_says_so(monkeypatch: pytest.MonkeyPatch) -> None:
    pricer = one_way((-2, 4), (-3, 3), 12)
    good: Distilled = form("lines").distil(pricer, Wanted(4, SHOWN))
    bad = replace(good, rule=spoilt(good.rule))
    monkeypatch.setattr(polish, "MOST_PRICED", 20)
    short = polished(pricer, Wanted(4, SHOWN), bad)
    assert "ended before all moves" in short.notes[-1]
    assert risk(pricer, short.rule) < risk(pricer, bad.rule)


@pytest.mark.parametrize("name", ["frost-watch", "lot-inspection"])
def test_lines_and_layouts_are_each_others_opposite(name: str) -> None:
    _, pricer = starter(name)
    layout, _ = lossless(pricer, SHOWN)
    rule = as_rule(pricer, layout)
    assert as_rule(pricer, layout_of(pricer, SHOWN, rule)) == rule


def test_rows_and_boxes_are_each_others_opposite() -> None:
    for pricer, inputs in (
        (tiny(), SHOWN),
        (PRICERS["named"](), ("step", "shown", "thresholds")),
        (two_neighbours(), ("shown", "plus_shown", "first_answer")),
        (two_neighbours(), ("steps_since_first", "minus_shown")),
    ):
        rule = form("tree").distil(pricer, Wanted(5, inputs)).rule
        moves = BoxMoves(pricer, inputs, rule)
        assert moves.rule(moves.start) == rule


def grown(generator: np.random.Generator, shape: tuple[int, ...], boxes: int) -> tuple[Box, ...]:
    """Boxes by random successive cuts."""
    found: tuple[Box, ...] = (tuple((0, n) for n in shape),)
    while len(found) < boxes:
        options = list(cuts(found))
        number, below, above = options[generator.integers(len(options))]
        found = (*found[:number], below, above, *found[number + 1 :])
    return found


@pytest.mark.parametrize("seed", range(30))
def test_moved_cuts_still_cover_every_cell_once(seed: int) -> None:
    generator = np.random.default_rng(seed)
    shape = (6, 3, 4) if seed % 2 else (7, 5)
    boxes = grown(generator, shape, 7)
    moved = list(moved_cuts(boxes, (1, 2)))
    assert moved
    for one in moved:
        count = np.zeros(shape, dtype=int)
        for box in one:
            count[tuple(slice(start, stop) for start, stop in box)] += 1
        assert (count == 1).all()
        assert len(one) == len(boxes)
        assert one != boxes
    # Every box with room has a face that moves.
    changed = {k for one in moved for k in range(len(boxes)) if one[k] != boxes[k]}
    roomy = {k for k, box in enumerate(boxes) if any(b - a > 1 for a, b in box)}
    assert changed >= roomy - {k for k in roomy if only_stretch_is_whole(boxes[k], shape)}


def only_stretch_is_whole(box: Box, shape: tuple[int, ...]) -> bool:
    """Whether a box is longer than a cell only along axes that it fills."""
    return all(b - a in (1, n) for (a, b), n in zip(box, shape, strict=True))


def test_a_cut_that_several_rows_share_moves_as_one() -> None:
    boxes: tuple[Box, ...] = (((0, 3), (0, 2)), ((3, 6), (0, 1)), ((3, 6), (1, 2)))
    assert (((0, 2), (0, 2)), ((2, 6), (0, 1)), ((2, 6), (1, 2))) in set(moved_cuts(boxes, (1,)))
    assert all(one[1][0][0] == one[2][0][0] for one in moved_cuts(boxes, (1, 2)))


def test_lines_keep_a_bar_even_where_never_answering_is_free() -> None:
    """Rows without any bar would be read as rows of values, and priced as such."""
    pricer = one_way((-1, 3), (-2, 3), 7, losses=Losses(1.0, 1.3, 0.0, undecided=0.0))
    before, after = made(pricer, "lines", Wanted(2, SHOWN))
    assert after.rule.has_bars
    assert risk(pricer, after.rule) <= risk(pricer, before.rule) + 1e-12


@pytest.mark.parametrize("name", ["minus_at", "plus_at", "both", "border"])
@pytest.mark.parametrize("by", [-2, 2])
def test_whatever_is_spoilt_no_single_move_is_left_that_helps(name: str, by: int) -> None:
    """One bar of the quiet lines, both of them, or the step between these lines is misplaced."""
    pricer = one_way((-2, 4), (-3, 3), 12, losses=UNEVEN)
    good: Distilled = form("lines").distil(pricer, Wanted(4, SHOWN))
    first, second, *rest = good.rule.rows
    assert first.shows == second.shows
    if name == "border":
        last = (first.step_to or 0) + 4 + by
        first, second = replace(first, step_to=last), replace(second, step_from=last + 1)
    else:
        for bar in ("minus_at", "plus_at") if name == "both" else (name,):
            moved = (replace(row, **{bar: getattr(row, bar) + by}) for row in (first, second))
            first, second = moved
    bad = replace(good, rule=replace(good.rule, rows=(first, second, *rest)))
    assert whole(pricer, bad.rule)
    mended = polished(pricer, Wanted(4, SHOWN), bad)
    least = risk(pricer, mended.rule)
    moves = [rule for rule in bars_moved(mended.rule) if whole(pricer, rule)]
    assert min(risk(pricer, rule) for rule in moves) >= least - 1e-12
    assert least < risk(pricer, bad.rule)


def test_faces_that_only_meet_in_a_corner_move_by_themselves() -> None:
    boxes: tuple[Box, ...] = (
        ((0, 3), (0, 1)),
        ((0, 3), (1, 3)),
        ((3, 6), (0, 1)),
        ((3, 6), (1, 3)),
    )
    moved = set(moved_cuts(boxes, (1,)))
    assert (((0, 2), (0, 1)), boxes[1], ((2, 6), (0, 1)), boxes[3]) in moved
    assert (boxes[0], ((0, 4), (1, 3)), boxes[2], ((4, 6), (1, 3))) in moved


def test_a_tree_stays_a_tree() -> None:
    """Moving half of its first cut would leave rows that its sentences cannot be made of."""
    pricer = one_way((-2, 4), (-3, 3), 8)
    low, rest = frozenset({"minus"}), frozenset({"undecided", "plus"})
    rows = [
        Row(step_to=4, shows={"a0": low}, value=-0.5),
        Row(step_to=4, shows={"a0": rest}, value=0.5),
        Row(step_from=5, shows={"a0": low}, value=-0.6),
        Row(step_from=5, shows={"a0": rest}, value=0.6),
    ]
    orders = {}
    for name in ("tree", "table"):
        moves = BoxMoves(pricer, SHOWN, Rule(name, "a1", ("a0",), tuple(rows)))
        made_of = [one.boxes for one in moves.moves(moves.start)]
        orders[name] = {in_order_of_cuts(boxes) for boxes in made_of}
    assert orders == {"tree": {True}, "table": {True, False}}


def test_a_table_for_all_is_left_as_it_is() -> None:
    """It is right where all use it; the price of a single user would spoil it."""
    pricer = one_way((-2, 4), (-3, 3), 8)
    good: Distilled = form("table").distil(pricer, Wanted(3, SHOWN))
    bad = replace(good, rule=replace(spoilt(good.in_rows), form="table-for-all"))
    kept = polished(pricer, Wanted(3, SHOWN), bad)
    assert kept.rule == bad.rule
    assert kept.notes[-1].startswith("Not polished")
