"""One step of a followed record: what rule and exact agent make of it, however others are seen."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from thumbwright.distill.rules import Rule
from thumbwright.distill.signs import Own
from thumbwright.distill.views import NO_ROW, View, rows_in
from thumbwright.exact.group import Thresholds
from thumbwright.exact.walk import TIE

WATCH = "watch"
"""What somebody does who has not answered."""


@dataclass(frozen=True)
class RuleSays:
    """What the rule makes of one step.

    Attributes
    ----------
    row : int or None
        Which row held, from 0; None where none did, or once the rule has answered.
    worth : float or None
        Its worth (nats), in a rule of worths.
    does : str or None
        "watch", "plus" or "minus"; None once it has answered at an earlier step.
    """

    row: int | None = None
    worth: float | None = None
    does: str | None = None


@dataclass(frozen=True)
class ExactSays:
    """What the exact agent makes of one step.

    Attributes
    ----------
    worth, belief : float or None
        Worth of what was shown, and belief (nats); None without a belief, or once it has answered.
    does : str or None
        "watch", "plus" or "minus"; None likewise.
    """

    worth: float | None = None
    belief: float | None = None
    does: str | None = None


@dataclass(frozen=True)
class Step:
    """One step of a record as followed.

    Attributes
    ----------
    step : int
    sign : str
    states : tuple of int
        What each seen agent shows, where they are told apart.
    count : int or None
        The own count, where there is one.
    own : float
        Worth of all own observations so far (nats).
    rule : RuleSays
    exact : ExactSays
    impossible : str or None
        Why the model gives what is shown no chance, at the step where that begins.
    shown : tuple of two ints, or None
        How many others show plus and minus, where they are counted.
    """

    step: int
    sign: str
    states: tuple[int, ...]
    count: int | None
    own: float
    rule: RuleSays
    exact: ExactSays
    impossible: str | None = None
    shown: tuple[int, int] | None = None


@dataclass(frozen=True)
class Judge:
    """What follows from an agent's own observations and what others show.

    Attributes
    ----------
    own : Own
        Its observations so far.
    prior : float
        Log-odds of plus (nats).
    bounds : Thresholds
    """

    own: Own
    prior: float
    bounds: Thresholds

    def by_rule(self, rule: Rule, view: View) -> RuleSays:
        """What a rule says in the one situation of a view.

        Evidence that settles the question comes before the rule. Raises ValueError if the rule has
        bars and there is no own count.
        """
        sure = self._sure()
        number = int(np.ravel(rows_in(rule, view)[0])[0])
        if number == NO_ROW:
            return RuleSays(does=sure or WATCH)
        row = rule.rows[number]
        if sure:
            return RuleSays(number, row.value, sure)
        if row.value is not None:
            belief = self.prior + self.own.tally + row.value
            return RuleSays(number, row.value, self._answer(belief))
        count = self.own.count
        if count is None:
            raise ValueError("a rule of bars needs an own count")
        if row.plus_at is not None and count >= row.plus_at:
            return RuleSays(number, None, "plus")
        if row.minus_at is not None and count <= row.minus_at:
            return RuleSays(number, None, "minus")
        return RuleSays(number, None, WATCH)

    def exactly(self, worth: float) -> tuple[ExactSays, str | None]:
        """Belief and act at the exact worth of what is shown (nats), or why there is no belief."""
        own = self.own.tally
        if not np.isfinite(worth) and not np.isfinite(own) and worth != own:
            return (
                ExactSays(),
                "its own observation proves one answer and what it is shown the other",
            )
        belief = self.prior + own + worth
        return ExactSays(worth, belief, self._sure() or self._answer(belief)), None

    def _answer(self, belief: float) -> str:
        """What an agent with this belief (nats) does."""
        if belief >= self.bounds.plus - TIE:
            return "plus"
        return "minus" if belief <= self.bounds.minus + TIE else WATCH

    def _sure(self) -> str | None:
        """The answer that the agent's own evidence proves, if it proves one."""
        if np.isfinite(self.own.tally):
            return None
        return "plus" if self.own.tally > 0 else "minus"


def listed(steps: Sequence[int]) -> str:
    """Steps in words, runs drawn together: "steps 2, 4 and 6 to 40"."""
    runs: list[list[int]] = []
    for step in steps:
        if runs and step == runs[-1][-1] + 1:
            runs[-1].append(step)
        else:
            runs.append([step])
    said = [f"{run[0]} to {run[-1]}" if len(run) > 2 else ", ".join(map(str, run)) for run in runs]
    if len(said) > 6:
        said = [*said[:5], f"more up to {steps[-1]}"]
    joined = ", ".join(said[:-1]) + (" and " if len(said) > 1 else "") + said[-1]
    return ("step " if len(steps) == 1 else "steps ") + joined
