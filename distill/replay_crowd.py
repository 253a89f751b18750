"""Following a record of a member of a crowd: what a rule on counts says, and the exact member.

As in ``replay`` both are followed until they answer, and as if the member still showed "undecided".
The exact worth is that of ``exact.crowd_followed``: where answers run round within a step, all the
ways in which its rounds can have added up to what is recorded are weighed together, and the member
is followed at the round of its own observation and at the end of the step.

A rule may look at how many gave the first answer, and which. Where the step in which it came has
several rounds, the record does not say who was first; then the numbers that are most likely under
the prior and what had been shown by the end of that step are taken, once and for all. Where the
model has no such numbers, as the record is impossible, all that came in that step count as first.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field

import numpy as np

from thumbwright.distill.crowd_situations import Counted
from thumbwright.distill.record_reading import Line, Record
from thumbwright.distill.replay_step import WATCH, ExactSays, Judge, RuleSays, Step, listed
from thumbwright.distill.rules import SHOWN, Rule
from thumbwright.distill.signs import Own
from thumbwright.exact.arrays import IntArray
from thumbwright.exact.crowd import Crowd
from thumbwright.exact.crowd_followed import Followed
from thumbwright.exact.group import Group

_PLUS, _MINUS = SHOWN.index("plus"), SHOWN.index("minus")
_FEW = 5
"""So many of the counts that were possible are listed."""


def follow_counts(
    group: Group, crowd: Crowd, agent: str, rule: Rule, record: Record
) -> tuple[tuple[Step, ...], list[str]]:
    """Follow a record.

    Parameters
    ----------
    group : Group
    crowd : Crowd
        The group as a crowd.
    agent : str
        Whose record it is; it makes one observation at every step.
    rule : Rule
        Rows that overlap are taken in order; they look at counts and steps alone.
    record : Record

    Returns
    -------
    tuple of Step, list of str
        The steps, and what in them rests on a convention.

    Raises
    ------
    ModelError
        Where the record may have come about in too many ways.
    ValueError
        If the rule has bars and the agent's own observations make no count.
    """
    walker = _Walker(group, crowd, agent, rule)
    steps = tuple(walker.step(line) for line in record.lines)
    return steps, walker.remarks


@dataclass(frozen=True)
class _Told:
    """What a rule is told of the others; numbers as in ``Counted``."""

    plus: int = 0
    minus: int = 0
    first: int = 0
    last: int = 0
    came: tuple[int, int] = (0, 0)

    def view(self, step: int, others: int) -> Counted:
        """The one situation that this is at a step."""
        shown = (self.plus, self.minus, self.first, self.last, *self.came)
        return Counted(np.array([step]), others, *(np.array([number]) for number in shown))


@dataclass
class _Walker:
    """Where the record stands: what is known so far, and who has answered."""

    group: Group
    crowd: Crowd
    agent: str
    rule: Rule
    told: _Told = field(default_factory=_Told)
    lost: bool = False
    rule_done: bool = False
    exact_done: bool = False
    remarks: list[str] = field(default_factory=list)

    def __post_init__(self) -> None:
        group = self.group
        me = group.agents[group.index[self.agent]]
        self.kind_of = {m: k for k, kind in enumerate(self.crowd.kinds) for m in kind.members}
        self.seen = me.sees
        kind = self.kind_of[self.agent]
        self.followed = Followed(self.crowd, kind, group.prior, group.horizon, group.exchange)
        self.settles = group.exchange == "settle"
        self.own = Own(me.evidence)
        self.judge = Judge(self.own, group.prior, me.thresholds[0][1])

    def step(self, line: Line) -> Step:
        """One line of the record: the look after its observation, and the one that ends it."""
        self.own.observe(line.sign)
        rule, exact, impossible = RuleSays(), ExactSays(), None
        for ends in (False, True) if self.settles else (True,):
            if ends:
                impossible = self._look_across(line) or impossible
            if not self.rule_done:
                rule = self.judge.by_rule(self.rule, self.told.view(line.step, len(self.seen)))
                self.rule_done = rule.does not in (WATCH, None)
            if self.lost and not self.exact_done:
                exact = ExactSays()
            elif not self.exact_done:
                exact, contradiction = self.judge.exactly(self.followed.worth())
                impossible = impossible or contradiction
                self.lost = contradiction is not None
                self.exact_done = not self.lost and exact.does != WATCH
        shown = (self.told.plus, self.told.minus)
        return Step(
            line.step,
            line.sign.name,
            line.states,
            self.own.count,
            self.own.tally,
            rule,
            exact,
            impossible,
            shown,
        )

    def _look_across(self, line: Line) -> str | None:
        """Take in what is shown; says why the model gives it no chance, where that begins."""
        plus, minus = self._by_kind(line)
        # What is used from the next step on was shown at the end of the step before.
        step = line.step if self.settles else line.step - 1
        before, why = self.told, None
        # Once the exact member has answered, only who came first is still of use.
        if not self.lost and not (self.exact_done and before.first):
            why = self._go_on(step, plus, minus)
            self.lost = why is not None
        now = (int(plus.sum()), int(minus.sum()))
        came = (now[0] - before.plus, now[1] - before.minus)
        if any(came) and before.first:
            self.told = _Told(*now, before.first, step, before.came)
        elif any(came):
            self.told = _Told(*now, step, step, self._came_first(came))
        return None if self.exact_done else why

    def _go_on(self, step: int, plus: IntArray, minus: IntArray) -> str | None:
        if not step:
            if not plus.any() and not minus.any():
                return None
            return "the model never lets anybody answer before anything has been observed"
        self.followed.go_on(plus, minus)
        return None if self.followed.ways else self._why_impossible(step, plus, minus)

    def _by_kind(self, line: Line) -> tuple[IntArray, IntArray]:
        """How many others of each kind show plus and minus, shape (K,)."""
        plus, minus = (np.zeros(len(self.crowd.kinds), dtype=np.int64) for _ in range(2))
        if line.counts is not None:
            # The reader lets counts stand only where all others are of one kind.
            others = self.kind_of[self.seen[0]]
            plus[others], minus[others] = line.counts
        for member, state in zip(self.seen, line.states, strict=line.counts is None):
            plus[self.kind_of[member]] += state == _PLUS
            minus[self.kind_of[member]] += state == _MINUS
        return plus, minus

    def _came_first(self, came: tuple[int, int]) -> tuple[int, int]:
        """How many said plus and minus at the moment of the first answer."""
        found = {} if self.lost else self.followed.first_answers()
        first = max(found, key=lambda pair: found[pair]) if found else came
        looks = any(
            "came_first" in row.ranges or row.first_answer is not None for row in self.rule.rows
        )
        if looks and self.settles and sum(came) > 1 and (len(found) != 1):
            if found:
                sure = f"the most likely under the model ({found[first]:.2f})"
            else:
                sure = "all that came in that step, since the model has none"
            self.remarks.append(
                "the record does not say who was first within the step; the rule is told "
                f"{first[0]} plus and {first[1]} minus, {sure}"
            )
        return first

    def _why_impossible(self, step: int, plus: IntArray, minus: IntArray) -> str:
        """What was shown, and what the model would have allowed instead."""
        now = (int(plus.sum()), int(minus.sum()))
        said = (
            f"the model never lets {now[0]} of the others show plus and {now[1]} minus at the end "
            f"of step {step} after all that came before"
        )
        allowed = self.followed.allowed()
        if allowed is None:
            return said
        totals = {(sum(a), sum(b)) for a, b in allowed}
        if now in totals:
            return f"{said}; it would have allowed these numbers, but of other kinds of members"
        return f"{said}; it would have allowed {_counts(totals)}"


def _counts(totals: set[tuple[int, int]]) -> str:
    """Pairs of counts in words, those with one number of minus drawn together."""
    said = []
    for minus in sorted({pair[1] for pair in totals}):
        numbers = _runs(sorted(pair[0] for pair in totals if pair[1] == minus))
        said.append(f"{numbers} plus with {minus} minus")
    more = len(said) - _FEW
    if more > 1:
        said = [*said[:_FEW], f"more, up to {max(b for _, b in totals)} minus"]
    return "; ".join(said)


def _runs(numbers: Sequence[int]) -> str:
    return listed(numbers).split(" ", 1)[1].replace(" and ", " or ")
