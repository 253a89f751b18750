"""Situations with their answers, for the check that an exported file makes of itself.

Each row gives two: the least and the greatest of everything that it accepts. With them stand the
tallies on both sides of where the row, or the agent's thresholds, call for an answer.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

from thumbwright.distill.code.inputs import STEP, Input, Part
from thumbwright.distill.code.told import row_in
from thumbwright.distill.findings import Findings
from thumbwright.distill.rules import Row
from thumbwright.exact.walk import TIE

BESIDE = 1e-6
"""How far from a threshold (nats): far beyond rounding, and beyond what counts as a tie."""

_MORE = 3
"""How far above its least number a row without a greatest one is asked."""


@dataclass(frozen=True)
class Sample:
    """One situation: its inputs in the order of the arguments, and what is to come of it.

    ``tally`` is ``None`` for a worth; ``expected`` is a worth (nats) or an answer.
    """

    given: tuple[int | str, ...]
    tally: float | None
    expected: float | str


def worths(part: Part, findings: Findings) -> tuple[Sample, ...]:
    """Samples of what a situation is worth."""
    samples = []
    for given, row in _corners(part, findings):
        assert row.value is not None
        samples.append(Sample(given, None, row.value))
    return tuple(dict.fromkeys(samples))


def answers(part: Part, findings: Findings) -> tuple[Sample, ...]:
    """Samples of what is answered."""
    samples = [
        Sample(given, tally, answer(part, row, tally, findings))
        for number, (given, row) in enumerate(_corners(part, findings))
        for tally in _tallies(part, row, findings, up=number % 2 == 1)
    ]
    return tuple(dict.fromkeys(samples))


def answer(part: Part, row: Row, tally: float, findings: Findings) -> str:
    """What the agent shows with this own tally where this row holds."""
    if part.valued:
        assert row.value is not None
        belief = findings.prior + tally + row.value
        low, high = findings.bounds[0] + TIE, findings.bounds[1] - TIE
    else:
        belief = tally
        low = -math.inf if row.minus_at is None else row.minus_at
        high = math.inf if row.plus_at is None else row.plus_at
    return "plus" if belief >= high else "minus" if belief <= low else "undecided"


def _corners(part: Part, findings: Findings) -> list[tuple[tuple[int | str, ...], Row]]:
    """Least and greatest situation of each row, with the row that holds there."""
    found = []
    for row in part.rule.rows:
        for last in (False, True):
            given = {one.key: _end(one, part, row, findings, last) for one in part.inputs}
            number = row_in(part.rule, given)
            if number is not None:
                found.append((tuple(given.values()), part.rule.rows[number]))
    return found


def _end(one: Input, part: Part, row: Row, findings: Findings, last: bool) -> int | str:
    if one.names:
        names = part.accepted(row, one)
        return names[-1 if last else 0]
    if one.key == STEP:
        least, greatest = row.step_from, row.step_to
        open_end = max(findings.case.time.horizon, least or 1)
    else:
        least, greatest = row.ranges.get(one.key, (None, None))
        open_end = (least or 0) + _MORE
    if not last:
        return max(one.least, one.least if least is None else least)
    return open_end if greatest is None else greatest


def _tallies(part: Part, row: Row, findings: Findings, up: bool) -> tuple[float, ...]:
    """Just short of an answer, and enough for it: of minus, or, with ``up``, of plus."""
    if part.valued:
        assert row.value is not None
        if math.isinf(row.value):
            return (0.0,)
        level = findings.bounds[1 if up else 0] - findings.prior - row.value
        by = (-BESIDE, BESIDE) if up else (BESIDE, -BESIDE)
        return tuple(float(f"{level + step:.12g}") for step in by)
    bar = row.plus_at if up else row.minus_at
    if bar is None:
        return (0,)
    return (bar - 1, bar) if up else (bar + 1, bar)
