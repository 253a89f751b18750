"""What members of a crowd may look at when they go by a policy, and what a policy has them do."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from thumbwright.exact.arrays import BoolArray, FloatArray, IntArray
from thumbwright.exact.play import Act
from thumbwright.exact.walk import TIE, Walk


@dataclass(frozen=True)
class InPublic:
    """What has been shown in each of H public histories, as an undecided member sees it.

    Attributes
    ----------
    step, round : int
        Own observations so far, this one included; round within the step.
    plus, minus : ndarray of int, shape (K, H)
        How many others of each kind show plus and show minus.
    first, last : ndarray of int, shape (H,)
        Step of the first and of the latest answer; 0 where there is none.
    first_plus, first_minus : ndarray of int, shape (H,)
        How many gave either answer at the moment of the first.
    """

    step: int
    round: int
    plus: IntArray
    minus: IntArray
    first: IntArray
    last: IntArray
    first_plus: IntArray
    first_minus: IntArray

    def __len__(self) -> int:
        return len(self.first)


CrowdPolicy = Callable[[InPublic], Act]
"""What a member makes of all histories of a round; the arrays of the act have shape (H,)."""


def value_of(act: Act, size: int) -> FloatArray:
    """The value of an act for each of ``size`` histories (nats)."""
    return np.broadcast_to(np.asarray(act.value, dtype=float), (size,))


def reached(walk: Walk, prior: float, act: Act, size: int) -> tuple[BoolArray, BoolArray]:
    """Which rows and columns of a walk of ``size`` histories an act has answer plus, and minus."""
    if act.minus_at is None or act.plus_at is None:
        belief = prior + walk.tally[:, None] + value_of(act, size)[None, :]
        with np.errstate(invalid="ignore"):
            return belief >= walk.high[:, None] - TIE, belief <= walk.low[:, None] + TIE
    count = walk.count[:, None]
    low, high = (np.broadcast_to(bar, (size,)) for bar in (act.minus_at, act.plus_at))
    return count >= high, count <= low
