"""Layouts of lines: ranges of steps with equal bars, per set of shown states.

A *context* is one combination of what the seen agents show (and, where the rule may look at them,
of their thresholds). For each set of contexts the steps from 1 to the horizon are divided into
lines. Layouts are values: merging makes a new one.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass, replace
from itertools import product

import numpy as np

from thumbwright.distill.costs import Pricer
from thumbwright.distill.network_pricer import NetworkPricer
from thumbwright.distill.rules import SHOWN, Row, Rule
from thumbwright.distill.situations import values_of
from thumbwright.exact.arrays import FloatArray, IntArray
from thumbwright.exact.walk import TIE

Sides = tuple[frozenset[int], ...]
"""A box of contexts: per seen agent the shown states, then per seen agent its thresholds."""


@dataclass(frozen=True)
class Line:
    """Bars for a range of steps, both ends included; a bar of None is never reached.

    ``free`` marks a line whose bars are not those of all exact worths that it covers: because the
    situations of one cell differ, or because lines were merged at a cost. Its bars are for pricing
    to choose.
    """

    start: int
    stop: int
    minus_at: int | None
    plus_at: int | None
    base: bool = False
    free: bool = False

    @property
    def bars(self) -> tuple[int | None, int | None]:
        """The two bars."""
        return self.minus_at, self.plus_at

    @property
    def apart(self) -> bool:
        """Whether the bars leave room between them, or at least do not cross."""
        return self.minus_at is None or self.plus_at is None or self.minus_at < self.plus_at


@dataclass(frozen=True)
class Layout:
    """Per box of contexts its lines in order of steps."""

    groups: tuple[tuple[Sides, tuple[Line, ...]], ...]

    def __len__(self) -> int:
        return sum(len(lines) for _, lines in self.groups)

    @property
    def lines(self) -> tuple[Line, ...]:
        """All lines, in printing order."""
        return tuple(line for _, lines in self.groups for line in lines)

    def with_line(self, number: int, line: Line) -> Layout:
        """The same layout with one line replaced."""
        groups, position = [], 0
        for sides, lines in self.groups:
            inside = number - position
            if 0 <= inside < len(lines):
                lines = (*lines[:inside], line, *lines[inside + 1 :])
            position += len(lines)
            groups.append((sides, lines))
        return Layout(tuple(groups))

    def tidied(self) -> Layout:
        """The same layout with neighbouring lines of equal bars as one; base lines stay apart."""
        groups = []
        for sides, lines in self.groups:
            kept: list[Line] = []
            for line in lines:
                if kept and kept[-1].bars == line.bars and kept[-1].base == line.base:
                    free = kept[-1].free or line.free
                    kept[-1] = replace(kept[-1], stop=line.stop, free=free)
                else:
                    kept.append(line)
            groups.append((sides, tuple(kept)))
        return Layout(tuple(groups))

    def merges(self, unnoticed: bool) -> Iterator[Layout]:
        """Every layout with one line fewer: neighbouring lines of a group, or whole groups.

        The merged line takes every pair of bars between those of the two. With ``unnoticed``, for
        merges that hardly change anything, a base line is not merged into one that is not and the
        merged bars are not set free.
        """
        for number, (sides, lines) in enumerate(self.groups):
            for i in range(len(lines) - 1):
                one, other = lines[i], lines[i + 1]
                if unnoticed and one.base != other.base:
                    continue
                free = not unnoticed or one.free or other.free
                for minus_at, plus_at in between(one, other):
                    base = one.base and other.base
                    line = Line(one.start, other.stop, minus_at, plus_at, base, free)
                    shorter = (*lines[:i], line, *lines[i + 2 :])
                    yield self._with_group(number, sides, shorter)
        for first in range(len(self.groups)):
            for second in range(first + 1, len(self.groups)):
                yield from self._joined(first, second, unnoticed)

    def _joined(self, first: int, second: int, unnoticed: bool) -> Iterator[Layout]:
        """The two groups as one, where both are a single line and together a box of contexts."""
        (sides, lines), (other_sides, other_lines) = self.groups[first], self.groups[second]
        union = joined(sides, other_sides)
        if union is None or len(lines) > 1 or len(other_lines) > 1:
            return
        if unnoticed and lines[0].base != other_lines[0].base:
            return
        free = not unnoticed or lines[0].free or other_lines[0].free
        rest = tuple(g for k, g in enumerate(self.groups) if k not in (first, second))
        for minus_at, plus_at in between(lines[0], other_lines[0]):
            line = replace(lines[0], minus_at=minus_at, plus_at=plus_at, base=False, free=free)
            yield Layout((*rest[:first], (union, (line,)), *rest[first:]))

    def _with_group(self, number: int, sides: Sides, lines: tuple[Line, ...]) -> Layout:
        return Layout((*self.groups[:number], (sides, lines), *self.groups[number + 1 :]))


def between(one: Line, other: Line) -> list[tuple[int | None, int | None]]:
    """All pairs of bars between those of two lines; only the ends where a bar is never reached."""
    choices = []
    for a, b in ((one.minus_at, other.minus_at), (one.plus_at, other.plus_at)):
        if a is None or b is None:
            choices.append([a] if a == b else [a, b])
        elif abs(a - b) > 3:
            choices.append([a, b])
        else:
            choices.append(list(range(min(a, b), max(a, b) + 1)))
    return [
        (low, high) for low, high in product(*choices) if low is None or high is None or low < high
    ]


def joined(one: Sides, other: Sides) -> Sides | None:
    """The union of two boxes of contexts where that is a box, else None."""
    differing = [k for k, (a, b) in enumerate(zip(one, other, strict=True)) if a != b]
    if len(differing) != 1:
        return None
    k = differing[0]
    return (*one[:k], one[k] | other[k], *one[k + 1 :])


def lossless(pricer: NetworkPricer, inputs: tuple[str, ...]) -> tuple[Layout, int]:
    """The layout in which every situation has the bars of its exact worth.

    Returns
    -------
    Layout
    int
        How many cells of the inputs hold situations with different exact bars; such a cell gets
        the bars of its pooled worth.
    """
    group = pricer.group
    situations = pricer.situations
    if "step" not in inputs:
        steps = np.ones(len(situations.step), dtype=np.int64)
    else:
        steps = situations.step
    contexts = _contexts(pricer, inputs)
    low, high = exact_bars(pricer, situations.worth, situations.step)
    mixed = 0
    groups: list[tuple[Sides, tuple[Line, ...]]] = []
    for context in sorted(set(map(tuple, contexts.tolist()))):
        here = (contexts == context).all(axis=1)
        lines: list[Line] = []
        nothing_shown = not any(context[: len(pricer.seen)])
        for step in np.unique(steps[here]):
            cell = here & (steps == step)
            bars = {(a, b) for a, b in zip(low[cell], high[cell], strict=True)}
            silent = bool((np.abs(situations.worth[cell]) <= TIE).all()) and nothing_shown
            if len(bars) > 1:
                mixed += 1
                worth = values_of(
                    situations.plus[cell].sum(keepdims=True),
                    situations.minus[cell].sum(keepdims=True),
                )
                middle = np.array([np.median(situations.step[cell])])
                (pair,) = zip(*exact_bars(pricer, worth, middle), strict=True)
            else:
                (pair,) = bars
            _append(lines, int(step), *_named(pricer, pair), silent, free=len(bars) > 1)
        lines[-1] = replace(lines[-1], stop=group.horizon)
        groups.append((_sides(context, len(pricer.seen), "shown" in inputs), tuple(lines)))
    return Layout(_same_lines_together(groups)), mixed


def moved_bars(pricer: NetworkPricer, inputs: tuple[str, ...], layout: Layout) -> Iterator[Layout]:
    """Every layout with one bar of a free line moved by one, within the exact bars it covers."""
    situations = pricer.situations
    contexts = _contexts(pricer, inputs)
    exact = exact_bars(pricer, situations.worth, situations.step)
    number = -1
    for sides, lines in layout.groups:
        inside = np.ones(len(contexts), dtype=bool)
        for k, codes in enumerate(sides):
            inside &= np.isin(contexts[:, k], list(codes))
        for line in lines:
            number += 1
            covered = inside & (situations.step >= line.start) & (situations.step <= line.stop)
            for name, bars in zip(("minus_at", "plus_at"), exact, strict=True):
                bar = getattr(line, name)
                if bar is None or not line.free or not covered.any():
                    continue
                for to in (bar - 1, bar + 1):
                    other = replace(line, **{name: to})
                    if other.apart and bars[covered].min() <= to <= bars[covered].max():
                        yield layout.with_line(number, other)


class Moves:
    """How far bars move from one layout to another, weighted with how often that matters."""

    def __init__(self, pricer: NetworkPricer, inputs: tuple[str, ...]) -> None:
        situations = pricer.situations
        self._contexts, self._step = _contexts(pricer, inputs), situations.step
        self._mass = situations.plus + situations.minus
        lowest, highest = count_range(pricer)
        self._never = (lowest - 1, highest + 1)

    def between(self, one: Layout, other: Layout) -> float:
        """Sum over situations of their mass times the steps by which bars move."""
        first, second = self._bars(one), self._bars(other)
        # Beyond a few steps a bar is out of reach either way.
        moved = np.minimum(np.abs(first - second), 4).sum(axis=0)
        return float(self._mass @ moved)

    def _bars(self, layout: Layout) -> IntArray:
        bars = np.empty((2, len(self._step)), dtype=np.int64)
        for sides, lines in layout.groups:
            inside = np.ones(len(self._step), dtype=bool)
            for k, codes in enumerate(sides):
                inside &= np.isin(self._contexts[:, k], list(codes))
            where = np.flatnonzero(inside)
            number = np.searchsorted([line.stop for line in lines], self._step[where])
            for row, name in enumerate(("minus_at", "plus_at")):
                named = [getattr(line, name) for line in lines]
                filled = [self._never[row] if bar is None else bar for bar in named]
                bars[row, where] = np.array(filled)[number]
        return bars


def _sides(context: tuple[int, ...], seen: int, shown: bool) -> Sides:
    """The context as a box; all shown states where the rule may not look at them."""
    states = [frozenset([code]) if shown else frozenset(range(3)) for code in context[:seen]]
    return (*states, *(frozenset([number]) for number in context[seen:]))


def _append(
    lines: list[Line],
    step: int,
    minus_at: int | None,
    plus_at: int | None,
    base: bool,
    free: bool = False,
) -> None:
    """One more step; a range reaches over steps at which the context cannot occur."""
    if lines and lines[-1].bars == (minus_at, plus_at):
        last = lines[-1]
        lines[-1] = replace(last, stop=step, base=last.base and base, free=last.free or free)
        return
    start = 1 if not lines else lines[-1].stop + 1
    if lines and start < step:
        lines[-1] = replace(lines[-1], stop=step - 1)
        start = step
    lines.append(Line(start, step, minus_at, plus_at, base, free))


def exact_bars(pricer: Pricer, worth: FloatArray, step: IntArray) -> tuple[IntArray, IntArray]:
    """Own counts at or below and at or above which exact play answers, arrays (R,).

    Counts that cannot be reached by the horizon are brought to one beyond what can be.
    """
    group = pricer.group
    agent = group.agents[group.index[pricer.agent]]
    bounds, evidence = agent.thresholds[0][1], agent.evidence
    unit, rest = float(evidence.alpha[0]), group.prior + worth + evidence.beta * step
    lowest, highest = count_range(pricer)
    minus_at = np.floor((bounds.minus + TIE - rest) / unit)
    plus_at = np.ceil((bounds.plus - TIE - rest) / unit)
    return (
        np.clip(minus_at, lowest - 1, highest).astype(np.int64),
        np.clip(plus_at, lowest, highest + 1).astype(np.int64),
    )


def count_range(pricer: Pricer) -> tuple[int, int]:
    """Lowest and highest own count that the horizon allows."""
    evidence = pricer.group.agents[pricer.group.index[pricer.agent]].evidence
    moves = np.append(evidence.offsets[:, 0], 0) * pricer.group.horizon
    return int(moves.min()), int(moves.max())


def _named(pricer: Pricer, pair: tuple[int, int]) -> tuple[int | None, int | None]:
    lowest, highest = count_range(pricer)
    return (
        None if pair[0] < lowest else int(pair[0]),
        None if pair[1] > highest else int(pair[1]),
    )


def _contexts(pricer: NetworkPricer, inputs: tuple[str, ...]) -> IntArray:
    """One row of codes per situation: shown states, then numbers of the settings' thresholds."""
    situations = pricer.situations
    shown = situations.states if "shown" in inputs else np.zeros_like(situations.states)
    if "thresholds" not in inputs:
        return shown
    order = threshold_order(pricer)
    numbers = np.array(
        [[order.index(s.names[agent]) for agent in pricer.seen] for s in pricer.settings],
        dtype=np.int64,
    ).reshape(len(pricer.settings), len(pricer.seen))
    return np.concatenate([shown, numbers[situations.setting]], axis=1)


def threshold_order(pricer: NetworkPricer) -> list[str]:
    """Names of the thresholds that the rule tells apart, in the order of the case."""
    return list(dict.fromkeys(name for s in pricer.settings for name in s.names.values()))


def _same_lines_together(
    groups: list[tuple[Sides, tuple[Line, ...]]],
) -> tuple[tuple[Sides, tuple[Line, ...]], ...]:
    """Join boxes of contexts that have the very same lines, as long as boxes result."""
    position = 0
    while position < len(groups):
        sides, lines = groups[position]
        for other in range(position + 1, len(groups)):
            union = joined(sides, groups[other][0])
            if union is not None and groups[other][1] == lines:
                groups[position] = (union, lines)
                del groups[other]
                position = -1
                break
        position += 1
    return tuple(groups)


def as_rule(pricer: NetworkPricer, layout: Layout, form: str = "lines") -> Rule:
    """The layout as rows of a rule."""
    horizon, seen = pricer.group.horizon, pricer.seen
    order = threshold_order(pricer)
    rows = []
    for sides, lines in layout.groups:
        shows = {
            agent: frozenset(SHOWN[code] for code in codes)
            for agent, codes in zip(seen, sides, strict=False)
            if len(codes) < len(SHOWN)
        }
        named = {
            agent: frozenset(order[number] for number in numbers)
            for agent, numbers in zip(seen, sides[len(seen) :], strict=False)
            if len(numbers) < len(order)
        }
        rows += [_row(line, horizon, shows, named) for line in lines]
    return Rule(form, pricer.agent, seen, tuple(rows))


def _row(
    line: Line,
    horizon: int,
    shows: Mapping[str, frozenset[str]],
    named: Mapping[str, frozenset[str]],
) -> Row:
    return Row(
        step_from=None if line.start == 1 else line.start,
        step_to=None if line.stop == horizon else line.stop,
        shows=shows,
        thresholds=named,
        minus_at=line.minus_at,
        plus_at=line.plus_at,
        base=line.base,
    )


def alone_rows(pricer: Pricer) -> tuple[Row, ...]:
    """The bars of exact play with nobody to watch, by range of steps."""
    horizon = pricer.group.horizon
    steps = np.arange(1, horizon + 1)
    low, high = exact_bars(pricer, np.zeros(horizon), steps)
    lines: list[Line] = []
    for step, pair in zip(steps, zip(low, high, strict=True), strict=True):
        _append(lines, int(step), *_named(pricer, pair), True)
    return tuple(_row(line, horizon, {}, {}) for line in lines)
