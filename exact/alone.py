"""One agent alone: survival, the law of its decision time and its outcomes, for a long horizon."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from thumbwright.exact.arrays import FloatArray
from thumbwright.exact.errors import ModelError
from thumbwright.exact.evidence.base import Evidence
from thumbwright.exact.group import Thresholds, same_thresholds
from thumbwright.exact.walk import TIE, Walk

MOST_STEPS = 200_000
"""An agent that is not done by then has evidence too weak for its thresholds."""


@dataclass(frozen=True)
class Alone:
    """What an agent by itself ends up doing.

    Attributes
    ----------
    answers : ndarray of float, shape (2, 2, n + 1)
        Probability of committing at each step: axis 0 to plus, to minus; axis 1 given plus, given
        minus. Step 0 is always empty: nobody commits before its first observation.
    undecided : ndarray of float, shape (2,)
        Probability of being undecided after the last step, given plus and given minus.
    steps : ndarray of float, shape (2,)
        Mean number of steps used; an undecided agent has used all of them.
    stops, goes_on : tuple of float
        The beliefs next to the thresholds that were reached: the highest that answered minus and
        the lowest that answered plus; the lowest and the highest at which the agent went on, the
        prior among them where it lies between the thresholds.
    """

    answers: FloatArray
    undecided: FloatArray
    steps: FloatArray
    stops: tuple[float, float]
    goes_on: tuple[float, float]

    def wrong(self) -> FloatArray:
        """Probability of a wrong answer, given plus and given minus, shape (2,)."""
        return np.array([self.answers[1, 0].sum(), self.answers[0, 1].sum()])


def alone(
    evidence: Evidence,
    thresholds: Thresholds,
    prior: float,
    horizon: int | None = None,
    leftover: float = 1e-14,
) -> Alone:
    """Play one agent by itself, to the horizon or until less than ``leftover`` is undecided.

    Raises ModelError where it is still undecided with more than that after 200,000 steps.
    """
    walk = Walk(evidence, same_thresholds(thresholds), 0 if horizon is None else horizon)
    laws: list[FloatArray] = []
    survival: list[FloatArray] = [np.ones(2)]
    stops, goes_on = [-np.inf, np.inf], [np.inf, -np.inf]
    if thresholds.minus + TIE < prior < thresholds.plus - TIE:
        goes_on = [prior, prior]
    last = MOST_STEPS if horizon is None else horizon
    for _ in range(last):
        certain = walk.observe()
        belief = prior + walk.tally
        plus, minus = belief >= thresholds.plus - TIE, belief <= thresholds.minus + TIE
        gone = np.exp(np.logaddexp(walk.cut(plus[:, None], minus[:, None]), certain))[:, :, 0]
        laws.append(gone)
        survival.append(np.exp(walk.log_undecided())[:, 0])
        if minus.any():
            stops[0] = max(stops[0], float(belief[minus].max()))
        if plus.any():
            stops[1] = min(stops[1], float(belief[plus].min()))
        between = belief[~(plus | minus)]
        if len(between):
            goes_on = [min(goes_on[0], float(between.min())), max(goes_on[1], float(between.max()))]
        if horizon is None and survival[-1].max() < leftover:
            break
    else:
        if horizon is None:
            raise ModelError(
                f"after {MOST_STEPS:,} steps an agent alone is still undecided with probability "
                f"{survival[-1].max():.3g}: the evidence is too weak for these thresholds"
            )
    answers = np.concatenate([np.zeros((2, 2, 1)), np.stack(laws, axis=2)], axis=2)
    steps = np.stack(survival[:-1]).sum(axis=0)
    return Alone(answers, survival[-1], steps, (stops[0], stops[1]), (goes_on[0], goes_on[1]))
