"""Following a record step by step: what a rule says, and what the exact agent believes and does.

Both are followed as long as they have not answered, and as if the agent still showed "undecided":
the exact belief is

    prior + own observations + worth of the shown history,

the worth being the log ratio of the probabilities of that history, the agent made to show
undecided, from the exact solution of the group. What the record says of others becomes a history
thus. Where what is shown is used from the next step on (exchange "once"), a state first seen at
step t was shown at the end of step t - 1. Where answers run round within a step ("settle"), it was
shown in one of the rounds of step t; if the record does not say in which, and several are
possible, the probabilities of all of them are added up, and the agent is followed at the round of
its own observation and at the end of the step only.

A history of probability zero leaves the exact agent without a belief from then on; the rule goes
on, since it looks at nothing but what is shown. Such a history is named.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from itertools import groupby

import numpy as np

from thumbwright.distill.playing import view_of
from thumbwright.distill.record_reading import Line, Record
from thumbwright.distill.rules import SHOWN, Rule
from thumbwright.distill.signs import Own
from thumbwright.distill.views import NO_ROW, rows_in
from thumbwright.exact.arrays import FloatArray
from thumbwright.exact.engine import Moment, Solution
from thumbwright.exact.group import UNDECIDED, Thresholds
from thumbwright.exact.walk import TIE

WATCH = "watch"
"""What somebody does who has not answered."""


@dataclass(frozen=True)
class Told:
    """What is known of one seen agent: its state, and when it was first shown.

    ``step`` is that of its answer, 0 while undecided; ``round`` is None where not known.
    """

    state: int = UNDECIDED
    step: int = 0
    round: int | None = None


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
    count : int or None
        The own count, where there is one.
    own : float
        Worth of all own observations so far (nats).
    rule : RuleSays
    exact : ExactSays
    impossible : str or None
        Why the model gives what is shown no chance, at the step where that begins.
    """

    step: int
    sign: str
    states: tuple[int, ...]
    count: int | None
    own: float
    rule: RuleSays
    exact: ExactSays
    impossible: str | None = None


def follow(
    solution: Solution, agent: str, rule: Rule, names: Mapping[str, str], record: Record
) -> tuple[Step, ...]:
    """Follow a record.

    Parameters
    ----------
    solution : Solution
    agent : str
        Whose record it is; it makes one observation at every step.
    rule : Rule
        Rows that overlap are taken in order.
    names : mapping of agent id to str
        Names of the seen agents' thresholds, where the rule may look at them.
    record : Record

    Raises
    ------
    ValueError
        If the rule has bars and the agent's own observations make no count.
    """
    walker = _Walker(solution, agent, rule, names)
    return tuple(walker.step(line) for line in record.lines)


@dataclass
class _Walker:
    """Where the record stands: what is known so far, and who has answered."""

    solution: Solution
    agent: str
    rule: Rule
    names: Mapping[str, str]
    told: tuple[Told, ...] = ()
    rule_done: bool = False
    exact_done: bool = False
    own: Own = field(init=False)

    def __post_init__(self) -> None:
        group = self.solution.group
        position = group.index[self.agent]
        me = group.agents[position]
        self.seen = me.sees
        self.bounds: Thresholds = me.thresholds[0][1]
        self.events = [self.solution.tracks[k].events for k in group.sees[position]]
        moments = self.solution.tracks[position].moments
        self.moments = {step: list(those) for step, those in groupby(moments, lambda m: m.step)}
        self.settles = group.exchange == "settle"
        self.told = tuple(Told() for _ in self.seen)
        self.own = Own(me.evidence)

    def step(self, line: Line) -> Step:
        """One line of the record, through the rounds of its step."""
        self.own.observe(line.sign)
        before = self.told
        self.told = tuple(
            old if old.state else Told(state, self._shown_at(line.step), round_) if state else old
            for old, state, round_ in zip(before, line.states, line.rounds, strict=True)
        )
        rule, exact, impossible = RuleSays(), ExactSays(), None
        for moment, told in self._looks(line.step, before):
            if not self.rule_done:
                rule = self._by_rule(moment, told)
                self.rule_done = rule.does not in (WATCH, None)
            if not self.exact_done:
                exact, impossible = self._exactly(moment, told)
                self.exact_done = exact.does != WATCH
        return Step(
            line.step,
            line.sign.name,
            line.states,
            self.own.count,
            self.own.tally,
            rule,
            exact,
            impossible,
        )

    def _shown_at(self, step: int) -> int:
        """Step at whose end, or in whose rounds, a state was shown that is first seen at a step."""
        return step if self.settles else step - 1

    def _looks(self, step: int, before: tuple[Told, ...]) -> list[tuple[Moment, tuple[Told, ...]]]:
        """The rounds of a step at which it is known what is shown, with what is."""
        moments = self.moments[step]
        if not self.settles:
            return [(moments[0], self.told)]
        looks = [(moments[0], before)]
        rounds = [self._round_of(k, told) for k, told in enumerate(self.told)]
        if all(old.state or when is not None for old, when in zip(before, rounds, strict=True)):
            for moment in moments[1:-1]:
                now = tuple(
                    old if old.state or (when or 0) >= moment.round else told
                    for old, told, when in zip(before, self.told, rounds, strict=True)
                )
                looks.append((moment, now))
        if self.told != before or len(moments) > 1:
            looks.append((moments[-1], self.told))
        return looks

    def _round_of(self, seen: int, told: Told) -> int | None:
        """The round of a seen agent's answer if the record tells it, or the model has but one.

        0, which changes nothing, for one that has not answered.
        """
        if not told.state:
            return 0
        possible = {self.events[seen].round[event] for event in self._placed(seen, told)}
        if told.round is not None or len(possible) != 1:
            return told.round
        return possible.pop()

    def _placed(self, seen: int, told: Told) -> list[int]:
        """Which display events of a seen agent agree with what is known of it."""
        if not told.state:
            return [0]
        events = self.events[seen]
        return [
            number
            for number in range(1, len(events))
            if (events.state[number], events.step[number]) == (told.state, told.step)
            and told.round in (None, events.round[number])
        ]

    def _by_rule(self, moment: Moment, told: tuple[Told, ...]) -> RuleSays:
        """What the rule says; evidence that settles the question comes before it."""
        sure = _sure(self.own.tally)
        columns = [
            tuple(np.array(x) for x in (one.state, one.step, one.round or 0)) for one in told
        ]
        view = view_of(self.rule.seen, self.names, np.array(moment.step), columns)
        number = int(rows_in(self.rule, view)[0])
        if number == NO_ROW:
            return RuleSays(does=sure or WATCH)
        row = self.rule.rows[number]
        if sure:
            return RuleSays(number, row.value, sure)
        if row.value is not None:
            belief = self.solution.group.prior + self.own.tally + row.value
            return RuleSays(number, row.value, self._answer(belief))
        count = self.own.count
        if count is None:
            raise ValueError("a rule of bars needs an own count")
        if row.plus_at is not None and count >= row.plus_at:
            return RuleSays(number, None, "plus")
        if row.minus_at is not None and count <= row.minus_at:
            return RuleSays(number, None, "minus")
        return RuleSays(number, None, WATCH)

    def _exactly(self, moment: Moment, told: tuple[Told, ...]) -> tuple[ExactSays, str | None]:
        """Belief and act of the exact agent, or why it has none."""
        placed = [
            [e for e in self._placed(k, one) if e < length]
            for k, (one, length) in enumerate(zip(told, moment.value.shape, strict=True))
        ]
        chance = _log_chance(moment, placed)
        if not np.isfinite(chance).any():
            return ExactSays(), self._why_impossible(moment, told)
        worth = float(chance[0] - chance[1])
        own = self.own.tally
        if not np.isfinite(worth) and not np.isfinite(own) and worth != own:
            return (
                ExactSays(),
                "its own observation proves one answer and what it is shown the other",
            )
        belief = self.solution.group.prior + own + worth
        return ExactSays(worth, belief, _sure(own) or self._answer(belief)), None

    def _answer(self, belief: float) -> str:
        """What an agent with this belief (nats) does."""
        if belief >= self.bounds.plus - TIE:
            return "plus"
        return "minus" if belief <= self.bounds.minus + TIE else WATCH

    def _why_impossible(self, moment: Moment, told: tuple[Told, ...]) -> str:
        """Name what the model never lets happen, as narrowly as it can be."""
        for k, one in enumerate(told):
            if one.state and not self._placed(k, one):
                return self._never_answers(k, one)
        for k, one in enumerate(told):
            alone = [
                list(range(length)) if j != k else [e for e in self._placed(k, one) if e < length]
                for j, length in enumerate(moment.value.shape)
            ]
            if np.isfinite(_log_chance(moment, alone)).any():
                continue
            if one.state:
                return f"the model never lets {self._name(k, one)} while the agent is undecided"
            until = moment.step if self.settles else moment.step - 1
            return (
                f"the model never leaves {self.seen[k]} undecided to the end of step {until} while"
                " the agent is undecided"
            )
        said = [
            self._name(k, one) if one.state else f"{self.seen[k]} stay undecided"
            for k, one in enumerate(told)
        ]
        return f"the model never lets all of this come together: {'; '.join(said)}"

    def _name(self, seen: int, told: Told) -> str:
        round_ = "" if told.round is None or not self.settles else f", round {told.round}"
        when = f"at step {told.step}{round_}" if told.step else "before it has observed anything"
        return f"{self.seen[seen]} answer {SHOWN[told.state]} {when}"

    def _never_answers(self, seen: int, told: Told) -> str:
        events = self.events[seen]
        steps = sorted(
            {
                step
                for state, step in zip(events.state, events.step, strict=True)
                if state == told.state
            }
        )
        if not steps:
            when = f"; it never answers {SHOWN[told.state]} at all"
        else:
            when = f"; it can at {_listed(steps)}"
        if told.step in steps:
            rounds = sorted(
                {
                    events.round[e]
                    for e in range(1, len(events))
                    if (events.state[e], events.step[e]) == (told.state, told.step)
                }
            )
            when = f"; there it can in round {', '.join(map(str, rounds))}"
        return f"the model never lets {self._name(seen, told)}{when}"


def _log_chance(moment: Moment, placed: Sequence[Sequence[int]]) -> FloatArray:
    """Log probability that one of the histories placed so is shown, given plus, given minus."""
    if not all(placed):
        return np.full(2, -np.inf)
    where = np.ix_(*placed) if placed else ()
    each = np.stack([np.ravel(side[where]) for side in moment.log_shown])
    total: FloatArray = np.logaddexp.reduce(each, axis=1)
    return total


def _sure(own: float) -> str | None:
    """The answer that the agent's own evidence proves, if it proves one."""
    return None if np.isfinite(own) else "plus" if own > 0 else "minus"


def _listed(steps: Sequence[int]) -> str:
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
