"""The inputs of a rule as the axes of a grid, on which situations are laid and rows are boxes.

Steps, numbers of agents and times come in their own order; shown states and first answers in an
order that runs from minus to plus; named thresholds in the order of the sum of their two beliefs.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

import numpy as np

from thumbwright.distill.costs import Pricer
from thumbwright.distill.network_pricer import NetworkPricer
from thumbwright.distill.rules import FIRST_ANSWER, FIRST_ANSWERS, NUMBERS, SHOWN, Row
from thumbwright.distill.situations import Situations
from thumbwright.exact.arrays import IntArray

_STATE_ORDER = ("minus", "undecided", "plus")
_ANSWER_ORDER = ("minus", "both", "nobody", "plus")


@dataclass(frozen=True)
class Axis:
    """One input of the grid: the cell of each situation, and how a row narrows to some cells.

    Attributes
    ----------
    name : str
    cells : int
    where : ndarray of int, shape (R,)
        Cell of each situation.
    says : callable
        ``says(row, start, stop)`` is the row narrowed to the cells from start to before stop.
    """

    name: str
    cells: int
    where: IntArray
    says: Callable[[Row, int, int], Row]


def grid_axes(pricer: Pricer, inputs: Sequence[str]) -> list[Axis]:
    """The axes of the grid, in the order in which the inputs are declared."""
    situations = pricer.situations
    axes: list[Axis] = []
    for name in inputs:
        if name == "step":
            horizon = pricer.group.horizon
            axes.append(Axis("step", horizon, situations.step - 1, _step_range(horizon)))
        elif name == "shown":
            axes += _shown_axes(_told_apart(pricer).situations)
        elif name == "thresholds":
            axes += [_thresholds_axis(_told_apart(pricer), agent) for agent in pricer.seen]
        elif name == FIRST_ANSWER:
            axes.append(_answers_axis(pricer))
        elif name in NUMBERS:
            axes.append(_number_axis(name, pricer))
    return axes


def _told_apart(pricer: Pricer) -> NetworkPricer:
    assert isinstance(pricer, NetworkPricer), "a crowd is played only where its rule counts"
    return pricer


def _shown_axes(situations: Situations) -> list[Axis]:
    code = np.array([_STATE_ORDER.index(state) for state in SHOWN])
    return [
        Axis(f"{agent} shown", 3, code[situations.states[:, k]], _states(agent))
        for k, agent in enumerate(situations.seen)
    ]


def _step_range(horizon: int) -> Callable[[Row, int, int], Row]:
    def says(row: Row, start: int, stop: int) -> Row:
        return replace(
            row,
            step_from=None if start == 0 else start + 1,
            step_to=None if stop == horizon else stop,
        )

    return says


def _states(agent: str) -> Callable[[Row, int, int], Row]:
    def says(row: Row, start: int, stop: int) -> Row:
        if stop - start == len(_STATE_ORDER):
            return row
        return replace(row, shows={**row.shows, agent: frozenset(_STATE_ORDER[start:stop])})

    return says


def _thresholds_axis(pricer: NetworkPricer, agent: str) -> Axis:
    """Named thresholds in the order of the sum of their two beliefs."""
    sums: dict[str, float] = {}
    for setting in pricer.settings:
        group = setting.solution.group
        bounds = group.agents[group.index[agent]].thresholds[0][1]
        sums[setting.names[agent]] = bounds.plus + bounds.minus
    order = sorted(sums, key=lambda name: sums[name])
    number = np.array([order.index(setting.names[agent]) for setting in pricer.settings])

    def says(row: Row, start: int, stop: int) -> Row:
        if stop - start == len(order):
            return row
        return replace(row, thresholds={**row.thresholds, agent: frozenset(order[start:stop])})

    return Axis(f"{agent} thresholds", len(order), number[pricer.situations.setting], says)


def _number_axis(name: str, pricer: Pricer) -> Axis:
    """A number of agents or steps; beyond what can occur its ends are open."""
    number = pricer.situations.number(name)
    least, cells = int(number.min()), int(np.ptp(number)) + 1

    def says(row: Row, start: int, stop: int) -> Row:
        if stop - start == cells:
            return row
        low = None if start == 0 else least + start
        high = None if stop == cells else least + stop - 1
        return replace(row, ranges={**row.ranges, name: (low, high)})

    return Axis(name, cells, number - least, says)


def _answers_axis(pricer: Pricer) -> Axis:
    found = pricer.situations.first_answer()
    order = [answer for answer in _ANSWER_ORDER if (found == FIRST_ANSWERS.index(answer)).any()]
    code = np.array([order.index(a) if a in order else -1 for a in FIRST_ANSWERS])

    def says(row: Row, start: int, stop: int) -> Row:
        if stop - start == len(order):
            return row
        return replace(row, first_answer=frozenset(order[start:stop]))

    return Axis(FIRST_ANSWER, len(order), code[found], says)
