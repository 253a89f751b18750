"""The exact engine: plays a whole group, round by round, over all display histories at once.

At every round each undecided agent decides for every history that it may have been shown (see
``player``), and what commits becomes a new event of its display history. An event depends only on
what was shown before it, so when a seen agent gains an event, that slice starts as a copy of its
"undecided" slice.

An agent that plays exactly takes a history for worth the log ratio of its probabilities with the
agent held to showing undecided, which is the contraction of everybody else's weights (see
``contract``); readers for rules and for exact agents among rule users are in ``play``.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from thumbwright.exact.alike import likeness
from thumbwright.exact.arrays import FloatArray
from thumbwright.exact.errors import ModelError
from thumbwright.exact.evidence.law import Law
from thumbwright.exact.forecast import refuse_too_large
from thumbwright.exact.group import Group
from thumbwright.exact.player import (
    ExactReader,
    Player,
    Reader,
    Reading,
    Scene,
    by_value,
    leanings,
    worth,
)
from thumbwright.exact.stage import Progress, Stage
from thumbwright.exact.track import Events, Moment, Track

__all__ = [
    "Events",
    "ExactReader",
    "Moment",
    "Player",
    "Progress",
    "Reader",
    "Reading",
    "Scene",
    "Solution",
    "Track",
    "by_value",
    "leanings",
    "run",
    "solve",
    "worth",
]


@dataclass(frozen=True)
class Solution:
    """The exact play of a group: a track per agent, in the group's order.

    Attributes
    ----------
    group : Group
    tracks : tuple of Track
    dropped : tuple of two floats
        Probability, given plus and given minus, of the display events that were dropped on
        request, summed; 0 where nothing was.
    doubtful : tuple of two floats
        Probability, given plus and given minus, summed over agents and rounds, of being where what
        was dropped could have turned a decision. It is 0 where every agent sees all those whose
        displays bear on it.

    Notes
    -----
    Where no dropped event has occurred and no decision was doubtful, the group plays as it would
    with nothing dropped. Therefore every probability given an answer is right within
    ``dropped + doubtful`` for that answer.
    """

    group: Group
    tracks: tuple[Track, ...]
    dropped: tuple[float, float] = (0.0, 0.0)
    doubtful: tuple[float, float] = (0.0, 0.0)

    @property
    def near_tie_mass(self) -> float:
        """Probability, summed over agents, decided by the tie rule and by no clear margin."""
        return sum(track.near_tie for track in self.tracks)

    @property
    def dropped_mass(self) -> float:
        """Prior-weighted probability of the display events that were dropped, summed."""
        return self._weighted(self.dropped)

    @property
    def uncertainty(self) -> float:
        """By how much any probability, averaged over the prior, may be off for what was dropped."""
        return min(1.0, self._weighted(self.dropped) + self._weighted(self.doubtful))

    def _weighted(self, pair: tuple[float, float]) -> float:
        return self.group.prior_plus * pair[0] + (1.0 - self.group.prior_plus) * pair[1]


def solve(
    group: Group,
    progress: Progress | None = None,
    drop: float = 0.0,
    memory: float | None = None,
) -> Solution:
    """Play the group exactly.

    Parameters
    ----------
    group : Group
    progress : callable, optional
        Told the name of the work, how much is done, and of how much.
    drop : float
        Display events (agent, step, round, sign) whose probability stays below this under both
        answers are not kept. See :class:`Solution` for what that can change.
    memory : float, optional
        Bytes that the run may take; if None, half of what is free.

    Returns
    -------
    Solution
        With nothing dropped exact up to floating point: nothing is sampled or split beyond what
        the evidence says of itself.

    Raises
    ------
    ModelError
        Before anything is allocated, where the run would need more memory than it may take, or
        ``drop`` is no probability below 1.
    """
    if not 0.0 <= drop < 1.0:
        raise ModelError(f"what may be dropped is a probability from 0 to below 1, not {drop:g}")
    refuse_too_large(group, memory)
    stage = Stage(group, [ExactReader() for _ in group.agents], drop, likeness=likeness(group))
    tracks = stage.play(progress)
    doubtful = sum((player.doubtful for player in stage.players), np.zeros(2))
    return Solution(group, tracks, _two(stage.dropped), _two(doubtful))


def run(
    group: Group,
    readers: Sequence[Reader],
    progress: Progress | None = None,
    laws: Sequence[Law | None] | None = None,
) -> tuple[Track, ...]:
    """Play the group with one reader per agent and return their tracks; ``laws`` as for Stage."""
    return Stage(group, readers, laws=laws).play(progress)


def _two(pair: FloatArray) -> tuple[float, float]:
    return float(pair[0]), float(pair[1])
