"""Evidence on a lattice.

One observation x has probabilities f+(x) and f-(x) and is worth its log-likelihood ratio
ln f+(x)/f-(x), in nats. Own tallies are sums of such worths. On an integer lattice of D axes every
value moves the own count S by whole steps, and after n observations the tally is

    y = alpha . S + beta * n,

so that equal tallies are equal integers and nothing is rounded. D = 1 is a ladder; D > 1 counts
how often each value has occurred.

Under either answer the probability of a set of observation sequences that all end at tally y
differs by exactly e^y. A walk therefore carries one measure only, with the masses
sqrt(f+ f-) per observation, from which both follow: q+ = m e^(y/2), q- = m e^(-y/2).

Certain evidence, a value that one answer makes impossible, has an infinite worth. Whoever meets
it commits at once (thresholds are finite), so its mass never enters a walk; it is kept apart in
``certain_plus`` and ``certain_minus``.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from thumbwright.exact.arrays import FloatArray, IntArray
from thumbwright.exact.errors import ModelError


@dataclass(frozen=True)
class Split:
    """How continuous or incommensurable evidence was put on a ladder.

    Attributes
    ----------
    step : float
        Ladder step delta (nats).
    change : float
        Largest relative change of error probabilities and mean steps of an agent alone when the
        ladder was made about twice as fine.
    tolerance : float
        The largest change allowed.
    """

    step: float
    change: float
    tolerance: float


@dataclass(frozen=True)
class Evidence:
    """One private observation.

    Attributes
    ----------
    kind : str
        Name of the kind, for messages.
    labels : tuple of str
        A word per ordinary value, shape (K,).
    plus, minus : ndarray of float, shape (K,)
        Probability of each ordinary value given plus, given minus (both positive).
    offsets : ndarray of int, shape (K, D)
        By how much each value moves the own count on each lattice axis.
    alpha : ndarray of float, shape (D,)
        Worth of one lattice unit (nats).
    beta : float
        Worth of having made one more observation, whatever it was (nats).
    certain_plus, certain_minus : float
        Probability given plus (minus) of a value that minus (plus) makes impossible.
    split : Split or None
        How the evidence was put on a ladder, where it had to be.
    """

    kind: str
    labels: tuple[str, ...]
    plus: FloatArray
    minus: FloatArray
    offsets: IntArray
    alpha: FloatArray
    beta: float
    certain_plus: float = 0.0
    certain_minus: float = 0.0
    split: Split | None = field(default=None)

    def __post_init__(self) -> None:
        for name, kind in (("plus", np.float64), ("minus", np.float64), ("alpha", np.float64)):
            object.__setattr__(self, name, _frozen(np.array(getattr(self, name), dtype=kind)))
        offsets = np.array(self.offsets, dtype=np.int64).reshape(len(self.plus), len(self.alpha))
        object.__setattr__(self, "offsets", _frozen(offsets))
        for side, certain in ((self.plus, self.certain_plus), (self.minus, self.certain_minus)):
            total = float(side.sum()) + certain
            if abs(total - 1.0) > 1e-9 or certain < 0 or (side <= 0).any():
                raise ModelError(
                    f"{self.kind} evidence: the probabilities of what may be observed must be "
                    f"positive and sum to 1 under each answer, not {total:g}"
                )

    @property
    def on_ladder(self) -> bool:
        """Whether the own count is a single whole number."""
        return len(self.alpha) == 1

    @property
    def countable(self) -> bool:
        """Whether a person can keep the own count: a ladder that was not made by splitting."""
        return self.on_ladder and self.split is None and self.informative

    @property
    def informative(self) -> bool:
        """Whether any observation can tell the answers apart."""
        telling = bool((self.worths() != 0).any())
        return telling or bool(self.certain_plus + self.certain_minus > 0)

    def worths(self) -> FloatArray:
        """Log-likelihood ratio of each ordinary value, shape (K,), nats."""
        worths: FloatArray = self.offsets @ self.alpha + self.beta
        return worths

    def information(self, prior_plus: float = 0.5) -> float:
        """Mutual information (nats) between one observation and the answer."""
        weight = np.array([prior_plus, 1.0 - prior_plus])[:, None]
        ordinary = np.stack([self.plus, self.minus])
        mixed = (weight * ordinary).sum(axis=0)
        total = float((weight * ordinary * np.log(ordinary / mixed)).sum())
        certain = (self.certain_plus, self.certain_minus)
        for mass, share in zip(certain, weight.ravel(), strict=True):
            if mass and share:
                total += float(share * mass * np.log(1.0 / share))
        return total


@dataclass(frozen=True)
class Loose:
    """Evidence that has no lattice of its own and must be split before it can be walked.

    Attributes
    ----------
    kind : str
    spread : float
        Standard deviation of one worth (nats), a first guess of a sensible ladder step.
    cells : callable
        ``cells(step)`` gives, as three arrays of equal length, whole numbers k and the masses
        under plus and minus of all observations whose worth lies from k to k + 1 steps.
    certain_plus, certain_minus : float
        As for :class:`Evidence`.
    """

    kind: str
    spread: float
    cells: Callable[[float], tuple[IntArray, FloatArray, FloatArray]]
    certain_plus: float = 0.0
    certain_minus: float = 0.0


def _frozen(array: NDArray[np.generic]) -> NDArray[np.generic]:
    array.setflags(write=False)
    return array
