"""Few numbers fitted to weighted situations: worth as a sum of terms, by weighted log loss.

With masses w+ and w- of a situation and the worth v that a formula gives it, the loss is the sum of
w+ ln(1 + e^-v) + w- ln(1 + e^v): logistic regression without an intercept, convex in the numbers.
"""

from __future__ import annotations

from collections.abc import Callable, Hashable

import numpy as np
from numpy.typing import ArrayLike

from thumbwright.distill.costs import Pricer
from thumbwright.distill.views import View
from thumbwright.exact.arrays import FloatArray

FAR = 60.0
"""Worths of terms are kept within this (nats): beyond it a situation is certain."""


NEWTON = 6
"""Most steps after the search by gradients."""


def everywhere(pricer: Pricer, read: Callable[[View], ArrayLike]) -> FloatArray:
    """What is read off the view of every situation, shape (R,)."""
    found = np.empty(len(pricer.situations.step))
    for here, view in pricer.situations.views():
        found[here] = np.broadcast_to(np.asarray(read(view), dtype=float), here.shape)
    return found


def kinds(pricer: Pricer, counted: bool) -> list[tuple[str, ...]]:
    """Seen agents that are alike in thresholds, evidence and whom they see, put together.

    Where agents are ``counted`` and not told apart there is one kind without names.
    """
    if counted:
        return [()]
    group = pricer.group
    found: dict[Hashable, list[str]] = {}
    for other in pricer.seen:
        agent = group.agents[group.index[other]]
        looks = None if agent.looks is None else tuple(agent.looks)
        evidence = agent.evidence
        law = (
            evidence.kind,
            *(part.tobytes() for part in (evidence.plus, evidence.minus, evidence.offsets)),
        )
        back = pricer.agent in agent.sees
        found.setdefault((agent.thresholds, law, len(agent.sees), looks, back), []).append(other)
    return [tuple(alike) for alike in found.values()]


def log_loss(value: FloatArray, plus: FloatArray, minus: FloatArray) -> float:
    """Loss (nats) of giving situations with these masses these worths."""
    total = 0.0
    for mass, side in ((plus, -value), (minus, value)):
        # What is never met costs nothing, even where its worth is infinite.
        met = mass > 0
        total += float(mass[met] @ np.logaddexp(0.0, side[met]))
    return total


def fitted(
    terms: FloatArray, plus: FloatArray, minus: FloatArray, given: FloatArray | None = None
) -> FloatArray:
    """The worths of terms that lose least.

    Parameters
    ----------
    terms : ndarray of float, shape (R, K)
        How much of each term a situation has.
    plus, minus : ndarray of float, shape (R,)
        Masses.
    given : ndarray of float, shape (R,), optional
        Worth (nats) that is there besides.

    Returns
    -------
    ndarray of float, shape (K,)
        Nats per unit of each term.
    """
    from scipy.optimize import minimize

    if terms.shape[1] == 0:
        return np.zeros(0)
    base = np.zeros(len(plus)) if given is None else given
    total = float((plus + minus).sum())
    size = np.maximum(np.abs(terms).max(axis=0), 1e-300)
    scaled = terms / size

    def loss(numbers: FloatArray) -> float:
        return log_loss(base + scaled @ numbers, plus, minus) / total

    def slope(numbers: FloatArray) -> FloatArray:
        # The derivative of the loss by v is w- s(v) - w+ s(-v), s the logistic function.
        half = np.tanh((base + scaled @ numbers) / 2.0)
        down: FloatArray = scaled.T @ ((minus - plus) + (minus + plus) * half)
        return down / (2.0 * total)

    def bend(numbers: FloatArray) -> FloatArray:
        half = np.tanh((base + scaled @ numbers) / 2.0)
        weight = (plus + minus) * (1.0 - half**2) / (4.0 * total)
        return np.asarray(scaled.T @ (weight[:, None] * scaled))

    start = np.zeros(terms.shape[1])
    found = minimize(
        loss, start, jac=slope, hess=bend, method="trust-exact", options={"gtol": 1e-9}
    )
    numbers = np.asarray(found.x, dtype=float)
    # A worth that stands on a bar must stand on it to rounding: a few steps of Newton's method.
    for _ in range(NEWTON):
        step = np.linalg.lstsq(bend(numbers), slope(numbers), rcond=1e-12)[0]
        if np.abs(slope(numbers - step)).max() >= np.abs(slope(numbers)).max():
            break
        numbers = numbers - step
    return np.asarray(np.clip(numbers / size, -FAR, FAR), dtype=float)


def information_of(pricer: Pricer, value: FloatArray) -> float | None:
    """Information kept by giving every situation this worth (nats), shape (R,)."""
    s = pricer.situations
    # g of a group with its best value is its loss at worth 0 less its loss at that value.
    even = float((s.plus + s.minus).sum()) * np.log(2.0)
    return s.information_kept(even - log_loss(value, s.plus, s.minus))
