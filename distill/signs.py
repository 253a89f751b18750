"""What one private observation may be called in a record, and what it is worth.

The names are those of the case: for coin "plus" and "minus", for a sign that is there or not "1"
and "0", for counts the number, for listed evidence the names of its values. Where there are two,
the case's own words for them will do too. A reading on a scale (normal) has no names: it is given
by its worth in nats.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from thumbwright.distill.case import Case
from thumbwright.distill.evidence_keys import (
    BernoulliEvidence,
    CalibrationEvidence,
    CoinEvidence,
    EvidenceKeys,
    ListedEvidence,
)
from thumbwright.exact.arrays import IntArray
from thumbwright.exact.evidence.base import Evidence


@dataclass(frozen=True)
class Sign:
    """One value of the evidence.

    Attributes
    ----------
    name : str
    worth : float
        Log-likelihood ratio (nats); infinite where one answer makes the value impossible.
    moves : tuple of int, or None
        By how much it moves the own count on each axis of the lattice; None where it is certain
        evidence, or where the evidence was split and so has no count of its own.
    """

    name: str
    worth: float
    moves: tuple[int, ...] | None


def signs_of(case: Case, agent: str, evidence: Evidence) -> dict[str, Sign]:
    """The signs of an agent by what they may be called; empty where they have no names."""
    keys = case.agents[agent].evidence or case.evidence
    masses = _masses(keys)
    if masses is None:
        names = () if evidence.split else evidence.labels
        worths = evidence.worths()
        found = [Sign(n, float(worths[k]), _moves(evidence, k)) for k, n in enumerate(names)]
    else:
        found = [_sign(evidence, *one) for one in masses]
    signs = {sign.name: sign for sign in found}
    if len(found) == 2:
        low, high = sorted(found, key=lambda sign: sign.worth)
        words = ((case.words.plus_sign, high), (case.words.minus_sign, low))
        if case.words.plus_sign != case.words.minus_sign:
            signs = {**{word: sign for word, sign in words if word}, **signs}
    return signs


def _masses(keys: EvidenceKeys) -> list[tuple[str, float, float]] | None:
    """Name and probability under plus and minus of each possible value, certain ones included.

    None for kinds whose values are whole numbers or lie on a scale.
    """
    if isinstance(keys, CoinEvidence):
        found = [("minus", 1.0 - keys.p, keys.p), ("plus", keys.p, 1.0 - keys.p)]
    elif isinstance(keys, BernoulliEvidence | CalibrationEvidence):
        plus, minus = _rates(keys)
        found = [("0", 1.0 - plus, 1.0 - minus), ("1", plus, minus)]
    elif isinstance(keys, ListedEvidence):
        names = keys.values or [str(k + 1) for k in range(len(keys.plus))]
        found = list(zip(names, keys.plus, keys.minus, strict=True))
    else:
        return None
    return [one for one in found if one[1] > 0 or one[2] > 0]


def _rates(keys: BernoulliEvidence | CalibrationEvidence) -> tuple[float, float]:
    if isinstance(keys, BernoulliEvidence):
        return keys.p_plus, keys.p_minus
    positives, negatives = keys.hits + keys.misses, keys.false_alarms + keys.correct_rejections
    return keys.hits / positives, keys.false_alarms / negatives


def _sign(evidence: Evidence, name: str, plus: float, minus: float) -> Sign:
    if minus == 0 or plus == 0:
        return Sign(name, math.inf if minus == 0 else -math.inf, None)
    worth = math.log(plus) - math.log(minus)
    if evidence.split:
        return Sign(name, worth, None)
    # Listed values of one worth are one value of the evidence, so the worth finds it.
    worths = evidence.worths()
    nearest = int(np.argmin(np.abs(worths - worth)))
    return Sign(name, float(worths[nearest]), _moves(evidence, nearest))


def _moves(evidence: Evidence, value: int) -> tuple[int, ...]:
    return tuple(int(step) for step in evidence.offsets[value])


class Own:
    """An agent's own observations, added up as they come."""

    def __init__(self, evidence: Evidence) -> None:
        self._evidence = evidence
        self._counts: IntArray | None = np.zeros(len(evidence.alpha), dtype=np.int64)
        self._sum, self._made = 0.0, 0

    def observe(self, sign: Sign) -> None:
        """Take in one observation."""
        self._made += 1
        self._sum += sign.worth
        if sign.moves is None:
            self._counts = None
        elif self._counts is not None:
            self._counts = self._counts + np.array(sign.moves, dtype=np.int64)

    @property
    def count(self) -> int | None:
        """The own count, where it is one whole number."""
        if self._counts is None or not self._evidence.on_ladder:
            return None
        return int(self._counts[0])

    @property
    def tally(self) -> float:
        """Sum of the worths (nats); where they are whole steps, free of added-up rounding."""
        if self._counts is None:
            return self._sum
        return float(self._counts @ self._evidence.alpha) + self._evidence.beta * self._made
