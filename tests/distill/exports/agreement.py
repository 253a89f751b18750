"""One set of situations, and what every way of running a rule must answer there.

To add an engine, write a function

    def run(folder: Path, findings: Findings, asked: Asked) -> Answers

that puts every situation of ``asked.situations`` to the rule in ``folder`` (the files that the
exports wrote, one of them perhaps deliberately spoilt) and returns, in the same order,

- ``values``: the worth in nats (a float), ``None`` where the rule has no row; or, for the whole
  list, ``None`` if the engine has no worths to give;
- ``answers``: "plus", "minus", "undecided", ``None`` where the rule has no row; likewise.

Then make it an :class:`Engine` and add it to ``ENGINES`` of ``test_agreement.py``, with one or
more ``spoils``: how to change one number and one comparison of its file, which must be noticed.
A situation is the agent's own ``tally`` (whole where ``asked.parts.decide`` holds bars, else
nats) and ``given``, what each input is by its key in ``rule.csv`` (``step``, ``upper_shows``,
``upper_thresholds``, ``plus_shown``, ``first_answer``). ``asked.parts.value.inputs`` and
``asked.parts.decide.inputs`` say which inputs each rule looks at, and their allowed names.
Many situations differ in the tally alone: where asking is slow, put each of
``asked.distinct(part)`` once.
"""

from __future__ import annotations

import itertools
import math
import random
import re
from collections import Counter
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from functools import cached_property
from pathlib import Path
from typing import Any

from thumbwright.distill.code.inputs import STEP, Input, Part, Parts, parts_of
from thumbwright.distill.code.told import row_in
from thumbwright.distill.findings import Findings
from thumbwright.distill.rules import Row, Rule
from thumbwright.exact.walk import TIE

Given = dict[str, int | str]
Value = float | None
Answer = str | None

RANDOM = 2000
MOST_DISTINCT = 4_000

ran: Counter[str] = Counter()
"""How many answers of each engine were compared in this run; told when the tests close."""


@dataclass(frozen=True)
class Situation:
    """What a rule is asked: the own tally, and what each input is."""

    tally: float
    given: Given


@dataclass(frozen=True)
class Answers:
    """What an engine said, one entry per situation; ``None`` for what it does not do."""

    values: Sequence[Value] | None = None
    answers: Sequence[Answer] | None = None


@dataclass(frozen=True)
class Asked:
    """The situations of one rule, and what it looks at.

    ``complete`` says that every distinct situation is among them: every combination of names and
    of stretches of numbers between which no row changes.
    """

    parts: Parts
    situations: tuple[Situation, ...]
    complete: bool

    @cached_property
    def keys(self) -> tuple[str, ...]:
        return tuple(one.key for one in self.parts.inputs)

    def given_to(self, part: Part) -> list[tuple[int | str, ...]]:
        """What each situation gives to one part, in the order of its inputs."""
        keys = [one.key for one in part.inputs]
        return [tuple(s.given[key] for key in keys) for s in self.situations]

    def distinct(self, part: Part) -> list[tuple[int | str, ...]]:
        """The same, each once, in the order in which they come up."""
        return list(dict.fromkeys(self.given_to(part)))


Run = Callable[[Path, Findings, Asked], Answers]


@dataclass(frozen=True)
class Spoil:
    """How to change a file so that its rule is another one: what to find, and what to put.

    ``on`` names the findings of ``hand_built.py`` whose file is spoilt.
    """

    what: str
    pattern: str
    replacement: str
    on: str = "bars"

    def applied(self, text: str) -> str:
        changed, times = re.subn(self.pattern, self.replacement, text, count=1)
        assert times == 1, f"nothing to spoil: {self.pattern}"
        assert changed != text
        return changed


@dataclass(frozen=True)
class Engine:
    """One way of running a rule.

    Attributes
    ----------
    name : str
    file : str
        The export that it reads, which is spoilt in turn.
    run : Run
    spoils : tuple of Spoil
        Mostly for "bars", whose first row is step 2 or less, upper undecided: -3, 3.
    ulps : int
        By how many units in the last place a worth may be off: 0 but for R, whose parser of
        decimals is documented to be off by as much.
    missing : callable
        Why it cannot run here, or an empty text.
    skips : tuple of str
        Findings that it cannot run, by name (such as infinite worths).
    """

    name: str
    file: str
    run: Run
    spoils: tuple[Spoil, ...] = ()
    ulps: int = 0
    missing: Callable[[], str] = lambda: ""
    skips: tuple[str, ...] = ()


def asked_of(findings: Findings, seed: int = 20261201, times: int = RANDOM) -> Asked:
    """Every distinct situation of the rule, and random ones with many at the edges."""
    parts = parts_of(findings)
    edges = {one.key: _edges(one, parts, findings) for one in parts.inputs}
    axes = edges
    if math.prod(len(edge) for edge in edges.values()) > MOST_DISTINCT:
        axes = {one.key: _firsts(one, parts, findings) for one in parts.inputs}
    complete = math.prod(len(axis) for axis in axes.values()) <= MOST_DISTINCT
    situations: list[Situation] = []
    for chosen in itertools.product(*axes.values()) if complete else ():
        given = dict(zip(axes, chosen, strict=True))
        situations += [Situation(tally, given) for tally in _tallies(parts.decide, given, findings)]
    chance = random.Random(seed)
    for _ in range(times):
        given = {one.key: _any(one, edges[one.key], findings, chance) for one in parts.inputs}
        tallies = _tallies(parts.decide, given, findings)
        loose: float = chance.randint(-12, 12)
        if parts.decide.valued:
            loose += round(chance.random(), 6)
        situations.append(Situation(chance.choice([*tallies, loose]), given))
    return Asked(parts, tuple(situations), complete)


def in_memory(_folder: Path, findings: Findings, asked: Asked) -> Answers:
    """The rule itself, by ``views.rows_in``: what all others are held against."""
    value, decide = asked.parts.value, asked.parts.decide
    return Answers(
        None if value is None else [None if r is None else r.value for r in _held(value, asked)],
        [
            None if row is None else answer(decide, row, situation.tally, findings)
            for row, situation in zip(_held(decide, asked), asked.situations, strict=True)
        ],
    )


def answer(part: Part, row: Row, tally: float, findings: Findings) -> str:
    """What an agent with this own tally answers where this row holds."""
    if part.valued:
        assert row.value is not None
        belief = findings.prior + tally + row.value
        plus, minus = belief >= findings.bounds[1] - TIE, belief <= findings.bounds[0] + TIE
    else:
        plus = row.plus_at is not None and tally >= row.plus_at
        minus = row.minus_at is not None and tally <= row.minus_at
    return "plus" if plus else "minus" if minus else "undecided"


def disagreements(expected: Answers, got: Answers, asked: Asked, engine: Engine) -> list[str]:
    """Say where an engine answers otherwise, the first few; and count what was compared."""
    found: list[str] = []
    compared = 0
    for what in ("values", "answers"):
        wanted, said = getattr(expected, what), getattr(got, what)
        if wanted is None or said is None:
            continue
        assert len(said) == len(asked.situations), f"{engine.name}: {len(said)} {what}"
        compared += len(said)
        for situation, one, other in zip(asked.situations, wanted, said, strict=True):
            if not _same(one, other, engine.ulps):
                found.append(f"{engine.name}: {what}: {situation}: {other!r}, not {one!r}")
    assert compared, f"{engine.name} answered nothing"
    ran[engine.name] += compared
    return found


def _same(one: Value | Answer, other: Value | Answer, ulps: int) -> bool:
    if isinstance(one, float) and isinstance(other, float) and math.isfinite(one):
        return abs(one - other) <= ulps * math.ulp(one)
    return one == other


def first_row(rule: Rule, given: dict[str, Any]) -> Row | None:
    """The first row that holds, by nothing but comparisons."""
    for row in rule.rows:
        ends = {"step": (row.step_from, row.step_to), **row.ranges}
        named = {f"{a}_shows": s for a, s in row.shows.items()}
        named |= {f"{a}_thresholds": s for a, s in row.thresholds.items()}
        if row.first_answer is not None:
            named["first_answer"] = row.first_answer
        if all(
            (least is None or given[key] >= least) and (most is None or given[key] <= most)
            for key, (least, most) in ends.items()
        ) and all(given[key] in names for key, names in named.items() if key in given):
            return row
    return None


def _held(part: Part, asked: Asked) -> list[Row | None]:
    keys = [one.key for one in part.inputs]
    known: dict[tuple[int | str, ...], Row | None] = {}
    for given in asked.distinct(part):
        number = row_in(part.rule, dict(zip(keys, given, strict=True)))
        known[given] = None if number is None else part.rule.rows[number]
    return [known[given] for given in asked.given_to(part)]


def _edges(one: Input, parts: Parts, findings: Findings) -> list[int] | list[str]:
    """Every name; or the least number, each number at which a row begins, and the neighbours."""
    if one.names:
        return list(one.names)
    firsts = [int(first) for first in _firsts(one, parts, findings)]
    return sorted({first + by for first in firsts for by in (-1, 0, 1) if first + by >= one.least})


def _firsts(one: Input, parts: Parts, findings: Findings) -> list[int] | list[str]:
    """Every name; or the least number of each stretch in which no row begins or ends."""
    if one.names:
        return list(one.names)
    firsts: set[int] = {one.least}
    if one.key == STEP:
        firsts.add(findings.case.time.horizon + 1)
    for part in (parts.value, parts.decide):
        for row in () if part is None else part.rule.rows:
            pair = (row.step_from, row.step_to) if one.key == STEP else row.ranges.get(one.key)
            least, greatest = pair or (None, None)
            firsts |= set() if least is None else {max(one.least, least)}
            firsts |= set() if greatest is None else {greatest + 1}
    return sorted(firsts)


def _any(
    one: Input, edge: Sequence[int | str], findings: Findings, chance: random.Random
) -> int | str:
    if one.names or chance.random() < 0.5:
        return chance.choice(edge)
    return chance.randint(one.least, 2 * findings.case.time.horizon)


def _tallies(part: Part, given: Given, findings: Findings) -> list[float]:
    """Each bar of the row that holds and its neighbours, or tallies about the thresholds."""
    row = first_row(part.rule, given) or Row()
    if not part.valued:
        bars = [bar for bar in (row.minus_at, row.plus_at) if bar is not None]
        return sorted({0, *(bar + by for bar in bars for by in (-1, 0, 1))})
    if row.value is None or math.isinf(row.value):
        return [0.0, -2.5]
    by = (-1e-6, -2e-9, -1e-10, 0.0, 1e-10, 2e-9, 1e-6)
    return [b - findings.prior - row.value + d for b in findings.bounds for d in by]
