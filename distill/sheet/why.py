"""Why an undecided neighbour changes anything: one sentence, from that neighbour's thresholds.

A neighbour that reaches one call sooner than the other says something by having made none. The
sentence is held against the exact worth of everybody being undecided: where that does not bear
out the plain reason (numbers that drift, an uneven prior), it says what the worth does instead.
"""

from __future__ import annotations

import math

from thumbwright.distill.findings import Findings
from thumbwright.distill.rules import Row
from thumbwright.distill.sheet.card import is_quiet
from thumbwright.distill.sheet.parts import Card, Note
from thumbwright.distill.sheet.voice import Voice
from thumbwright.distill.sheet.words import capital, counted, listing, plural, quoted

FAINT = 0.02
"""Worths (nats) this small, or a tenth of the largest, are no news."""


def why(findings: Findings, voice: Voice, card: Card) -> Note | None:
    """Return the remark; nothing where nobody is watched."""
    names: dict[str, list[str]] = {"minus": [], "plus": [], "even": []}
    for agent in voice.seen:
        if agent in findings.leans:
            names[findings.leans[agent]].append(voice.names[agent])
    if not any(names.values()):
        return None
    news = quiet_news(findings)
    text = _reason(names, news, voice)
    words = quoted(voice.shows["undecided"])
    pair = _differing(findings, voice, card)
    if pair is not None:
        (first, base), (second, row) = pair
        moved = _moved(base, row, voice, card)
        return Note(f"Why {second} differs from {first}:", f"{text} So {moved}." if moved else text)
    nothing = not names["minus"] and not names["plus"] and not news
    return Note(f"Why {words} {'changes nothing' if nothing else 'matters'}:", text)


def quiet_news(findings: Findings) -> frozenset[str]:
    """Return for which answers everybody being undecided speaks at some step.

    Without a curve for that state the neighbours' nearer thresholds are taken at their word.
    """
    for curve in findings.worth_curves:
        if curve.plus_and_minus == (0, 0):
            worths = [worth for worth in curve.worth if worth is not None and math.isfinite(worth)]
            faint = max(FAINT, 0.1 * max(map(abs, worths), default=0.0))
            sides = (("plus", max(worths, default=0.0)), ("minus", -min(worths, default=0.0)))
            return frozenset(side for side, most in sides if most > faint)
    other = {"minus": "plus", "plus": "minus"}
    return frozenset(other[lean] for lean in findings.leans.values() if lean in other)


def _reason(names: dict[str, list[str]], news: frozenset[str], voice: Voice) -> str:
    words = quoted(voice.shows["undecided"])
    answers = {"plus": voice.plus, "minus": voice.minus}
    leaning = [lean for lean in ("minus", "plus") if names[lean]]
    expected = {"minus": "plus", "plus": "minus"}
    if len(leaning) < 2 and len(news) == 2:
        everyone = capital(voice.whom([name for some in names.values() for name in some]))
        return (
            f"{everyone}: at some {plural(voice.check)} one call comes sooner, at others the other,"
            f" so {words} speaks now for one answer, now for the other."
        )
    if not leaning:
        start = f"{capital(voice.whom(names['even']))}: as soon to one call as to the other,"
        if not news:
            return f"{start} so {words} says nothing until somebody calls."
        toward = quoted(answers[next(iter(news))])
        return f"{start} yet here {words} for long speaks a little for {toward}."
    if len(leaning) == 1 and expected[leaning[0]] not in news:
        everyone = capital(voice.whom(names[leaning[0]]))
        if not news:
            return f"{everyone}: here {words} says next to nothing until somebody calls."
        toward = quoted(answers[next(iter(news))])
        return f"{everyone}: here {words} for long speaks a little for {toward}."
    acts = {"minus": voice.do_minus, "plus": voice.do_plus}
    said = [
        f"{capital(voice.whom(names[lean]))}: sooner to {quoted(acts[lean])} than to"
        f" {quoted(acts[expected[lean]])}, so {words} for long speaks a little for"
        f" {quoted(answers[expected[lean]])}."
        for lean in leaning
    ]
    if names["even"]:
        said.append(f"{listing(names['even'])}: {words} says nothing until somebody calls.")
    return " ".join(said)


def _differing(
    findings: Findings, voice: Voice, card: Card
) -> tuple[tuple[str, Row], tuple[str, Row]] | None:
    """Return the base line and the last one for an undecided neighbour, if they are two."""
    result = findings.forms.get("lines")
    if result is None or card.kind not in ("strips", "numbers"):
        return None
    lines = zip(card.letter_of_row, result.rule.rows, strict=True)
    quiet = [(letter, row) for letter, row in lines if is_quiet(row, voice)]
    base = next((line for line in quiet if line[1].base), None)
    by_habit = any(row.thresholds for _, row in quiet)
    if base is None or quiet[-1] == base or by_habit:
        return None
    return base, quiet[-1]


def _moved(base: Row, row: Row, voice: Voice, card: Card) -> str:
    """Say how the bars of ``row`` differ from those of ``base``; "" where they do not."""
    noun = "box" if card.kind == "strips" else "sign"
    parts = []
    for act, before, after, lower_is_later in (
        (voice.do_minus, base.minus_at, row.minus_at, True),
        (voice.do_plus, base.plus_at, row.plus_at, False),
    ):
        if before is None or after is None or before == after:
            continue
        later = (after < before) == lower_is_later
        much = counted(abs(after - before), noun)
        parts.append(f"{act} {much} {'later' if later else 'sooner'}")
    return listing(parts)
