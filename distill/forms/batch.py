"""Pricing many layouts of lines in one go, where the network allows it; else one by one."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from thumbwright.distill.forms.runs import (
    Layout,
    Sides,
    as_rule,
    count_range,
    threshold_order,
)
from thumbwright.distill.network_pricer import NetworkPricer
from thumbwright.distill.situations import values_of
from thumbwright.distill.tallies import Tally, average
from thumbwright.exact.arrays import FloatArray, IntArray, sums
from thumbwright.exact.many import (
    Bars,
    ManyTallies,
    changed_many,
    fits,
    likely_counts,
    play_many,
)

MOST_AT_ONCE = 400
"""Layouts priced together: more would only cost memory."""


class Batch:
    """Prices layouts of one agent's lines; results do not depend on which way is taken."""

    def __init__(self, pricer: NetworkPricer) -> None:
        self._pricer = pricer
        self.together = all(
            fits(s.solution, s.solution.group.index[pricer.agent]) for s in pricer.settings
        )
        situations = pricer.situations
        shape = (len(pricer.settings), 3, pricer.group.horizon + 1)
        if self.together:
            where = (situations.setting, situations.states[:, 0], situations.step)
            flat = np.ravel_multi_index(where, shape)
            self._masses = [
                sums(flat, side, int(np.prod(shape))).reshape(shape)
                for side in (situations.plus, situations.minus)
            ]

    def objectives(self, layouts: Sequence[Layout]) -> list[float]:
        """What a search minimises, for each layout."""
        return [self._pricer.objective(found) for found in self.tallies(layouts)]

    def tallies(self, layouts: Sequence[Layout]) -> list[Tally]:
        """How each layout turns out."""
        if not self.together:
            rules = (as_rule(self._pricer, layout) for layout in layouts)
            return [self._pricer.rule_tally(rule, whole=False) for rule in rules]
        found: list[Tally] = []
        for start in range(0, len(layouts), MOST_AT_ONCE):
            part = layouts[start : start + MOST_AT_ONCE]
            played = [
                (
                    setting.weight,
                    play_many(setting.solution, self._position, self._bars(part, number)),
                )
                for number, setting in enumerate(self._pricer.settings)
            ]
            found += [
                average([(weight, one_of(many, i)) for weight, many in played])
                for i in range(len(part))
            ]
        return found

    def changed(self, original: Layout, layouts: Sequence[Layout]) -> list[float]:
        """Probability that each layout ever acts differently from the original in one outing."""
        pricer = self._pricer
        if not self.together:
            rule = as_rule(pricer, original)
            return [pricer.changed(rule, as_rule(pricer, layout)) for layout in layouts]
        prior = np.array([pricer.prior_plus, 1.0 - pricer.prior_plus])
        found: list[float] = []
        for start in range(0, len(layouts), MOST_AT_ONCE):
            part = layouts[start : start + MOST_AT_ONCE]
            total = np.zeros(len(part))
            for number, setting in enumerate(pricer.settings):
                one, many = self._bars([original], number), self._bars(part, number)
                changed = changed_many(setting.solution, self._position, one, many)
                total += setting.weight * (changed @ prior)
            found += total.tolist()
        return found

    def counts(self, layout: Layout) -> int:
        """How many own counts lie between the outermost bars of a layout."""
        group = self._pricer.group
        lowest, highest = likely_counts(group.agents[self._position].evidence, group.horizon)
        low = [lowest if line.minus_at is None else line.minus_at for line in layout.lines]
        high = [highest if line.plus_at is None else line.plus_at for line in layout.lines]
        return max(min(max(high), highest) - max(min(low), lowest), 1)

    @property
    def _position(self) -> int:
        return self._pricer.group.index[self._pricer.agent]

    def _bars(self, layouts: Sequence[Layout], setting: int) -> Bars:
        """Layouts as bars per step and shown state, in one setting."""
        pricer = self._pricer
        lowest, highest = count_range(pricer)
        shape = (len(layouts), pricer.group.horizon + 1, 3)
        pooled: dict[tuple[Sides, int], float] = {}
        low: IntArray = np.full(shape, lowest - 1, dtype=np.int64)
        high: IntArray = np.full(shape, highest + 1, dtype=np.int64)
        value: FloatArray = np.zeros((len(layouts), 3))
        for i, layout in enumerate(layouts):
            for sides, lines in layout.groups:
                if not self._holds(sides, setting):
                    continue
                states = sorted(sides[0])
                for line in lines:
                    where = (i, slice(line.start, line.stop + 1), states)
                    if line.minus_at is not None:
                        low[where] = line.minus_at
                    if line.plus_at is not None:
                        high[where] = line.plus_at
                last = (sides, lines[-1].start)
                if last not in pooled:
                    pooled[last] = self._pooled(*last)
                value[i, states] = pooled[last]
        return Bars(low, high, value)

    def _holds(self, sides: Sides, setting: int) -> bool:
        """Whether a box of contexts includes the thresholds of a setting."""
        if len(sides) == 1:
            return True
        names = self._pricer.settings[setting].names
        return threshold_order(self._pricer).index(names[self._pricer.seen[0]]) in sides[1]

    def _pooled(self, sides: Sides, start: int) -> float:
        """Best value of the row that is in force at the horizon."""
        pricer = self._pricer
        settings = [k for k in range(len(pricer.settings)) if self._holds(sides, k)]
        where = np.ix_(settings, sorted(sides[0]), range(start, pricer.group.horizon + 1))
        plus, minus = (side[where].sum() for side in self._masses)
        return float(values_of(np.array([plus]), np.array([minus]))[0])


def one_of(many: ManyTallies, i: int) -> Tally:
    """The outcome of one of many rules that were priced together."""
    return Tally(
        many.plus[i],
        many.minus[i],
        many.undecided[i],
        many.steps[i],
        many.lean_plus[i],
        many.lean_minus[i],
    )
