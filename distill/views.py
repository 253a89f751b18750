"""What a rule may look at, and which row of a rule holds there.

A view is everything that inputs can be read off: the step, what each seen agent shows and since
when, or, where agents are counted and not named, how many show what. All of its numbers are arrays
that broadcast against each other, one entry per situation.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from functools import reduce
from types import MappingProxyType
from typing import Protocol

import numpy as np

from thumbwright.distill.rules import FIRST_ANSWERS, SHOWN, Row, Rule
from thumbwright.exact.arrays import BoolArray, IntArray

NO_ROW = -1
"""Stands for the row of a situation that meets none."""

_LATER = np.int64(1) << 40
"""The moment of an answer that has not been given: later than any that has."""


class View(Protocol):
    """Situations as a rule sees them; every array broadcasts to all of them.

    Attributes
    ----------
    step : ndarray of int
        Own observations so far, this one included.
    names : mapping of agent id to str
        Names of the seen agents' thresholds, where the rule may look at them; else empty.
    """

    @property
    def step(self) -> IntArray:
        """Own observations so far."""
        ...

    @property
    def names(self) -> Mapping[str, str]:
        """Names of the seen agents' thresholds."""
        ...

    def state(self, agent: str) -> IntArray:
        """Codes of what a seen agent shows."""
        ...

    def number(self, name: str) -> IntArray:
        """One of ``rules.NUMBERS``."""
        ...

    def first_answer(self) -> IntArray:
        """Codes, in the order of ``rules.FIRST_ANSWERS``."""
        ...


@dataclass(frozen=True)
class Named:
    """A view of agents that are told apart.

    Attributes
    ----------
    step : ndarray of int
    states, shown_steps, shown_rounds : mapping of agent id to ndarray of int
        Code of what each seen agent shows; step and round at which it answered, 0 while undecided.
    names : mapping of agent id to str
    """

    step: IntArray
    states: Mapping[str, IntArray]
    shown_steps: Mapping[str, IntArray]
    shown_rounds: Mapping[str, IntArray]
    names: Mapping[str, str] = field(default_factory=lambda: MappingProxyType({}))

    def state(self, agent: str) -> IntArray:
        """Codes of what a seen agent shows."""
        return self.states[agent]

    def number(self, name: str) -> IntArray:
        """One of ``rules.NUMBERS``."""
        zero = np.zeros((), dtype=np.int64)
        if name in _COUNTED:
            code = _COUNTED[name]
            return sum(((s == code).astype(np.int64) for s in self.states.values()), zero)
        if name == "came_first":
            together = (moment == self._first_moment() for moment in self._moments())
            came = sum((t.astype(np.int64) for t in together), zero)
            return np.where(self._anybody(), came, 0)
        first = name == "steps_since_first"
        never = np.array(_LATER if first else 0)
        steps = [
            np.where(self.states[agent] > 0, step, never)
            for agent, step in self.shown_steps.items()
        ]
        when = reduce(np.minimum if first else np.maximum, steps, never)
        return np.where(self._anybody(), self.step - when + 1, 0)

    def first_answer(self) -> IntArray:
        """Codes, in the order of ``rules.FIRST_ANSWERS``."""
        no = np.zeros((), dtype=bool)
        first, said = self._first_moment(), []
        for code in (SHOWN.index("plus"), SHOWN.index("minus")):
            came = (
                (state == code) & (moment == first)
                for state, moment in zip(self.states.values(), self._moments(), strict=True)
            )
            said.append(reduce(np.logical_or, came, no))
        return coded_answer(*said)

    def _anybody(self) -> BoolArray:
        no = np.zeros((), dtype=bool)
        return reduce(np.logical_or, (state > 0 for state in self.states.values()), no)

    def _moments(self) -> list[IntArray]:
        """When each answered, step before round, as one number."""
        width = 1 + max((int(r.max(initial=0)) for r in self.shown_rounds.values()), default=0)
        return [
            np.where(self.states[a] > 0, self.shown_steps[a] * width + self.shown_rounds[a], _LATER)
            for a in self.states
        ]

    def _first_moment(self) -> IntArray:
        return reduce(np.minimum, self._moments(), np.array(_LATER))


_COUNTED = {f"{state}_shown": code for code, state in enumerate(SHOWN)}


def coded_answer(plus: BoolArray, minus: BoolArray) -> IntArray:
    """Code of the first answer from whether plus, whether minus was among those given first."""
    names = [["nobody", "minus"], ["plus", "both"]]
    codes = np.array([[FIRST_ANSWERS.index(name) for name in pair] for pair in names])
    code: IntArray = codes[np.asarray(plus).astype(int), np.asarray(minus).astype(int)]
    return code


def holds(row: Row, view: View) -> BoolArray:
    """Where a row holds; broadcasts to all situations of the view."""
    here = np.ones((), dtype=bool)
    for agent, accepted in row.thresholds.items():
        if agent in view.names and view.names[agent] not in accepted:
            return np.zeros((), dtype=bool)
    here = here & _within(view.step, row.step_from, row.step_to)
    for agent, accepted in row.shows.items():
        table = np.array([state in accepted for state in SHOWN])
        here = here & table[view.state(agent)]
    for name, (least, greatest) in row.ranges.items():
        here = here & _within(view.number(name), least, greatest)
    if row.first_answer is not None:
        table = np.array([answer in row.first_answer for answer in FIRST_ANSWERS])
        here = here & table[view.first_answer()]
    return here


def rows_in(rule: Rule, view: View) -> tuple[IntArray, IntArray]:
    """Which row holds in each situation, and how many do.

    Returns
    -------
    row : ndarray of int
        Number of the first row that holds; ``NO_ROW`` where none does.
    count : ndarray of int
        How many hold. Both have the shape to which the view's arrays that the rule looks at
        broadcast.
    """
    kept = Kept(view)
    held = np.broadcast_arrays(*(holds(row, kept) for row in rule.rows), view.step)[:-1]
    row = np.full(held[0].shape, NO_ROW, dtype=np.int64)
    count = np.zeros(held[0].shape, dtype=np.int64)
    for number in reversed(range(len(held))):
        row[held[number]] = number
        count += held[number]
    return row, count


class Kept:
    """A view whose numbers are worked out once, however many rows look at them."""

    def __init__(self, view: View) -> None:
        self._view = view
        self._numbers: dict[str, IntArray] = {}
        self._first: IntArray | None = None
        self.step, self.names = view.step, view.names

    def state(self, agent: str) -> IntArray:
        """Codes of what a seen agent shows."""
        return self._view.state(agent)

    def number(self, name: str) -> IntArray:
        """One of ``rules.NUMBERS``."""
        if name not in self._numbers:
            self._numbers[name] = self._view.number(name)
        return self._numbers[name]

    def first_answer(self) -> IntArray:
        """Codes, in the order of ``rules.FIRST_ANSWERS``."""
        if self._first is None:
            self._first = self._view.first_answer()
        return self._first


def _within(number: IntArray, least: int | None, greatest: int | None) -> BoolArray:
    inside = np.ones((), dtype=bool)
    if least is not None:
        inside = inside & (number >= least)
    if greatest is not None:
        inside = inside & (number <= greatest)
    return inside
