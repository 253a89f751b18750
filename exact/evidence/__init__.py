"""Kinds of evidence: what one private observation can be, and what it is worth.

One file per kind; :func:`build` finds a kind by its name. A new kind is a function that returns an
:class:`~thumbwright.exact.evidence.base.Evidence` and one line in :data:`KINDS`.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

from thumbwright.exact.errors import ModelError
from thumbwright.exact.evidence.base import Evidence, Loose
from thumbwright.exact.evidence.binary import bernoulli, calibration, coin
from thumbwright.exact.evidence.counts import binomial, poisson
from thumbwright.exact.evidence.listed import listed
from thumbwright.exact.evidence.normal import normal

KINDS: dict[str, Callable[..., Evidence | Loose]] = {
    "coin": coin,
    "bernoulli": bernoulli,
    "calibration": calibration,
    "binomial": binomial,
    "poisson": poisson,
    "listed": listed,
    "normal": normal,
}


def build(kind: str, **keys: Any) -> Evidence | Loose:
    """Evidence of a kind by name, still loose where it needs a ladder made for it.

    Raises :class:`ModelError` for an unknown kind or bad keys.
    """
    if kind not in KINDS:
        raise ModelError(f"no evidence of kind {kind!r} (allowed: {', '.join(KINDS)})")
    return KINDS[kind](**keys)
