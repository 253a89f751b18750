"""What a rule looks at, as arguments of a function, and its rows as conditions on them.

An input is the step, what one seen agent shows, one of ``rules.NUMBERS``, which answer came first,
or the name of one seen agent's thresholds. Where it is not a whole number it has a code: the place
of its text in :attr:`Input.names`. So 0, 1, 2 stand for undecided, plus, minus as everywhere.
"""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass

from thumbwright.distill.code.reserved import RESERVED
from thumbwright.distill.exports.rule_csv import (
    SHOWS,
    THRESHOLDS,
    answers_used,
    chosen_form,
    is_valued,
    number_means,
    numbers_used,
    threshold_names,
)
from thumbwright.distill.findings import Findings
from thumbwright.distill.rules import FIRST_ANSWER, FIRST_ANSWERS, NUMBERS, SHOWN, Row, Rule

STEP = "step"
_ID = re.compile(r"[A-Za-z][A-Za-z0-9_-]*")


@dataclass(frozen=True)
class Input:
    """One thing that a rule looks at.

    Attributes
    ----------
    key : str
        What it is called in ``rule.csv``, ends of ranges aside: ``step``, ``upper_shows``,
        ``upper_thresholds``, ``plus_shown``, ``first_answer``.
    argument : str
        The argument of a function: a legal name in every language, given to no other input.
    names : tuple of str
        What it may be, in the order of the codes; empty for a whole number.
    least : int
        Least whole number that it may be.
    meaning : str
        What it is, for people. May hold labels of the case.
    """

    key: str
    argument: str
    names: tuple[str, ...] = ()
    least: int = 0
    meaning: str = ""


@dataclass(frozen=True)
class Within:
    """The condition that a whole number lies within two ends, inclusive; ``None`` is open."""

    argument: str
    least: int | None
    greatest: int | None


@dataclass(frozen=True)
class Among:
    """The condition that a code is one of these, in ascending order."""

    argument: str
    codes: tuple[int, ...]


Condition = Within | Among


@dataclass(frozen=True)
class Part:
    """A rule with the inputs that it looks at: what becomes one function."""

    rule: Rule
    inputs: tuple[Input, ...]

    @property
    def valued(self) -> bool:
        """Whether its rows hold worths (nats), not bars on the own count."""
        return is_valued(self.rule)

    def conditions(self, row: Row) -> tuple[Condition, ...]:
        """All that must hold for a row, in the order of the inputs; none: it always holds."""
        made: list[Condition] = []
        for one in self.inputs:
            if one.names:
                codes = tuple(one.names.index(name) for name in self.accepted(row, one))
                if not codes:
                    raise ValueError(f"a row accepts nothing that {one.key} can be")
                if len(codes) < len(one.names):
                    made.append(Among(one.argument, codes))
            elif one.key == STEP and (row.step_from, row.step_to) != (None, None):
                made.append(Within(one.argument, row.step_from, row.step_to))
            elif row.ranges.get(one.key, (None, None)) != (None, None):
                made.append(Within(one.argument, *row.ranges[one.key]))
        return tuple(made)

    def accepted(self, row: Row, one: Input) -> tuple[str, ...]:
        """Names that a row accepts of an input, in the order of their codes."""
        said = _said_of(row, one.key)
        return one.names if said is None else tuple(name for name in one.names if name in said)


@dataclass(frozen=True)
class Parts:
    """The functions of an exported file: ``value``, where a form holds worths, and ``decide``."""

    value: Part | None
    decide: Part

    @property
    def inputs(self) -> tuple[Input, ...]:
        """All inputs, each once, in the order of the arguments."""
        both = (*(self.value.inputs if self.value else ()), *self.decide.inputs)
        return tuple(sorted(dict.fromkeys(both), key=lambda one: _place(one, self.decide.rule)))


def parts_of(findings: Findings) -> Parts:
    """Return what an exported file does.

    ``decide`` follows the rule that ``rule.csv`` holds; ``value`` the same, if it holds worths,
    else the table or the first form that does.

    Raises
    ------
    ValueError
        If the findings hold no rule, or an id or a name of thresholds that a case may not have.
    """
    decided = chosen_form(findings)
    forms = [
        findings.forms[name].rule for name in ("table", *findings.forms) if name in findings.forms
    ]
    valued = decided if is_valued(decided) else next(filter(is_valued, forms), None)
    rules = [rule for rule in (valued, decided) if rule is not None]
    called, known = _arguments(rules), _names_told_apart(rules, findings)
    return Parts(
        None if valued is None else Part(valued, _inputs(valued, findings, called, known)),
        Part(decided, _inputs(decided, findings, called, known)),
    )


def agents_shown(rule: Rule) -> tuple[str, ...]:
    """Ids of the agents whose shown state decides between rows, in the order of the case."""
    every = frozenset(SHOWN)
    used = {a for row in rule.rows for a, accepted in row.shows.items() if accepted != every}
    return tuple(agent for agent in rule.seen if agent in used)


def agents_named(rule: Rule) -> tuple[str, ...]:
    """Ids of the agents whose thresholds some row looks at, in the order of the case."""
    used = {agent for row in rule.rows for agent in row.thresholds}
    return tuple(agent for agent in rule.seen if agent in used)


def _said_of(row: Row, key: str) -> frozenset[str] | None:
    """Names that the row accepts; ``None`` where it does not look."""
    if key == FIRST_ANSWER:
        return row.first_answer
    for end, looked_at in ((SHOWS, row.shows), (THRESHOLDS, row.thresholds)):
        agent = key.removesuffix(end)
        if agent != key and agent in looked_at:
            return looked_at[agent]
    return None


def _inputs(
    rule: Rule, findings: Findings, called: dict[str, str], known: tuple[str, ...]
) -> tuple[Input, ...]:
    """Return what the rule looks at, the step always first."""
    case = findings.case
    label = f" of {case.time.step_label}" if case.time.step_label else ""
    made = [
        Input(
            STEP,
            STEP,
            least=1,
            meaning=f"own observations so far, this one included (steps{label}); from 1",
        )
    ]
    for agent in agents_shown(rule):
        words = (case.words.shows_nothing, case.words.shows_plus, case.words.shows_minus)
        states = "; ".join(f"{s}: {word}" for s, word in zip(SHOWN, words, strict=True))
        meaning = f"what {case.agents[agent].name} shows now ({states})"
        made.append(Input(agent + SHOWS, called[agent + SHOWS], SHOWN, meaning=meaning))
    made += [
        Input(name, name, meaning=f"{number_means(name)}; from 0") for name in numbers_used(rule)
    ]
    if answers_used(rule):
        meaning = "which answer a seen agent gave first; both: both at that moment"
        made.append(Input(FIRST_ANSWER, FIRST_ANSWER, FIRST_ANSWERS, meaning=meaning))
    for agent in agents_named(rule):
        meaning = f"which thresholds {case.agents[agent].name} has"
        made.append(Input(agent + THRESHOLDS, called[agent + THRESHOLDS], known, meaning=meaning))
    return tuple(made)


def _names_told_apart(rules: Sequence[Rule], findings: Findings) -> tuple[str, ...]:
    """Return the names of thresholds that the rules were made for, in the order of the case."""
    wanted = dict.fromkeys(name for rule in rules for name in threshold_names(rule, findings))
    used = set(findings.case.rule.covers)
    for rule in rules:
        used.update(
            name for row in rule.rows for names in row.thresholds.values() for name in names
        )
    return tuple(safe_id(name) for name in wanted if name in used)


def _arguments(rules: Sequence[Rule]) -> dict[str, str]:
    """Return a name for each agent's state and thresholds that is legal in every language."""
    taken = {STEP, FIRST_ANSWER, *NUMBERS}
    called: dict[str, str] = {}
    for end, tail in ((SHOWS, ""), (THRESHOLDS, THRESHOLDS)):
        for agent in dict.fromkeys(agent for rule in rules for agent in rule.seen):
            name = safe_id(agent).replace("-", "_") + tail
            while name in taken or name.lower() in RESERVED:
                name += "_"
            taken.add(name)
            called[agent + end] = name
    return called


def safe_id(text: str) -> str:
    """Return an id or a name of thresholds as it is.

    Raises
    ------
    ValueError
        If it holds anything but letters, digits, ``-`` and ``_``: it goes into code.
    """
    if not _ID.fullmatch(text):
        raise ValueError(f"{text!r} is no id: a letter, then letters, digits, - and _")
    return text


def _place(one: Input, rule: Rule) -> tuple[int, int]:
    """Where an input stands among the arguments: step, agents, numbers, first answer, names."""
    if one.key == STEP:
        return 0, 0
    if one.key in NUMBERS:
        return 2, NUMBERS.index(one.key)
    if one.key == FIRST_ANSWER:
        return 3, 0
    if one.names == SHOWN:
        return 1, rule.seen.index(one.key.removesuffix(SHOWS))
    return 4, rule.seen.index(one.key.removesuffix(THRESHOLDS))
