"""What observations are really like, where those who make them take them for something else.

The values, and by how much each moves the own count, are those of the evidence that an observer
believes in; only their probabilities differ. A walk can follow them where the real worth of a value
is linear in the count as well,

    ln f+(x)/f-(x) = alpha . offset(x) + beta,

for then the two probabilities of a set of observation sequences that end at the same count still
differ by one factor. That holds for whatever two values are really like, for counts of another rate
or another chance of success, for evidence all of whose worths are stretched by one factor, and for
observations that say nothing. Other laws are refused.

A value that the observer takes for proof need not be proof. Its real probability under either
answer is kept apart, since whoever meets it answers at once.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from thumbwright.exact.arrays import FloatArray, IntArray
from thumbwright.exact.errors import ModelError
from thumbwright.exact.evidence.base import Evidence

_LINEAR = 1e-9


@dataclass(frozen=True)
class Law:
    """Probabilities of what one observation may be.

    Attributes
    ----------
    plus, minus : ndarray of float, shape (K,)
        Real probability of each ordinary value given plus, given minus (both positive).
    offsets : ndarray of int, shape (K, D)
        By how much each moves the own count.
    alpha : ndarray of float, shape (D,)
        Real worth of one lattice unit (nats); it may be negative.
    beta : float
        Real worth of having made one more observation (nats).
    proof : ndarray of float, shape (2, 2)
        Real probability of what is taken for proof: axis 0 of plus, of minus; axis 1 given plus,
        given minus.
    """

    plus: FloatArray
    minus: FloatArray
    offsets: IntArray
    alpha: FloatArray
    beta: float
    proof: FloatArray

    def __post_init__(self) -> None:
        total = np.array([self.plus.sum(), self.minus.sum()]) + self.proof.sum(axis=0)
        if np.abs(total - 1.0).max() > 1e-9 or (self.proof < 0).any():
            raise ModelError(
                "the real probabilities of what may be observed must be positive and sum to 1 "
                f"under each answer, not to {total[0]:g} and {total[1]:g}"
            )
        for array in (self.plus, self.minus, self.offsets, self.alpha, self.proof):
            array.setflags(write=False)


def as_believed(evidence: Evidence) -> Law:
    """The law of evidence that is what it is taken for."""
    return Law(
        evidence.plus,
        evidence.minus,
        evidence.offsets,
        evidence.alpha,
        evidence.beta,
        np.diag([evidence.certain_plus, evidence.certain_minus]),
    )


def stretched(evidence: Evidence, factor: float) -> Law:
    """The same observations, every worth really ``factor`` times what it is taken for.

    Probabilities are proportional to sqrt(f+ f-) e^(+-factor w/2) for a value of worth w. For a
    coin this multiplies the log-odds of a right sign, for counts the log ratio of the two rates or
    of the two odds, their geometric mean being kept. Where the two normalising sums differ, what
    one more observation is worth moves with them.

    Raises ModelError where some observation is proof, of which there is no half.
    """
    if evidence.certain_plus + evidence.certain_minus > 0:
        raise ModelError("evidence that can prove an answer cannot be made stronger or weaker")
    middle, worths = np.sqrt(evidence.plus * evidence.minus), evidence.worths()
    plus, minus = middle * np.exp(factor * worths / 2), middle * np.exp(-factor * worths / 2)
    sums = plus.sum(), minus.sum()
    beta = factor * evidence.beta - float(np.log(sums[0] / sums[1]))
    return Law(
        plus / sums[0],
        minus / sums[1],
        evidence.offsets,
        factor * evidence.alpha,
        beta,
        np.zeros((2, 2)),
    )


def useless(evidence: Evidence) -> Law:
    """Observations that say nothing: each as likely under either answer as it is on average."""
    mean = (evidence.plus + evidence.minus) / 2.0
    certain = np.array([evidence.certain_plus, evidence.certain_minus]) / 2.0
    return Law(
        mean,
        mean.copy(),
        evidence.offsets,
        np.zeros_like(evidence.alpha),
        0.0,
        np.stack([certain, certain], axis=1),
    )


def nothing(evidence: Evidence) -> Law:
    """No observation at all: the own count stays where it is."""
    axes = len(evidence.alpha)
    still = np.zeros((1, axes), dtype=np.int64)
    return Law(np.ones(1), np.ones(1), still, np.zeros(axes), 0.0, np.zeros((2, 2)))


def real_law(evidence: Evidence, real: Evidence) -> Law:
    """The law of observations that are really of one kind and taken for another.

    Raises ModelError where the two do not have the same values on the same lattice, or the real
    worths are not linear in the count.
    """
    if evidence.split or real.split:
        raise ModelError(
            "what was split onto a ladder cannot really be other evidence, whose ladder would be "
            "another one"
        )
    if evidence.kind == real.kind == "poisson":
        return as_believed(real)
    certain = np.array([evidence.certain_plus, evidence.certain_minus])
    if not set(evidence.labels) <= set(real.labels):
        raise ModelError(
            f"{evidence.kind} evidence with the values {', '.join(evidence.labels)} cannot really "
            f"be {real.kind} evidence with {', '.join(real.labels) or 'nothing but proofs'}: all "
            "its values must be possible under both answers"
        )
    place = [real.labels.index(label) for label in evidence.labels]
    plus, minus = real.plus[place], real.minus[place]
    proof = np.zeros((2, 2))
    rest = np.maximum(0.0, 1.0 - np.array([plus.sum(), minus.sum()]))
    if rest.max() > 1e-12:
        if np.count_nonzero(certain) != 1:
            raise ModelError(
                f"{evidence.kind} evidence cannot really be {real.kind} evidence with values that "
                "it does not have"
            )
        proof[int(np.argmax(certain))] = rest
    return _fitted(plus, minus, evidence.offsets, proof)


def _fitted(plus: FloatArray, minus: FloatArray, offsets: IntArray, proof: FloatArray) -> Law:
    """The law with the worths, linear in the count, that these probabilities have."""
    columns = np.column_stack([offsets, np.ones(len(plus))]).astype(float)
    worths = np.log(plus) - np.log(minus)
    solved = np.linalg.lstsq(columns, worths, rcond=None)[0]
    if len(worths) and np.abs(worths - columns @ solved).max() > _LINEAR:
        raise ModelError(
            "the real worth of an observation must be linear in what it adds to the own count; "
            "with these probabilities it is not"
        )
    return Law(plus, minus, offsets, solved[:-1], float(solved[-1]), proof)
