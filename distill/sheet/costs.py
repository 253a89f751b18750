"""What the card costs, in counts of a hundred, and a made-up run through it."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from thumbwright.distill.findings import Figures, Findings
from thumbwright.distill.sheet.card import peg_words, short_act
from thumbwright.distill.sheet.counted import tally_of
from thumbwright.distill.sheet.doubts import doubts_front
from thumbwright.distill.sheet.parts import Card, Grid
from thumbwright.distill.sheet.voice import Counting, Voice
from thumbwright.distill.sheet.words import capital, of_hundred, quoted

MOST_COLUMNS = 3
"""Agents watched that each get a column of the example."""


def ways(findings: Findings, voice: Voice) -> tuple[tuple[str, Figures], ...]:
    """Return the ways of playing that page 1 compares, the card first."""
    result = findings.forms.get("lines") or findings.forms.get("table")
    if result is None:
        result = next(iter(findings.forms.values()))
    name = "this card" if "lines" in findings.forms else "this sheet"
    together = [] if result.everybody is None else [("if everybody uses it", result.everybody)]
    return (
        (name, result.figures),
        *together,
        ("full calculation", findings.exact),
        (f"{quoted(voice.shows['undecided'])} ignored", findings.plain_count),
        ("everybody ignored", findings.alone),
    )


def costs(findings: Findings, voice: Voice) -> Grid:
    """Return the table of wrong calls of both kinds and the average check.

    A column for no call at all is added where that happens at least once in 100 outings.
    """
    prior = findings.case.question.prior_plus
    rows = []
    late = [
        prior * figures.given_plus["undecided"] + (1 - prior) * figures.given_minus["undecided"]
        for _, figures in ways(findings, voice)
    ]
    shows_late = max(late) >= 0.01
    for (name, figures), undecided in zip(ways(findings, voice), late, strict=True):
        row = [
            name,
            of_hundred(figures.wrong_given_plus),
            of_hundred(figures.wrong_given_minus),
        ]
        if shows_late:
            row.append(of_hundred(undecided))
        row.append(str(max(1, round(figures.mean_step))))
        rows.append(tuple(row))
    head = ["", *(f"if {quoted(truth)}" for truth in (voice.plus, voice.minus))]
    if shows_late:
        head.append("no call, of 100")
    head.append(f"average {voice.check}")
    return Grid(
        "How often the call is wrong, and when it is made",
        tuple(head),
        tuple(rows),
        frozenset({0}),
    )


def cost_note(findings: Findings, voice: Voice) -> str:
    """Say where watching is worth nothing, the card worse than that, or would be; else ""."""
    said = []
    if not findings.watching_is_worth:
        said.append("Here watching is worth next to nothing.")
    name, figures = ways(findings, voice)[0]
    if figures.worse_than(findings.alone):
        said.append(f"{capital(name)} is worse than ignoring everybody.")
    return " ".join(said) or doubts_front(findings)


def example(findings: Findings, voice: Voice, counting: Counting, card: Card) -> Grid | None:
    """Return the made-up run as a table, or nothing where the job found none to show."""
    steps = findings.example
    if not steps:
        return None
    if len(voice.seen) == 1:
        seen_heads = [capital(voice.thing) if voice.thing else voice.seen_names[0]]
    elif len(voice.seen) <= MOST_COLUMNS:
        seen_heads = list(voice.seen_names)
    else:
        seen_heads = ["Shown"]
    kept = "Number" if counting.tally else "Peg"
    head = (capital(voice.check), *seen_heads, "Sign", kept, "Do")
    result = findings.forms.get("lines")
    by_count = result is not None and not result.rule.is_grid
    rows = tuple(_example_row(step, voice, counting, card, by_count) for step in steps)
    marked = frozenset(place for place, step in enumerate(steps) if step["act"] != "watch")
    return Grid("A made-up example, line by line", head, rows, marked)


def _example_row(
    step: Mapping[str, Any], voice: Voice, counting: Counting, card: Card, by_count: bool
) -> tuple[str, ...]:
    signs = {"plus": voice.plus_short, "minus": voice.minus_short}
    sign = signs.get(step["sign"], str(step["sign"]))
    shown = tuple(voice.shows_short[step["shows"][agent]] for agent in voice.seen)
    if len(voice.seen) > MOST_COLUMNS:
        shows = {agent: step["shows"][agent] for agent in voice.seen}
        each = {agent: frozenset({state}) for agent, state in shows.items()}
        shown = (tally_of(shows, voice) if by_count else voice.situation(each),)
    act = f"{card.letter_of_row[step['line']]}: {short_act(step['act'], voice)}"
    peg = peg_words(step["peg"], voice, counting).replace(" ", "\u00a0")
    return (str(step["step"]), *shown, sign, peg, act)
