"""The most information that any k groups of situations could keep, however they are drawn.

For two answers the best grouping of situations into k groups is made of intervals once they are
sorted by their posterior (B. Kurkoski and H. Yagi, IEEE Transactions on Information Theory 60
(2014) 4544-4552), and the best cut moves one way as the interval's end does, so a divide-and-
conquer search finds it exactly.
"""

from __future__ import annotations

import numpy as np

from thumbwright.distill.forms.boxes import gain
from thumbwright.exact.arrays import FloatArray, IntArray, sums

MOST_SINGLE = 20_000
"""More situations than this are put together where their posteriors nearly agree."""

_EVEN_STEPS = 10_000


def best_groupings(plus: FloatArray, minus: FloatArray, most: int) -> FloatArray:
    """Largest summed g of any grouping into at most k groups, for k = 1 .. ``most``.

    Of very many situations those of nearly equal posterior are put together first, and all that
    this could cost is added to every entry: then it is a bound, too high by less than 1e-7 of the
    mass.

    Parameters
    ----------
    plus, minus : ndarray of float, shape (R,)
        Masses of the situations.
    most : int

    Returns
    -------
    ndarray of float, shape (most,)
    """
    plus, minus = _sorted_and_merged(plus, minus)
    apart = 0.0
    if len(plus) > MOST_SINGLE:
        kept_apart = float(gain(plus, minus).sum())
        plus, minus = _nearly_merged(plus, minus)
        apart = max(kept_apart - float(gain(plus, minus).sum()), 0.0)
    running = [np.concatenate([[0.0], np.cumsum(side)]) for side in (plus, minus)]
    count = len(plus)
    best = np.concatenate([[0.0], gain(running[0][1:], running[1][1:])])
    ceilings = [float(best[count])]
    for groups in range(2, most + 1):
        if groups > count:
            ceilings.append(ceilings[-1])
            continue
        best = _one_more(best, running[0], running[1], groups)
        ceilings.append(max(ceilings[-1], float(best[count])))
    return np.array(ceilings) + apart


def _sorted_and_merged(plus: FloatArray, minus: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Situations in order of posterior, those of equal posterior put together."""
    both = plus + minus
    plus, minus, both = plus[both > 0], minus[both > 0], both[both > 0]
    share = plus / both
    order = np.argsort(share, kind="stable")
    starts = np.concatenate([[True], np.diff(share[order]) > 1e-13])
    group: IntArray = np.cumsum(starts) - 1
    return sums(group, plus[order]), sums(group, minus[order])


def _nearly_merged(plus: FloatArray, minus: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Situations put together whose posteriors lie within one of so many even steps.

    The steps are even on the scale on which what is lost within one depends on its width only.
    """
    angle = np.arcsin(np.sqrt(plus / (plus + minus)))
    step = np.minimum((angle * (_EVEN_STEPS / (np.pi / 2))).astype(np.int64), _EVEN_STEPS - 1)
    _, group = np.unique(step, return_inverse=True)
    return sums(group, plus), sums(group, minus)


def _one_more(best: FloatArray, plus: FloatArray, minus: FloatArray, groups: int) -> FloatArray:
    """Best sums over every prefix with one group more than ``best`` has."""
    count = len(best) - 1
    fresh = np.full(count + 1, -np.inf)
    # Each job: prefixes first..last whose best cut lies in low..high.
    jobs = [(groups, count, groups - 1, count - 1)]
    while jobs:
        first, last, low, high = jobs.pop()
        if first > last:
            continue
        end = (first + last) // 2
        cuts = np.arange(low, min(high, end - 1) + 1)
        saved = best[cuts] + gain(plus[end] - plus[cuts], minus[end] - minus[cuts])
        pick = int(np.argmax(saved))
        fresh[end] = saved[pick]
        jobs.append((first, end - 1, low, int(cuts[pick])))
        jobs.append((end + 1, last, int(cuts[pick]), high))
    return fresh
