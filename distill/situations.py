"""The situations an agent can find itself in, with their weights: what rules are distilled from.

A situation is a setting, a step, a round and a history it may have been shown. With P+ and P- the
probabilities of that history, the agent held to showing undecided, and omega the probability that
it is still undecided there (the mean over both answers, shared among the rounds of a step), the
situation has the masses omega P+ and omega P-. A row that lumps situations is best valued at the
log ratio of their masses added up.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from thumbwright.distill.assemble import Setting
from thumbwright.distill.forms.boxes import gain
from thumbwright.distill.playing import NO_ROW, lay_out
from thumbwright.distill.rules import SHOWN, Rule
from thumbwright.exact.arrays import FloatArray, IntArray, sums


@dataclass(frozen=True)
class Situations:
    """All situations that are possible under either answer, one entry each.

    Attributes
    ----------
    seen : tuple of str
        Ids of the seen agents.
    setting, step, round : ndarray of int, shape (R,)
    states : ndarray of int, shape (R, number of seen agents)
        Codes of the shown states.
    plus, minus : ndarray of float, shape (R,)
        Masses given plus and given minus.
    worth : ndarray of float, shape (R,)
        Exact worth (nats).
    """

    seen: tuple[str, ...]
    setting: IntArray
    step: IntArray
    round: IntArray
    states: IntArray
    plus: FloatArray
    minus: FloatArray
    worth: FloatArray

    @property
    def joint(self) -> IntArray:
        """One number per joint shown state, shape (R,); 0 is everybody undecided."""
        weights = len(SHOWN) ** np.arange(len(self.seen))[::-1]
        joint: IntArray = self.states @ weights.astype(np.int64)
        return joint

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

    def rows_of(self, rule: Rule, settings: Sequence[Setting]) -> IntArray:
        """Which row of a rule holds in each situation, shape (R,); NO_ROW in a gap."""
        rows = np.full(len(self.step), NO_ROW, dtype=np.int64)
        for number, setting in enumerate(settings):
            here = self.setting == number
            grid = lay_out(rule, setting.solution.group.horizon, setting.names).row
            rows[here] = grid[(self.step[here], *self.states[here].T)]
        return rows

    def pooled(self, rows: IntArray, count: int) -> tuple[FloatArray, FloatArray]:
        """Masses of each of ``count`` rows, given plus and given minus."""
        used = rows >= 0
        return sums(rows[used], self.plus[used], count), sums(rows[used], self.minus[used], count)


def values_of(plus: FloatArray, minus: FloatArray) -> FloatArray:
    """Best value (nats) of rows with these masses; 0 where a row never applies."""
    with np.errstate(divide="ignore", invalid="ignore"):
        value: FloatArray = np.log(plus) - np.log(minus)
    return np.where((plus > 0) | (minus > 0), value, 0.0)


def situations_of(settings: Sequence[Setting], agent: str) -> Situations:
    """Collect the situations of one agent over all settings."""
    columns: list[list[NDArray[Any]]] = [[] for _ in range(7)]
    seen: tuple[str, ...] = ()
    for number, setting in enumerate(settings):
        group = setting.solution.group
        position = group.index[agent]
        seen = group.agents[position].sees
        state = [np.array(setting.solution.tracks[k].events.state) for k in group.sees[position]]
        moments = setting.solution.tracks[position].moments
        rounds = Counter(moment.step for moment in moments)
        for moment in moments:
            possible = np.isfinite(moment.log_shown).any(axis=0)
            where = np.nonzero(possible) if seen else ()
            # A step that is held in several rounds is still one step spent undecided.
            omega = np.exp(moment.log_before).mean(axis=0)[possible].ravel() / rounds[moment.step]
            shown = np.exp(moment.log_shown)[:, possible].reshape(2, -1)
            size = len(omega)
            states = [s[w] for s, w in zip(state, where, strict=True)]
            entries = (
                np.full(size, number),
                np.full(size, moment.step),
                np.full(size, moment.round),
                np.stack(states, axis=1) if states else np.zeros((size, 0), dtype=np.int64),
                setting.weight * omega * shown[0],
                setting.weight * omega * shown[1],
                moment.value[possible].ravel(),
            )
            for column, entry in zip(columns, entries, strict=True):
                column.append(entry)
    joined = [np.concatenate(column) for column in columns]
    return Situations(seen, *joined)
