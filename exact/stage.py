"""All agents on stage together, step by step and round by round.

An event depends only on what was shown before it, so when a seen agent gains an event, that slice
of whatever depends on it starts as a copy of its "undecided" slice.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence

import numpy as np

from thumbwright.exact.arrays import FloatArray, IntArray
from thumbwright.exact.contract import Contractions
from thumbwright.exact.group import MINUS, PLUS, Group
from thumbwright.exact.player import Player, Reader, Track
from thumbwright.exact.store import shell

Progress = Callable[[str, int, int], None]


class TooLarge(Exception):
    """The next round would need more entries than a stage was given."""


class Stage:
    """All players together, and the weights of their display histories so far.

    Parameters
    ----------
    group : Group
    readers : sequence of Reader
        One per agent, in the group's order.
    drop : float
        Events whose probability stays below this under both answers are not kept.
    most_entries : float
        TooLarge is raised where the display weights would have more entries than this.

    Attributes
    ----------
    contractions : Contractions
    players : list of Player
    dropped : ndarray of float, shape (2,)
        Probability of the events that were dropped, given plus and given minus.
    """

    def __init__(
        self,
        group: Group,
        readers: Sequence[Reader],
        drop: float = 0.0,
        most_entries: float = math.inf,
    ) -> None:
        self._group, self._drop, self._most = group, drop, most_entries
        self.contractions = Contractions(group)
        self.players = [Player(group, i, reader) for i, reader in enumerate(readers)]
        self.dropped: FloatArray = np.zeros(2)
        size = len(self.players)
        sources = [self.contractions.sources(i) for i in range(size)]
        self._sources = sources
        self._hides = [bool(sources[i] - set(group.sees[i])) for i in range(size)]
        self._gained = [0] * size
        self._changed: set[int] = set()

    def play(self, progress: Progress | None) -> tuple[Track, ...]:
        """All steps; returns the tracks of all players, with the weights of their displays."""
        horizon = self._group.horizon
        for step in range(1, horizon + 1):
            if progress:
                progress("exact beliefs", step - 1, horizon)
            self.step(step)
        if progress:
            progress("exact beliefs", horizon, horizon)
        for player, display in zip(self.players, self.contractions.displays, strict=True):
            player.track.log_weights = display.log_weights()
        return tuple(player.track for player in self.players)

    def step(self, step: int) -> None:
        """Observe, then one round, or rounds until no agent could commit any more."""
        for player in self.players:
            player.observe()
        round_ = 0
        while self._round(step, round_) and self._group.exchange == "settle":
            round_ += 1

    def _round(self, step: int, round_: int) -> bool:
        """One round; returns whether any agent could have committed in it."""
        size = len(self.players)
        gone = [self._decision(i, step, round_) for i in range(size)]
        shown = [self._show(i, step, round_, one) for i, one in enumerate(gone)]
        self._gained = [gained for gained, _ in shown]
        self._changed = {i for i, (_, changed) in enumerate(shown) if changed}
        if self._most < math.inf and self._entries() > self._most:
            raise TooLarge
        for i, player in enumerate(self.players):
            for axis, other in enumerate(self._group.sees[i]):
                if self._gained[other]:
                    self.contractions.displays[i].grow(axis, self._gained[other])
                    player.grow(axis, self._gained[other])
        self.contractions.renew(self._gained, self._changed)
        return bool(self._changed)

    def _decision(self, i: int, step: int, round_: int) -> FloatArray | None:
        """What commits, as log weights; None where nothing does."""
        player, columns = self.players[i], None
        if round_ and player.reader.steady:
            if self._sources[i].isdisjoint(self._changed):
                player.wait(step, round_)
                return None
            columns = shell(player.shape, tuple(self._fresh(j) for j in self._group.sees[i]))
        shown = self.contractions.log_shown(i).copy()
        seen = tuple(self.players[other].track.events for other in self._group.sees[i])
        lost = None
        if self._hides[i] and self.dropped.any():
            lost = np.maximum(0.0, 1.0 - np.exp(shown.reshape(2, -1)).sum(axis=1))
        return player.decide(step, round_, seen, shown, columns, lost)

    def _entries(self) -> float:
        """Entries of all display weights, given one answer, as they will be after this round."""
        events = [len(player.track.events) for player in self.players]
        return sum(
            math.prod([float(events[i]), *(events[k] for k in seen)])
            for i, seen in enumerate(self._group.sees)
        )

    def _fresh(self, i: int) -> IntArray:
        """Entries of an agent's events that the last round made or changed."""
        length = len(self.players[i].track.events)
        return np.array([0, *range(length - self._gained[i], length)])

    def _show(self, i: int, step: int, round_: int, gone: FloatArray | None) -> tuple[int, bool]:
        """Turn what was cut into display events; those impossible under both answers vanish.

        Returns how many there are, and whether anything could have been shown.
        """
        if gone is None:
            return 0, False
        track = self.players[i].track
        moment, events, changed = track.moments[-1], [], False
        for sign, state in enumerate((PLUS, MINUS)):
            log_joint = (gone[sign] + moment.log_shown).reshape(2, -1)
            if not np.isfinite(log_joint).any():
                continue
            changed = True
            if self._drop:
                chance = np.exp(log_joint).sum(axis=1)
                if chance.max() < self._drop:
                    self.dropped += chance
                    continue
            track.events.add(state, step, round_)
            events.append(gone[sign])
        self.contractions.displays[i].show(moment.log_after, events)
        return len(events), changed
