"""Most informative partitions against everything that could have been chosen instead."""

from __future__ import annotations

import json
import math
from collections.abc import Iterator
from itertools import combinations, pairwise
from pathlib import Path
from typing import Any

import numpy as np
import pytest
import ruptures
from hypothesis import given, settings, strategies as st
from hypothesis.extra import numpy as hnp
from ruptures.base import BaseCost
from sklearn.tree import DecisionTreeClassifier

from thumbwright.distill.forms.boxes import Box, best_partitions
from thumbwright.distill.forms.grouping import best_groupings

PUBLISHED = Path(__file__).parents[2] / "reference" / "published.json"

Array = np.ndarray[Any, Any]
Masses = tuple[Array, Array]


def g(plus: float, minus: float) -> float:
    """Log loss saved by valuing a group for itself, written out."""
    total = 0.0
    for mass in (plus, minus):
        if mass > 0.0:
            total += mass * math.log(2.0 * mass / (plus + minus))
    return total


def summed(plus: Array, minus: Array, boxes: tuple[Box, ...]) -> float:
    """g of boxes, each cell added up one by one."""
    total = 0.0
    for box in boxes:
        where = tuple(slice(start, stop) for start, stop in box)
        total += g(math.fsum(plus[where].ravel()), math.fsum(minus[where].ravel()))
    return total


def tables(shape: tuple[int, ...], most: int) -> list[set[frozenset[Box]]]:
    """Every table that successive cuts can make, by number of boxes (entry 0: one box)."""
    found: list[set[frozenset[Box]]] = [{frozenset([tuple((0, n) for n in shape)])}]
    for _ in range(most - 1):
        found.append({more for table in found[-1] for more in cut_once(table)})
    return found


def cut_once(table: frozenset[Box]) -> Iterator[frozenset[Box]]:
    for box in table:
        for axis, (start, stop) in enumerate(box):
            for cut in range(start + 1, stop):
                halves = [
                    (*box[:axis], ends, *box[axis + 1 :]) for ends in ((start, cut), (cut, stop))
                ]
                yield table - {box} | frozenset(halves)


def masses(seed: int, shape: tuple[int, ...]) -> Masses:
    """Random masses; some cells can occur under one answer only, some not at all."""
    draw = np.random.default_rng(seed)
    plus, minus = draw.gamma(0.7, size=(2, *shape))
    for side in (plus, minus):
        never = draw.random(shape) < 0.15
        never.flat[0] = False
        side[never] = 0.0
    return plus / plus.sum(), minus / minus.sum()


def greedy(plus: Array, minus: Array, leaves: int) -> float:
    """g of scikit-learn's greedy tree: two rows per cell, one for each answer."""
    cells = np.array(list(np.ndindex(*plus.shape)))
    where = np.concatenate([cells, cells])
    answer = np.repeat([1, 0], len(cells))
    weight = np.concatenate([plus.ravel(), minus.ravel()])
    tree = DecisionTreeClassifier(criterion="log_loss", max_leaf_nodes=leaves, random_state=0)
    leaf = tree.fit(where, answer, sample_weight=weight).apply(cells)
    return sum(
        g(float(plus.ravel()[leaf == name].sum()), float(minus.ravel()[leaf == name].sum()))
        for name in np.unique(leaf)
    )


class SavedLogLoss(BaseCost):  # type: ignore[misc]
    """The cost of a segment for the independent library: minus what it saves."""

    model, min_size = "", 1

    def fit(self, signal: Array) -> SavedLogLoss:
        self.signal = signal
        return self

    def error(self, start: int, end: int) -> float:
        plus, minus = self.signal[start:end].sum(axis=0)
        return -g(float(plus), float(minus))


SHAPES = [(1,), (5,), (7,), (2, 2), (3, 3), (4, 2), (2, 2, 2), (2, 3, 2)]


@pytest.mark.parametrize("shape", SHAPES)
@pytest.mark.parametrize("seed", range(4))
def test_no_table_of_successive_cuts_is_better(shape: tuple[int, ...], seed: int) -> None:
    plus, minus = masses(seed, shape)
    most = min(5, math.prod(shape) + 1)
    found = best_partitions(plus, minus, most)
    best = -math.inf
    for here, these in zip(found, tables(shape, most), strict=True):
        best = max([best, *(summed(plus, minus, tuple(table)) for table in these)])
        assert here.gain == pytest.approx(best, rel=1e-12)
        # What is claimed is what the boxes give, and they cover every cell once.
        assert summed(plus, minus, here.boxes) == pytest.approx(here.gain, rel=1e-12)
        covered = np.zeros(shape, dtype=int)
        for box in here.boxes:
            covered[tuple(slice(start, stop) for start, stop in box)] += 1
        assert (covered == 1).all()


def test_some_best_tables_are_out_of_reach_of_the_greedy_tree() -> None:
    """The comparison with brute force would tell a greedy search apart."""
    short = 0
    for seed in range(20):
        plus, minus = masses(seed, (3, 3))
        short += best_partitions(plus, minus, 4)[3].gain > greedy(plus, minus, 4) + 1e-6
    assert short >= 5


@pytest.mark.parametrize("seed", range(5))
def test_one_dimension_against_an_independent_library(seed: int) -> None:
    plus, minus = masses(seed, (30,))
    search = ruptures.Dynp(custom_cost=SavedLogLoss(), min_size=1, jump=1)
    search.fit(np.column_stack([plus, minus]))
    found = best_partitions(plus, minus, 8)
    for rows in range(2, 9):
        ends = search.predict(n_bkps=rows - 1)
        boxes = tuple(((a, b),) for a, b in zip([0, *ends[:-1]], ends, strict=True))
        assert found[rows - 1].gain == pytest.approx(summed(plus, minus, boxes), rel=1e-12)


@pytest.mark.parametrize("shape", [(25,), (9, 7), (5, 3, 4), (3, 2, 3, 2)])
@pytest.mark.parametrize("seed", range(3))
def test_never_below_the_greedy_tree(shape: tuple[int, ...], seed: int) -> None:
    plus, minus = masses(seed, shape)
    found = best_partitions(plus, minus, 9)
    for leaves in range(2, 10):
        assert found[leaves - 1].gain >= greedy(plus, minus, leaves) - 1e-12


GRIDS = st.integers(0, 10_000).flatmap(
    lambda seed: hnp.array_shapes(min_dims=1, max_dims=3, min_side=1, max_side=4).map(
        lambda shape: masses(seed, shape)
    )
)


@settings(max_examples=60)
@given(GRIDS)
def test_more_rows_never_keep_less_and_cells_apart_keep_all(cells: Masses) -> None:
    plus, minus = cells
    most = plus.size + 1
    gains = [one.gain for one in best_partitions(plus, minus, most)]
    assert (np.diff(gains) >= -1e-13).all()
    assert gains[0] == pytest.approx(g(float(plus.sum()), float(minus.sum())), abs=1e-13)
    everything = sum(g(float(a), float(b)) for a, b in zip(plus.flat, minus.flat, strict=True))
    assert gains[-1] == pytest.approx(everything, rel=1e-12, abs=1e-13)


@settings(max_examples=60)
@given(GRIDS, st.integers(1, 6))
def test_swapping_the_answers_and_rescaling_change_nothing(cells: Masses, most: int) -> None:
    plus, minus = cells
    found = best_partitions(plus, minus, most)
    for other, scale in (
        (best_partitions(minus, plus, most), 1.0),
        (best_partitions(1e-9 * plus, 1e-9 * minus, most), 1e-9),
        (best_partitions(4.0 * plus, 4.0 * minus, most), 4.0),
    ):
        for one, same in zip(found, other, strict=True):
            assert same.boxes == one.boxes
            assert same.gain == pytest.approx(scale * one.gain, rel=1e-12, abs=1e-14 * scale)
    # Turning an axis round mirrors the boxes but cannot change what they keep.
    turned = best_partitions(plus[::-1], minus[::-1], most)
    assert [t.gain for t in turned] == pytest.approx([f.gain for f in found], rel=1e-12, abs=1e-14)


@settings(max_examples=60)
@given(GRIDS, st.integers(1, 6), st.floats(0.05, 0.95), st.data())
def test_a_duplicated_situation_changes_nothing(
    cells: Masses, most: int, share: float, data: st.DataObject
) -> None:
    plus, minus = cells
    axis = data.draw(st.integers(0, plus.ndim - 1))
    place = data.draw(st.integers(0, plus.shape[axis] - 1))

    def twice(side: Array) -> Array:
        order = sorted([*range(side.shape[axis]), place])
        copy = np.take(side, order, axis=axis)
        view = np.moveaxis(copy, axis, 0)
        view[place] *= share
        view[place + 1] *= 1.0 - share
        return copy

    found = [one.gain for one in best_partitions(plus, minus, most)]
    split = [one.gain for one in best_partitions(twice(plus), twice(minus), most)]
    assert split == pytest.approx(found, rel=1e-12, abs=1e-14)
    grouped = best_groupings(plus.ravel(), minus.ravel(), most)
    again = best_groupings(twice(plus).ravel(), twice(minus).ravel(), most)
    assert again == pytest.approx(grouped, rel=1e-12, abs=1e-14)


@settings(max_examples=80)
@given(GRIDS, st.integers(2, 6), st.integers(0, 99))
def test_merging_rows_never_keeps_more(cells: Masses, rows: int, seed: int) -> None:
    """Any grouping at all, of a box shape or not."""
    plus, minus = cells
    row = np.random.default_rng(seed).integers(0, rows, plus.size)

    def kept(row: Array) -> float:
        return sum(
            g(float(plus.ravel()[row == r].sum()), float(minus.ravel()[row == r].sum()))
            for r in np.unique(row)
        )

    merged = np.where(row == rows - 1, 0, row)
    assert kept(merged) <= kept(row) + 1e-13
    # And no grouping, whatever it looks at, beats the ceiling for as many groups.
    assert kept(row) <= best_groupings(plus.ravel(), minus.ravel(), rows)[-1] + 1e-13


# --- the ceiling -----------------------------------------------------------------------------


def set_partitions(items: list[int]) -> Iterator[list[list[int]]]:
    if not items:
        yield []
        return
    for smaller in set_partitions(items[1:]):
        for place in range(len(smaller)):
            yield [
                *smaller[:place],
                [items[0], *smaller[place]],
                *smaller[place + 1 :],
            ]
        yield [[items[0]], *smaller]


@pytest.mark.parametrize("seed", range(8))
def test_the_ceiling_is_the_best_of_all_groupings(seed: int) -> None:
    """Not only of contiguous ones: every way of grouping seven situations is tried."""
    plus, minus = masses(seed, (7,))
    best = [-math.inf] * 7
    for groups in set_partitions(list(range(7))):
        value = sum(g(float(plus[part].sum()), float(minus[part].sum())) for part in groups)
        best[len(groups) - 1] = max(best[len(groups) - 1], value)
    at_most = np.maximum.accumulate(best)
    assert best_groupings(plus, minus, 7) == pytest.approx(at_most, rel=1e-12)


@pytest.mark.parametrize("seed", range(4))
def test_the_ceiling_over_many_situations_is_the_best_contiguous_grouping(seed: int) -> None:
    plus, minus = masses(seed, (14,))
    order = np.argsort(plus / np.maximum(plus + minus, 1e-300), kind="stable")
    up, down = plus[order], minus[order]
    found = best_groupings(plus, minus, 6)
    for groups in range(1, 7):
        best = -math.inf
        for cuts in combinations(range(1, 14), groups - 1):
            ends = [0, *cuts, 14]
            parts = [(float(up[a:b].sum()), float(down[a:b].sum())) for a, b in pairwise(ends)]
            best = max(best, sum(g(*part) for part in parts))
        assert found[groups - 1] == pytest.approx(best, rel=1e-12)


def test_the_ceiling_over_very_many_situations() -> None:
    """The search that skips cuts against one that tries them all."""
    plus, minus = masses(0, (150,))
    order = np.argsort(plus / (plus + minus + 1e-300), kind="stable")
    up, down = plus[order], minus[order]
    lone = np.full((151, 151), -math.inf)
    for a, b in combinations(range(151), 2):
        lone[a, b] = g(float(up[a:b].sum()), float(down[a:b].sum()))
    best, gains = lone[0], []
    for _ in range(12):
        gains.append(float(best[150]))
        best = (best[:, None] + lone).max(axis=0)
    assert best_groupings(plus, minus, 12) == pytest.approx(gains, rel=1e-12)


@settings(max_examples=60)
@given(GRIDS, st.integers(1, 8))
def test_the_ceiling_is_never_below_a_table(cells: Masses, most: int) -> None:
    plus, minus = cells
    ceiling = best_groupings(plus.ravel(), minus.ravel(), most)
    tables_ = [one.gain for one in best_partitions(plus, minus, most)]
    assert (ceiling >= np.array(tables_) - 1e-13).all()


def test_merging_four_values_to_two() -> None:
    """Meets js-merge: information about an even question, in nats."""
    (entry,) = (e for e in json.loads(PUBLISHED.read_text()) if e["id"] == "js-merge")
    all_four, merged, lost = entry["value"]
    plus = np.array([0.1, 0.2, 0.3, 0.4]) / 2.0
    for gains in (
        [one.gain for one in best_partitions(plus, plus[::-1], 4)],
        best_groupings(plus, plus[::-1], 4).tolist(),
    ):
        assert [gains[3], gains[1]] == pytest.approx([all_four, merged], rel=1e-10)
        assert gains[3] - gains[1] == pytest.approx(lost, rel=1e-9)
        assert gains[0] == pytest.approx(0.0, abs=1e-15)
