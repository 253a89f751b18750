"""Plain phrases for the sheet, made from the group's own words.

Labels come from the case and may be anything; every function returns one clean line of text.
Nothing here escapes: that is the business of the templates.
"""

from __future__ import annotations

import math
import unicodedata
from collections.abc import Iterable, Sequence

_ARTICLES = frozenset({"a", "an", "the", "your", "their", "this", "that"})
_PARTICLES = frozenset(
    {"away", "back", "down", "in", "off", "on", "out", "over", "through", "under", "up"}
)

# Widths (em) of capitals in a wide bold sans-serif face, so that a word said to fit a zone fits
# in the narrower faces too. Letters not listed are taken as 0.85.
_BOLD_CAPITALS = {
    **dict.fromkeys("IJ .,:;'!-", 0.40),
    **dict.fromkeys("EFLST", 0.69),
    **dict.fromkeys("ABCKPRXYZVD", 0.78),
    "N": 0.82,
    **dict.fromkeys("MW", 1.10),
    **dict.fromkeys("0123456789", 0.70),
}


def clean(text: str) -> str:
    """Return ``text`` as one line: no control or text-direction characters, single spaces.

    The two joiners that some scripts are spelt with are kept.
    """
    kept = []
    for letter in text:
        category = unicodedata.category(letter)
        if category in ("Cc", "Zl", "Zp"):
            kept.append(" ")
        elif category not in ("Cf", "Cs") or letter in "\u200c\u200d":
            kept.append(letter)
    return " ".join("".join(kept).split())


def capital(text: str) -> str:
    """Return ``text`` with its first letter as a capital."""
    return text[:1].upper() + text[1:]


def listing(items: Sequence[str], last: str = "and") -> str:
    """Join with commas and a last "and"."""
    if len(items) < 2:
        return "".join(items)
    return ", ".join(items[:-1]) + f" {last} " + items[-1]


def plural(phrase: str) -> str:
    """Return the regular English plural of a phrase by its last word, or the word before "of".

    Words that end in s, and whatever does not end in a letter, are left alone.
    """
    head, of, tail = phrase.partition(" of ")
    if of:
        return plural(head) + of + tail
    lower = phrase.lower()
    if not phrase or not lower[-1].isalpha() or (lower.endswith("s") and lower[-2:] != "ss"):
        return phrase
    if lower.endswith(("ch", "sh", "x", "z", "ss")):
        return phrase + "es"
    if lower.endswith("y") and lower[-2:-1] not in ("a", "e", "i", "o", "u", ""):
        return phrase[:-1] + "ies"
    return phrase + "s"


def quoted(phrase: str) -> str:
    """Put a phrase of the group in quotes, unless it brings its own."""
    return phrase if "“" in phrase else f"“{phrase}”"


def unquoted(phrase: str) -> str:
    """Take off quotes that enclose a whole phrase."""
    inner = phrase[1:-1]
    whole = phrase[:1] == "“" and phrase[-1:] == "”" and "“" not in inner
    return inner if whole and inner.strip() else phrase


def apart(first: str, second: str) -> tuple[str, str]:
    """Drop the words that two phrases share: "frost sign", "mild sign" → frost, mild.

    Shared beginnings go first, then shared ends; nothing is dropped where one of the phrases
    would be left without a word.
    """
    _, (first, second) = shared_start((first, second))
    one, two = unquoted(first).split(), unquoted(second).split()
    while len(one) > 1 and len(two) > 1 and one[-1].lower() == two[-1].lower():
        one.pop()
        two.pop()
    return " ".join(one), " ".join(two)


def shared_start(phrases: Sequence[str]) -> tuple[str, tuple[str, ...]]:
    """Split off the words with which all phrases begin: "lamp lit", "lamp dark" → lamp.

    Returns the shared words ("" if there are none) and what is left of each phrase. The split
    leaves every phrase at least one word.
    """
    words = [phrase.split() for phrase in phrases]
    count = 0
    while all(len(each) > count + 1 for each in words) and (
        len({each[count].lower() for each in words}) == 1
    ):
        count += 1
    return " ".join(words[0][:count]), tuple(" ".join(each[count:]) for each in words)


def short_form(phrase: str) -> str:
    """Return the word of an act by which it is called out: light the lamp → light.

    The words before an article carry the act; of a verb with a particle (stand down) the
    particle is the part that differs from other acts.
    """
    words = phrase.split()
    for place, word in enumerate(words):
        if word.lower() in _ARTICLES and place:
            words = words[:place]
            break
    if len(words) > 1 and words[1].lower() in _PARTICLES:
        return words[1]
    return words[0] if words else ""


def act_forms(do_minus: str, do_plus: str) -> tuple[tuple[str, ...], tuple[str, ...]]:
    """Return for each of the two acts its wordings, longest first, never the same for both."""
    forms_minus, forms_plus = [do_minus], [do_plus]
    _, (rest_minus, rest_plus) = shared_start((do_minus, do_plus))
    rest_minus, rest_plus = unquoted(rest_minus), unquoted(rest_plus)
    if (rest_minus, rest_plus) != (do_minus, do_plus):
        forms_minus.append(rest_minus)
        forms_plus.append(rest_plus)
    short_minus, short_plus = short_form(rest_minus), short_form(rest_plus)
    if short_minus.lower() == short_plus.lower():
        short_minus, short_plus = rest_minus.split()[-1], rest_plus.split()[-1]
    if short_minus.lower() != short_plus.lower():
        forms_minus.append(short_minus)
        forms_plus.append(short_plus)
    return tuple(dict.fromkeys(forms_minus)), tuple(dict.fromkeys(forms_plus))


def width(text: str) -> float:
    """Estimate the width (em) of ``text`` in bold capitals."""
    return sum(_BOLD_CAPITALS.get(letter, 0.85) for letter in text.upper())


def fitting(forms: Iterable[str], room: float) -> str:
    """Return the longest wording no wider than ``room`` (em); "" where none fits."""
    return max((form for form in forms if width(form) <= room), key=len, default="")


def counted(count: int, noun: str) -> str:
    """Return "one {noun if count == 1 else plural(noun)}", "two boxes" and so on."""
    names = ("no", "one", "two", "three", "four", "five", "six", "seven", "eight", "nine", "ten")
    return f"{names[count] if count < len(names) else count} {noun if count == 1 else plural(noun)}"


def times_in(share: float) -> str:
    """Write a probability as whole "times in": 0.6 → "6 times in 10"; no decimals.

    Shares that are no whole number of thousandths are rounded and said to be about so.
    """
    if share <= 0.0:
        return "never"
    if share >= 1.0:
        return "always"
    for base in (10, 100, 1000):
        count = round(share * base)
        if 0 < count < base and abs(share * base - count) < 1e-9 * base:
            return _times(count, f"{base:,}")
    for base in (1000, 10_000, 1_000_000):
        if share * base >= 9.5 and (1.0 - share) * base >= 0.5:
            return "about " + _times(round(share * base), f"{base:,}")
    if share < 0.5:
        return "less than 1 time in 100,000"
    return "all but always"


def _times(count: int, base: str) -> str:
    return f"{count:,} time{'' if count == 1 else 's'} in {base}"


def of_hundred(share: float) -> str:
    """Write a probability as a count of 100: whole, "fewer than 1", or "none"."""
    count = 100.0 * share
    if count < 1e-9:
        return "none"
    if count < 1.0 - 1e-9:
        return "fewer than 1"
    return str(math.floor(count + 0.5))


def odds_in_words(value: float, plus: str, minus: str) -> str:
    """Say how strongly a worth (nats) speaks for an answer, as whole numbers "to".

    A worth v makes plus e^v times as likely against minus as it was before.
    """
    ratio = math.exp(min(abs(value), 60.0))
    toward = plus if value > 0 else minus
    if ratio < 1.05:
        return "says nothing either way"
    if ratio < 9.95:
        amount = f"about {round(10 * ratio)} to 10"
    elif ratio < 1000:
        digits = 10 ** (len(str(int(ratio))) - 2)
        amount = f"about {round(ratio / digits) * digits} to 1"
    else:
        amount = "more than 1,000 to 1"
    return f"{amount} for {quoted(toward)}"


def five(number: float | None) -> str:
    """Write a figure with five significant digits, a true minus sign, no trailing point."""
    if number is None:
        return "none"
    if not math.isfinite(number):
        return "∞" if number > 0 else "−∞"
    if number == 0:
        return "0"
    size = abs(number)
    text = f"{size:#.5g}" if 1e-4 <= size < 1e5 else f"{size:.4e}"
    return ("−" if number < 0 else "") + text.rstrip(".").replace("e-", "e−")


def signed(number: int) -> str:
    """Write a whole number with its sign, for the modeller."""
    return "0" if number == 0 else f"{'−' if number < 0 else '+'}{abs(number)}"


def range_words(least: int | None, most: int | None, open_end: str = "or more") -> str:
    """Say a range of whole numbers, both ends included; ``None`` is open."""
    if most is None:
        return "any" if least is None else f"{least} {open_end}"
    if least is None or least == 0:
        return "0" if most == 0 else f"at most {most}"
    return str(least) if least == most else f"{least} to {most}"


def told(heading: str, note: str) -> str:
    """Join a heading and the remark under it into one phrase."""
    if not note:
        return heading
    return f"{heading} {note}" if note.startswith("(") else f"{heading}; {note}"


def letters(index: int) -> str:
    """Return A, B, … Z, AA, AB … for 0, 1, …"""
    text = ""
    index += 1
    while index:
        index, rest = divmod(index - 1, 26)
        text = chr(65 + rest) + text
    return text
