"""Rules in action: which row holds in which situation, and what the row says there.

A rule that looks at step and shown states is compiled once into a grid [step, state of each seen
agent] of row numbers. One that looks at numbers of agents or at times is read situation by
situation.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from thumbwright.distill.reckoned import Way, act_of
from thumbwright.distill.rules import SHOWN, Row, Rule
from thumbwright.distill.views import NO_ROW, Named, View, rows_in
from thumbwright.exact.arrays import FloatArray, IntArray
from thumbwright.exact.group import Group
from thumbwright.exact.play import NEVER, Act, Policy, Situation


@dataclass(frozen=True)
class Grid:
    """A rule laid out over steps and shown states.

    Attributes
    ----------
    row : ndarray of int, shape (T + 1, 3, ..., 3)
        The first row that holds for each step (entry 0 is unused) and joint shown state;
        ``NO_ROW`` in a gap.
    count : ndarray of int, same shape
        How many rows hold there.
    """

    row: IntArray
    count: IntArray


def lay_out(rule: Rule, horizon: int, names: Mapping[str, str]) -> Grid:
    """The grid of a rule where the seen agents have the thresholds of these names."""
    shape = (horizon + 1, *(len(SHOWN) for _ in rule.seen))
    row_of, count = np.full(shape, NO_ROW, dtype=np.int64), np.zeros(shape, dtype=np.int64)
    for number in reversed(range(len(rule.rows))):
        row = rule.rows[number]
        if any(
            names.get(agent) not in accepted
            for agent, accepted in row.thresholds.items()
            if agent in names
        ):
            continue
        where = holds(row, rule.seen, horizon)
        row_of[where] = number
        count[where] += 1
    return Grid(row_of, count)


def holds(row: Row, seen: Sequence[str], horizon: int) -> tuple[NDArray[np.int64], ...]:
    """Index of the grid cells in which a row holds, thresholds aside."""
    first = 1 if row.step_from is None else max(1, row.step_from)
    last = horizon if row.step_to is None else min(horizon, row.step_to)
    states = [
        [code for code, state in enumerate(SHOWN) if state in row.shows.get(agent, SHOWN)]
        for agent in seen
    ]
    return np.ix_(np.arange(first, last + 1), *(np.array(s, dtype=np.int64) for s in states))


def rule_policy(
    rule: Rule, group: Group, names: Mapping[str, str], row_values: FloatArray | None = None
) -> Policy:
    """The rule as a policy of its agent.

    Parameters
    ----------
    rule : Rule
    group : Group
    names : mapping
        Names of the seen agents' thresholds, where the rule may look at them.
    row_values : ndarray of float, shape (rows,), optional
        For a rule of bars, the worth of each row (nats): it decides which answer an agent favours
        that is undecided at the horizon. Zero where left out.
    """
    rows_at, sheet = _looked_up(rule, group, names), _Sheet(rule, row_values)
    return lambda situation: sheet.act(rows_at(situation))


def acts(rule: Rule, view: View, row_values: FloatArray | None = None) -> Act:
    """What a rule makes of all situations of a view; ``row_values`` as for ``rule_policy``."""
    return _Sheet(rule, row_values).act(rows_in(rule, view)[0])


class _Sheet:
    """Values and bars of all rows, to be looked up by the number of the row."""

    def __init__(self, rule: Rule, row_values: FloatArray | None) -> None:
        low = [-NEVER if row.minus_at is None else row.minus_at for row in rule.rows]
        high = [NEVER if row.plus_at is None else row.plus_at for row in rule.rows]
        values = [0.0 if row.value is None else row.value for row in rule.rows]
        if rule.has_bars and row_values is not None:
            values = row_values.tolist()
        # One more entry at the end is what NO_ROW (-1) picks: no news, no answer.
        self._value: FloatArray = np.array([*values, 0.0])
        self._low: IntArray = np.array([*low, -NEVER], dtype=np.int64)
        self._high: IntArray = np.array([*high, NEVER], dtype=np.int64)
        self._has_bars = rule.has_bars

    def act(self, row: IntArray) -> Act:
        """What these rows say."""
        if not self._has_bars:
            return Act(self._value[row], row=row)
        return Act(self._value[row], self._low[row], self._high[row], row)


def way_policy(way: Way, seen: Sequence[str], names: Mapping[str, str]) -> Policy:
    """Any function of a view as a policy of an agent that sees these."""
    return lambda situation: act_of(way(_view(seen, names, situation)))


def _view(seen: Sequence[str], names: Mapping[str, str], situation: Situation) -> Named:
    told = zip(situation.states, situation.shown_steps, situation.shown_rounds, strict=True)
    return view_of(seen, names, np.array(situation.step), tuple(told))


def view_of(
    seen: Sequence[str],
    names: Mapping[str, str],
    step: IntArray,
    told: Sequence[Sequence[IntArray]],
) -> Named:
    """A view of agents that are told apart.

    ``told`` has, per seen agent in this order, the codes of what it shows and the steps and rounds
    of its answers.
    """
    states, steps, rounds = (
        {agent: one[k] for agent, one in zip(seen, told, strict=True)} for k in range(3)
    )
    return Named(step, states, steps, rounds, names)


def _looked_up(
    rule: Rule, group: Group, names: Mapping[str, str]
) -> Callable[[Situation], IntArray]:
    """Which row of a rule holds in a situation: from a grid where that is enough."""
    if rule.is_grid:
        grid = lay_out(rule, group.horizon, names).row
        return lambda situation: grid[situation.step][situation.states]

    def read(situation: Situation) -> IntArray:
        return rows_in(rule, _view(rule.seen, names, situation))[0]

    return read


def alone_policy(_situation: Situation) -> Act:
    """Nobody is looked at."""
    return Act(np.zeros(()))


def plain_count_policy(group: Group, agent: str) -> Policy:
    """A commitment seen counts as that neighbour's threshold less the prior, silence as nothing.

    Where the neighbour's thresholds are unknown the mean over their possibilities is taken.
    """
    worths = []
    for other in group.agents[group.index[agent]].sees:
        bounds = group.agents[group.index[other]].thresholds
        plus = sum(share * bound.plus for share, bound in bounds) - group.prior
        minus = sum(share * bound.minus for share, bound in bounds) - group.prior
        worths.append(np.array([0.0, plus, minus]))

    def policy(situation: Situation) -> Act:
        value: FloatArray = np.zeros(())
        for worth, states in zip(worths, situation.states, strict=True):
            value = value + worth[states]
        return Act(value)

    return policy
