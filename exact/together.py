"""What the whole group ends up doing: first and last answers, followers, majorities.

Given the answer, the display histories of all agents factorise (see ``contract``); every figure
here is a sum of their product over all joint histories in which each agent's events carry a weight
of their own. The sum is taken one agent at a time, never over the joint histories one by one.

* Weights of 0 and 1 say which events are allowed: nobody answers plus, everybody has answered.
* Counts come from their generating polynomial. With a weight x on what is counted the sum is
  sum_k P(k) x^k, and its values at the roots of unity are the discrete Fourier transform of P(k).
* An event depends only on what was shown before it, so what has been shown by the end of a step
  has the same product form, with "undecided" meaning "undecided so far". Nobody having answered by
  then is therefore a plain product, and who follows the first answer within a step is a sum over
  the events of that step alone.

Counts are right to about 1e-14 in absolute terms, whatever their size. Where rare events were
dropped from the solution, every figure is right within what the solution says of that.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from thumbwright.exact.arrays import BoolArray, FloatArray, IntArray
from thumbwright.exact.engine import Solution
from thumbwright.exact.group import MINUS, PLUS, UNDECIDED
from thumbwright.exact.jointly import displays, elimination, ends_of, refuse_too_wide, total


@dataclass(frozen=True)
class Together:
    """What a group ends up doing. Every array has given plus and given minus along its first axis.

    Attributes
    ----------
    first : ndarray of float, shape (2, T + 1)
        Probability that the first answer of the group comes at each step; step 0 is empty.
    nobody : ndarray of float, shape (2,)
        Probability that nobody has answered by the horizon.
    last : ndarray of float, shape (2, T + 1)
        Probability that the last agent to answer does so at each step, everybody having answered.
    not_everybody : ndarray of float, shape (2,)
        Probability that somebody is undecided at the horizon.
    followers : ndarray of float, shape (2, N)
        Probability that somebody answers and that exactly k others follow at once: in the step of
        the first answer, after its round. Under ``exchange = "once"`` a step has one round and
        nobody can, so all of it lies at k = 0.
    right_majority, wrong_majority : ndarray of float, shape (2,)
        Probability that more agents answer right than wrong, and the other way round; the
        undecided do not vote.
    tie : ndarray of float, shape (2,)
        Probability that as many answer right as wrong, at least one each.
    split : ndarray of float, shape (2,)
        Probability that both answers are given by somebody.
    all_right, all_wrong : ndarray of float, shape (2,)
        Probability that everybody answers, and all of them right, or wrong.
    """

    first: FloatArray
    nobody: FloatArray
    last: FloatArray
    not_everybody: FloatArray
    followers: FloatArray
    right_majority: FloatArray
    wrong_majority: FloatArray
    tie: FloatArray
    split: FloatArray
    all_right: FloatArray
    all_wrong: FloatArray

    def mean_step(self, which: str) -> tuple[float | None, float | None]:
        """Mean step of the "first" or "last" answer, where there is one, for each given answer."""
        law = {"first": self.first, "last": self.last}[which]
        means = [_mean(row) for row in law]
        return means[0], means[1]

    def mean_followers(self) -> tuple[float | None, float | None]:
        """Mean number that follow the first answer at once, where there is one."""
        means = [_mean(row) for row in self.followers]
        return means[0], means[1]


def together(solution: Solution) -> Together:
    """Sum up what the whole group does in a solution.

    Parameters
    ----------
    solution : Solution
        The play of a group; every track holds the display weights at the horizon.

    Raises
    ------
    ModelError
        Before anything is allocated, where the group is too wide for its displays to be summed
        jointly. :func:`first_answer` and :func:`followers` are much narrower and do without.
    """
    refuse_too_wide(solution)
    first, nobody = first_answer(solution)
    last = _last_answer(solution)
    return Together(
        first=first,
        nobody=nobody,
        last=last,
        not_everybody=np.clip(1.0 - last.sum(axis=1), 0.0, 1.0),
        followers=followers(solution),
        **_shares(solution, nobody),
    )


def first_answer(solution: Solution) -> tuple[FloatArray, FloatArray]:
    """Law of the step of the first answer, shape (2, T + 1), and of none at all, shape (2,)."""
    silent = [np.ones(2)]
    for step in range(1, solution.group.horizon + 1):
        log_silent = np.zeros(2)
        for moment in ends_of(solution, step):
            log_silent = log_silent + moment.log_after.reshape(2, -1)[:, 0]
        silent.append(np.exp(log_silent))
    survival = np.stack(silent, axis=1)
    law = np.concatenate([np.zeros((2, 1)), np.clip(-np.diff(survival), 0.0, 1.0)], axis=1)
    return law, survival[:, -1]


def followers(solution: Solution) -> FloatArray:
    """Law of the number that follow the first answer at once, shape (2, N).

    What is missing to 1 is the probability that nobody answers at all.
    """
    size = len(solution.tracks)
    if solution.group.exchange == "once":
        law = np.zeros((2, size))
        law[:, 0] = first_answer(solution)[0].sum(axis=1)
        return law
    roots = _roots(size)
    values = np.zeros((len(roots), 2), dtype=complex)
    order = elimination(solution.group)
    for step in range(1, solution.group.horizon + 1):
        picks = [_undecided_or_in(track.events.step, step) for track in solution.tracks]
        when = [
            np.array(track.events.round)[pick]
            for track, pick in zip(solution.tracks, picks, strict=True)
        ]
        pieces = displays(solution, step, picks)
        for round_ in sorted({int(r) for rounds in when for r in rounds[1:]}):
            weights = [_following(rounds, round_, roots) for rounds in when]
            sums = total(pieces, weights, order)
            # Both halves keep earlier rounds silent; the second keeps this one silent as well.
            values += sums[: len(roots)] - sums[len(roots) :]
    return _law(values, size)


def _following(rounds: IntArray, first: int, roots: NDArray[Any]) -> NDArray[Any]:
    """Weights (2 * roots, events): x on what comes after the round, 1 or 0 on what comes in it."""
    halves = []
    for now in (1.0, 0.0):
        half = np.where(rounds > first, roots[:, None], np.where(rounds == first, now, 0.0))
        half[:, 0] = 1.0
        halves.append(half)
    return np.concatenate(halves)


def _undecided_or_in(steps: Sequence[int], step: int) -> IntArray:
    """Undecided so far, and the events of one step, of events at these steps."""
    return np.concatenate([[0], np.flatnonzero(np.array(steps) == step)]).astype(np.int64)


def _last_answer(solution: Solution) -> FloatArray:
    """Law of the step at which the last of all agents has answered, shape (2, T + 1)."""
    done = [np.zeros(2)]
    for step in range(1, solution.group.horizon + 1):
        when = [np.array(track.events.step) for track in solution.tracks]
        done.append(_chance(solution, step, [(w >= 1) & (w <= step) for w in when]))
    law = np.clip(np.diff(np.stack(done, axis=1)), 0.0, 1.0)
    return np.concatenate([np.zeros((2, 1)), law], axis=1)


def _chance(solution: Solution, step: int, allowed: Sequence[BoolArray]) -> FloatArray:
    """Probability that, by the end of a step, every agent shows one of its allowed events."""
    picks = [np.flatnonzero(mask) for mask in allowed]
    if min(len(pick) for pick in picks) == 0:
        return np.zeros(2)
    ones = [np.ones((1, len(pick))) for pick in picks]
    chance = total(displays(solution, step, picks), ones, elimination(solution.group))
    return np.asarray(chance[0], dtype=np.float64)


def _shares(solution: Solution, nobody: FloatArray) -> dict[str, FloatArray]:
    """Majorities, ties, splits and unanimous groups at the horizon."""
    size, horizon = len(solution.tracks), solution.group.horizon
    states = [np.array(track.events.state) for track in solution.tracks]
    no_plus, no_minus, all_plus, all_minus = (
        _chance(solution, horizon, [np.isin(state, allowed) for state in states])
        for allowed in ((UNDECIDED, MINUS), (UNDECIDED, PLUS), (PLUS,), (MINUS,))
    )
    roots = _roots(2 * size + 1)[:, None]
    weights = [
        np.where(state == PLUS, roots, np.where(state == MINUS, roots.conj(), 1.0))
        for state in states
    ]
    pieces = displays(solution, horizon, [np.arange(len(state)) for state in states])
    # Entry d is the probability that plus leads by d answers; leads of minus count from the end.
    lead = _law(total(pieces, weights, elimination(solution.group)), 2 * size + 1)
    for_plus, for_minus = lead[:, 1 : size + 1].sum(axis=1), lead[:, size + 1 :].sum(axis=1)
    return {
        "right_majority": np.array([for_plus[0], for_minus[1]]),
        "wrong_majority": np.array([for_minus[0], for_plus[1]]),
        "tie": np.clip(lead[:, 0] - nobody, 0.0, 1.0),
        "split": np.clip(1.0 - no_plus - no_minus + nobody, 0.0, 1.0),
        "all_right": np.array([all_plus[0], all_minus[1]]),
        "all_wrong": np.array([all_minus[0], all_plus[1]]),
    }


# --- laws ----------------------------------------------------------------------------------------


def _roots(count: int) -> NDArray[Any]:
    """The roots of unity at which the generating polynomial of ``count`` terms is asked for."""
    return np.asarray(np.exp(-2j * np.pi * np.arange(count // 2 + 1) / count))


def _law(values: NDArray[Any], count: int) -> FloatArray:
    """From values (roots, 2) of a generating polynomial to its coefficients, shape (2, count)."""
    return np.clip(np.fft.irfft(values, n=count, axis=0).T, 0.0, 1.0)


def _mean(law: FloatArray) -> float | None:
    weight = float(law.sum())
    return float(law @ np.arange(len(law))) / weight if weight > 0.0 else None
