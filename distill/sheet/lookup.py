"""The look-up: the rule of the card as plain data that a script in the page can ask.

Whatever is asked for becomes an entry of ``asks``: a whole number, one of some options, or a count
that follows from other entries. A row says for each entry what it accepts, in the same order, so
that finding the row is one comparison per entry. Nothing here is rounded; numbers are those of
the rule.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

from thumbwright.distill.exports.rule_csv import SHOWS, THRESHOLDS
from thumbwright.distill.findings import Findings
from thumbwright.distill.rules import FIRST_ANSWERS, NUMBERS, SHOWN, Row, Rule
from thumbwright.distill.sheet.card import NEVER, at_or_above, at_or_below, heading, scale
from thumbwright.distill.sheet.counted import SHOWN_BY, asked, first_answer
from thumbwright.distill.sheet.parts import Ask, Card, Lookup
from thumbwright.distill.sheet.voice import Counting, Voice
from thumbwright.distill.sheet.words import capital, clean, letters, odds_in_words, told
from thumbwright.exact.walk import TIE

MOST_ON_A_SLIDER = 2000


@dataclass(frozen=True)
class _Entry:
    """One entry of what is asked for.

    ``what`` is "step", "shows", "thresholds", "number", "first_answer" or "sure"; ``of`` the id
    of an agent or the name of a number. ``ask`` is what the page shows; None where the number
    follows from what the agents at the places ``over`` show, ``option`` being the state counted.
    """

    what: str
    of: str = ""
    ask: Ask | None = None
    names: tuple[str, ...] = ()
    option: int = 0
    over: tuple[int, ...] = ()

    @property
    def key(self) -> str:
        """What the entry is called in ``rule.csv``, ends of ranges aside."""
        ends = {"shows": SHOWS, "thresholds": THRESHOLDS}
        return self.of + ends.get(self.what, "") if self.of else self.what


def lookup(findings: Findings, voice: Voice, counting: Counting, card: Card) -> Lookup:
    """Build the look-up for the rule that is printed on the card."""
    result = findings.forms.get("lines") or findings.forms.get("table")
    if result is None:
        result = next(iter(findings.forms.values()))
    rule = result.rule
    entries = _entries(rule, voice)
    rows = [_row(row, place, entries, voice, counting, card) for place, row in enumerate(rule.rows)]
    kind, least, most = _scale(rule, findings, counting)
    fewer, more, again = _buttons(kind, voice, counting)
    whole = kind != "worth"
    data = {
        "asks": [_record(entry) for entry in entries],
        "rows": rows,
        "alone": _alone(rule, findings, entries, voice, counting, card),
        "unsure": next((n for n, entry in enumerate(entries) if entry.what == "sure"), None),
        "bars": rule.has_bars,
        "flipped": counting.flipped,
        "own": None if rule.has_bars else _own(findings),
        "least": least,
        "most": most,
        "pegs": {"minus": voice.minus_short, "plus": voice.plus_short} if kind == "peg" else None,
        "says": _says(voice),
    }
    return Lookup(
        heading="Look it up",
        intro=(
            "Set what holds now and read what to do. An alarm, an order or plain evidence comes"
            " first, here as on the rest of the sheet."
        ),
        asks=tuple(entry.ask for entry in entries if entry.ask is not None),
        kind=kind,
        own=_own_label(kind),
        least=least if whole else 0,
        most=most if whole else 0,
        fewer=fewer,
        more=more,
        again=again,
        data=data,
    )


def _entries(rule: Rule, voice: Voice) -> tuple[_Entry, ...]:
    """What has to be known to find a row, in the order in which it is asked."""
    step = Ask(capital(voice.check), (), 1, voice.horizon)
    found = [_Entry("step", ask=step)]
    by_name = any(row.shows for row in rule.rows)
    states = tuple(capital(voice.shows_short[state]) for state in SHOWN)
    if by_name:
        for agent in voice.seen:
            label = f"{voice.names[agent]}: {voice.thing}" if voice.thing else voice.names[agent]
            found.append(_Entry("shows", agent, Ask(label, states), SHOWN))
    places = tuple(n for n, entry in enumerate(found) if entry.what == "shows")
    for agent in voice.seen:
        accepted = {name for row in rule.rows for name in row.thresholds.get(agent, ())}
        names = tuple(sorted(accepted))
        if names:
            label = f"Habit of {voice.names[agent]}"
            ask = Ask(label, tuple(clean(name) for name in names))
            found.append(_Entry("thresholds", agent, ask, names))
    for name in NUMBERS:
        if not any(name in row.ranges for row in rule.rows):
            continue
        if by_name and name in SHOWN_BY:
            option = SHOWN.index(SHOWN_BY[name])
            found.append(_Entry("number", name, option=option, over=places))
        else:
            most = voice.horizon if name.startswith("steps") else len(voice.seen)
            found.append(_Entry("number", name, Ask(asked(name, voice), (), 0, most)))
    if any(row.first_answer is not None for row in rule.rows):
        options = tuple(capital(first_answer(answer, voice)) for answer in FIRST_ANSWERS)
        found.append(_Entry("first_answer", ask=Ask("First call", options), names=FIRST_ANSWERS))
    if voice.seen:
        lead = "Is anyone on watch there?" if len(voice.seen) == 1 else "Are they all on watch?"
        sure = Ask(lead, ("Yes, that is known", "No, or not sure"))
        found.append(_Entry("sure", ask=sure, names=("yes", "no")))
    return tuple(found)


def _record(entry: _Entry) -> dict[str, Any]:
    if entry.ask is None:
        return {"kind": "count", "key": entry.key, "option": entry.option, "over": entry.over}
    if entry.ask.options:
        return {"kind": "choice", "key": entry.key, "names": entry.names}
    ends = {"least": entry.ask.least, "most": entry.ask.most}
    return {"kind": "number", "key": entry.key} | ends


def _fits(row: Row, entries: Sequence[_Entry]) -> list[list[int | None] | None]:
    """What the row accepts of every entry: null, a least and a greatest, or numbers of options."""
    found: list[list[int | None] | None] = []
    for entry in entries:
        if entry.what == "step":
            found.append([row.step_from, row.step_to])
        elif entry.what == "number":
            found.append(list(row.ranges[entry.of]) if entry.of in row.ranges else None)
        else:
            accepted = {
                "shows": row.shows.get(entry.of),
                "thresholds": row.thresholds.get(entry.of),
                "first_answer": row.first_answer,
            }.get(entry.what)
            options = [n for n, name in enumerate(entry.names) if accepted and name in accepted]
            found.append(None if accepted is None else [*options])
    return found


def _row(
    row: Row, place: int, entries: Sequence[_Entry], voice: Voice, counting: Counting, card: Card
) -> dict[str, Any]:
    """One row with the line it is printed under and what it says in words."""
    line = card.letter_of_row[place] if place < len(card.letter_of_row) else letters(place)
    return {
        "line": line,
        "said": f"{line}. {told(*heading(row, voice))}",
        "then": _then(row, voice, counting),
        "fits": _fits(row, entries),
        "minus": row.minus_at,
        "plus": row.plus_at,
        "value": _number(row.value),
    }


def _number(value: float | None) -> float | str | None:
    """Write a worth so that the script reads the same number; JSON has no infinities."""
    if value is None or math.isfinite(value):
        return value
    return "Infinity" if value > 0 else "-Infinity"


def _then(row: Row, voice: Voice, counting: Counting) -> str:
    """Say at which counts a row has an answer, or how strongly what is shown speaks."""
    if row.value is not None:
        return f"What is shown {odds_in_words(row.value, voice.plus, voice.minus)}."
    acts = ((row.minus_at, voice.do_minus, False), (row.plus_at, voice.do_plus, True))
    parts = []
    for bar, act, above in acts:
        if bar is None:
            parts.append(f"{act}: {NEVER}")
        elif not counting.tally:
            parts.append(f"{act}: {(at_or_above if above else at_or_below)(bar, voice)}")
        else:
            number = -bar if counting.flipped else bar
            more = above != counting.flipped
            if number <= 0 and more:
                parts.append(f"{act}: whatever your number")
            elif number < 0:
                parts.append(f"{act}: {NEVER}")
            else:
                parts.append(f"{act}: {number} or {'more' if more else 'fewer'}")
    return f"{capital('; '.join(parts))}."


def _alone(
    rule: Rule,
    findings: Findings,
    entries: Sequence[_Entry],
    voice: Voice,
    counting: Counting,
    card: Card,
) -> list[dict[str, Any]] | None:
    """The rows for an agent that is not sure anyone is on watch; None where there are none."""
    if not rule.has_bars:
        return [_row(Row(value=0.0), len(rule.rows), entries, voice, counting, card)]
    rows = findings.alone_rows
    if not card.alone:
        return None
    if not rows:
        rows = tuple(
            Row(minus_at=row.minus_at, plus_at=row.plus_at) for row in rule.rows if row.base
        )[:1]
    said = capital(card.alone)
    return [
        {
            "line": said,
            "said": f"{said}. Nobody on watch, or not sure.",
            "then": _then(row, voice, counting),
            "fits": _fits(row, entries),
            "minus": row.minus_at,
            "plus": row.plus_at,
            "value": None,
        }
        for row in rows
    ]


def _own(findings: Findings) -> dict[str, Any]:
    """What the own evidence is worth and where the agent answers, all in nats."""
    return {
        "prior": findings.prior,
        "per_count": findings.alpha if findings.count_is_whole else None,
        "per_step": (findings.beta or 0.0) if findings.count_is_whole else 0.0,
        "minus": findings.bounds[0],
        "plus": findings.bounds[1],
        "tie": TIE,
    }


def _scale(rule: Rule, findings: Findings, counting: Counting) -> tuple[str, int, int]:
    """The kind of the own number and its ends, beyond which nothing changes any more."""
    if not rule.has_bars and not (findings.count_is_whole and findings.alpha):
        return "worth", 0, 0
    if rule.has_bars:
        low, high = scale((*rule.rows, *findings.alone_rows))
    else:
        low, high = _reach(rule, findings)
    low, high = max(low, -MOST_ON_A_SLIDER), min(high, MOST_ON_A_SLIDER)
    if not counting.tally:
        return "peg", low, high
    if counting.flipped:
        low, high = -high, -low
    return "number", 0, max(high, 1)


def _reach(rule: Rule, findings: Findings) -> tuple[int, int]:
    """The counts at which every row of values has an answer at every step."""
    own, horizon = _own(findings), findings.case.time.horizon
    values = [row.value for row in rule.rows if row.value is not None and math.isfinite(row.value)]
    fixed = [
        own["prior"] + value + own["per_step"] * step
        for value in [0.0, *values]
        for step in (1, horizon)
    ]
    ends = [
        (bound - other) / own["per_count"]
        for bound in (own["minus"], own["plus"])
        for other in fixed
    ]
    return min(0, math.floor(min(ends)) - 1), max(0, math.ceil(max(ends)) + 1)


def _buttons(kind: str, voice: Voice, counting: Counting) -> tuple[str, str, str]:
    """What the buttons beside the peg say, and the one that begins again."""
    if kind == "peg":
        left, right = capital(voice.minus_sign), capital(voice.plus_sign)
        return f"{left}: one left", f"{right}: one right", "Begin again"
    if kind == "number":
        return "Take 1 off", f"{capital(counting.sign)}: add 1", "Begin again"
    return "", "", "Begin again"


def _own_label(kind: str) -> str:
    return {
        "peg": "Your peg",
        "number": "Your number",
        "worth": "Your own evidence so far, in nats (leave it empty where nobody keeps it)",
    }[kind]


def _says(voice: Voice) -> dict[str, str]:
    """The sentences that the script puts together; it makes none of its own."""
    return {
        "plus": capital(voice.do_plus),
        "minus": capital(voice.do_minus),
        "watch": "Keep watching",
        "open": "Add what it counts to what you have seen yourself",
        "none": "No line fits that",
        "none_then": "These cannot hold together. Look again at what you have set.",
        "late": "No answer here",
        "late_then": f"The {voice.check} must be a whole number from 1 to {voice.horizon:,}. After"
        " the last one, follow your local rule.",
        "off": "Not a number that can be",
        "off_then": "Look again at what you have set.",
        "unsure": "Put this card aside",
        "unsure_then": "Nothing here is made for that. Follow your usual practice.",
        "or_more": "or more",
    }
