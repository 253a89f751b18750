"""Plain probabilities of how one way of playing turns out, and linear figures of them.

Where public histories were sampled a tally keeps what happened in each, so that every figure has a
standard error, and the difference of two figures that of their paired difference.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, fields

import numpy as np

from thumbwright.exact.arrays import FloatArray
from thumbwright.exact.crowd_figures import Weights
from thumbwright.exact.engine import Track
from thumbwright.exact.outcomes import outcome
from thumbwright.exact.stopping import Losses

PARTS = ("plus", "minus", "undecided", "steps", "lean_plus", "lean_minus")
"""What a tally counts."""


@dataclass(frozen=True)
class Sampled:
    """What happened in each of H sampled histories; fields as in :class:`Tally`, shape (2, H).

    ``weights`` are those of the histories.
    """

    plus: FloatArray
    minus: FloatArray
    undecided: FloatArray
    steps: FloatArray
    lean_plus: FloatArray
    lean_minus: FloatArray
    weights: Weights


@dataclass(frozen=True)
class Tally:
    """Plain probabilities of how one way of playing turns out, averaged over settings.

    ``plus``, ``minus``, ``undecided``, ``steps`` have shape (2,), given plus and given minus.
    ``lean_plus``, ``lean_minus``, also (2,), are the undecided at the horizon whose belief favours
    plus or minus; one that favours neither counts half for each. ``sampled`` is None unless
    histories were sampled.
    """

    plus: FloatArray
    minus: FloatArray
    undecided: FloatArray
    steps: FloatArray
    lean_plus: FloatArray
    lean_minus: FloatArray
    off_model: float = 0.0
    sampled: Sampled | None = None

    def risk(self, losses: Losses, prior_plus: float) -> float:
        """Expected loss, averaged over the prior."""
        return risk_of(losses, prior_plus).of(self)


@dataclass(frozen=True)
class Figure:
    """A linear figure of a tally: weights, shape (2,), of each of its parts given plus and minus.

    ``constant`` is added.
    """

    weights: dict[str, FloatArray]
    constant: float = 0.0

    def of(self, tally: Tally) -> float:
        """Its value."""
        return self.constant + float(
            sum(weight @ getattr(tally, name) for name, weight in self.weights.items())
        )

    def by_history(self, sampled: Sampled) -> FloatArray:
        """What each sampled history adds given plus and given minus, shape (2, H)."""
        total: FloatArray = np.zeros_like(sampled.plus)
        for name, weight in self.weights.items():
            total += weight[:, None] * getattr(sampled, name)
        return total


def prior_pair(prior_plus: float) -> FloatArray:
    """Prior probability of either answer, shape (2,)."""
    return np.array([prior_plus, 1.0 - prior_plus])


def accuracy_of(prior_plus: float) -> Figure:
    """Probability of having given the right answer by the horizon."""
    plus, minus = np.diag(prior_pair(prior_plus))
    return Figure({"plus": plus, "minus": minus})


def mean_step_of(prior_plus: float) -> Figure:
    """Mean number of steps used."""
    return Figure({"steps": prior_pair(prior_plus)})


def wrong_of(given: int) -> Figure:
    """Probability of having given the wrong answer, given plus (0) or minus (1)."""
    pick = np.zeros(2)
    pick[given] = 1.0
    return Figure({"minus" if given == 0 else "plus": pick})


def risk_of(losses: Losses, prior_plus: float) -> Figure:
    """Expected loss, averaged over the prior."""
    prior = prior_pair(prior_plus)
    false_plus = np.array([0.0, losses.false_plus * prior[1]])
    false_minus = np.array([losses.false_minus * prior[0], 0.0])
    weights = {"plus": false_plus, "minus": false_minus, "steps": losses.per_step * prior}
    if losses.undecided is None:
        weights |= {"lean_plus": false_plus, "lean_minus": false_minus}
    else:
        weights["undecided"] = losses.undecided * prior
    return Figure(weights)


def error_of(figure: Figure, tally: Tally) -> float:
    """Standard error of a figure; 0 where nothing was sampled."""
    if tally.sampled is None:
        return 0.0
    return tally.sampled.weights.total_error(figure.by_history(tally.sampled))


def error_of_difference(figure: Figure, one: Tally, other: Tally) -> float:
    """Standard error of the difference of two figures, paired where the histories are the same."""
    if one.sampled and other.sampled and one.sampled.weights is other.sampled.weights:
        difference = figure.by_history(one.sampled) - figure.by_history(other.sampled)
        return one.sampled.weights.total_error(difference)
    return float(np.hypot(error_of(figure, one), error_of(figure, other)))


def tally(track: Track, off_model: float = 0.0) -> Tally:
    """Count up a track."""
    given = outcome(track)
    half = track.leaning[2] / 2.0
    return Tally(
        plus=np.array([o.plus for o in given]),
        minus=np.array([o.minus for o in given]),
        undecided=np.array([o.undecided for o in given]),
        steps=np.array([o.mean_steps for o in given]),
        lean_plus=track.leaning[0] + half,
        lean_minus=track.leaning[1] + half,
        off_model=off_model,
    )


def average(parts: Sequence[tuple[float, Tally]]) -> Tally:
    """The mean of several tallies, none of them sampled, with these shares."""
    names = [field.name for field in fields(Tally) if field.name != "sampled"]
    return Tally(**{name: sum(w * getattr(part, name) for w, part in parts) for name in names})
