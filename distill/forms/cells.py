"""Many ways of playing priced at once, where a rule of step and shown state needs few cells.

Where the rule's agent sees a single other and looks at steps, shown states and thresholds only,
every way of playing comes down to bars per setting, step and shown state.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from thumbwright.distill.costs import Pricer
from thumbwright.distill.forms.axes import Axis, grid_axes
from thumbwright.distill.forms.batch import MOST_AT_ONCE, one_of
from thumbwright.distill.forms.runs import exact_bars
from thumbwright.distill.network_pricer import NetworkPricer
from thumbwright.distill.reckoned import Way, act_of
from thumbwright.distill.situations import Situations
from thumbwright.distill.tallies import Tally, average
from thumbwright.exact.arrays import FloatArray, IntArray
from thumbwright.exact.many import Bars, fits, play_many

ON_A_GRID = ("step", "shown", "thresholds")
"""Inputs that leave a rule a grid of steps and shown states."""

PerCell = tuple[IntArray, IntArray, FloatArray]
"""Lower bar, upper bar and worth (nats) for each setting, step and shown state, (S, T, 3)."""


class Cells:
    """All settings, steps and shown states of one agent that sees a single other."""

    def __init__(self, pricer: NetworkPricer) -> None:
        self._pricer = pricer
        self._position = pricer.group.index[pricer.agent]
        self.shape = (len(pricer.settings), pricer.group.horizon, 3)
        self._every = _every_cell(pricer, self.shape)

    @classmethod
    def of(cls, pricer: Pricer, inputs: Sequence[str]) -> Cells | None:
        """The cells of a rule that looks at these; None where it must be played to be priced."""
        if not isinstance(pricer, NetworkPricer) or not set(inputs) <= set(ON_A_GRID):
            return None
        position = pricer.group.index[pricer.agent]
        on = all(fits(s.solution, position) for s in pricer.settings)
        # Bars stand in order only where the own count speaks for plus as it grows.
        return cls(pricer) if on and pricer.group.agents[position].evidence.alpha[0] > 0 else None

    def axes(self, inputs: Sequence[str]) -> list[Axis]:
        """The axes of a grid of inputs, on which these cells are laid; (S * T * 3,)."""
        return grid_axes(replace(self._pricer, situations=self._every), inputs)

    def of_values(self, value: FloatArray) -> PerCell:
        """The bars that worths (nats) of shape (S, T, 3) yield."""
        step: IntArray = self._every.step.reshape(self.shape)
        return (*exact_bars(self._pricer, value, step), value)

    def of_way(self, way: Way) -> PerCell:
        """What a way of playing comes down to."""
        low, high = np.empty((2, *self.shape), dtype=np.int64)
        value = np.empty(self.shape)
        for number, (here, view) in enumerate(self._every.views()):
            act = act_of(way(view))
            value[number] = np.broadcast_to(act.value, here.shape).reshape(self.shape[1:])
            if act.minus_at is None or act.plus_at is None:
                low[number], high[number] = (bar[number] for bar in self.of_values(value)[:2])
            else:
                for bar, said in ((low, act.minus_at), (high, act.plus_at)):
                    bar[number] = np.broadcast_to(said, here.shape).reshape(self.shape[1:])
        return low, high, value

    def tallies(self, ways: Sequence[PerCell]) -> list[Tally]:
        """How each turns out."""
        found: list[Tally] = []
        for start in range(0, len(ways), MOST_AT_ONCE):
            part = ways[start : start + MOST_AT_ONCE]
            low, high, value = (np.stack(column) for column in zip(*part, strict=True))
            # Entry 0 of the steps is unused.
            low, high = (np.concatenate([bar[:, :, :1], bar], axis=2) for bar in (low, high))
            played = []
            for k, setting in enumerate(self._pricer.settings):
                bars = Bars(low[:, k], high[:, k], value[:, k, -1])
                many = play_many(setting.solution, self._position, bars)
                played.append((setting.weight, many))
            found += [
                average([(weight, one_of(many, i)) for weight, many in played])
                for i in range(len(part))
            ]
        return found


def _every_cell(pricer: NetworkPricer, shape: tuple[int, ...]) -> Situations:
    """Every setting, step and shown state of the one seen agent, as situations without mass."""
    setting, step, state = (index.ravel() for index in np.indices(shape))
    nothing = np.zeros(len(step))
    never = np.zeros((len(step), 1), dtype=np.int64)
    return Situations(
        pricer.situations.names,
        pricer.seen,
        setting,
        step + 1,
        np.zeros_like(step),
        state[:, None],
        never,
        never,
        nothing,
        nothing,
        nothing,
    )
