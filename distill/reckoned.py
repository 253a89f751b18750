"""Rules that are reckoned from what is shown, not looked up in rows: what all of them answer to.

A way of playing is any function of a view: it returns worths in nats, arrays that broadcast to the
situations of the view, or an ``Act`` with bars on the own count. A reckoned rule is a way of
playing that also knows whom it is for and can be said in sentences.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Protocol

import numpy as np

from thumbwright.distill.views import View
from thumbwright.exact.arrays import FloatArray
from thumbwright.exact.play import Act

Way = Callable[[View], FloatArray | float | Act]
"""Worths (nats) of the situations of a view, or an act with bars."""


class Reckoned(Protocol):
    """A rule of few numbers.

    Attributes
    ----------
    form, agent : str
    seen : tuple of str
        As for a rule of rows.
    """

    @property
    def form(self) -> str:
        """Name of the form that made it."""
        ...

    @property
    def agent(self) -> str:
        """Id of the agent it is for."""
        ...

    @property
    def seen(self) -> tuple[str, ...]:
        """Ids of the agents that it sees."""
        ...

    @property
    def unit(self) -> float:
        """Worth of one unit of its numbers (nats)."""
        ...

    @property
    def parameters(self) -> dict[str, float]:
        """Its numbers by name, in the order in which they are said."""
        ...

    def __call__(self, view: View) -> FloatArray | float | Act:
        """Worths (nats) of the situations of a view, or an act with bars."""
        ...

    def sentences(self) -> tuple[str, ...]:
        """The rule in plain sentences; agents by their ids."""
        ...


def act_of(said: FloatArray | float | Act) -> Act:
    """What a way of playing returned, as an act."""
    return said if isinstance(said, Act) else Act(np.asarray(said, dtype=float))
