"""Rules of lines that lie one move from others: a bar, or the step between two lines, moved."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import replace

from thumbwright.distill.forms.batch import Batch
from thumbwright.distill.forms.boxes import gain
from thumbwright.distill.forms.runs import (
    Layout,
    Line,
    Sides,
    as_rule,
    count_range,
    threshold_order,
)
from thumbwright.distill.network_pricer import NetworkPricer
from thumbwright.distill.rules import SHOWN, Row, Rule
from thumbwright.distill.tallies import Tally

REACH = (1, 2, 4, 8, 16)
"""By so many steps the border of two lines is moved; by one only where each rule has to be played
by itself."""

BARS = ((-1, 0), (1, 0), (0, -1), (0, 1), (-1, -1), (1, 1))
"""By how much the two bars of a line are moved at once."""


class LineMoves:
    """Moves of the bars of lines, and of the steps at which one line follows another."""

    def __init__(self, pricer: NetworkPricer, inputs: Sequence[str], rule: Rule) -> None:
        self._pricer, self._batch, self._form = pricer, Batch(pricer), rule.form
        self.together = self._batch.together
        self._lowest, self._highest = count_range(pricer)
        self.start = layout_of(pricer, inputs, rule)

    def tallies(self, many: Sequence[Layout]) -> list[Tally]:
        """How each turns out."""
        return self._batch.tallies(many)

    def moves(self, layout: Layout) -> Iterator[Layout]:
        """Every layout that is one move away."""
        for number, line in enumerate(layout.lines):
            for moved in self._bars(line):
                other = layout.with_line(number, moved)
                # Rows without any bar would be read as rows of values.
                if any(one.bars != (None, None) for one in other.lines):
                    yield other
        for place, (sides, lines) in enumerate(layout.groups):
            for k in range(1, len(lines)):
                for stop in self._borders(lines[k - 1], lines[k]):
                    pair = replace(lines[k - 1], stop=stop), replace(lines[k], start=stop + 1)
                    shifted = (sides, (*lines[: k - 1], *pair, *lines[k + 1 :]))
                    yield Layout((*layout.groups[:place], shifted, *layout.groups[place + 1 :]))

    def tidied(self, layout: Layout) -> Layout:
        """Neighbouring lines of equal bars as one."""
        return layout.tidied()

    def rule(self, layout: Layout) -> Rule:
        """As rows."""
        return as_rule(self._pricer, layout, self._form)

    def information_kept(self, layout: Layout) -> float | None:
        """Share of information that the lines keep."""
        situations, rule = self._pricer.situations, self.rule(layout)
        pooled = situations.pooled(situations.rows_of(rule), len(rule.rows))
        return situations.information_kept(float(gain(*pooled).sum()))

    def _bars(self, line: Line) -> Iterator[Line]:
        """The line with other bars; one that is never reached lies one beyond what can be."""
        low = self._lowest - 1 if line.minus_at is None else line.minus_at
        high = self._highest + 1 if line.plus_at is None else line.plus_at
        for down, up in BARS:
            minus_at, plus_at = low + down, high + up
            if minus_at < self._lowest - 1 or plus_at > self._highest + 1:
                continue
            moved = replace(
                line,
                minus_at=None if minus_at < self._lowest else minus_at,
                plus_at=None if plus_at > self._highest else plus_at,
                # With other bars it is no longer the line for being alone.
                base=False,
            )
            if moved.apart:
                yield moved

    def _borders(self, one: Line, other: Line) -> Iterator[int]:
        """Where the first of two neighbouring lines may end instead."""
        for by in REACH if self.together else REACH[:1]:
            for stop in (one.stop - by, one.stop + by):
                if one.start <= stop < other.stop:
                    yield stop


def layout_of(pricer: NetworkPricer, inputs: Sequence[str], rule: Rule) -> Layout:
    """The lines of a rule as a layout; the opposite of ``runs.as_rule``."""
    groups: dict[Sides, list[Line]] = {}
    horizon, order = pricer.group.horizon, threshold_order(pricer)
    for row in rule.rows:
        groups.setdefault(_sides(row, rule.seen, order, "thresholds" in inputs), []).append(
            Line(
                row.step_from or 1,
                horizon if row.step_to is None else row.step_to,
                row.minus_at,
                row.plus_at,
                row.base,
            )
        )
    return Layout(
        tuple((s, tuple(sorted(one, key=lambda line: line.start))) for s, one in groups.items())
    )


def _sides(row: Row, seen: Sequence[str], order: Sequence[str], named: bool) -> Sides:
    shown = [frozenset(map(SHOWN.index, row.shows.get(agent, SHOWN))) for agent in seen]
    if not named:
        return tuple(shown)
    names = [frozenset(map(order.index, row.thresholds.get(agent, order))) for agent in seen]
    return (*shown, *names)
