"""The situations an agent can find itself in, with their weights: what rules are distilled from.

A situation is a setting, a step, a round and a history it may have been shown. With P+ and P- the
probabilities of that history, the agent held to showing undecided, and omega the probability that
it is still undecided there (the mean over both answers, shared among the rounds of a step), the
situation has the masses omega P+ and omega P-. A row that lumps situations is best valued at the
log ratio of their masses added up.
"""

from __future__ import annotations

from abc import ABC, abstractmethod
from collections import Counter
from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from thumbwright.distill.assemble import Setting
from thumbwright.distill.forms.boxes import gain
from thumbwright.distill.rules import SHOWN, Rule
from thumbwright.distill.views import Named, View, rows_in
from thumbwright.exact.arrays import FloatArray, IntArray, sums
from thumbwright.exact.player import worth


class Weighed(ABC):
    """Situations with their weights, whatever it is that tells them apart.

    Attributes
    ----------
    step, round : ndarray of int, shape (R,)
    plus, minus : ndarray of float, shape (R,)
        Masses given plus and given minus.
    worth : ndarray of float, shape (R,)
        Exact worth (nats).
    """

    step: IntArray
    round: IntArray
    plus: FloatArray
    minus: FloatArray
    worth: FloatArray

    @abstractmethod
    def views(self) -> Iterator[tuple[IntArray, View]]:
        """Groups of situations, by number, and what a rule may look at in each group."""

    @abstractmethod
    def said(self, which: int) -> str:
        """One situation in words, to go on after "at"."""

    @property
    @abstractmethod
    def joint(self) -> IntArray:
        """One number per joint shown state, shape (R,); 0 is everybody undecided."""

    @property
    def everything(self) -> float:
        """G of all situations kept apart: what exact worths save in log loss."""
        return float(gain(self.plus, self.minus).sum())

    @property
    def nothing(self) -> float:
        """G of all situations lumped together: what the best single value saves."""
        return float(gain(self.plus.sum(keepdims=True), self.minus.sum(keepdims=True))[0])

    def information_kept(self, saved: float) -> float | None:
        """Share of the log-loss gain over the best single value; None where there is none."""
        span = self.everything - self.nothing
        if span <= 1e-12 * max(self.everything, 1e-300):
            return None
        return (saved - self.nothing) / span

    def rows_of(self, rule: Rule) -> IntArray:
        """Which row of a rule holds in each situation, shape (R,); NO_ROW in a gap."""
        return self.held_by(rule)[0]

    def held_by(self, rule: Rule) -> tuple[IntArray, IntArray]:
        """Which row of a rule holds in each situation, and how many do; both shape (R,)."""
        rows, count = np.empty((2, len(self.step)), dtype=np.int64)
        for here, view in self.views():
            rows[here], count[here] = rows_in(rule, view)
        return rows, count

    def held_in(self, rule: Rule, which: int) -> list[int]:
        """Numbers, from 0, of the rows that hold in one situation."""
        single = (Rule(rule.form, rule.agent, rule.seen, (row,)) for row in rule.rows)
        return [n for n, one in enumerate(single) if self.held_by(one)[1][which]]

    def number(self, name: str) -> IntArray:
        """One of ``rules.NUMBERS`` in every situation, shape (R,)."""
        return self._read(lambda view: view.number(name))

    def first_answer(self) -> IntArray:
        """Code of the first answer in every situation, shape (R,)."""
        return self._read(lambda view: view.first_answer())

    def _read(self, read: Callable[[View], IntArray]) -> IntArray:
        found = np.empty(len(self.step), dtype=np.int64)
        for here, view in self.views():
            found[here] = read(view)
        return found

    def pooled(self, rows: IntArray, count: int) -> tuple[FloatArray, FloatArray]:
        """Masses of each of ``count`` rows, given plus and given minus."""
        used = rows >= 0
        return sums(rows[used], self.plus[used], count), sums(rows[used], self.minus[used], count)


@dataclass(frozen=True)
class Situations(Weighed):
    """All situations of an agent that tells those it sees apart, one entry each.

    They are possible under either answer.

    Attributes
    ----------
    names : tuple of mapping of agent id to str
        Per setting the names of the seen agents' thresholds, where a rule may look at them.
    seen : tuple of str
        Ids of the seen agents.
    setting : ndarray of int, shape (R,)
    states, shown_steps, shown_rounds : ndarray of int, shape (R, number of seen agents)
        Codes of the shown states; step and round of each answer, 0 while undecided.
    """

    names: tuple[Mapping[str, str], ...]
    seen: tuple[str, ...]
    setting: IntArray
    step: IntArray
    round: IntArray
    states: IntArray
    shown_steps: IntArray
    shown_rounds: IntArray
    plus: FloatArray
    minus: FloatArray
    worth: FloatArray

    @property
    def joint(self) -> IntArray:
        """One number per joint shown state, shape (R,); 0 is everybody undecided."""
        weights = len(SHOWN) ** np.arange(len(self.seen))[::-1]
        joint: IntArray = self.states @ weights.astype(np.int64)
        return joint

    def views(self) -> Iterator[tuple[IntArray, View]]:
        """One group per setting."""
        for number, names in enumerate(self.names):
            here = np.flatnonzero(self.setting == number)
            states, steps, rounds = (
                dict(zip(self.seen, column[here].T, strict=True))
                for column in (self.states, self.shown_steps, self.shown_rounds)
            )
            yield here, Named(self.step[here], states, steps, rounds, names)

    def said(self, which: int) -> str:
        """Step, shown states and, where they vary, thresholds."""
        parts = [f"step {int(self.step[which])}"]
        parts += [
            f"with {agent} showing {SHOWN[int(code)]}"
            for agent, code in zip(self.seen, self.states[which], strict=True)
        ]
        names = self.names[int(self.setting[which])]
        parts += [f"and {agent} having thresholds {name}" for agent, name in names.items()]
        return " ".join(parts)


def values_of(plus: FloatArray, minus: FloatArray) -> FloatArray:
    """Best value (nats) of rows with these masses; 0 where a row never applies."""
    with np.errstate(divide="ignore", invalid="ignore"):
        value: FloatArray = np.log(plus) - np.log(minus)
    return np.where((plus > 0) | (minus > 0), value, 0.0)


def situations_of(settings: Sequence[Setting], agent: str) -> Situations:
    """Collect the situations of one agent over all settings."""
    columns: list[list[NDArray[Any]]] = [[] for _ in range(9)]
    seen: tuple[str, ...] = ()
    for number, setting in enumerate(settings):
        group = setting.solution.group
        position = group.index[agent]
        seen = group.agents[position].sees
        events = [setting.solution.tracks[k].events for k in group.sees[position]]
        told = [
            [np.array(e.state) for e in events],
            [np.array(e.step) for e in events],
            [np.array(e.round) for e in events],
        ]
        moments = setting.solution.tracks[position].moments
        rounds = Counter(moment.step for moment in moments)
        for moment in moments:
            possible = np.isfinite(moment.log_shown).any(axis=0)
            where = np.nonzero(possible) if seen else ()
            # A step that is held in several rounds is still one step spent undecided.
            omega = np.exp(moment.log_before).mean(axis=0)[possible].ravel() / rounds[moment.step]
            shown = np.exp(moment.log_shown)[:, possible].reshape(2, -1)
            size = len(omega)
            columns_seen = [
                np.stack([x[w] for x, w in zip(one, where, strict=True)], axis=1)
                if seen
                else np.zeros((size, 0), dtype=np.int64)
                for one in told
            ]
            entries = (
                np.full(size, number),
                np.full(size, moment.step),
                np.full(size, moment.round),
                *columns_seen,
                setting.weight * omega * shown[0],
                setting.weight * omega * shown[1],
                worth(moment.log_shown)[possible].ravel(),
            )
            for column, entry in zip(columns, entries, strict=True):
                column.append(entry)
    joined = [np.concatenate(column) for column in columns]
    setting_of, *rest = joined
    names: tuple[Mapping[str, str], ...] = tuple(setting.names for setting in settings)
    return Situations(names, seen, setting_of, *rest)
