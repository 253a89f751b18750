"""When to stop observing, alone: best thresholds from costs, and costs from thresholds.

Setting of A. Wald and J. Wolfowitz (1948): a loss for each kind of wrong answer, a price per
observation, no horizon. With belief x and P = 1/(1 + e^-x) the least risk satisfies

    V(x) = min( false_plus (1 - P), false_minus P, per_step + E V(x + worth of one observation) ).

Best thresholds are the ends of the interval of beliefs at which going on is strictly better.
Conversely, the risk of a pair of thresholds is linear in the three costs, so the costs under
which an agent's decisions are best form a cone, bounded by four indifferences: stopping at the
nearest belief where it stops, and going on at the furthest belief where it goes on, on each side.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from thumbwright.exact.alone import alone
from thumbwright.exact.arrays import FloatArray
from thumbwright.exact.errors import ModelError
from thumbwright.exact.evidence.base import Evidence
from thumbwright.exact.group import Thresholds

_FINEST = 0.01
_MOST_ROUNDS = 200_000


@dataclass(frozen=True)
class Losses:
    """What wrong answers and steps cost, in one unit of loss.

    ``undecided`` is the loss of having no answer at the horizon; ``None`` means that the agent
    then gives the answer that its belief favours.
    """

    false_plus: float
    false_minus: float
    per_step: float
    undecided: float | None = None


@dataclass(frozen=True)
class Cone:
    """The costs under which thresholds are best for an agent alone, the smaller loss scaled to 1.

    Attributes
    ----------
    middle : Losses
        The centre of the cone on a logarithmic scale.
    corners : tuple of Losses
    ratio : tuple of float
        Lowest and highest false_plus / false_minus.
    per_step : tuple of float
        Lowest and highest price of a step.
    """

    middle: Losses
    corners: tuple[Losses, ...]
    ratio: tuple[float, float]
    per_step: tuple[float, float]


def best_alone(evidence: Evidence, losses: Losses) -> Thresholds:
    """Beliefs (nats) between which one more observation is worth its price.

    Solved by value iteration over a grid of beliefs, fine against the worth of an observation;
    on a ladder without drift the grid carries every move exactly, elsewhere values are
    interpolated. Raises ModelError where no observation is ever worth its price.
    """
    grid, stop, go_on = _solve(evidence, losses)
    gain = stop - go_on
    wants = np.flatnonzero(gain > 0)
    if not len(wants):
        raise ModelError(
            f"an observation at {losses.per_step:g} per step is never worth its price: nobody "
            "would watch; lower per_step or raise the losses"
        )

    def crossing(inside: int, outside: int) -> float:
        share = gain[inside] / (gain[inside] - gain[outside])
        return float(grid[inside] + share * (grid[outside] - grid[inside]))

    return Thresholds(
        crossing(int(wants[0]), int(wants[0]) - 1), crossing(int(wants[-1]), int(wants[-1]) + 1)
    )


def _solve(evidence: Evidence, losses: Losses) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Grid of beliefs, least cost of stopping there, least cost of going on there."""
    if min(losses.false_plus, losses.false_minus, losses.per_step) <= 0:
        raise ModelError("best thresholds need positive losses and a positive price per step")
    worths = evidence.worths()
    typical = float(np.abs(worths[worths != 0]).min(initial=1.0))
    if evidence.on_ladder and evidence.beta == 0.0 and evidence.alpha[0] != 0:
        unit = abs(float(evidence.alpha[0]))
        spacing = unit / max(8, math.ceil(unit / _FINEST))
    else:
        spacing = min(_FINEST, typical / 8)
    # Beyond this belief even perfect knowledge would save less than one observation costs.
    reach = math.log(max(losses.false_plus, losses.false_minus) / losses.per_step) + 1.0
    reach = max(reach, 1.0) + float(np.abs(worths).max(initial=0.0))
    half = math.ceil(reach / spacing)
    grid: FloatArray = spacing * np.arange(-half, half + 1, dtype=np.float64)
    chance = 1.0 / (1.0 + np.exp(-grid))
    stop = np.minimum(losses.false_plus * (1.0 - chance), losses.false_minus * chance)
    moves = []
    for worth, f_plus, f_minus in zip(worths, evidence.plus, evidence.minus, strict=True):
        where = np.clip(np.arange(2 * half + 1) + worth / spacing, 0, 2 * half)
        left = np.minimum(np.floor(where + 1e-9).astype(int), 2 * half - 1)
        share = np.clip(where - left, 0.0, 1.0)
        share[np.abs(share) < 1e-9] = 0.0
        moves.append((chance * f_plus + (1 - chance) * f_minus, left, share))
    value = stop.copy()
    for _ in range(_MOST_ROUNDS):
        go_on = np.full(len(grid), losses.per_step)
        for weight, left, share in moves:
            go_on += weight * ((1 - share) * value[left] + share * value[left + 1])
        fresh = np.minimum(stop, go_on)
        change = float(np.abs(fresh - value).max())
        value = fresh
        if change < 1e-14 * max(losses.false_plus, losses.false_minus):
            return grid, stop, go_on
    raise ModelError("best thresholds did not settle: the evidence is too weak for these costs")


def costs_behind(
    evidence: Evidence, thresholds: Thresholds, prior: float, horizon: int
) -> Cone | None:
    """The cone of costs under which these decisions are best for an agent alone, or None.

    ``horizon`` bounds the beliefs that count as reached; the costs themselves are those of the
    problem without a horizon. None where no costs make the thresholds best, or the agent never
    answers one of the two.
    """
    reached = alone(evidence, thresholds, prior, horizon)
    if not all(map(math.isfinite, (*reached.stops, *reached.goes_on))):
        return None
    # Each row r says r . (false_plus, false_minus, per_step) >= 0.
    rows = []
    for belief, stays, plus_side in (
        (reached.stops[1], True, True),
        (reached.goes_on[1], False, True),
        (reached.stops[0], True, False),
        (reached.goes_on[0], False, False),
    ):
        chance = 1.0 / (1.0 + math.exp(-belief))
        later = alone(evidence, thresholds, belief)
        missed, mistaken = later.wrong()
        steps = chance * later.steps[0] + (1 - chance) * later.steps[1]
        go_on = np.array([(1 - chance) * mistaken, chance * missed, steps])
        stop = np.array([1 - chance, 0, 0] if plus_side else [0, chance, 0])
        rows.append(go_on - stop if stays else stop - go_on)
    return _cone(np.stack(rows))


def _cone(rows: FloatArray) -> Cone | None:
    """Corners of the region rows . (L+, L-, c) >= 0 with L+ + L- = 2, in the plane (L+, c)."""
    # L- = 2 - L+ turns each row into a half-plane g . (L+, c) + h >= 0.
    sides = np.column_stack([rows[:, 0] - rows[:, 1], rows[:, 2]])
    levels = 2.0 * rows[:, 1]
    corners = []
    for i in range(len(rows)):
        for j in range(i + 1, len(rows)):
            pair = sides[[i, j]]
            if abs(np.linalg.det(pair)) < 1e-14:
                continue
            point = np.linalg.solve(pair, -levels[[i, j]])
            slack = sides @ point + levels
            scale = np.abs(sides) @ np.abs(point) + np.abs(levels)
            if (slack >= -1e-9 * scale).all() and 0 < point[0] < 2 and point[1] > 0:
                corners.append((float(point[0]), float(point[1])))
    if not corners:
        return None
    scaled = tuple(_scaled(plus, 2.0 - plus, price) for plus, price in corners)
    ratios = [loss.false_plus / loss.false_minus for loss in scaled]
    prices = [loss.per_step for loss in scaled]
    ratio = math.sqrt(min(ratios) * max(ratios))
    middle = _scaled(ratio, 1.0, min(ratio, 1.0) * math.sqrt(min(prices) * max(prices)))
    return Cone(middle, scaled, (min(ratios), max(ratios)), (min(prices), max(prices)))


def _scaled(false_plus: float, false_minus: float, per_step: float) -> Losses:
    unit = min(false_plus, false_minus)
    return Losses(false_plus / unit, false_minus / unit, per_step / unit)
