"""What a member of a crowd may have been shown, itself made to show undecided.

These are the situations that rules on counts are distilled from: how many of each kind show plus
and how many minus, at which step and round, what that is worth, and how likely it is.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from thumbwright.exact.arrays import FloatArray, IntArray
from thumbwright.exact.crowd_course import (
    MOST,
    Enumerated,
    Rounds,
    Sampled,
    balanced,
    blocks,
    half_of,
    play,
)
from thumbwright.exact.crowd_kinds import Crowd, check_play
from thumbwright.exact.crowd_play import Histories
from thumbwright.exact.errors import ModelError


@dataclass(frozen=True)
class CrowdSituations:
    """What one member may have been shown, itself made to show undecided; R moments of histories.

    Every public history has one entry at each round of each step in which the member could still
    be undecided. All histories have all rounds that a step has in actual play, as in the model.
    Which these are is found by playing first with nobody held; where histories are dropped or
    sampled, rounds that only others need are missing.

    Attributes
    ----------
    kind : int
        Which kind the member is of.
    step, round : ndarray of int, shape (R,)
    plus, minus : ndarray of int, shape (R, K)
        How many others of each kind show plus and show minus before the round.
    worth : ndarray of float, shape (R,)
        Exact worth of the history (nats).
    shown : ndarray of float, shape (2, R)
        Probability of the history given plus and given minus, the member held. Where histories are
        sampled, their weights: sums over the entries of a moment estimate probabilities, and the
        log ratio of the two weights is the exact worth of the history.
    still : ndarray of float, shape (2, R)
        Probability that the member itself is undecided before the round, shown that history,
        given plus and given minus.
    label : ndarray of int, shape (R,)
        Number of the sampled history, from 0, the first half of them given plus; 0 if enumerated.
    dropped : tuple of two floats
        Probability given plus and given minus of the histories that were dropped.
    """

    kind: int
    step: IntArray
    round: IntArray
    plus: IntArray
    minus: IntArray
    worth: FloatArray
    shown: FloatArray
    still: FloatArray
    label: IntArray
    dropped: tuple[float, float]


def enumerate_situations(
    crowd: Crowd,
    kind: int,
    prior: float,
    horizon: int,
    exchange: str,
    drop: float = 0.0,
    most: int = MOST,
) -> CrowdSituations:
    """All situations of a member of one kind.

    Parameters
    ----------
    crowd : Crowd
    kind : int
        Which kind the member is of; the other parameters are those of ``enumerate_crowd``.
    prior, horizon, exchange, drop
        As for ``enumerate_crowd``.
    most : int
        Histories, and situations, that may be held.

    Raises
    ------
    ModelError
        Where more would be held, or an argument is not allowed.
    """
    _check(crowd, kind, prior, horizon, exchange)
    one, rounds = np.zeros(1, dtype=np.int64), Rounds()
    course = Enumerated(crowd.size, drop, most)
    settle = exchange == "settle"
    if settle:
        play(Histories(crowd, prior, horizon, one), course, horizon, settle, rounds)
        course = Enumerated(crowd.size, drop, most)
    histories, notes = Histories(crowd, prior, horizon, one, held=kind), _Notes(most)
    play(histories, course, horizon, settle, notes.take, rounds)
    dropped = float(course.dropped[0]), float(course.dropped[1])
    return notes.situations(kind, np.exp(notes.log_weight()), dropped)


def sample_situations(
    crowd: Crowd,
    kind: int,
    prior: float,
    horizon: int,
    exchange: str,
    histories: int,
    seed: int,
) -> CrowdSituations:
    """Situations of a member of one kind along sampled public histories.

    Parameters
    ----------
    crowd : Crowd
    kind : int
        Which kind the member is of; the other parameters are those of ``sample_crowd``.
    prior, horizon, exchange, histories, seed
        As for ``sample_crowd``.

    Raises
    ------
    ModelError
        Where an argument is not allowed.
    """
    _check(crowd, kind, prior, horizon, exchange)
    course, notes = Sampled(np.random.default_rng(seed), half_of(histories)), _Notes(None)
    rounds, settle = Rounds(), exchange == "settle"
    if settle:
        for labels in blocks(histories):
            play(Histories(crowd, prior, horizon, labels), course, horizon, settle, rounds)
    for labels in blocks(histories):
        batch = Histories(crowd, prior, horizon, labels, held=kind)
        play(batch, course, horizon, settle, notes.take, rounds)
    return notes.situations(kind, balanced(notes.worth()) / histories, (0.0, 0.0))


def _check(crowd: Crowd, kind: int, prior: float, horizon: int, exchange: str) -> None:
    check_play(crowd, prior, horizon, exchange)
    if not 0 <= kind < len(crowd.kinds):
        raise ModelError(f"the crowd has {len(crowd.kinds)} kinds, counted from 0; not {kind}")


class _Notes:
    """Collects situations round by round."""

    def __init__(self, most: int | None) -> None:
        self._most, self._held = most, 0
        self._parts: list[tuple[FloatArray | IntArray, ...]] = []

    def take(self, step: int, round_: int, histories: Histories) -> None:
        """All histories in which the member may be undecided before this round."""
        assert histories.held is not None
        log_still = histories.log_left[histories.held]
        here = np.flatnonzero(np.isfinite(log_still).any(axis=0))
        self._held += len(here)
        if self._most is not None and self._held > self._most:
            raise ModelError(
                f"more than {self._most:,} situations would be held; drop the least likely "
                "histories, sample histories instead, or shorten the horizon"
            )
        record = histories.record
        self._parts.append(
            (
                np.full(len(here), step),
                np.full(len(here), round_),
                record.plus[:, here],
                record.minus[:, here],
                histories.worth(histories.held, here),
                record.log_weight[:, here],
                np.exp(log_still[:, here]),
                record.label[here],
            )
        )

    def _column(self, number: int) -> FloatArray | IntArray:
        return np.concatenate([part[number] for part in self._parts], axis=-1)

    def log_weight(self) -> FloatArray:
        return self._column(5).astype(np.float64)

    def worth(self) -> FloatArray:
        return self._column(4).astype(np.float64)

    def situations(
        self, kind: int, shown: FloatArray, dropped: tuple[float, float]
    ) -> CrowdSituations:
        whole = [self._column(number).astype(np.int64) for number in (0, 1, 2, 3, 7)]
        return CrowdSituations(
            kind=kind,
            step=whole[0],
            round=whole[1],
            plus=whole[2].T,
            minus=whole[3].T,
            worth=self.worth(),
            shown=shown,
            still=self._column(6).astype(np.float64),
            label=whole[4],
            dropped=dropped,
        )
