"""Loose evidence on a ladder: what splitting keeps, what it changes, when it is refused."""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy.integrate import quad
from scipy.stats import norm

from tests.exact.comparing import built, outcomes_apart, worths_apart
from tests.slow import group as slow
from tests.slow.enumerate import enumerate_group
from thumbwright.exact import splitting
from thumbwright.exact.alone import alone
from thumbwright.exact.arrays import FloatArray
from thumbwright.exact.engine import solve
from thumbwright.exact.errors import ModelError
from thumbwright.exact.evidence.base import Evidence, Loose
from thumbwright.exact.evidence.binary import bernoulli, coin
from thumbwright.exact.evidence.counts import binomial, poisson
from thumbwright.exact.evidence.listed import listed
from thumbwright.exact.evidence.normal import normal
from thumbwright.exact.group import Thresholds
from thumbwright.exact.splitting import on_ladder, settle

THREE_TO_ONE = Thresholds(-1.0986, 1.0986)
FIVE = ((0.13, 0.05), (0.17, 0.11), (0.19, 0.23), (0.23, 0.27), (0.28, 0.34))
"""Five values whose worths have no common step."""


def loose(evidence: Evidence | Loose) -> Loose:
    assert isinstance(evidence, Loose)
    return evidence


def exact(evidence: Evidence | Loose) -> Evidence:
    assert isinstance(evidence, Evidence)
    return evidence


def figures(evidence: Evidence, bars: Thresholds, horizon: int | None = None) -> FloatArray:
    """Error probabilities, then mean steps, given plus and given minus."""
    played = alone(evidence, bars, 0.0, horizon)
    return np.concatenate([played.wrong(), played.steps])


@pytest.mark.parametrize("step", [0.5, 0.1, 0.03])
@pytest.mark.parametrize("source", [normal(0.5), listed(*zip(*FIVE, strict=True))])
def test_a_split_keeps_the_masses_and_is_a_proper_model(
    source: Evidence | Loose, step: float
) -> None:
    """Every point is worth what its masses say, and each cell's masses are kept by its halves."""
    made, cells = on_ladder(loose(source), step), loose(source).cells(step)
    assert made.plus.sum() == pytest.approx(1.0, abs=1e-12)
    assert np.log(made.plus / made.minus) == pytest.approx(made.worths(), abs=1e-9)
    assert made.worths() == pytest.approx(step * made.offsets[:, 0], abs=1e-12)
    # Means of e^(-worth) and of the side of the question survive; information only grows.
    assert float(made.plus @ np.exp(-made.worths())) == pytest.approx(1.0, abs=1e-9)
    k, plus, minus = cells
    low, high = k * step, (k + 1) * step
    worth = np.log(plus / minus)
    assert (low - 1e-9 <= worth).all()
    assert (worth <= high + 1e-9).all()
    both = (plus + minus) / 2
    before = sum(float((side * np.log(side / both)).sum()) / 2 for side in (plus, minus))
    assert made.information() >= before - 1e-12


def true_information(d: float) -> float:
    """Mutual information of a reading and an even question, by quadrature."""

    def integrand(x: float) -> float:
        worth = d * x  # reading at x, means at +-d/2
        plus = float(norm.pdf(x, d / 2))
        return plus * (math.log(2.0) - math.log1p(math.exp(-worth)))

    return float(quad(integrand, -12, 12, epsabs=1e-14)[0])


def test_a_threshold_beside_a_ladder_point_shifts_outcomes() -> None:
    """normal(0.5), thresholds just short of eleven steps of 0.1: off by 0.43 of a step."""
    source = loose(normal(0.5))
    coarse, fine = on_ladder(source, 0.1), on_ladder(source, THREE_TO_ONE.plus / 500.5)
    # Of the mean worth given plus, d^2/2, and of the mutual information with the answer.
    assert float(coarse.plus @ coarse.worths()) / 0.125 - 1.0 == pytest.approx(0.007, abs=5e-4)
    excess = coarse.information() / true_information(0.5) - 1.0
    assert excess == pytest.approx(0.0065, abs=5e-5)
    assert fine.information() == pytest.approx(true_information(0.5), rel=1e-5)
    assert figures(coarse, THREE_TO_ONE)[2] == pytest.approx(6.51, abs=5e-3)
    assert figures(fine, THREE_TO_ONE)[2] == pytest.approx(6.94, abs=5e-3)


@pytest.mark.parametrize("tolerance", [1e-2, 1e-3])
def test_settling_states_its_change_and_keeps_its_word(tolerance: float) -> None:
    source = loose(normal(0.5))
    made = settle(source, [THREE_TO_ONE], 0.0, 60, tolerance)
    assert made.split is not None
    assert made.split.tolerance == tolerance
    assert 0.0 < made.split.change < tolerance
    assert made.alpha[0] == made.split.step
    finest = figures(on_ladder(source, 0.001), THREE_TO_ONE, 60)
    off = np.abs(figures(made, THREE_TO_ONE, 60) / finest - 1.0).max()
    assert off < tolerance
    # Thresholds lie about midway between ladder points.
    assert (1.0986 / made.split.step) % 1.0 == pytest.approx(0.5, abs=0.02)


def test_the_stated_change_is_that_of_the_last_refinement() -> None:
    """Recomputed from the two last ladders, which are told by what settle asks for."""
    source, asked = loose(normal(0.8)), []

    def cells(step: float):  # type: ignore[no-untyped-def]
        asked.append(step)
        return source.cells(step)

    watched = Loose(source.kind, source.spread, cells)
    bars = [Thresholds(-1.3, 1.3), Thresholds(-0.7, 2.0)]
    made = settle(watched, bars, 0.0, 40, 1e-2)
    assert made.split is not None
    finest, before = sorted(set(asked))[:2]
    assert finest == made.split.step
    assert 1.5 < before / finest < 3.0
    changes = []
    for pair in bars:
        one, other = (figures(on_ladder(source, s), pair, 40) for s in (before, finest))
        changes.append(np.abs(one / other - 1.0).max())
    assert made.split.change == pytest.approx(max(changes), rel=1e-9)


def test_settling_serves_the_worst_of_several_thresholds() -> None:
    source = loose(normal(0.5))
    pairs = [Thresholds(-1.0, 1.0), Thresholds(-2.3, 1.7), Thresholds(-0.9, 2.9)]
    made = settle(source, pairs, 0.3, 50)
    for pair in pairs:
        fine = alone(on_ladder(source, 0.003), pair, 0.3, 50)
        got = alone(made, pair, 0.3, 50)
        # The change on refining estimates the distance from the truth; it is no bound.
        assert got.wrong() == pytest.approx(fine.wrong(), rel=2e-3)
        assert got.steps == pytest.approx(fine.steps, rel=2e-3)


def test_thresholds_that_are_not_even_lie_midway_too() -> None:
    made = settle(loose(normal(0.5)), [Thresholds(-1.0, 1.7)], 0.2, 40)
    assert made.split is not None
    for reach in (-1.0 - 0.2, 1.7 - 0.2):
        assert (reach / made.split.step) % 1.0 == pytest.approx(0.5, abs=0.1)


def test_what_does_not_settle_is_refused(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(splitting, "MOST_VALUES", 100)
    with pytest.raises(ModelError, match=r"above the tolerance of 1e-06; raise tolerance"):
        settle(loose(normal(0.5)), [THREE_TO_ONE], 0.0, 60, 1e-6)


# --- listed evidence -------------------------------------------------------------------------


def test_five_values_without_a_step_are_split_and_come_close_to_enumeration() -> None:
    source = loose(listed(*zip(*FIVE, strict=True)))
    assert source.kind == "listed"
    bars = Thresholds(-0.8, 0.7)
    made = settle(source, [bars], 0.0, 7)
    assert made.split is not None
    model = enumerate_group(slow.Group(((),), (FIVE,), ((slow.Thresholds(-0.8, 0.7),),), 7))
    played = alone(made, bars, 0.0, 7)
    true = [model.given_plus[0].minus, model.given_minus[0].plus]
    assert played.wrong() == pytest.approx(true, rel=3e-2)
    assert float(played.steps[0]) == pytest.approx(model.given_plus[0].mean_step, rel=1e-2)


FOUR = ((0.2, 0.1), (0.21, 0.18), (0.26, 0.35), (0.33, 0.37))


def test_four_values_without_a_step_are_exact() -> None:
    """Counted each for itself: alone and in company as in the enumeration."""
    evidence = exact(listed(*zip(*FOUR, strict=True)))
    assert (evidence.split, evidence.on_ladder) == (None, False)
    assert evidence.alpha.shape == (3,)
    assert sorted(evidence.worths()) == pytest.approx(
        sorted(math.log(p / m) for p, m in FOUR), abs=1e-13
    )
    bars = (slow.Thresholds(-0.8, 0.7),)
    for sees, horizon in ((((),), 7), (((), (0,)), 4), (((1,), (0,)), 3)):
        count = len(sees)
        group = slow.Group(sees, (FOUR,) * count, (bars,) * count, horizon, "settle", 0.4)
        model, solution = enumerate_group(group), solve(built(group))
        assert model.narrowest > 1e-10
        assert outcomes_apart(model, solution) < 1e-12
        assert worths_apart(model, solution) < 1e-10


def test_certain_values_stay_apart_when_the_rest_is_split() -> None:
    plus = [0.9 * p for p, _ in FIVE] + [0.1, 0.0]
    minus = [0.8 * m for _, m in FIVE] + [0.0, 0.2]
    made = settle(loose(listed(plus, minus)), [Thresholds(-0.8, 0.7)], 0.0, 6)
    assert (made.certain_plus, made.certain_minus) == pytest.approx((0.1, 0.2), abs=1e-12)
    assert made.plus.sum() == pytest.approx(0.9, abs=1e-12)
    assert made.minus.sum() == pytest.approx(0.8, abs=1e-12)


@pytest.mark.parametrize(
    ("source", "step"),
    [
        (coin(0.6), math.log(1.5)),
        (bernoulli(0.3, 0.1), math.log(3) - math.log(0.7 / 0.9)),
        (binomial(6, 0.5, 0.3), math.log(5 / 3) - math.log(0.5 / 0.7)),
        (poisson(2.0, 1.2), math.log(2.0 / 1.2)),
    ],
    ids=lambda x: getattr(x, "kind", ""),
)
def test_ladders_are_found_in_lists(source: Evidence, step: float) -> None:
    """The same evidence as a list has the same ladder, in some units, and the same outcomes."""
    keep = np.minimum(source.plus, source.minus) > 1e-12
    plus, minus = source.plus[keep], source.minus[keep]
    found = exact(listed(plus / plus.sum(), minus / minus.sum()))
    assert (found.on_ladder, found.split) == (True, None)
    steps = found.alpha[0] / step
    assert min(abs(steps - 1), abs(steps - 2)) < 1e-9  # a coin's two worths lie two signs apart
    worths = np.log(plus / plus.sum()) - np.log(minus / minus.sum())
    assert sorted(found.worths()) == pytest.approx(sorted(worths), abs=1e-9)
    bars = Thresholds(-1.4, 1.1)
    assert figures(found, bars, 40) == pytest.approx(figures(source, bars, 40), rel=1e-8)


def test_ladders_of_worths_with_a_common_measure() -> None:
    """Worths of 2, -3 and 0.5 units: the unit must be a half, and nothing coarser."""
    unit = 0.31
    worths = np.array([2.0, -3.0, 0.5]) * unit
    # Masses under minus that make both sides sum to one.
    third = 0.3
    a, b = np.linalg.solve(
        np.array([[1.0, 1.0], np.exp(worths[:2])]), [1 - third, 1 - third * math.exp(worths[2])]
    )
    minus = np.array([a, b, third])
    found = exact(listed(minus * np.exp(worths), minus))
    assert found.beta == 0.0
    assert found.alpha == pytest.approx([unit / 2], rel=1e-12)
    assert sorted(found.offsets[:, 0].tolist()) == [-6, 1, 4]
