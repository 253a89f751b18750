"""Putting loose evidence on a ladder by splitting its values, with the effect on outcomes.

A value with masses f+ and f- and k d <= ln(f+/f-) <= (k+1) d is divided in two, worth exactly
k d and (k+1) d, with the same total masses. The result is a proper evidence model, slightly more
informative than the original: whoever is told which half came up learns a little more.

What counts is the effect on what agents do, which is large when a threshold lies just beside a
ladder point. So steps are chosen that put the thresholds midway between ladder points where
possible, and made finer until error probabilities and mean steps of an agent alone settle.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from thumbwright.exact.alone import alone
from thumbwright.exact.arrays import FloatArray, sums
from thumbwright.exact.errors import ModelError
from thumbwright.exact.evidence.base import Evidence, Loose, Split
from thumbwright.exact.group import Thresholds

MOST_VALUES = 20_000
"""A ladder on which one observation has more values than this is refused as too fine."""


def on_ladder(loose: Loose, step: float, split: Split | None = None) -> Evidence:
    """The evidence split onto a ladder with this step (nats)."""
    k, plus, minus = loose.cells(step)
    ratio = np.exp(k * step)
    below_minus = (np.exp(step) * ratio * minus - plus) / (ratio * np.expm1(step))
    # Rounding may leave a cell that lies on a ladder point a hair outside it.
    below_minus = np.clip(below_minus, 0.0, np.minimum(minus, plus / ratio))
    below_plus = ratio * below_minus
    low, width = int(k.min()), int(k.max() - k.min()) + 2
    masses: list[FloatArray] = []
    for below, all_ in ((below_plus, plus), (below_minus, minus)):
        masses.append(sums(k - low, below, width) + sums(k + 1 - low, all_ - below, width))
    kept = (masses[0] > 0) & (masses[1] > 0)
    points = np.arange(low, low + width, dtype=np.int64)[kept]
    open_plus, open_minus = 1.0 - loose.certain_plus, 1.0 - loose.certain_minus
    return Evidence(
        kind=loose.kind,
        labels=tuple(f"{point} steps" for point in points),
        plus=masses[0][kept] * (open_plus / masses[0][kept].sum()),
        minus=masses[1][kept] * (open_minus / masses[1][kept].sum()),
        offsets=points[:, None],
        alpha=np.array([step]),
        beta=0.0,
        certain_plus=loose.certain_plus,
        certain_minus=loose.certain_minus,
        split=split,
    )


def settle(
    loose: Loose,
    thresholds: Sequence[Thresholds],
    prior: float,
    horizon: int,
    tolerance: float = 1e-3,
) -> Evidence:
    """Split onto the coarsest ladder whose effect on an agent alone has settled.

    Parameters
    ----------
    loose : Loose
    thresholds : sequence of Thresholds
        All thresholds (nats) that agents with this evidence have.
    prior : float
        Prior log-odds (nats).
    horizon : int
        Steps.
    tolerance : float
        Largest relative change of error probabilities and mean steps of an agent alone, at any of
        the thresholds, when the ladder is made about twice as fine.

    Returns
    -------
    Evidence
        With ``split`` stating the step and the change.

    Raises
    ------
    ModelError
        Where the change is still above the tolerance on the finest ladder allowed.
    """
    target = min(loose.spread, min(t.plus - t.minus for t in thresholds) / 4.0)
    step = _midway(target, thresholds, prior)
    before = _outcomes(on_ladder(loose, step), thresholds, prior, horizon)
    change = np.inf
    while True:
        step = _midway(step / 2.0, thresholds, prior)
        if len(loose.cells(step)[0]) > MOST_VALUES:
            raise ModelError(
                f"{loose.kind} evidence had to be split onto a ladder, and with steps of "
                f"{2 * step:.3g} nats error probabilities and mean steps still changed by "
                f"{change:.2g}, above the tolerance of {tolerance:.2g}; raise tolerance, or give "
                "the evidence as listed values"
            )
        after = _outcomes(on_ladder(loose, step), thresholds, prior, horizon)
        change = float((np.abs(after - before) / np.maximum(after, 1e-300)).max())
        if change < tolerance:
            return on_ladder(loose, step, Split(step, change, tolerance))
        before = after


def _midway(target: float, thresholds: Sequence[Thresholds], prior: float) -> float:
    """A step near the target that puts the thresholds as nearly midway between points as it can."""
    steps = target * np.linspace(1.0, 0.75, 251)
    bounds = np.array([bound - prior for t in thresholds for bound in (t.minus, t.plus)])
    off = np.abs((bounds[None, :] / steps[:, None]) % 1.0 - 0.5).max(axis=1)
    return float(steps[int(np.argmin(np.round(off, 12)))])


def _outcomes(
    evidence: Evidence, thresholds: Sequence[Thresholds], prior: float, horizon: int
) -> FloatArray:
    """Error probabilities and mean steps of an agent alone, for each pair of thresholds."""
    figures = []
    for pair in thresholds:
        result = alone(evidence, pair, prior, horizon)
        figures.append(np.concatenate([result.wrong(), result.steps]))
    return np.concatenate(figures)
