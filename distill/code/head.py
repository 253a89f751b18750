"""The comment at the head of an exported file: what it is, the caution, the cost, the arguments.

Labels of the case stand here and nowhere else in the code, and only after :func:`quiet`.
"""

from __future__ import annotations

import textwrap
import unicodedata

from thumbwright.distill.cautions import cautions
from thumbwright.distill.code.inputs import Part, Parts
from thumbwright.distill.exports.rule_csv import THRESHOLDS
from thumbwright.distill.findings import Figures, Findings
from thumbwright.distill.rules import SHOWN

_WIDTH = 92
_MOST_NAMED = 8
_APART = ("*/", "/*", "??", "</")
"""Pairs that end or begin a comment, or stand for another character, in one language or another."""


def quiet(text: str) -> str:
    """Return ``text`` on one line, with nothing in it that means anything within a comment.

    White space becomes single spaces. Control characters, those that change the direction of
    writing or are not seen, and the backslash, which joins lines in C, are written as
    ``[U+005C]``; pairs that end a comment are set apart.
    """
    line = "".join(c if _harmless(c) else f"[U+{ord(c):04X}]" for c in " ".join(text.split()))
    for pair in _APART:
        while pair in line:
            line = line.replace(pair, " ".join(pair))
    return line


def _harmless(character: str) -> bool:
    if character in " \\":
        return character == " "
    return unicodedata.category(character)[0] not in "CZ"


def head(
    findings: Findings, parts: Parts, language: str, alone: str, signatures: tuple[str, ...]
) -> tuple[str, ...]:
    """Return the lines of the comment, without what marks them as one.

    Parameters
    ----------
    findings : Findings
    parts : Parts
    language : str
        What the file is written in.
    alone : str
        The command that runs the file's own check.
    signatures : tuple of str
        How the language says what each function takes and gives.
    """
    # The first two lines hold no label: Python looks there for the encoding of the file.
    lines = [
        f"A rule of thumb for one watcher, as {language}. A calculation, made by thumbwright: read",
        "the caution and the cost below before you use it.",
        "",
    ]
    for title, paragraphs in (
        ("", _what(findings)),
        ("CAUTION", tuple(cautions(findings.case.question.stakes))),
        ("COST", _cost(findings)),
        ("FUNCTIONS", signatures),
        ("ARGUMENTS", _arguments(findings, parts)),
        (
            "CHECK",
            (f"{alone} runs the situations at the end of the file; exit status 1: mismatch.",),
        ),
    ):
        lines += [title] if title else []
        for paragraph in paragraphs:
            lines += _wrapped(quiet(paragraph))
        if title == "COST":
            lines += ["", *_table(findings, parts)]
        lines.append("")
    return tuple(lines[:-1])


def _wrapped(paragraph: str) -> list[str]:
    return textwrap.wrap(
        paragraph,
        _WIDTH,
        subsequent_indent="  ",
        break_long_words=False,
        break_on_hyphens=False,
    )


def _what(findings: Findings) -> tuple[str, ...]:
    case = findings.case
    seen = [f"{case.agents[agent].name} ({agent})" for agent in findings.seen]
    if len(seen) > _MOST_NAMED:
        seen = [f"{len(seen)} others"]
    watching = f", watching {', '.join(seen) or 'nobody'}"
    whose = f"{case.agents[findings.agent].name} ({findings.agent})"
    if case.rule.agent == "any":
        whose = f"any of the group, all being alike: here {whose}"
    return (
        f"Case: {case.title}",
        f"Case {case.name}, digest {findings.digest}; thumbwright {findings.version}.",
        f"For {whose}{watching}.",
        f"plus: {case.question.plus}",
        f"minus: {case.question.minus}",
        f"Worked out for steps 1 to {case.time.horizon}. At later steps the rows that are open at"
        " the end still hold, but nothing was worked out or priced there.",
    )


def _cost(findings: Findings) -> tuple[str, ...]:
    said = [
        "Share of outings that end in a wrong answer, given that plus or that minus is true, and"
        " the mean number of steps used, where this agent alone uses the rule and the others are"
        " exact. It holds for this very rule: price it again after any change."
    ]
    if not findings.is_exact:
        said.append(" ".join(("Not every figure is exact.", *findings.caveats)))
    return tuple(said)


def _table(findings: Findings, parts: Parts) -> list[str]:
    forms = {parts.decide.rule.form: "decide()"}
    if parts.value is not None:
        form = parts.value.rule.form
        forms[form] = f"{forms[form]}, by value()" if form in forms else "answering by value()"
    ways: list[tuple[str, Figures]] = [
        (name, findings.forms[form].figures) for form, name in forms.items()
    ]
    ways += [
        ("the full calculation", findings.exact),
        ("undecided neighbours ignored", findings.plain_count),
        ("everybody ignored", findings.alone),
    ]
    lines = [f"{'':30}{'wrong, plus true':>18}{'wrong, minus true':>19}{'mean steps':>12}"]
    lines += [
        f"{name:30}{f.wrong_given_plus:18.4f}{f.wrong_given_minus:19.4f}{f.mean_step:12.2f}"
        for name, f in ways
    ]
    return lines


def _arguments(findings: Findings, parts: Parts) -> tuple[str, ...]:
    said = [f"tally: {tally_means(findings, parts.decide)}"]
    for one in parts.inputs:
        meaning = one.meaning
        if one.key.endswith(THRESHOLDS) and one.names != SHOWN:
            known = ", ".join(f"{code} {name}" for code, name in enumerate(one.names))
            meaning = f"{meaning}: {known}"
        said.append(f"{one.argument}: {meaning}")
    return tuple(said)


def tally_means(findings: Findings, part: Part) -> str:
    """Say what an agent hands over as its tally, and in which unit."""
    if not part.valued:
        words = findings.case.words
        own = {"plus": words.plus_sign, "minus": words.minus_sign}
        labels = [own.get(label, label) for label in findings.labels]
        moves = zip(labels, findings.value_offsets or (), strict=False)
        listed = ", ".join(f"{label} {offset:+d}" for label, offset in moves)
        return "the own count: a whole number, the sum over all own observations" + (
            f" of what each moves it ({listed})" if listed else ""
        )
    said = (
        "the own evidence in nats, the prior left out: the sum over all own observations of the"
        " natural logarithm of how much likelier each is if plus is true"
    )
    if findings.count_is_whole and findings.alpha is not None and findings.beta is not None:
        said += f" (here {findings.alpha:.13g} * own count"
        said += f" + {findings.beta:.13g} * step)" if findings.beta else ")"
    return said.replace("+ -", "- ")
