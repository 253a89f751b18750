"""From the rows of a rule to the card: strips of boxes, two numbers a line, or blocks."""

from __future__ import annotations

from thumbwright.distill.findings import Findings
from thumbwright.distill.rules import FIRST_ANSWERS, SHOWN, Row
from thumbwright.distill.sheet.counted import situation
from thumbwright.distill.sheet.parts import Block, Card, Grid, Line, Peg, Zone
from thumbwright.distill.sheet.voice import Counting, Voice
from thumbwright.distill.sheet.words import fitting, letters, odds_in_words, plural, told, width

_QUIET = frozenset({"undecided"})
_SINCE = ("steps_since_first", "steps_since_last", "came_first")

MOST_BOXES = 15
OUTER_BOXES = 2
STRIP_EMS = 31.0
"""Width of a whole strip in ems of its own text, on the narrowest page it is printed on."""

ACROSS = 4
"""Blocks that stand side by side on paper."""

MOST_EXTRA_LINES, MOST_EXTRA_ROWS = 3, 12
"""How much room the card gives to bars for nobody on watch; longer ones are left out of it."""

NEVER = "never"
ANY = "any"
NOBODY = "Nobody on watch"
UNSURE = "or you are not sure"


def card(findings: Findings, voice: Voice, counting: Counting) -> Card:
    """Build the card from the lines form, or from a table in words where none is possible."""
    result = findings.forms.get("lines")
    if result is None:
        return _strengths(findings, voice)
    rows, alone = result.rule.rows, findings.alone_rows
    drifts = bool(findings.beta)
    if counting.tally:
        return _blocks(rows, alone, voice, counting)
    return _lines(rows, alone, voice, drifts)


def alone_place(
    rows: tuple[Row, ...], alone: tuple[Row, ...], voice: Voice, drifts: bool
) -> int | None:
    """Return the line that serves where nobody is on watch: the one with the bars of alone.

    Without known bars of being alone it is the base line, which holds at every check as long as
    the worth of the own count does not drift.
    """
    quiet = [place for place, row in enumerate(rows) if is_quiet(row, voice)]
    if alone:
        bars = {(row.minus_at, row.plus_at) for row in alone}
        return next((p for p in quiet if {(rows[p].minus_at, rows[p].plus_at)} == bars), None)
    return None if drifts else next((place for place in quiet if rows[place].base), None)


def is_quiet(row: Row, voice: Voice) -> bool:
    """Whether a row holds only while all watched agents are undecided."""
    if all(row.shows.get(agent, frozenset(SHOWN)) == _QUIET for agent in voice.seen):
        return True
    most = {name: ends[1] for name, ends in row.ranges.items()}
    least = row.ranges.get("undecided_shown", (None, None))[0] or 0
    return (
        most.get("plus_shown") == most.get("minus_shown") == 0
        or any(most.get(name) == 0 for name in _SINCE)
        or least >= len(voice.seen)
        or row.first_answer == frozenset(FIRST_ANSWERS[:1])
    )


def scale(rows: tuple[Row, ...]) -> tuple[int, int]:
    """Return the first and last box of a scale shared by all rows.

    Box 0 is on it, and every zone at an end is at least two boxes wide. A row that never gives
    an answer has no zone for it.
    """
    reach = OUTER_BOXES - 1
    bars = [bar for row in rows for bar in (row.minus_at, row.plus_at) if bar is not None]
    return min([0, *(bar - reach for bar in bars)]), max([0, *(bar + reach for bar in bars)])


def zones(row: Row, low: int, high: int) -> tuple[tuple[str, int], ...]:
    """Cut the boxes from ``low`` to ``high`` into zones of (kind, number of boxes)."""
    left = 0 if row.minus_at is None else max(0, min(row.minus_at, high) - low + 1)
    right = 0 if row.plus_at is None else max(0, high - max(row.plus_at, low) + 1)
    middle = high - low + 1 - left - right
    parts = (("minus", left), ("watch", middle), ("plus", right))
    return tuple(part for part in parts if part[1] > 0)


def at_or_below(count: int | None, voice: Voice) -> str:
    """Say "own count of ``count`` or less" without a minus sign."""
    if count is None:
        return NEVER
    if count < 0:
        return f"{voice.minus_short} {-count} or more"
    if count == 0:
        return f"0 or any {voice.minus_short}"
    return f"{voice.plus_short} {count} or further left"


def at_or_above(count: int | None, voice: Voice) -> str:
    """Say "own count of ``count`` or more" without a minus sign."""
    if count is None:
        return NEVER
    if count > 0:
        return f"{voice.plus_short} {count} or more"
    if count == 0:
        return f"0 or any {voice.plus_short}"
    return f"{voice.minus_short} {-count} or further right"


def peg_words(count: int, voice: Voice, counting: Counting) -> str:
    """Say where the peg or the number stands."""
    if counting.tally:
        return str(-count if counting.flipped else count)
    if count == 0:
        return "0"
    return f"{voice.plus_short if count > 0 else voice.minus_short} {abs(count)}"


def heading(
    row: Row, voice: Voice, with_checks: bool = True, alone: bool = False
) -> tuple[str, str]:
    """Return the heading of a line and the remark under it.

    ``alone`` says that the line also serves where nobody is on watch.
    """
    shown = situation(row, voice)
    checks = voice.checks(row.step_from, row.step_to) if with_checks else ""
    text = f"{shown}, {checks}" if checks else shown
    habits = voice.habits(row.thresholds)
    text = f"{text} ({habits})" if habits else text
    accepted = {row.shows.get(agent, frozenset(SHOWN)) for agent in voice.seen}
    if alone:
        return text, "or nobody on watch"
    if is_quiet(row, voice):
        return text, "and known to be on watch"
    if len(voice.seen) == 1 and accepted == {frozenset({"plus"})}:
        return text, _saying(text, voice.plus)
    if len(voice.seen) == 1 and accepted == {frozenset({"minus"})}:
        return text, _saying(text, voice.minus)
    return text, ""


def _counts(row: Row) -> bool:
    return bool(row.ranges) or row.first_answer is not None


def _saying(heading: str, answer: str) -> str:
    """Tell the answer behind a shown state, unless its heading has told it."""
    return "" if answer.lower() in heading.lower() else f"(says: {answer})"


def shown_title(voice: Voice, by_count: bool = False) -> str:
    """Return the head of the column that says what is shown."""
    if len(voice.seen) == 1:
        name = voice.seen_names[0]
        return f"{name}: {voice.thing}" if voice.thing else name
    if by_count:
        return f"How many {plural(voice.thing)}" if voice.thing else "How many show what"
    return f"Each {voice.thing}" if voice.thing else "What they show"


def _lines(rows: tuple[Row, ...], alone: tuple[Row, ...], voice: Voice, drifts: bool) -> Card:
    """Print every row as a line; lines for nobody on watch are added where none serves."""
    serves = alone_place(rows, alone, voice, drifts)
    extra = alone if serves is None and len(alone) <= MOST_EXTRA_LINES else ()
    low, high = scale((*rows, *extra))
    fits = high - low + 1 <= MOST_BOXES
    lines = []
    for place, row in enumerate((*rows, *extra)):
        if place < len(rows):
            text, note = heading(row, voice, alone=place == serves)
        else:
            checks = voice.checks(row.step_from, row.step_to)
            text, note = f"{NOBODY}, {checks}" if checks else NOBODY, UNSURE
        strip, below = _strip(row, low, high, voice) if fits else ((), ())
        lines.append(
            Line(
                letter=letters(place),
                heading=text,
                note=note,
                minus_at=at_or_below(row.minus_at, voice),
                plus_at=at_or_above(row.plus_at, voice),
                zones=strip,
                below=below,
            )
        )
    pegs = tuple(
        Peg(str(abs(at)), "" if at == 0 else voice.plus_short if at > 0 else voice.minus_short)
        for at in range(low, high + 1)
    )
    read = "Read what stands under it." if fits else "Read your line; between, keep watching."
    if serves is not None:
        use = f"line {letters(serves)}"
    elif len(extra) > 1:
        use = f"lines {letters(len(rows))} to {letters(len(lines) - 1)}"
    else:
        use = f"line {letters(len(rows))}" if extra else ""
    return Card(
        kind="strips" if fits else "numbers",
        heading=f"Your peg starts on 0. {read}",
        shown=shown_title(voice, any(_counts(row) for row in rows)),
        left=f"more {plural(voice.minus_sign)}",
        right=f"more {plural(voice.plus_sign)}",
        left_boxes=-low if fits else 0,
        right_boxes=high + 1 if fits else 0,
        pegs=pegs if fits else (),
        lines=tuple(lines),
        blocks=(),
        few=f"{voice.do_minus} at",
        many=f"{voice.do_plus} at",
        check=voice.check,
        strengths=None,
        letter_of_row=tuple(line.letter for line in lines[: len(rows)]),
        alone=use,
    )


def _strip(row: Row, low: int, high: int, voice: Voice) -> tuple[tuple[Zone, ...], tuple[str, ...]]:
    """Return the zones of a line, and the words that found no room in them."""
    forms = {
        "minus": voice.minus_forms,
        "watch": ("keep watching", "watch"),
        "plus": voice.plus_forms,
    }
    spoken = {
        "minus": f"{at_or_below(row.minus_at, voice)}: {voice.do_minus}",
        "watch": "between: keep watching",
        "plus": f"{at_or_above(row.plus_at, voice)}: {voice.do_plus}",
    }
    strip, below = [], []
    for kind, boxes in zones(row, low, high):
        room = boxes * STRIP_EMS / (high - low + 1) - 0.45
        # Words of the middle zone are small letters of ordinary weight: about a fifth narrower.
        label = fitting(forms[kind], room / 0.78 if kind == "watch" else room)
        if not label:
            below.append(spoken[kind])
        strip.append(Zone(kind, boxes, label, spoken[kind]))
    return tuple(strip), tuple(below)


def _blocks(
    rows: tuple[Row, ...], alone: tuple[Row, ...], voice: Voice, counting: Counting
) -> Card:
    """Group the rows of each shown state; the numbers change from range to range."""
    groups: dict[tuple[object, ...], list[Row]] = {}
    for row in rows:
        groups.setdefault(_state(row, voice), []).append(row)
    names = {state: letters(number) for number, state in enumerate(groups)}
    bars = [_bars_by_check(part, voice) for part in groups.values()]
    quiet = [is_quiet(part[0], voice) for part in groups.values()]
    serves = None
    if alone:
        wanted = _bars_by_check(list(alone), voice)
        serves = next((n for n, found in enumerate(bars) if quiet[n] and found == wanted), None)
    added = serves is None and 0 < len(alone) <= MOST_EXTRA_ROWS
    count = len(groups) + added
    # Four tables side by side leave no room for both ends of a range.
    ends_only = count > ACROSS - 1
    blocks = []
    for number, part in enumerate(groups.values()):
        text, note = heading(part[0], voice, with_checks=False, alone=number == serves)
        table = _block_rows(part, voice, counting, ends_only)
        blocks.append(Block(letters(number), text, note, table))
    use = "" if serves is None else letters(serves)
    if added:
        use = letters(len(blocks))
        table = _block_rows(list(alone), voice, counting, ends_only)
        blocks.append(Block(use, NOBODY, UNSURE, table))
    few, many = voice.minus_forms[-1], voice.plus_forms[-1]
    if counting.flipped:
        few, many = many, few
    return Card(
        kind="blocks",
        heading=(
            f"Your number starts at 0. Read the row of this {voice.check}; between, keep watching."
        ),
        shown=shown_title(voice),
        left="",
        right="",
        left_boxes=0,
        right_boxes=0,
        pegs=(),
        lines=(),
        blocks=tuple(blocks),
        few=f"{few} at … or fewer",
        many=f"{many} at … or more",
        check=voice.check,
        strengths=None,
        letter_of_row=tuple(names[_state(row, voice)] for row in rows),
        alone=use,
    )


def _state(row: Row, voice: Voice) -> tuple[object, ...]:
    """Return what a row holds for besides the checks: shown states and habits."""
    shown = [row.shows.get(agent, frozenset(SHOWN)) for agent in voice.seen]
    return (
        *shown,
        *sorted((agent, tuple(sorted(names))) for agent, names in row.thresholds.items()),
        *sorted(row.ranges.items()),
        row.first_answer,
    )


def _bars_by_check(rows: list[Row], voice: Voice) -> list[tuple[int | None, int | None] | None]:
    """Return the bars at every check; None where no row holds."""
    found: list[tuple[int | None, int | None] | None] = [None] * voice.horizon
    for row in rows:
        last = voice.horizon if row.step_to is None else min(row.step_to, voice.horizon)
        for check in range(row.step_from or 1, last + 1):
            found[check - 1] = (row.minus_at, row.plus_at)
    return found


def _block_rows(
    rows: list[Row], voice: Voice, counting: Counting, ends_only: bool
) -> tuple[tuple[str, str, str], ...]:
    ordered = sorted(rows, key=lambda row: row.step_from or 1)
    return tuple(_block_row(row, voice, counting, ends_only) for row in ordered)


def _block_row(row: Row, voice: Voice, counting: Counting, ends_only: bool) -> tuple[str, str, str]:
    low, high = row.minus_at, row.plus_at
    if counting.flipped:
        low, high = (None if high is None else -high), (None if low is None else -low)
    few = NEVER if low is None or low < 0 else str(low)
    many = NEVER if high is None else str(high) if high > 0 else ANY
    last = voice.horizon if row.step_to is None else row.step_to
    span = f"to {last}" if ends_only else voice.span(row.step_from, row.step_to)
    return span, few, many


def _strengths(findings: Findings, voice: Voice) -> Card:
    """Say in words how strongly each thing shown speaks, where no count can be kept by hand."""
    result = findings.forms.get("table") or next(iter(findings.forms.values()))
    rows = []
    for place, row in enumerate(result.rule.rows):
        text, note = heading(row, voice)
        said = told(text, note)
        worth = 0.0 if row.value is None else row.value
        rows.append((f"{letters(place)}. {said}", odds_in_words(worth, voice.plus, voice.minus)))
    return Card(
        kind="table",
        heading="How much counts what the others show",
        shown=shown_title(voice),
        left="",
        right="",
        left_boxes=0,
        right_boxes=0,
        pegs=(),
        lines=(),
        blocks=(),
        few="",
        many="",
        check=voice.check,
        strengths=Grid(
            "Add this to what you have seen yourself",
            (shown_title(voice), "how strongly it speaks, beside your own looks"),
            tuple(rows),
        ),
        letter_of_row=tuple(letters(place) for place in range(len(rows))),
        alone="",
    )


def short_act(act: str, voice: Voice) -> str:
    """Return the act of an example line in few words."""
    if act == "watch":
        return "watch"
    forms = voice.plus_forms if act == "plus" else voice.minus_forms
    return min(forms, key=width) if width(forms[0]) > 11.0 else forms[0]
