"""From rows to the text of code: what each language calls things, and what its template is given.

The templates get finished text, in which only ids, names of thresholds, numbers and the states of
the program stand; labels of the case are in the head comment alone.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any

from thumbwright.distill.code import samples
from thumbwright.distill.code.head import head
from thumbwright.distill.code.inputs import Condition, Input, Part, Parts, Within, parts_of
from thumbwright.distill.code.samples import Sample
from thumbwright.distill.findings import Findings
from thumbwright.distill.rules import FIRST_ANSWERS, SHOWN, Row
from thumbwright.distill.sheet.templates import rendered
from thumbwright.exact.walk import TIE


@dataclass(frozen=True)
class Spelling:
    """How a language writes what a rule needs.

    Attributes
    ----------
    language : str
    file : str
        Name of the file; its template is called the same, with ``.j2``.
    comment : str
        What begins a line that is a comment.
    constant : str
        What the names of the constants for states begin with.
    equals, both, either, always, infinity : str
        Equal; and; or; true; a number beyond all others.
    brackets : bool
        Whether each comparison needs brackets.
    values, answers : str
        What the functions give, for the head comment.
    alone : str
        The command that runs the file's own check.
    names_as_codes : bool
        Whether states are handed over as constants rather than as text.
    """

    language: str
    file: str
    comment: str
    constant: str
    equals: str
    both: str
    either: str
    always: str
    infinity: str
    brackets: bool
    values: str
    answers: str
    alone: str
    names_as_codes: bool = False

    def number(self, number: float) -> str:
        """Write the shortest decimal that reads back as the same double, or a whole number.

        Raises ValueError for what is not a number.
        """
        if isinstance(number, int):
            return str(number)
        if math.isnan(number):
            raise ValueError("a worth that is not a number cannot be written")
        if math.isinf(number):
            return self.infinity if number > 0 else f"-{self.infinity}"
        return repr(float(number) + 0.0)

    def code(self, one: Input, code: int) -> str:
        """Write the code of one of an input's names."""
        if one.names in (SHOWN, FIRST_ANSWERS):
            return self.constant + one.names[code].upper()
        if self.names_as_codes:
            return f"{self.constant}HAS_{one.names[code].replace('-', '_')}"
        return str(code)

    def given(self, one: Input, given: int | str) -> str:
        """Write what is handed over for an input."""
        if isinstance(given, int):
            return str(given)
        return self.code(one, one.names.index(given)) if self.names_as_codes else f'"{given}"'

    def condition(self, condition: Condition, inputs: dict[str, Input]) -> str:
        """Write one condition."""
        name = condition.argument
        if isinstance(condition, Within):
            ends = ((">=", condition.least), ("<=", condition.greatest))
            said = [f"{name} {sign} {end}" for sign, end in ends if end is not None]
            return self.both.join(map(self._bracketed, said))
        said = [f"{name} {self.equals} {self.code(inputs[name], c)}" for c in condition.codes]
        joined = self.either.join(map(self._bracketed, said))
        return f"({joined})" if len(said) > 1 else joined

    def _bracketed(self, text: str) -> str:
        return f"({text})" if self.brackets else text


def spelled(findings: Findings, spelling: Spelling) -> dict[str, str | bytes]:
    """Return the exported file of a language, by its name."""
    parts = parts_of(findings)
    signatures = _signatures(parts, spelling)
    lines = head(findings, parts, spelling.language, spelling.alone, signatures)
    decided = samples.answers(parts.decide, findings)
    values = {
        "head": [f"{spelling.comment} {line}".rstrip() for line in lines],
        "value": None,
        "decide": _function(parts.decide, decided, spelling),
        "by_worth": parts.decide.valued,
        "states": SHOWN,
        "answers": FIRST_ANSWERS if any(i.names == FIRST_ANSWERS for i in parts.inputs) else None,
        "thresholds": _thresholds(parts, spelling),
        "prior": spelling.number(findings.prior),
        "minus_at": spelling.number(findings.bounds[0]),
        "plus_at": spelling.number(findings.bounds[1]),
        "tie": spelling.number(TIE),
    }
    if parts.value is not None:
        values["value"] = _function(parts.value, samples.worths(parts.value, findings), spelling)
    template = f"{spelling.file}.j2"
    return {spelling.file: rendered(template, values, autoescape=False)}


def _function(part: Part, checks: tuple[Sample, ...], spelling: Spelling) -> dict[str, Any]:
    """What a template is told of one function."""
    inputs = {one.argument: one for one in part.inputs}
    rows = []
    for row in part.rule.rows:
        made = [spelling.condition(condition, inputs) for condition in part.conditions(row)]
        rows.append({"when": spelling.both.join(made) or spelling.always, **_then(row, spelling)})
    return {
        "inputs": [
            {
                "argument": one.argument,
                "whole": not one.names,
                "least": one.least,
                "most": len(one.names) - 1,
                "kind": _kind(one),
            }
            for one in part.inputs
        ],
        "arguments": list(inputs),
        "rows": rows,
        "checks": [
            {
                "given": [
                    spelling.given(*pair) for pair in zip(part.inputs, one.given, strict=True)
                ],
                "tally": None if one.tally is None else spelling.number(one.tally),
                "expected": one.expected
                if isinstance(one.expected, str)
                else spelling.number(one.expected),
            }
            for one in checks
        ],
    }


def _then(row: Row, spelling: Spelling) -> dict[str, str | None]:
    worth = None if row.value is None else spelling.number(float(row.value))
    bars = {"minus_at": row.minus_at, "plus_at": row.plus_at}
    return {"worth": worth} | {k: None if bar is None else str(int(bar)) for k, bar in bars.items()}


def _kind(one: Input) -> str:
    """Which list of names an input takes its codes from."""
    return {(): "whole", SHOWN: "states", FIRST_ANSWERS: "answers"}.get(one.names, "thresholds")


def _thresholds(parts: Parts, spelling: Spelling) -> list[tuple[str, str]] | None:
    """Names of thresholds, each with how the language writes its code."""
    for one in parts.inputs:
        if _kind(one) == "thresholds":
            return [(name, spelling.code(one, code)) for code, name in enumerate(one.names)]
    return None


def _signatures(parts: Parts, spelling: Spelling) -> tuple[str, ...]:
    said = []
    if parts.value is not None:
        arguments = ", ".join(one.argument for one in parts.value.inputs)
        said.append(
            f"value({arguments}): what the situation is worth, in nats: what it adds to the"
            f" log-odds for plus. {spelling.values}"
        )
    arguments = ", ".join(one.argument for one in parts.decide.inputs)
    said.append(f"decide(tally, {arguments}): what to show. {spelling.answers}")
    return tuple(said)
