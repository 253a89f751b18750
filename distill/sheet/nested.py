"""Rows made by successive cuts as nested sentences: first what to look at, then what follows.

The nesting is found in the rows themselves: where all of them can be told apart by one input, that
input comes first, and each of its cases is split further in the same way.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from functools import partial
from itertools import chain
from typing import Any

from thumbwright.distill.findings import Findings, FormResult, RowUse
from thumbwright.distill.rules import FIRST_ANSWERS, NUMBERS, SHOWN, Row
from thumbwright.distill.sheet.parts import Nested, Sentence
from thumbwright.distill.sheet.voice import Voice
from thumbwright.distill.sheet.words import capital, five, listing

NUMBER_WORDS = {
    "plus_shown": "number showing plus",
    "minus_shown": "number showing minus",
    "undecided_shown": "number showing undecided",
    "steps_since_first": "steps since the first answer",
    "steps_since_last": "steps since the last answer",
    "came_first": "number of agents that answered first",
}
"""What a rule may read off the seen agents, in words."""

Accepted = frozenset[Any]
"""Everything that a row accepts of one input: names, or whole numbers."""

_NOTHING: Accepted = frozenset()


@dataclass(frozen=True)
class _Input:
    """One input: what a row accepts of it, and that in words."""

    accepts: Callable[[Row], Accepted]
    words: Callable[[Accepted], str]


def nested(caption: str, result: FormResult, findings: Findings, voice: Voice) -> Nested:
    """The rows of a form as nested sentences, each row with its worth and its use."""
    leaves = [
        (row, _leaf(number, row, use, findings))
        for number, (row, use) in enumerate(zip(result.rule.rows, result.uses, strict=True))
    ]
    inputs = [*_named_inputs(result.rule.rows, voice), *_counted_inputs(findings)]
    if len(leaves) == 1:
        return Nested(caption, (Sentence(f"Always: {leaves[0][1]}.", ()),))
    return Nested(caption, tuple(_sentences(leaves, inputs)))


def _leaf(number: int, row: Row, use: RowUse, findings: Findings) -> str:
    worth = f"worth {five(row.value)} nats"
    if findings.count_is_whole and findings.alpha and row.value is not None:
        worth += f", {five(row.value / findings.alpha)} in units of the count"
    force = f"in force {five(use.steps_in_force)} steps an outing"
    return f"{worth} (row {number + 1}; {force}, calls {five(use.calls)})"


def _sentences(leaves: Sequence[tuple[Row, str]], inputs: Sequence[_Input]) -> Iterator[Sentence]:
    """One sentence for each case of the first input that tells all these rows apart."""
    for one in inputs:
        accepted = [one.accepts(row) for row, _ in leaves]
        cuts = [
            k
            for k in range(1, len(accepted))
            if not _NOTHING.union(*accepted[:k]) & _NOTHING.union(*accepted[k:])
        ]
        if not cuts:
            continue
        for start, stop in zip([0, *cuts], [*cuts, len(leaves)], strict=True):
            asks = capital(one.words(_NOTHING.union(*accepted[start:stop])))
            if stop - start == 1:
                yield Sentence(f"{asks}: {leaves[start][1]}.", ())
            else:
                yield Sentence(f"{asks}:", tuple(_sentences(leaves[start:stop], inputs)))
        return
    raise ValueError("these rows were not made by successive cuts, lower side first")


def _named_inputs(rows: Sequence[Row], voice: Voice) -> Iterator[_Input]:
    for agent in voice.seen:
        lead = f"where {voice.names[agent]} shows "
        yield _Input(partial(_shows, agent), partial(_names, lead, SHOWN))
    for agent in voice.seen:
        accepted = (sorted(row.thresholds.get(agent, ())) for row in rows)
        names = tuple(dict.fromkeys(chain.from_iterable(accepted)))
        lead = f"where the thresholds of {voice.names[agent]} are "
        if names:
            yield _Input(partial(_thresholds, agent, names), partial(_names, lead, names))
    yield _Input(_first_answer, partial(_names, "where the first answer was ", FIRST_ANSWERS))


def _counted_inputs(findings: Findings) -> Iterator[_Input]:
    horizon = findings.case.time.horizon
    for name in NUMBERS:
        most = horizon if name.startswith("steps") else len(findings.seen)
        yield _Input(partial(_number, name, most), partial(_numbers, NUMBER_WORDS[name], most))
    yield _Input(partial(_step, horizon), partial(_steps, horizon))


def _shows(agent: str, row: Row) -> Accepted:
    return row.shows.get(agent, frozenset(SHOWN))


def _thresholds(agent: str, names: Sequence[str], row: Row) -> Accepted:
    return row.thresholds.get(agent, frozenset(names))


def _first_answer(row: Row) -> Accepted:
    return frozenset(FIRST_ANSWERS) if row.first_answer is None else row.first_answer


def _number(name: str, most: int, row: Row) -> Accepted:
    low, high = row.ranges.get(name, (None, None))
    return frozenset(range(low or 0, (most if high is None else high) + 1))


def _step(horizon: int, row: Row) -> Accepted:
    last = horizon if row.step_to is None else row.step_to
    return frozenset(range(row.step_from or 1, last + 1))


def _steps(horizon: int, accepted: Accepted) -> str:
    low, high = min(accepted), max(accepted)
    if low == high:
        return f"at step {low}"
    return f"from step {low} on" if high == horizon else f"at steps {low} to {high}"


def _names(lead: str, order: Sequence[str], accepted: Accepted) -> str:
    return lead + listing([name for name in order if name in accepted], "or")


def _numbers(lead: str, most: int, accepted: Accepted) -> str:
    low, high = min(accepted), max(accepted)
    if low == high:
        return f"{lead} {low}"
    return f"{lead} {low} or more" if high == most else f"{lead} {low} to {high}"
