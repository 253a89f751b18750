"""Plain phrases for rows that look at how many show what, and since when, not at who it is."""

from __future__ import annotations

from thumbwright.distill.rules import NUMBERS, Row
from thumbwright.distill.sheet.voice import Voice
from thumbwright.distill.sheet.words import capital, listing, plural

SHOWN_BY = {
    "plus_shown": "plus",
    "minus_shown": "minus",
    "undecided_shown": "undecided",
}
"""The numbers that count agents, and the state they count."""

FIRST_WORDS = {
    "nobody": "nobody has called yet",
    "plus": "“{plus}” was called first",
    "minus": "“{minus}” was called first",
    "both": "both calls came first, at the same moment",
}


def numbers(row: Row, voice: Voice) -> str:
    """Say the numbers that a row asks for as a phrase; "" where it asks for none."""
    parts = [_number(name, *row.ranges[name], voice) for name in NUMBERS if name in row.ranges]
    if row.first_answer is not None:
        said = [first_answer(answer, voice) for answer in FIRST_WORDS if answer in row.first_answer]
        parts.append(listing(said, "or"))
    return "; ".join(part for part in parts if part)


def situation(row: Row, voice: Voice) -> str:
    """Say what the watched agents show where a row holds, as a heading."""
    said = numbers(row, voice)
    if not row.shows:
        return capital(said) if said else voice.situation(row.shows)
    return "; ".join([voice.situation(row.shows), said] if said else [voice.situation(row.shows)])


def first_answer(answer: str, voice: Voice) -> str:
    """Say which call came first."""
    return FIRST_WORDS[answer].format(plus=voice.plus, minus=voice.minus)


def tally_of(shows: dict[str, str], voice: Voice) -> str:
    """Say how many show what, most telling first: "2 lit, 1 blinking, 4 dark"."""
    counts = {
        state: sum(shown == state for shown in shows.values())
        for state in ("plus", "minus", "undecided")
    }
    return ", ".join(f"{n} {voice.shows_short[state]}" for state, n in counts.items() if n)


def asked(name: str, voice: Voice) -> str:
    """Return the question for one of ``rules.NUMBERS``."""
    if name in SHOWN_BY:
        return f"How many: {voice.shows_short[SHOWN_BY[name]]}"
    if name == "came_first":
        return "How many called first, at the same moment"
    which = "first" if name == "steps_since_first" else "latest"
    many = capital(plural(voice.check))
    return f"{many} from the {which} call to now, both counted; 0 while nobody has called"


def _number(name: str, least: int | None, most: int | None, voice: Voice) -> str:
    low = max(least or 0, 0)
    if low == 0 and most is None:
        return ""
    amount = _amount(low, most)
    if name in SHOWN_BY:
        return f"{amount} {voice.shows_short[SHOWN_BY[name]]}"
    if name == "came_first":
        return f"{amount} called first"
    which = "first" if name == "steps_since_first" else "latest"
    if most == 0:
        return "nobody has called yet"
    noun = voice.check if (low, most) == (1, 1) else plural(voice.check)
    return f"{amount} {noun} from the {which} call to now, both counted"


def _amount(low: int, most: int | None) -> str:
    if most is None:
        return f"{low} or more"
    if most == low:
        return str(low) if low else "none"
    if low == 0:
        return f"at most {most}"
    return f"{low} {'or' if most == low + 1 else 'to'} {most}"
