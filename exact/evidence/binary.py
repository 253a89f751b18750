"""Evidence with two values: coin, bernoulli, and bernoulli from calibration counts."""

from __future__ import annotations

import math

import numpy as np

from thumbwright.exact.errors import ModelError
from thumbwright.exact.evidence.base import Evidence


def coin(p: float) -> Evidence:
    """Two signs, each right with probability p: a step up or down of ln(p/(1-p)) nats.

    Raises ModelError unless 0.5 <= p <= 1. At p = 0.5 it carries no information; at p = 1 the
    first sign settles the question.
    """
    if not 0.5 <= p <= 1.0:
        raise ModelError(f"coin evidence needs 0.5 <= p <= 1, not {p:g}; below 0.5 swap the signs")
    if p == 1.0:
        return bernoulli(1.0, 0.0)
    worth = math.log(p / (1.0 - p))
    return Evidence(
        kind="coin",
        labels=("minus", "plus"),
        plus=np.array([1.0 - p, p]),
        minus=np.array([p, 1.0 - p]),
        offsets=np.array([[-1], [1]]),
        alpha=np.array([worth]),
        beta=0.0,
    )


def bernoulli(p_plus: float, p_minus: float) -> Evidence:
    """Something is noticed (1) or not (0), with probability p_plus or p_minus.

    The own count is the number of ones, each worth alpha = the difference of the log-odds; every
    observation is also worth beta = ln((1 - p_plus)/(1 - p_minus)). A probability of 0 or 1 under
    one answer only makes certain evidence, which is handled exactly.
    """
    for name, value in (("p_plus", p_plus), ("p_minus", p_minus)):
        if not 0.0 <= value <= 1.0:
            raise ModelError(f"bernoulli evidence: {name} must be a probability, not {value:g}")
    kept = [x for x in (0, 1) if _mass(p_plus, x) > 0 and _mass(p_minus, x) > 0]
    certain_plus = sum(_mass(p_plus, x) for x in (0, 1) if _mass(p_minus, x) == 0)
    certain_minus = sum(_mass(p_minus, x) for x in (0, 1) if _mass(p_plus, x) == 0)
    if len(kept) == 2:
        beta = math.log((1.0 - p_plus) / (1.0 - p_minus))
        alpha = math.log(p_plus / p_minus) - beta
    else:
        beta = math.log(_mass(p_plus, kept[0]) / _mass(p_minus, kept[0])) if kept else 0.0
        alpha = 0.0
    return Evidence(
        kind="bernoulli",
        labels=tuple(str(x) for x in kept),
        plus=np.array([_mass(p_plus, x) for x in kept]),
        minus=np.array([_mass(p_minus, x) for x in kept]),
        offsets=np.array([[x] for x in kept], dtype=np.int64).reshape(len(kept), 1),
        alpha=np.array([alpha]),
        beta=beta,
        certain_plus=certain_plus,
        certain_minus=certain_minus,
    )


def calibration(
    hits: float, misses: float, false_alarms: float, correct_rejections: float
) -> Evidence:
    """Bernoulli evidence of a detector tried on known cases.

    p_plus = hits/(hits + misses), p_minus = false_alarms/(false_alarms + correct_rejections).
    """
    counts = {"hits": hits, "misses": misses, "false_alarms": false_alarms}
    counts["correct_rejections"] = correct_rejections
    for name, count in counts.items():
        if not count >= 0 or not math.isfinite(count):
            raise ModelError(f"calibration evidence: {name} must be a count, not {count:g}")
    if hits + misses <= 0 or false_alarms + correct_rejections <= 0:
        raise ModelError(
            "calibration evidence needs at least one case of each kind: hits + misses and "
            "false_alarms + correct_rejections must be above 0"
        )
    return bernoulli(hits / (hits + misses), false_alarms / (false_alarms + correct_rejections))


def _mass(p: float, x: int) -> float:
    return p if x == 1 else 1.0 - p
