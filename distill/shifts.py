"""A rule of whole boxes: bars on the own count, and by how many boxes what is shown shifts them.

Both bars move together: down, towards minus, for what speaks for plus, since the agent then answers
plus sooner and minus later. A shift of one box is what one count is worth.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from thumbwright.distill.rules import SHOWN
from thumbwright.distill.views import View
from thumbwright.exact.arrays import FloatArray, IntArray
from thumbwright.exact.play import Act


@dataclass(frozen=True)
class Base:
    """Bars where nothing shifts them: up to a step, inclusive; None is to the end."""

    step_to: int | None
    minus_at: int
    plus_at: int


@dataclass(frozen=True)
class Move:
    """By how many boxes the bars go down for each agent that shows something.

    Attributes
    ----------
    shows : str
        Member of ``SHOWN``.
    agents : tuple of str
        Ids of the agents that are looked at; empty: all are counted, nobody is told apart.
    down : int
        Boxes towards minus; negative is up.
    step_from : int
        From this step on.
    """

    shows: str
    agents: tuple[str, ...]
    down: int
    step_from: int = 1


@dataclass(frozen=True)
class Shifts:
    """Bars, and whole shifts of both for each agent by what it shows.

    Attributes
    ----------
    agent : str
    seen : tuple of str
    base : tuple of Base
        In the order of their steps.
    moves : tuple of Move
    unit : float
        Worth of one count (nats).
    """

    agent: str
    seen: tuple[str, ...]
    base: tuple[Base, ...]
    moves: tuple[Move, ...]
    unit: float
    form: str = "shifts"

    @property
    def rows(self) -> int:
        """How many lines it takes on paper."""
        return len(self.base) + len(self.moves)

    @property
    def parameters(self) -> dict[str, float]:
        """Bars and shifts by name."""
        named: dict[str, float] = {}
        for number, base in enumerate(self.base, start=1):
            named[f"minus_at_{number}"], named[f"plus_at_{number}"] = base.minus_at, base.plus_at
            if base.step_to is not None:
                named[f"step_to_{number}"] = base.step_to
        for move in self.moves:
            name = "_".join(("down", move.shows, *move.agents))
            named[name] = move.down
            if move.step_from > 1:
                named[f"{name}_step_from"] = move.step_from
        return named

    def __call__(self, view: View) -> Act:
        """Bars of every situation; their shift says what an agent favours at the horizon."""
        step = np.asarray(view.step)
        low, high = (
            np.select(
                [step <= (np.inf if base.step_to is None else base.step_to) for base in self.base],
                [np.asarray(getattr(base, name)) for base in self.base],
            )
            for name in ("minus_at", "plus_at")
        )
        down = self.down(view)
        worth: FloatArray = np.asarray(self.unit * down, dtype=float)
        return Act(worth, low - down, high - down)

    def down(self, view: View) -> IntArray:
        """By how many boxes both bars go down in every situation."""
        total: IntArray = np.zeros((), dtype=np.int64)
        for move in self.moves:
            if move.agents:
                code = SHOWN.index(move.shows)
                count = sum((view.state(a) == code).astype(np.int64) for a in move.agents)
            else:
                count = view.number(f"{move.shows}_shown")
            total = total + move.down * np.asarray(count) * (view.step >= move.step_from)
        return total

    def sentences(self) -> tuple[str, ...]:
        """Bars first, then one sentence for each shift."""
        said, first = [], 1
        for base in self.base:
            if len(self.base) == 1:
                when = "Bars"
            elif base.step_to is None:
                when = f"Bars from step {first} on"
            else:
                when = f"Bars at steps {first} to {base.step_to}"
            first = (base.step_to or 0) + 1
            bars = f"minus at {base.minus_at} or below, plus at {base.plus_at} or above"
            said.append(f"{when}: {bars}.")
        for move in self.moves:
            boxes = "1 box" if abs(move.down) == 1 else f"{abs(move.down)} boxes"
            way = "down" if move.down > 0 else "up"
            who = "agent" if not move.agents else "of " + ", ".join(move.agents)
            if len(move.agents) == 1:
                lead = f"{move.agents[0]} shows {move.shows}"
            else:
                lead = f"for each {who} that shows {move.shows}"
            when = f" from step {move.step_from} on" if move.step_from > 1 else ""
            said.append(f"{lead[:1].upper()}{lead[1:]}{when}: both bars {boxes} {way}.")
        return tuple(said)
