"""A rule as plain data: rows over the situations an agent can tell apart.

A row says for which steps, for which shown states of the seen agents, for how many that show
something and, where the rule may look at them, for which thresholds of the seen agents it holds;
and then either what the situation is worth (``value``, nats, in place of the exact social part of
the belief) or at which own count the agent answers (``minus_at`` or fewer, ``plus_at`` or more).

Nothing here computes; forms make rules, costs price them, exports write them.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from types import MappingProxyType

SHOWN = ("undecided", "plus", "minus")
"""The states an agent can show, in the order of their codes 0, 1, 2 everywhere in the program."""

NUMBERS = (
    "plus_shown",
    "minus_shown",
    "undecided_shown",
    "steps_since_first",
    "steps_since_last",
    "came_first",
)
"""Whole numbers that a rule may read off the seen agents, whoever of them it is.

How many show plus, minus, undecided; the steps since the first and the last answer was given, that
step included; how many gave the first answer at the same moment. The last three are 0 while nobody
has answered.
"""

FIRST_ANSWER = "first_answer"
FIRST_ANSWERS = ("nobody", "plus", "minus", "both")
"""Which answer was given first; "both" if both were given at that moment, "nobody" if none yet."""


@dataclass(frozen=True)
class Row:
    """One line of a rule.

    Attributes
    ----------
    step_from, step_to : int or None
        First and last step (own observations so far, this one included), both inclusive;
        ``None`` is open.
    shows : mapping of agent id to frozenset of str
        The shown states (members of :data:`SHOWN`) that the row accepts of each seen agent.
        An agent left out may show anything.
    thresholds : mapping of agent id to frozenset of str
        The names of the thresholds that the row accepts of each seen agent; left out: any.
    value : float or None
        Worth of the situation in nats; ``None`` in a rule of bars.
    minus_at, plus_at : int or None
        Answer minus with an own count of ``minus_at`` or less, plus with ``plus_at`` or more;
        ``None`` means that this row never gives that answer.
    base : bool
        True for the line that holds while nothing can have been shown; it is also the line
        for an agent that is unsure whether anyone is on watch.
    ranges : mapping of str to pair of (int or None)
        For members of :data:`NUMBERS` the least and the greatest number, both inclusive, that the
        row accepts; ``None`` is open. A number left out may be anything.
    first_answer : frozenset of str or None
        Which of :data:`FIRST_ANSWERS` the row accepts; ``None``: any.
    """

    step_from: int | None = None
    step_to: int | None = None
    shows: Mapping[str, frozenset[str]] = field(default_factory=dict)
    thresholds: Mapping[str, frozenset[str]] = field(default_factory=dict)
    value: float | None = None
    minus_at: int | None = None
    plus_at: int | None = None
    base: bool = False
    ranges: Mapping[str, tuple[int | None, int | None]] = field(default_factory=dict)
    first_answer: frozenset[str] | None = None

    def __post_init__(self) -> None:
        object.__setattr__(self, "shows", MappingProxyType(dict(self.shows)))
        object.__setattr__(self, "thresholds", MappingProxyType(dict(self.thresholds)))
        object.__setattr__(self, "ranges", MappingProxyType(dict(self.ranges)))


@dataclass(frozen=True)
class Rule:
    """Rows plus the name of the form that made them.

    Attributes
    ----------
    form : str
        ``"lines"``, ``"table"``, or the name of a file it was read from.
    agent : str
        Id of the agent the rule is for.
    seen : tuple of str
        Ids of the agents it sees, in the order of the case.
    rows : tuple of Row
        In the order in which they are printed. Every situation meets exactly one.
    """

    form: str
    agent: str
    seen: tuple[str, ...]
    rows: tuple[Row, ...]

    @property
    def is_grid(self) -> bool:
        """Whether the rows look at steps, shown states and thresholds only."""
        return not any(row.ranges or row.first_answer is not None for row in self.rows)

    def _repr_html_(self) -> str:
        """The rows as a table, for notebooks."""
        from thumbwright.distill.sheet.notebook import rule_html

        return rule_html(self)

    @property
    def has_bars(self) -> bool:
        """Whether the rows hold bars on the own count rather than values in nats."""
        return any(row.minus_at is not None or row.plus_at is not None for row in self.rows)
