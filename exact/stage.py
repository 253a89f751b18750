"""All agents on stage together, step by step and round by round.

An event depends only on what was shown before it, so when a seen agent gains an event, that slice
of whatever depends on it starts as a copy of its "undecided" slice.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence

import numpy as np

from thumbwright.exact.alike import Likeness, each_for_itself
from thumbwright.exact.arrays import FloatArray, IntArray
from thumbwright.exact.contract import Contractions
from thumbwright.exact.evidence.law import Law
from thumbwright.exact.group import MINUS, PLUS, Group
from thumbwright.exact.player import Calls, Player, Reader
from thumbwright.exact.store import shell
from thumbwright.exact.track import Track

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
    likeness : Likeness, optional
        Who is worked out for whom; if None, everybody for itself. The readers of agents that are
        worked out together must be alike as well.
    laws : sequence of Law or None, optional
        Per agent the law of what it really observes, where that is not what it takes it for.

    Attributes
    ----------
    contractions : Contractions
    leads : tuple of int
        The agents that are worked out.
    players : list of Player
        One per agent; agents that are worked out together have one in common.
    dropped : ndarray of float, shape (2,)
        Probability of the events that were dropped, given plus and given minus.
    """

    def __init__(
        self,
        group: Group,
        readers: Sequence[Reader],
        drop: float = 0.0,
        most_entries: float = math.inf,
        likeness: Likeness | None = None,
        laws: Sequence[Law | None] | None = None,
    ) -> None:
        self._group, self._drop, self._most = group, drop, most_entries
        self._settles = group.exchange == "settle"
        self._likeness = likeness or each_for_itself(group)
        self.leads = self._likeness.leads
        self.contractions = Contractions(group, self._likeness)
        law = laws or [None] * len(group.agents)
        own = {i: Player(group, i, readers[i], law[i]) for i in self.leads}
        self.players = [own[lead] for lead in self._likeness.lead]
        self.dropped: FloatArray = np.zeros(2)
        self._sources = {i: group.sources(i) for i in self.leads}
        self._hides = {i: bool(self._sources[i] - set(group.sees[i])) for i in self.leads}
        self._gained = [0] * len(self.players)
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
        for i in self.leads:
            self.players[i].track.weights = self.contractions.displays[i].weights()
        return tuple(self._track(i) for i in range(len(self.players)))

    def _track(self, i: int) -> Track:
        """The track of an agent, its axes in the agent's own order."""
        track, agent = self.players[i].track, self._group.agents[i]
        worked_out = self._likeness.seen[i]
        turn = tuple(worked_out.index(k) for k in self._group.sees[i])
        return track if track.agent is agent else track.turned(agent, turn)

    def step(self, step: int) -> None:
        """Observe, then one round, or rounds until no agent could commit any more."""
        for i in self.leads:
            self.players[i].observe()
        round_ = 0
        while self._round(step, round_) and self._settles:
            round_ += 1

    def _round(self, step: int, round_: int) -> bool:
        """One round; returns whether any agent could have committed in it."""
        gone = {i: self._decision(i, step, round_) for i in self.leads}
        shown = {i: self._show(i, step, round_, one) for i, one in gone.items()}
        self._gained = [shown[lead][0] for lead in self._likeness.lead]
        self._changed = {i for i, lead in enumerate(self._likeness.lead) if shown[lead][1]}
        if self._most < math.inf and self._entries() > self._most:
            raise TooLarge
        if step == self._group.horizon and not (self._changed and self._settles):
            for i in self.leads:
                self.players[i].lean()
        for i in self.leads:
            for axis, other in enumerate(self._group.sees[i]):
                if self._gained[other]:
                    self.contractions.displays[i].grow(axis, self._gained[other])
                    self.players[i].grow(axis, self._gained[other])
        self.contractions.renew(self._gained, self._changed)
        return bool(self._changed)

    def _decision(self, i: int, step: int, round_: int) -> Calls | None:
        """What commits; None where nothing does."""
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
            math.prod([float(events[i]), *(events[k] for k in self._group.sees[i])])
            for i in self.leads
        )

    def _fresh(self, i: int) -> IntArray:
        """Entries of an agent's events that the last round made or changed."""
        length = len(self.players[i].track.events)
        return np.array([0, *range(length - self._gained[i], length)])

    def _show(self, i: int, step: int, round_: int, calls: Calls | None) -> tuple[int, bool]:
        """Turn what was cut into display events; those impossible under both answers vanish.

        Returns how many there are, and whether anything could have been shown.
        """
        if calls is None:
            return 0, False
        track, events = self.players[i].track, []
        for sign, state in enumerate((PLUS, MINUS)):
            if not calls.possible[sign]:
                continue
            chance = calls.chance[sign]
            if self._drop and chance.max() < self._drop:
                self.dropped += chance * self._likeness.lead.count(i)
                continue
            track.events.add(state, step, round_)
            events.append(calls.log_weights[sign])
        self.contractions.displays[i].show(track.moments[-1].log_after, events)
        return len(events), any(calls.possible)
