"""What a crowd ends up doing, from the histories that are over: exact sums or sampled estimates.

Half of the sampled histories are drawn given plus and half given minus; all of them serve for both
answers. How much likelier a history is given plus than given minus is known exactly, so it counts
for plus with its probability given plus over the mean of both, and for minus likewise (the balance
heuristic of E. Veach and L. J. Guibas, Optimally combining sampling techniques, SIGGRAPH 1995; from
memory). Weights lie between 0 and 2, and what is rare under one answer is estimated from where it
is common. Shares are ratios of weighted sums; their standard errors are those of linearised ratios,
the two halves being strata. What no sampled history did is estimated at 0 with an error of 0, which
says no more than that it is rare.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from thumbwright.exact.arrays import BoolArray, FloatArray, IntArray
from thumbwright.exact.crowd_kinds import Crowd
from thumbwright.exact.crowd_record import Record
from thumbwright.exact.outcomes import Outcome
from thumbwright.exact.together import Together

Two = tuple[FloatArray, FloatArray]
"""A figure and its standard error, both given plus and given minus along the first axis."""


Numbers = FloatArray | IntArray | BoolArray


@dataclass(frozen=True)
class KindPlay:
    """What a member of one kind ends up doing.

    Attributes
    ----------
    given, errors : pair of Outcome
        Given plus and given minus, and the standard errors of every number (0 if enumerated).
    leaning, leaning_errors : ndarray of float, shape (3, 2)
        Probability of being undecided at the horizon with a belief that favours plus, minus,
        neither; given plus and given minus.
    """

    given: tuple[Outcome, Outcome]
    errors: tuple[Outcome, Outcome]
    leaning: FloatArray
    leaning_errors: FloatArray


@dataclass(frozen=True)
class Mean:
    """A mean given plus and given minus with its standard errors; None where there is nothing."""

    value: tuple[float | None, float | None]
    error: tuple[float | None, float | None]


@dataclass(frozen=True)
class CrowdPlay:
    """What a crowd ends up doing.

    Attributes
    ----------
    crowd : Crowd
    kinds : tuple of KindPlay
        In the crowd's order.
    together, errors : Together
        What the whole crowd does, and the standard errors of every number (0 if enumerated).
    first, last, followers : Mean
        Mean step of the first commitment where there is one, of the last where all commit, and
        mean number of commitments in later rounds of the step of the first.
    near_tie_mass : float
        Expected number of members decided by the tie rule and by no clear margin.
    dropped : tuple of two floats
        Probability given plus and given minus of the public histories that were dropped; every
        probability is too low by at most this.
    dropped_mass : float
        The same, averaged over the prior.
    histories : int
        How many public histories were held, or sampled.
    sampled : bool
    """

    crowd: Crowd
    kinds: tuple[KindPlay, ...]
    together: Together
    errors: Together
    first: Mean
    last: Mean
    followers: Mean
    near_tie_mass: float
    dropped: tuple[float, float]
    dropped_mass: float
    histories: int
    sampled: bool


class Weights:
    """Weighted sums over histories, with standard errors.

    Parameters
    ----------
    weight : ndarray of float, shape (2, H)
        Of each history given plus and given minus.
    half : ndarray of bool, shape (H,), or None
        Which histories were drawn given plus; None where all histories there are were enumerated,
        so that sums are probabilities and nothing is uncertain.
    """

    def __init__(self, weight: FloatArray, half: BoolArray | None) -> None:
        self._weight = weight
        self._sampled = half is not None
        strata = [np.ones(weight.shape[1], dtype=bool)] if half is None else [half, ~half]
        self._strata = [np.flatnonzero(stratum) for stratum in strata]

    def mean(self, x: Numbers) -> Two:
        """Mean of x, shape (H,) or (2, H), over all histories, and its error; shape (2,)."""
        if not self._sampled:
            return (self._weight * x).sum(axis=1), np.zeros(2)
        return self.ratio(x, np.ones(self._weight.shape[1]))

    def ratio(self, x: Numbers, y: Numbers) -> Two:
        """Mean of x over mean of y, and its error; nan where the latter is 0."""
        top, bottom = (self._weight * x).sum(axis=1), (self._weight * y).sum(axis=1)
        value = np.divide(top, bottom, out=np.full(2, np.nan), where=bottom > 0)
        if not self._sampled:
            return value, np.where(bottom > 0, 0.0, np.nan)
        residue = self._weight * (x - value[:, None] * y)
        variance = np.zeros(2)
        for stratum in self._strata:
            variance += len(stratum) * residue[:, stratum].var(axis=1, ddof=1)
        return value, np.divide(np.sqrt(variance), bottom, out=np.full(2, np.nan), where=bottom > 0)

    def total_error(self, x: FloatArray) -> float:
        """Error of the sum of both means of x, shape (2, H); the same histories serve for both."""
        if not self._sampled:
            return 0.0
        whole = self._weight.sum(axis=1, keepdims=True)
        mean = (self._weight * x).sum(axis=1, keepdims=True) / whole
        residue = (self._weight / whole * (x - mean)).sum(axis=0)
        variance = sum(len(s) * residue[s].var(ddof=1) for s in self._strata)
        return float(np.sqrt(variance))

    def law(self, bins: IntArray, counts: BoolArray, size: int) -> Two:
        """Probability of each of ``size`` numbers, and its error, shape (2, size).

        Histories where ``counts`` is false have no number.
        """
        value, error = np.zeros((2, size)), np.zeros((2, size))
        for given, weight in enumerate(self._weight):
            value[given] = np.bincount(bins[counts], weight[counts], size)
            if not self._sampled:
                continue
            whole = weight.sum()
            value[given] /= whole
            variance = np.zeros(size)
            for stratum in self._strata:
                n, w, inside = len(stratum), weight[stratum], counts[stratum]
                here = bins[stratum][inside]
                # Of w (x - mean) with x = 1 in the bin and 0 elsewhere.
                one, two = (np.bincount(here, w[inside] ** p, size) for p in (1, 2))
                mean = value[given]
                total = one - mean * w.sum()
                squares = two * (1.0 - 2.0 * mean) + mean**2 * (w**2).sum()
                variance += n * np.maximum(squares - total**2 / n, 0.0) / (n - 1)
            error[given] = np.sqrt(variance) / whole
        return value, error


def kind_play(record: Record, weights: Weights, kind: int, size: int, horizon: int) -> KindPlay:
    """What a member of one kind does."""
    plus, minus = record.plus[kind] / size, record.minus[kind] / size
    decided, steps = plus + minus, record.steps[kind] / size
    undecided = (size - record.plus[kind] - record.minus[kind]) / size
    found = {
        "plus": weights.mean(plus),
        "minus": weights.mean(minus),
        "undecided": weights.mean(undecided),
        "mean_step_if_decided": weights.ratio(steps, decided),
        "mean_steps": weights.mean(steps + horizon * undecided),
    }
    lean = [weights.mean(one / size) for one in record.lean[kind]]
    value, error = (tuple(_outcome(found, given, which) for given in (0, 1)) for which in (0, 1))
    return KindPlay(
        (value[0], value[1]),
        (error[0], error[1]),
        np.stack([two[0] for two in lean]),
        np.stack([two[1] for two in lean]),
    )


def _outcome(found: dict[str, Two], given: int, which: int) -> Outcome:
    """Figures (0) or their errors (1) given one answer."""
    return Outcome(
        plus=float(found["plus"][which][given]),
        minus=float(found["minus"][which][given]),
        undecided=float(found["undecided"][which][given]),
        mean_step_if_decided=_number(found["mean_step_if_decided"][which][given]),
        mean_steps=float(found["mean_steps"][which][given]),
    )


def whole_crowd(
    record: Record, weights: Weights, size: int, horizon: int
) -> tuple[Together, Together, tuple[Mean, Mean, Mean]]:
    """What the whole crowd does: figures, errors, and mean steps and followers."""
    plus, minus = record.plus.sum(axis=0), record.minus.sum(axis=0)
    somebody, everybody = plus + minus > 0, plus + minus == size
    right, wrong = np.stack([plus, minus]), np.stack([minus, plus])
    found = {
        "first": weights.law(record.first, somebody, horizon + 1),
        "nobody": weights.mean(~somebody),
        "last": weights.law(record.last, everybody, horizon + 1),
        "not_everybody": weights.mean(~everybody),
        "followers": weights.law(record.followers, somebody, size),
        "right_majority": weights.mean(right > wrong),
        "wrong_majority": weights.mean(wrong > right),
        "tie": weights.mean((plus == minus) & somebody),
        "split": weights.mean((plus > 0) & (minus > 0)),
        "all_right": weights.mean(right == size),
        "all_wrong": weights.mean(wrong == size),
    }
    means = (
        _mean(weights.ratio(record.first * somebody, somebody)),
        _mean(weights.ratio(record.last * everybody, everybody)),
        _mean(weights.ratio(record.followers * somebody, somebody)),
    )
    value, error = (Together(**{k: two[which] for k, two in found.items()}) for which in (0, 1))
    return value, error, means


def _mean(two: Two) -> Mean:
    (up, down), (up_error, down_error) = two
    return Mean((_number(up), _number(down)), (_number(up_error), _number(down_error)))


def _number(value: float) -> float | None:
    return None if np.isnan(value) else float(value)
