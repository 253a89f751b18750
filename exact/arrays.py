"""Array types that signatures use, and the sums that several modules need."""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]
BoolArray = NDArray[np.bool_]


def sums(group: NDArray[Any], weights: FloatArray, count: int = 0) -> FloatArray:
    """Sum of the weights in each group.

    Parameters
    ----------
    group : ndarray of int, shape (R,)
        Which group each entry belongs to.
    weights : ndarray of float, shape (R,)
    count : int
        Least number of groups; groups without entries sum to 0.

    Returns
    -------
    ndarray of float, shape (at least count,)
    """
    return np.asarray(np.bincount(group, weights=weights, minlength=count), dtype=np.float64)
