"""Axes made coarser, and the ceiling over very many situations."""

from __future__ import annotations

from itertools import combinations, pairwise

import numpy as np
import pytest
from hypothesis import given, settings, strategies as st

from tests.distill.pricers import one_way
from thumbwright.distill.forms import coarse, grouping
from thumbwright.distill.forms.axes import grid_axes
from thumbwright.distill.forms.boxes import gain
from thumbwright.distill.rules import Row
from thumbwright.exact.arrays import FloatArray


def kept(plus: FloatArray, minus: FloatArray, edges: tuple[int, ...]) -> float:
    """Summed gain of ranges, each added up by itself."""
    ends = pairwise(edges)
    ranges = [(plus[a:b].sum(keepdims=True), minus[a:b].sum(keepdims=True)) for a, b in ends]
    return sum(float(gain(*pair)[0]) for pair in ranges)


@settings(max_examples=60)
@given(st.integers(0, 10_000), st.integers(1, 7), st.integers(1, 5))
def test_ranges_are_the_best_of_all(seed: int, count: int, most: int) -> None:
    rng = np.random.default_rng(seed)
    plus, minus = rng.exponential(size=(2, count)) * rng.integers(0, 2, (2, count))
    edges = coarse.best_ranges(plus, minus, most)
    assert edges[0] == 0
    assert edges[-1] == count
    assert len(edges) - 1 <= most
    assert (np.diff(edges) > 0).all()
    every = [
        kept(plus, minus, (0, *cuts, count))
        for number in range(most)
        for cuts in combinations(range(1, count), number)
    ]
    assert kept(plus, minus, tuple(edges)) == pytest.approx(max(every), abs=1e-12)


def test_only_what_is_too_large_is_made_coarser() -> None:
    pricer = one_way((-2, 4), (-3, 3), 40)
    axes = grid_axes(pricer, ("step", "shown"))
    s = pricer.situations
    same, said = coarse.searchable(axes, s.plus, s.minus, 820 * 6)
    assert same == axes
    assert said == ()
    made, said = coarse.searchable(axes, s.plus, s.minus, 500)
    assert coarse.boxes_of(made) <= 500
    assert made[1] is axes[1]
    assert f"step in {made[0].cells} ranges instead of 40" in said[0]
    # Each cell of the coarse axis says what its cells of the fine one say together.
    for cell in range(made[0].cells):
        row = made[0].says(Row(), cell, cell + 1)
        first, last = row.step_from or 1, row.step_to or 40
        steps = np.unique(s.step[made[0].where == cell])
        assert set(steps) <= set(range(first, last + 1))
    assert coarse.boxes_of(coarse.searchable(axes, s.plus, s.minus, 1)[0]) == 21 * 6


def test_the_ceiling_over_very_many_is_a_bound_and_close(monkeypatch: pytest.MonkeyPatch) -> None:
    rng = np.random.default_rng(4)
    plus, minus = rng.exponential(size=(2, 3000))
    exact = grouping.best_groupings(plus, minus, 5)
    monkeypatch.setattr(grouping, "MOST_SINGLE", 1000)
    bound = grouping.best_groupings(plus, minus, 5)
    assert (bound >= exact - 1e-10).all()
    assert (bound <= exact + 1e-7 * (plus.sum() + minus.sum())).all()
    monkeypatch.setattr(grouping, "_EVEN_STEPS", 3)
    assert (grouping.best_groupings(plus, minus, 5) > exact + 1e-4).all()
