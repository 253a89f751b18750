"""The form "tree": an independent best-first search, the table as its ceiling, and symmetries."""

from __future__ import annotations

import itertools
import math
from dataclasses import replace
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings, strategies as st

from tests.distill.forms.test_table import SHOWN, covers, kept_by_rows, starter
from tests.distill.pricers import covering, faults_of_cover, one_way
from thumbwright.distill.forms import Distilled, Wanted, table, tree
from thumbwright.distill.forms.boxes import best_partitions, gain
from thumbwright.distill.network_pricer import NetworkPricer

Box = tuple[tuple[int, int], ...]


def distilled(pricer: NetworkPricer, rows: int, inputs: tuple[str, ...] = SHOWN) -> Distilled:
    made = tree.distil(pricer, Wanted(rows, inputs))
    assert faults_of_cover(pricer, made.rule) == 0
    return made


def saved(plus: np.ndarray[Any, Any], minus: np.ndarray[Any, Any], boxes: list[Box]) -> float:
    """Summed g of boxes of a grid, box by box."""
    total = 0.0
    for box in boxes:
        where = tuple(slice(a, b) for a, b in box)
        p, m = float(plus[where].sum()), float(minus[where].sum())
        total += sum(w * math.log(2 * w / (p + m)) for w in (p, m) if w > 0)
    return total


def grown_slowly(plus: np.ndarray[Any, Any], minus: np.ndarray[Any, Any], leaves: int) -> list[Box]:
    """Best first, trying every cut of every leaf each time."""
    boxes: list[Box] = [tuple((0, n) for n in plus.shape)]
    while len(boxes) < leaves:
        best: tuple[float, list[Box]] = (saved(plus, minus, boxes) + 1e-12, boxes)
        for place, box in enumerate(boxes):
            for axis, (start, stop) in enumerate(box):
                for cut in range(start + 1, stop):
                    parts = [
                        (*box[:axis], side, *box[axis + 1 :])
                        for side in ((start, cut), (cut, stop))
                    ]
                    tried = [*boxes[:place], *parts, *boxes[place + 1 :]]
                    if saved(plus, minus, tried) > best[0]:
                        best = (saved(plus, minus, tried), tried)
        if best[1] is boxes:
            return boxes
        boxes = best[1]
    return boxes


@settings(max_examples=25, deadline=None)
@given(seed=st.integers(0, 10_000), leaves=st.integers(1, 7))
def test_random_grids_against_a_slow_search_and_the_table(seed: int, leaves: int) -> None:
    generator = np.random.default_rng(seed)
    shape = (int(generator.integers(2, 6)), int(generator.integers(2, 5)))
    plus, minus = generator.gamma(0.7, size=(2, *shape))
    where = np.array(list(itertools.product(*map(range, shape))))
    boxes = tree.grown(where, plus.ravel(), minus.ravel(), shape, leaves)
    found = saved(plus, minus, list(boxes))
    assert found == pytest.approx(saved(plus, minus, grown_slowly(plus, minus, leaves)), abs=1e-9)
    assert len(boxes) <= leaves
    covered = np.zeros(shape, dtype=int)
    for box in boxes:
        covered[tuple(slice(a, b) for a, b in box)] += 1
    assert (covered == 1).all()
    best = best_partitions(plus, minus, leaves)[-1]
    assert best.gain >= found - 1e-12


@pytest.mark.parametrize("rows", [1, 2, 3, 4, 6, 9])
@pytest.mark.parametrize("name", ["frost-watch", "lot-inspection", "covers"])
def test_never_above_the_table(name: str, rows: int) -> None:
    case, pricer = covers() if name == "covers" else starter(name)
    inputs = tuple(case.rule.inputs)
    made = distilled(pricer, rows, inputs)
    best = table.distil(pricer, Wanted(rows, inputs))
    assert made.information_kept is not None
    assert best.information_kept is not None
    assert made.information_kept <= best.information_kept + 1e-12
    assert made.information_kept == pytest.approx(kept_by_rows(pricer, made), abs=1e-12)
    if rows == 1:
        assert made.information_kept == pytest.approx(0.0, abs=1e-12)


def test_the_known_trees() -> None:
    """Found once by another route, with three kinds of neighbour; not published."""
    case, pricer = covers()
    for rows, kept in ((6, 0.92982), (8, 0.96776)):
        made = distilled(pricer, rows, tuple(case.rule.inputs))
        assert made.information_kept == pytest.approx(kept, abs=5e-6)


def said(pricer: NetworkPricer, made: Distilled) -> dict[tuple[int, int], float | None]:
    s = pricer.situations
    row = s.rows_of(made.rule)
    cells = zip(s.step.tolist(), s.states[:, 0].tolist(), row, strict=True)
    return {(step, state): made.rule.rows[r].value for step, state, r in cells}


@pytest.mark.parametrize("rows", [2, 3, 5, 7])
def test_swapping_plus_and_minus_mirrors_the_tree(rows: int) -> None:
    pricer, other = one_way((-2, 4), (-3, 4), 20), one_way((-4, 2), (-4, 3), 20)
    here, there = said(pricer, distilled(pricer, rows)), said(other, distilled(other, rows))
    turned = {(step, (0, 2, 1)[state]): value for (step, state), value in there.items()}
    assert turned.keys() == here.keys()
    for cell, value in here.items():
        assert value is not None
        assert turned[cell] == pytest.approx(-value, abs=1e-9), cell


def test_duplicated_situations_and_another_scale_change_nothing() -> None:
    pricer = one_way((-2, 4), (-3, 3), 20)
    s = pricer.situations
    names = ("setting", "step", "round", "states", "worth", "shown_steps", "shown_rounds")
    doubled = replace(
        s,
        **{name: np.concatenate([getattr(s, name)] * 2) for name in names},
        plus=np.concatenate([0.3 * s.plus, 0.7 * s.plus]),
        minus=np.concatenate([0.3 * s.minus, 0.7 * s.minus]),
    )
    scaled = replace(s, plus=1e-6 * s.plus, minus=1e-6 * s.minus)
    for rows in (2, 4, 6):
        made = distilled(pricer, rows)
        for other in (doubled, scaled):
            same = distilled(replace(pricer, situations=other), rows)
            assert same.information_kept == pytest.approx(made.information_kept, abs=1e-12)
            for one, two in zip(same.rule.rows, made.rule.rows, strict=True):
                assert replace(one, value=None) == replace(two, value=None)
                assert one.value == pytest.approx(two.value, abs=1e-9)


@pytest.mark.parametrize("lost", [0.02, 0.001])
def test_the_fewest_leaves_within_the_accuracy_that_may_be_lost(lost: float) -> None:
    pricer = one_way((-2, 4), (-3, 3), 30)
    made = tree.distil(pricer, Wanted(9, SHOWN, lost))
    assert pricer.figures(pricer.rule_tally(made.rule)).accuracy_lost <= lost
    fewer = distilled(pricer, len(made.rule.rows) - 1)
    assert pricer.figures(pricer.rule_tally(fewer.rule)).accuracy_lost > lost


def test_a_tree_serves_where_the_table_is_too_large() -> None:
    pricer = covering({"x": (-2, 4), "y": (-4, 2)}, (-3, 3), 10)
    inputs = ("step", "shown", "thresholds", "steps_since_first", "steps_since_last", "plus_shown")
    made = tree.distil(pricer, Wanted(12, inputs))
    assert pricer.situations.rows_of(made.rule).min() >= 0
    assert (
        gain(
            *pricer.situations.pooled(pricer.situations.rows_of(made.rule), len(made.rule.rows))
        ).sum()
        > pricer.situations.nothing
    )
