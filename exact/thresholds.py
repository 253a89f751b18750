"""Thresholds in the units people state them in, turned into beliefs (nats).

Thresholds in nats or as probabilities are beliefs as they stand. Thresholds in observations and
tolerated error rates are conditions on the evidence; they are counted from the prior.
"""

from __future__ import annotations

import math

from thumbwright.exact.errors import ModelError
from thumbwright.exact.evidence.base import Evidence
from thumbwright.exact.group import Thresholds


def log_odds(p: float) -> float:
    """Log-odds (nats) of a probability strictly between 0 and 1."""
    return math.log(p) - math.log1p(-p)


def from_observations(minus: float, plus: float, evidence: Evidence, prior: float) -> Thresholds:
    """So many observations' worth of evidence, for coin evidence (prior in nats)."""
    symmetric = evidence.on_ladder and evidence.beta == 0.0 and len(evidence.plus) == 2
    if evidence.kind != "coin" or not symmetric or not evidence.alpha[0] > 0:
        raise ModelError(
            "thresholds in observations need coin evidence with 0.5 < p < 1, where every "
            "observation has one finite worth; state them in nats or as probabilities instead"
        )
    worth = float(evidence.alpha[0])
    return Thresholds(prior + minus * worth, prior + plus * worth)


def from_probability(minus: float, plus: float) -> Thresholds:
    """Posterior probabilities of plus at or below and at or above which an agent commits."""
    for name, value in (("minus", minus), ("plus", plus)):
        if not 0.0 < value < 1.0:
            raise ModelError(
                f"a threshold as a probability must lie strictly between 0 and 1, not {value:g} "
                f"({name})"
            )
    return Thresholds(log_odds(minus), log_odds(plus))


def from_error_rates(false_plus: float, false_minus: float, prior: float) -> Thresholds:
    """Tolerated error rates, by the approximation of A. Wald, Sequential Analysis (1947).

    The evidence, counted from the prior, must reach ln((1 - false_minus)/false_plus) for plus or
    ln(false_minus/(1 - false_plus)) for minus. ``false_plus`` is the rate of answering plus when
    minus is true; real rates differ a little because evidence overshoots.
    """
    for name, value in (("false_plus", false_plus), ("false_minus", false_minus)):
        if not 0.0 < value < 1.0:
            raise ModelError(f"{name} must lie strictly between 0 and 1, not {value:g}")
    if false_plus + false_minus >= 1.0:
        raise ModelError(
            f"error rates of {false_plus:g} and {false_minus:g} sum to 1 or more: that is no "
            "better than guessing"
        )
    return Thresholds(
        prior + math.log(false_minus / (1.0 - false_plus)),
        prior + math.log((1.0 - false_minus) / false_plus),
    )
