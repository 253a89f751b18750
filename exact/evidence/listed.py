"""Evidence given as a list of values with their probabilities under each answer.

Values of equal worth are one value. If all worths are whole multiples of one step, or differ by
whole multiples of one, there is a ladder. Otherwise up to four values are counted each for
itself, which is exact too; more have to be split.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence

import numpy as np

from thumbwright.exact.arrays import FloatArray, IntArray, sums
from thumbwright.exact.errors import ModelError
from thumbwright.exact.evidence.base import Evidence, Loose

LONGEST = 1000
"""A common step that makes some worth more than this many steps long is taken for a chance hit."""

COUNTED = 4
"""Up to this many values without a common step are counted each for itself."""


def listed(
    plus: Sequence[float], minus: Sequence[float], values: Sequence[str] | None = None
) -> Evidence | Loose:
    """Evidence from a list: probabilities given plus, given minus, and a word for each value.

    Raises ModelError where lengths differ or a list is not a probability distribution.
    """
    f_plus, f_minus = np.array(plus, dtype=float), np.array(minus, dtype=float)
    labels = [str(v) for v in (values if values is not None else range(1, len(f_plus) + 1))]
    if not len(f_plus) == len(f_minus) == len(labels) or len(f_plus) == 0:
        raise ModelError(
            "listed evidence: plus, minus and values must be of one length, not "
            f"{len(f_plus)}, {len(f_minus)} and {len(labels)}"
        )
    for name, side in (("plus", f_plus), ("minus", f_minus)):
        if not (side >= 0).all() or abs(side.sum() - 1.0) > 1e-9:
            raise ModelError(
                f"listed evidence: the probabilities given {name} must not be negative and must "
                f"sum to 1, not {side.sum():.12g}"
            )
    certain_plus = float(f_plus[f_minus == 0].sum())
    certain_minus = float(f_minus[f_plus == 0].sum())
    open_ = (f_plus > 0) & (f_minus > 0)
    words = [label for label, kept in zip(labels, open_, strict=True) if kept]
    f_plus, f_minus, words = _merged(f_plus[open_], f_minus[open_], words)
    worths = np.log(f_plus) - np.log(f_minus)
    found = _ladder(worths)
    if found is None and len(worths) > COUNTED:
        spread = float(np.sqrt(((f_plus + f_minus) / 2 * worths**2).sum()))
        return Loose("listed", spread, _cells_of(f_plus, f_minus), certain_plus, certain_minus)
    if found is None:
        count = len(worths)
        offsets = np.eye(count, count - 1, dtype=np.int64)
        alpha, beta = worths[:-1] - worths[-1], float(worths[-1])
    else:
        offsets, alpha, beta = found
    return Evidence(
        "listed", tuple(words), f_plus, f_minus, offsets, alpha, beta, certain_plus, certain_minus
    )


def _merged(
    plus: FloatArray, minus: FloatArray, words: list[str]
) -> tuple[FloatArray, FloatArray, list[str]]:
    """Values of equal worth put together, in order of worth: a sufficient statistic."""
    if len(plus) == 0:
        return plus, minus, words
    worths = np.log(plus) - np.log(minus)
    order = np.argsort(worths, kind="stable")
    starts = np.concatenate([[True], np.diff(worths[order]) > 1e-12])
    group = np.cumsum(starts) - 1
    size = int(group[-1]) + 1
    joined = ["|".join(words[i] for i in order[group == g]) for g in range(size)]
    return sums(group, plus[order], size), sums(group, minus[order], size), joined


def _ladder(worths: FloatArray) -> tuple[IntArray, FloatArray, float] | None:
    """Offsets, alpha and beta of a ladder through all worths, or None."""
    if len(worths) == 0:
        return np.zeros((0, 1), dtype=np.int64), np.zeros(1), 0.0
    for beta in (0.0, float(worths[0])):
        step = _common_step(worths - beta)
        if step is not None:
            whole = np.zeros(len(worths)) if step == 0 else np.rint((worths - beta) / step)
            return whole.astype(np.int64)[:, None], np.array([step]), beta
    return None


def _common_step(lengths: FloatArray) -> float | None:
    """The largest step of which all lengths are whole multiples to 1e-12, or None."""
    size = float(np.abs(lengths).max())
    if size == 0:
        return 0.0
    step = 0.0
    for length in np.abs(lengths):
        a, b = max(step, float(length)), min(step, float(length))
        while b > 1e-9 * size:
            a, b = b, math.fmod(a, b)
            if a - b < 1e-9 * size:
                b = 0.0
        step = a
    count = np.rint(lengths / step)
    if np.abs(count).max() > LONGEST:
        return None
    # The Euclidean remainders carry rounding; the longest length gives the step most precisely.
    longest = int(np.argmax(np.abs(lengths)))
    step = float(lengths[longest] / count[longest])
    return step if np.abs(lengths - count * step).max() <= 1e-12 * max(size, 1.0) else None


def _cells_of(
    plus: FloatArray, minus: FloatArray
) -> Callable[[float], tuple[IntArray, FloatArray, FloatArray]]:
    worths = np.log(plus) - np.log(minus)

    def cells(step: float) -> tuple[IntArray, FloatArray, FloatArray]:
        k = np.floor(worths / step + 1e-12).astype(np.int64)
        return k, plus, minus

    return cells
