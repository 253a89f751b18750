"""Evidence that is a count: binomial and poisson. The own count is the sum of the counts seen."""

from __future__ import annotations

import math

import numpy as np
from scipy.stats import binom, poisson as poisson_law

from thumbwright.exact.errors import ModelError
from thumbwright.exact.evidence.base import Evidence

TAIL = 1e-15
"""Probability beyond which the tail of a Poisson count is cut; the rest is renormalised."""


def binomial(m: int, p_plus: float, p_minus: float) -> Evidence:
    """How many of m tries succeed, with probability p_plus or p_minus each.

    alpha as for bernoulli; beta = m ln((1 - p_plus)/(1 - p_minus)). Probabilities of 0 or 1 are
    refused: with several tries the certain values come mixed with uncertain ones.
    """
    if m < 1 or m != int(m):
        raise ModelError(f"binomial evidence: m must be a whole number of at least 1, not {m:g}")
    for name, value in (("p_plus", p_plus), ("p_minus", p_minus)):
        if not 0.0 < value < 1.0:
            raise ModelError(
                f"binomial evidence: {name} must lie strictly between 0 and 1, not {value:g}; "
                "certain evidence can be given as bernoulli or listed"
            )
    if m * max(-math.log(p) for p in (p_plus, p_minus, 1 - p_plus, 1 - p_minus)) > 700:
        raise ModelError(
            f"binomial evidence: with m = {int(m)} tries the rarest counts have no probability "
            "that a computer can hold; take fewer tries per step"
        )
    x = np.arange(int(m) + 1)
    per_try = math.log((1.0 - p_plus) / (1.0 - p_minus))
    return Evidence(
        kind="binomial",
        labels=tuple(str(value) for value in x),
        plus=binom.pmf(x, m, p_plus),
        minus=binom.pmf(x, m, p_minus),
        offsets=x[:, None],
        alpha=np.array([math.log(p_plus / p_minus) - per_try]),
        beta=m * per_try,
    )


def poisson(rate_plus: float, rate_minus: float) -> Evidence:
    """How many events fall into one step, at rate_plus or rate_minus events per step.

    alpha = ln(rate_plus/rate_minus), beta = -(rate_plus - rate_minus). Counts whose tail is below
    1e-15 under both answers are cut and the rest renormalised.
    """
    for name, value in (("rate_plus", rate_plus), ("rate_minus", rate_minus)):
        if not (0.0 < value < math.inf):
            raise ModelError(f"poisson evidence: {name} must be a positive rate, not {value:g}")
    if max(rate_plus, rate_minus) > 10_000:
        raise ModelError(
            "poisson evidence: rates above 10,000 per step are refused; shorten the step"
        )
    top = int(max(poisson_law.isf(TAIL, rate_plus), poisson_law.isf(TAIL, rate_minus))) + 1
    x = np.arange(top + 1)
    plus, minus = poisson_law.pmf(x, rate_plus), poisson_law.pmf(x, rate_minus)
    kept = (plus > 1e-290) & (minus > 1e-290)
    if min(plus[kept].sum(), minus[kept].sum()) < 1.0 - 1e-12:
        raise ModelError(
            f"poisson evidence: rates {rate_plus:g} and {rate_minus:g} are so far apart that one "
            "step settles the question; shorten the step"
        )
    x, plus, minus = x[kept], plus[kept], minus[kept]
    return Evidence(
        kind="poisson",
        labels=tuple(str(value) for value in x),
        plus=plus / plus.sum(),
        minus=minus / minus.sum(),
        offsets=x[:, None],
        alpha=np.array([math.log(rate_plus / rate_minus)]),
        beta=-(rate_plus - rate_minus),
    )
