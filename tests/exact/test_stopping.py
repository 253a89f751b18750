"""When to stop alone: best thresholds against value iteration, and the cone of costs behind."""

from __future__ import annotations

import math
from collections.abc import Iterator
from itertools import pairwise

import numpy as np
import pytest

from thumbwright.exact.alone import alone
from thumbwright.exact.errors import ModelError
from thumbwright.exact.evidence.base import Evidence
from thumbwright.exact.evidence.binary import bernoulli, coin
from thumbwright.exact.evidence.counts import binomial
from thumbwright.exact.group import Thresholds
from thumbwright.exact.stopping import Cone, Losses, best_alone, costs_behind

ALPHA = math.log(1.5)
CLEAR = 1e-9
"""A gain of going on smaller than this may fall either way in floating point."""


def going_on(p: float, losses: Losses, shift: float) -> tuple[list[float], list[float]]:
    """Beliefs shift + k alpha, and what going on gains over stopping there.

    Value iteration on this one lattice, where every move lands on a point: nothing interpolated.
    """
    worth = math.log(p / (1 - p))
    size = 40
    belief = [shift + k * worth for k in range(-size, size + 1)]
    chance = [1 / (1 + math.exp(-x)) for x in belief]
    stop = [min(losses.false_plus * (1 - c), losses.false_minus * c) for c in chance]
    value = list(stop)
    for _ in range(20_000):
        ahead = [losses.per_step] * len(belief)
        for k in range(1, len(belief) - 1):
            up = chance[k] * p + (1 - chance[k]) * (1 - p)
            ahead[k] += up * value[k + 1] + (1 - up) * value[k - 1]
        ahead[0], ahead[-1] = math.inf, math.inf
        fresh = [min(s, a) for s, a in zip(stop, ahead, strict=True)]
        change = max(abs(f - v) for f, v in zip(fresh, value, strict=True))
        value = fresh
        if change < 1e-13:
            break
    else:
        raise AssertionError("value iteration did not settle")
    return belief, [s - a for s, a in zip(stop, ahead, strict=True)]


@pytest.mark.parametrize(
    ("p", "losses"),
    [
        (0.6, Losses(1.0, 1.0, 0.015)),
        (0.6, Losses(1.0, 3.0, 0.02)),
        (0.7, Losses(4.0, 1.0, 0.03)),
        (0.8, Losses(1.0, 1.0, 0.004)),
        (0.55, Losses(2.0, 1.0, 0.01)),
    ],
)
def test_best_thresholds_against_value_iteration(p: float, losses: Losses) -> None:
    """On lattices through the even belief and beside it."""
    bars, worth = best_alone(coin(p), losses), math.log(p / (1 - p))
    decided = 0
    for shift in np.linspace(-0.5, 0.5, 5) * worth:
        for x, gain in zip(*going_on(p, losses, float(shift)), strict=True):
            # The program interpolates between beliefs 1/8 of a sign or 0.01 nats apart.
            if abs(gain) > CLEAR and min(abs(x - bars.plus), abs(x - bars.minus)) > 2e-3:
                assert (bars.minus < x < bars.plus) == (gain > 0), x
                decided += 1
    assert decided > 300


@pytest.mark.parametrize("evidence", [bernoulli(0.3, 0.1), binomial(3, 0.5, 0.35)])
def test_evidence_that_drifts_is_best_stopped_there_too(evidence: Evidence) -> None:
    """Moving either threshold makes the risk of an agent alone larger."""
    losses = Losses(1.0, 2.0, 0.01)
    best = best_alone(evidence, losses)

    def risk(bars: Thresholds) -> float:
        played = alone(evidence, bars, 0.0)
        missed, mistaken = played.wrong()
        return float((mistaken + 2.0 * missed + 0.01 * played.steps.sum()) / 2)

    least = risk(best)
    for move in (-0.4, -0.2, 0.2, 0.4):
        assert risk(Thresholds(best.minus + move, best.plus)) >= least - 1e-9
        assert risk(Thresholds(best.minus, best.plus + move)) >= least - 1e-9
    assert risk(Thresholds(best.minus - 1.0, best.plus + 1.0)) > least + 1e-3


def test_swapping_the_answers_mirrors_the_thresholds() -> None:
    one = best_alone(coin(0.6), Losses(1.0, 3.0, 0.02))
    other = best_alone(coin(0.6), Losses(3.0, 1.0, 0.02))
    assert [other.minus, other.plus] == pytest.approx([-one.plus, -one.minus], abs=1e-9)
    scaled = best_alone(coin(0.6), Losses(10.0, 30.0, 0.2))
    assert [scaled.minus, scaled.plus] == pytest.approx([one.minus, one.plus], abs=1e-7)


def test_what_has_no_best_thresholds_is_refused() -> None:
    with pytest.raises(ModelError, match="never worth its price"):
        best_alone(coin(0.6), Losses(1.0, 1.0, 0.2))
    with pytest.raises(ModelError, match="positive price"):
        best_alone(coin(0.6), Losses(1.0, 1.0, 0.0))


# --- costs behind thresholds ---------------------------------------------------------------------


def cone_of(minus: int, plus: int) -> Cone:
    cone = costs_behind(coin(0.6), Thresholds(minus * ALPHA, plus * ALPHA), 0.0, 200)
    assert cone is not None
    return cone


Point = tuple[float, float]
"""Loss of a wrong plus, and price of a step, where both losses sum to 2."""


def corners(cone: Cone) -> list[Point]:
    """Corners in order around the region."""
    points = []
    for loss in cone.corners:
        unit = 2.0 / (loss.false_plus + loss.false_minus)
        points.append((loss.false_plus * unit, loss.per_step * unit))
    x, y = (sum(p[k] for p in points) / len(points) for k in (0, 1))
    # Prices are about a hundredth of losses, so angles are taken after stretching.
    return sorted(points, key=lambda p: math.atan2((p[1] - y) * 50, p[0] - x))


def around(points: list[Point], out: float) -> Iterator[Point]:
    """Corners and middles of edges, moved away from the centre by this share."""
    centre = tuple(sum(p[k] for p in points) / len(points) for k in (0, 1))
    middles = [((a[0] + b[0]) / 2, (a[1] + b[1]) / 2) for a, b in pairwise([*points, points[0]])]
    for point in [*points, *middles]:
        yield (
            point[0] + out * (point[0] - centre[0]),
            point[1] + out * (point[1] - centre[1]),
        )


def decisions(point: Point) -> tuple[int, int] | None:
    """Best thresholds in whole signs from the even belief, by value iteration on that lattice.

    None where no look is worth its price.
    """
    belief, gain = going_on(0.6, Losses(point[0], 2.0 - point[0], point[1]), 0.0)
    goes_on = [round(x / ALPHA) for x, more in zip(belief, gain, strict=True) if more > 0]
    return (min(goes_on) - 1, max(goes_on) + 1) if goes_on else None


@pytest.mark.parametrize(("minus", "plus"), [(-2, 4), (-3, 3), (-1, 1), (-1, 2)])
def test_the_cone_is_exactly_where_the_decisions_are_best(minus: int, plus: int) -> None:
    points = corners(cone_of(minus, plus))
    assert len(points) >= 3
    for point in around(points, -0.003):
        assert decisions(point) == (minus, plus), point
    for point in around(points, 0.003):
        assert decisions(point) != (minus, plus), point


@pytest.mark.parametrize(("minus", "plus"), [(-2, 4), (-3, 3)])
def test_best_alone_gives_the_thresholds_back(minus: int, plus: int) -> None:
    cone = cone_of(minus, plus)
    losses = [cone.middle]
    losses += [Losses(x, 2.0 - x, y) for x, y in around(corners(cone), -0.05)]
    for loss in losses:
        bars = best_alone(coin(0.6), loss)
        assert math.floor(bars.minus / ALPHA) == minus
        assert math.ceil(bars.plus / ALPHA) == plus


def test_the_ranges_behind_two_down_four_up() -> None:
    cone = cone_of(-2, 4)
    # Found once on a grid of costs, which stays inside the corners; not published.
    assert cone.ratio[0] < 1.26 < 1.89 < cone.ratio[1]
    assert cone.per_step[0] < 0.0157 < 0.0222 < cone.per_step[1]
    assert cone.ratio == pytest.approx((1.26, 1.89), rel=0.05)
    assert cone.per_step == pytest.approx((0.0157, 0.0222), rel=0.05)
    middle = cone.middle
    assert middle.false_minus == 1.0
    assert middle.false_plus == pytest.approx(math.sqrt(cone.ratio[0] * cone.ratio[1]), rel=1e-12)
    price = math.sqrt(cone.per_step[0] * cone.per_step[1])
    assert middle.per_step == pytest.approx(price, rel=1e-12)
    mirror = cone_of(-4, 2)
    assert mirror.ratio == pytest.approx((1 / cone.ratio[1], 1 / cone.ratio[0]), rel=1e-9)
    assert mirror.per_step == pytest.approx(cone.per_step, rel=1e-9)
    for loss in cone.corners:
        assert min(loss.false_plus, loss.false_minus) == pytest.approx(1.0, rel=1e-12)


def test_thresholds_counted_from_another_prior() -> None:
    """Evidence of -2/+4 signs from a prior of 0.3: the beliefs that are reached count."""
    prior = math.log(0.3 / 0.7)
    bars = Thresholds(prior - 2 * ALPHA, prior + 4 * ALPHA)
    cone = costs_behind(coin(0.6), bars, prior, 200)
    assert cone is not None
    loss = cone.middle
    belief, gain = going_on(0.6, loss, prior)
    goes_on = [round((x - prior) / ALPHA) for x, more in zip(belief, gain, strict=True) if more > 0]
    assert (min(goes_on), max(goes_on)) == (-1, 3)


def test_no_costs_lie_behind_what_never_answers() -> None:
    assert costs_behind(coin(0.6), Thresholds(-9 * ALPHA, 3 * ALPHA), 0.0, 5) is None


def test_costs_behind_answering_at_the_first_sign() -> None:
    """With -1/+1 the belief before the first look is the one at which it goes on."""
    assert decisions((1.0, 0.06)) == (-1, 1)
    cone = costs_behind(coin(0.6), Thresholds(-ALPHA, ALPHA), 0.0, 40)
    assert cone is not None
    bars = best_alone(coin(0.6), cone.middle)
    assert (math.floor(bars.minus / ALPHA), math.ceil(bars.plus / ALPHA)) == (-1, 1)
