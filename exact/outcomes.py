"""What agents end up doing under exact play: sums over a solution's tracks."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from thumbwright.exact.engine import Solution, Track


@dataclass(frozen=True)
class Outcome:
    """What one agent ends up doing, given one answer.

    Attributes
    ----------
    plus, minus, undecided : float
        Probability of having committed to plus, to minus, to neither by the horizon.
    mean_step_if_decided : float or None
        Mean step of commitment among those who commit; None where nobody does.
    mean_steps : float
        Mean number of steps used; an agent that is undecided at the horizon has used all of them.
    """

    plus: float
    minus: float
    undecided: float
    mean_step_if_decided: float | None
    mean_steps: float


def outcome(track: Track) -> tuple[Outcome, Outcome]:
    """The outcome of one agent given plus and given minus."""
    horizon = track.answers.shape[2] - 1
    steps = np.arange(horizon + 1)
    results = []
    for given in (0, 1):
        plus, minus = (float(track.answers[sign, given].sum()) for sign in (0, 1))
        timed = float(track.answers[:, given].sum(axis=0) @ steps)
        undecided = float(track.undecided[given])
        decided = plus + minus
        results.append(
            Outcome(
                plus=plus,
                minus=minus,
                undecided=undecided,
                mean_step_if_decided=timed / decided if decided > 0 else None,
                mean_steps=timed + horizon * undecided,
            )
        )
    return results[0], results[1]


def outcomes(solution: Solution) -> tuple[tuple[Outcome, Outcome], ...]:
    """Per agent, in the group's order, its outcomes given plus and given minus."""
    return tuple(outcome(track) for track in solution.tracks)
