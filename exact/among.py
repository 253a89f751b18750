"""Exact agents among rule users: how they read what their model calls impossible.

An agent that plays exactly takes everybody for exact. When somebody plays by a rule it may be shown
a commitment that the exact solution gives probability zero. It is read as the same commitment at
the latest earlier moment at which the exact solution allowed it after the same seen history; where
there is none, it counts as no news, and the agent that committed is read as still undecided. A
silence that the exact solution calls impossible is no news either: the worth stays where it was.

Commitments first seen at the same moment are read together: as they are where the exact solution
allows them all, otherwise with as few as possible moved back, those of agents that come later in
the reader's order first.
"""

from __future__ import annotations

from collections.abc import Iterator
from itertools import product

import numpy as np

from thumbwright.exact.arrays import BoolArray, FloatArray, IntArray
from thumbwright.exact.engine import Events, Moment, Reader, Reading, Scene, Solution, by_value
from thumbwright.exact.walk import grown


class AmongOthersReader(Reader):
    """An exact agent that reads what it is shown by the exact solution, whoever shows it.

    Attributes
    ----------
    off_model : float
        Expected number of commitments that the agent, still undecided, was shown and had to read
        as something else; averaged over the prior.
    """

    def __init__(self, solution: Solution, position: int) -> None:
        group = solution.group
        self._moments = solution.tracks[position].moments
        self._times = [(moment.step, moment.round) for moment in self._moments]
        self._model = tuple(solution.tracks[other].events for other in group.sees[position])
        self._prior = np.array([group.prior_plus, 1.0 - group.prior_plus])
        self._shape: tuple[int, ...] = (1,) * len(self._model)
        # Per seen agent, which of its events in the exact solution each history is read as.
        self._index: list[IntArray] = [np.zeros(self._shape, dtype=np.int64) for _ in self._model]
        self._level: FloatArray = np.zeros(self._shape)
        self._moved: FloatArray = np.zeros(self._shape)
        self.off_model = 0.0

    def read(self, scene: Scene) -> Reading:
        """The exact worth of what each history is read as; the last level where it is no news."""
        moment = self._moments[self._latest(scene.step, scene.round)]
        if self._level.shape != self._shape:
            for where, events in self._news():
                self._settle(where, events, scene.seen, moment)
            self._shape = self._level.shape
        value = moment.value[tuple(self._index)] if self._index else moment.value
        self._level = np.where(np.isnan(value), self._level, value)
        return by_value(scene, self._level.ravel())

    def tell(self, scene: Scene, reading: Reading, calls: FloatArray, inside: FloatArray) -> None:
        """Count the odd commitments that were met while undecided."""
        if self._moved.any():
            self.off_model += float((self._prior @ inside) @ self._moved.ravel())
            self._moved[...] = 0.0

    def grow(self, axis: int, extra: int) -> None:
        """A new event is read as no news until the next round says better."""
        self._index = [grown(array, axis, extra) for array in self._index]
        self._level = grown(self._level, axis, extra)
        self._moved = grown(self._moved, axis, extra)

    def _news(self) -> Iterator[tuple[tuple[slice, ...], tuple[int | None, ...]]]:
        """Blocks of histories with the same new events: where they are, and which per agent."""
        choices: list[list[int | None]] = [
            [None, *range(old, new)]
            for old, new in zip(self._shape, self._level.shape, strict=True)
        ]
        for events in product(*choices):
            if any(event is not None for event in events):
                where = tuple(
                    slice(0, old) if event is None else slice(event, event + 1)
                    for event, old in zip(events, self._shape, strict=True)
                )
                yield where, events

    def _settle(
        self,
        where: tuple[slice, ...],
        events: tuple[int | None, ...],
        seen: tuple[Events, ...],
        moment: Moment,
    ) -> None:
        """Decide what the new events of one block of histories are read as."""
        reading = [array[where] for array in self._index]
        possible: BoolArray = np.asarray(np.isfinite(moment.log_shown).any(axis=0))
        waiting = np.ones(reading[0].shape, dtype=bool)
        options = [
            [None]
            if event is None
            else [*self._same_before(axis, seen[axis], event, possible.shape[axis]), 0]
            for axis, event in enumerate(events)
        ]
        for choice in product(*options):
            asked = [
                old if number is None else np.full_like(old, number)
                for old, number in zip(reading, choice, strict=True)
            ]
            fits = waiting & possible[tuple(asked)]
            for axis, number in enumerate(choice):
                if number is not None:
                    self._index[axis][where] = np.where(fits, number, self._index[axis][where])
            odd = sum(
                not self._is_same(axis, number, seen[axis], event)
                for axis, (number, event) in enumerate(zip(choice, events, strict=True))
                if number is not None and event is not None
            )
            self._moved[where] = np.where(fits, odd, self._moved[where])
            waiting &= ~fits
            if not waiting.any():
                return
        # Nothing fits: no news, all new commitments are odd.
        odd = sum(event is not None for event in events)
        self._moved[where] = np.where(waiting, odd, self._moved[where])

    def _same_before(self, axis: int, shown: Events, event: int, known: int) -> list[int]:
        """Among the first ``known`` events of the exact solution those of the same sign, not later.

        The latest comes first.
        """
        model, time = self._model[axis], (shown.step[event], shown.round[event])
        found = [
            e
            for e in range(1, known)
            if model.state[e] == shown.state[event] and (model.step[e], model.round[e]) <= time
        ]
        return sorted(found, key=lambda e: (model.step[e], model.round[e]), reverse=True)

    def _is_same(self, axis: int, number: int, shown: Events, event: int) -> bool:
        model = self._model[axis]
        return number > 0 and (model.step[number], model.round[number]) == (
            shown.step[event],
            shown.round[event],
        )

    def _latest(self, step: int, round_: int) -> int:
        """The exact solution's last moment that is not after this one."""
        position = len(self._times) - 1
        while position > 0 and self._times[position] > (step, round_):
            position -= 1
        return position
