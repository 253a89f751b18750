"""Normal evidence: readings with one spread and two means, d standard deviations apart."""

from __future__ import annotations

import numpy as np
from scipy.stats import norm

from thumbwright.exact.arrays import FloatArray, IntArray
from thumbwright.exact.errors import ModelError
from thumbwright.exact.evidence.base import Loose


def normal(d: float, tail: float = 1e-12) -> Loose:
    """A reading whose worth is normal with mean +-d^2/2 and standard deviation d (nats).

    ``tail`` is the probability cut off at each end under each answer; the rest is renormalised.
    It has no ladder of its own and is split onto one. Raises ModelError unless d > 0 and
    0 < tail < 0.01.
    """
    if not 0.0 < d <= 10.0:
        raise ModelError(f"normal evidence: d must be above 0 and at most 10, not {d:g}")
    if not 0.0 < tail < 0.01:
        raise ModelError(f"normal evidence: tail must lie between 0 and 0.01, not {tail:g}")
    mean, reach = d * d / 2.0, float(norm.isf(tail)) * d
    low, high = -mean - reach, mean + reach

    def cells(step: float) -> tuple[IntArray, FloatArray, FloatArray]:
        k = np.arange(int(np.floor(low / step)), int(np.ceil(high / step)), dtype=np.int64)
        edges = np.clip(np.append(k, k[-1] + 1) * step, low, high)
        masses = []
        for centre in (mean, -mean):
            z = (edges - centre) / d
            # Differences of the nearer tail keep their digits far from the mean.
            mass = np.where(z[:-1] > 0, norm.sf(z[:-1]) - norm.sf(z[1:]), np.diff(norm.cdf(z)))
            masses.append(mass / mass.sum())
        kept = (masses[0] > 0) & (masses[1] > 0)
        return k[kept], masses[0][kept], masses[1][kept]

    return Loose("normal", d, cells)
