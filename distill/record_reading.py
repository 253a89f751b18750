"""Reading a record of what an agent observed and was shown, with every fault reported at once.

A CSV file (UTF-8, commas, a header line; blank lines are ignored), one line per step, in order and
none left out. Columns, in any order:

- ``step``: 1, 2, 3, ...
- ``sign``: what the agent itself observed at that step, by the names in ``signs``; or, for a
  reading on a scale, ``sign_nats``, its worth in nats.
- ``ID_shows`` for each agent it sees: what that agent shows when ours decides. Where what is shown
  is used from the next step on, that is what it looked at before it observed; where answers run
  round within a step, it is what is shown when the step ends. Blank: as in the line before. The
  case's own words for the states will do too.
- ``ID_round``, only where answers run round within a step, and never needed: the round of the step
  in which that agent answered, 0 being that of its own observation. Blank: not known.
- ``ID_thresholds``, only where the rule tells thresholds apart. Blank: as in the line before.
"""

from __future__ import annotations

import csv
import io
import math
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path

from thumbwright.distill.case import Case
from thumbwright.distill.exports.rule_csv import SHOWS, THRESHOLDS
from thumbwright.distill.faults import Faults, clean, fault_line, hint, quoted
from thumbwright.distill.rules import SHOWN
from thumbwright.distill.signs import Sign

STEP, SIGN, SIGN_NATS, ROUND = "step", "sign", "sign_nats", "_round"

_COUNTS = tuple(f"{state}_shown" for state in SHOWN)
_FEW = 12
"""So many names of signs are listed in a message; of more, the first and the last."""


@dataclass(frozen=True)
class Line:
    """One step of a record.

    Attributes
    ----------
    step : int
    sign : Sign
    states : tuple of int
        Code of what each seen agent shows, in the order of the case.
    rounds : tuple of (int or None)
        Round in which each seen agent answered; None while undecided, or where not known.
    """

    step: int
    sign: Sign
    states: tuple[int, ...]
    rounds: tuple[int | None, ...]


@dataclass(frozen=True)
class Record:
    """A record as read: its lines, and the thresholds of the seen agents where they are told."""

    lines: tuple[Line, ...]
    names: Mapping[str, str]


def read_record(
    path: Path | str, case: Case, seen: Sequence[str], signs: Mapping[str, Sign]
) -> Record:
    """Read the record in ``path``.

    Parameters
    ----------
    path : Path or str
    case : Case
    seen : sequence of str
        Ids of the agents that the agent sees.
    signs : mapping of str to Sign
        What the agent may observe, by name; empty where it is given in nats.

    Raises
    ------
    Faults
        With one message ``FILE:LINE: column: what is wrong (allowed ...)`` for each fault.
    """
    reader = _Reader(str(path), case, tuple(seen), signs)
    record = reader.record(reader.text(Path(path)))
    if reader.faults:
        raise Faults(reader.faults)
    return record


class _Reader:
    """One pass over one file; gathers faults instead of stopping at the first."""

    def __init__(
        self, source: str, case: Case, seen: tuple[str, ...], signs: Mapping[str, Sign]
    ) -> None:
        self.source, self.case, self.seen, self.signs = source, case, seen, signs
        self.faults: list[str] = []
        self.unnamed: set[str] = set()
        self.tells = "thresholds" in case.rule.inputs
        self.settles = case.time.exchange == "settle"
        words = case.words
        own = zip((words.shows_nothing, words.shows_plus, words.shows_minus), range(3), strict=True)
        self.states = {**dict(own), **{state: code for code, state in enumerate(SHOWN)}}

    def fault(self, line: int | None, column: str, what: str) -> None:
        self.faults.append(fault_line(self.source, line, clean(column), what))

    def text(self, path: Path) -> str:
        try:
            content = path.read_bytes()
        except OSError as error:
            self.fault(None, "", f"{error.strerror or 'cannot be read'} (EVENTS is a CSV file)")
            raise Faults(self.faults) from error
        try:
            return content.decode("utf-8-sig")
        except UnicodeDecodeError as error:
            line = content.count(b"\n", 0, error.start) + 1
            what = f"byte 0x{content[error.start]:02x} is not UTF-8 (save the file as UTF-8)"
            self.fault(line, "", what)
            raise Faults(self.faults) from error

    def record(self, text: str) -> Record:
        records = self.records(text)
        first = next(records, None)
        if first is None:
            if not self.faults:
                self.fault(1, "", "empty file (the first line names the columns)")
            return Record((), {})
        number, header = first[0], [name.strip() for name in first[1]]
        if not self.header_is_sound(number, header):
            return Record((), {})
        lines: list[Line] = []
        names: dict[str, str] = {}
        step = 1
        for number, cells in records:
            if len(cells) != len(header):
                self.fault(number, "", f"{len(cells)} cells where the header has {len(header)}")
                step += 1
                continue
            cell = dict(zip(header, (one.strip() for one in cells), strict=True))
            step = self.step(number, step, cell[STEP])
            lines.append(self.line(number, step, cell, lines[-1] if lines else None))
            self.thresholds(number, cell, names)
            step += 1
        if not lines and not self.faults:
            self.fault(number, "", "a header but no steps (one line per step follows it)")
        return Record(tuple(lines), names)

    def records(self, text: str) -> Iterator[tuple[int, list[str]]]:
        """Yield ``(line, cells)`` for each line that is not blank."""
        reader = csv.reader(io.StringIO(text, newline=""), strict=True)
        while True:
            line = reader.line_num + 1
            try:
                cells = next(reader)
            except StopIteration:
                return
            except csv.Error as error:
                self.fault(line, "", f"not CSV: {error}")
                return
            if cells and (len(cells) > 1 or cells[0].strip()):
                yield line, cells

    def header_is_sound(self, line: int, header: list[str]) -> bool:
        """Report faults of the header; without a sound one the lines cannot be read."""
        before = len(self.faults)
        if len(header) == 1 and any(mark in header[0] for mark in ";\t"):
            self.fault(line, "", "columns are separated by commas, not ; or tabs")
            return False
        needed = [STEP, SIGN if self.signs else SIGN_NATS, *(one + SHOWS for one in self.seen)]
        needed += [one + THRESHOLDS for one in self.seen] if self.tells else []
        allowed = needed + ([one + ROUND for one in self.seen] if self.settles else [])
        for name in dict.fromkeys(header):
            if header.count(name) > 1:
                self.fault(line, name, f"column stands {header.count(name)} times")
            if name in _COUNTS:
                self.fault(line, name, "this case tells agents apart (give ID_shows for each)")
            elif name not in allowed:
                self.fault(line, name, "unknown column" + hint(name, allowed))
        for name in needed:
            if name not in header:
                self.fault(line, name, "column is missing")
        return len(self.faults) == before

    def step(self, line: int, expected: int, text: str) -> int:
        """The step of a line; where it is not the one that comes next, reading goes on from it."""
        said = self.whole(line, STEP, text)
        last = self.case.time.horizon
        if said is None:
            return expected
        if said != expected:
            self.fault(
                line, STEP, f"{said} where {expected} comes next (one line per step, from 1)"
            )
        elif said == last + 1:
            self.fault(line, STEP, f"{said} is after the last step of the case, {last}")
        return max(said, expected)

    def line(self, line: int, step: int, cell: dict[str, str], before: Line | None) -> Line:
        states, rounds = [], []
        for position, agent in enumerate(self.seen):
            old = before.states[position] if before else 0
            state = self.state(line, agent, cell, old)
            was = before.rounds[position] if before else None
            states.append(state)
            rounds.append(self.round(line, agent, cell, state, was if old else None, bool(old)))
        return Line(step, self.sign(line, cell), tuple(states), tuple(rounds))

    def sign(self, line: int, cell: dict[str, str]) -> Sign:
        if not self.signs:
            return self.reading(line, cell[SIGN_NATS])
        text = cell[SIGN]
        if text in self.signs:
            return self.signs[text]
        names = list(self.signs)
        if len(names) > _FEW:
            allowed = f" (allowed {clean(names[0])} to {clean(names[-1])})"
        else:
            allowed = hint(text, names)
        self.fault(line, SIGN, (f"{quoted(text)} is unknown" if text else "is blank") + allowed)
        return Sign(text, 0.0, None)

    def reading(self, line: int, text: str) -> Sign:
        """A reading on a scale, given by its worth."""
        try:
            number = float(text.replace("\N{MINUS SIGN}", "-")) if "_" not in text else math.nan
        except ValueError:
            number = math.nan
        if not math.isfinite(number):
            what = f"{quoted(text)} is not a finite number (nats)" if text else "is blank"
            self.fault(line, SIGN_NATS, what)
        return Sign(text, number, None)

    def state(self, line: int, agent: str, cell: dict[str, str], old: int) -> int:
        column = agent + SHOWS
        text = cell[column]
        if not text:
            return old
        if text not in self.states:
            self.fault(line, column, f"{quoted(text)} is unknown" + hint(text, SHOWN))
            return old
        state = self.states[text]
        if old and state != old:
            what = f"{SHOWN[state]} after {SHOWN[old]}: an answer is never taken back"
            self.fault(line, column, what)
            return old
        return state

    def round(
        self,
        line: int,
        agent: str,
        cell: dict[str, str],
        state: int,
        before: int | None,
        earlier: bool,
    ) -> int | None:
        """Round of the answer: told where it is first shown, or in any line after."""
        column = agent + ROUND
        text = cell.get(column, "")
        if not text:
            return before
        if not state:
            self.fault(line, column, f"{agent} has not answered yet (leave it blank)")
            return None
        number = self.whole(line, column, text, least=0)
        if earlier and number is not None and number != before:
            self.fault(line, column, "belongs into the line in which the answer is first shown")
        return number

    def thresholds(self, line: int, cell: dict[str, str], names: dict[str, str]) -> None:
        if not self.tells:
            return
        for agent in self.seen:
            column = agent + THRESHOLDS
            text = cell[column]
            if text and text not in self.case.rule.covers:
                what = f"{quoted(text)} is unknown" + hint(text, self.case.rule.covers)
                self.fault(line, column, what)
            elif text and names.setdefault(agent, text) != text:
                self.fault(line, column, f"{text} after {names[agent]}: thresholds do not change")
            elif not text and agent not in names and agent not in self.unnamed:
                self.unnamed.add(agent)
                self.fault(line, column, "is blank" + hint("", self.case.rule.covers))

    def whole(self, line: int, column: str, text: str, least: int = 1) -> int | None:
        try:
            number = int(text) if text.isascii() and "_" not in text else None
        except ValueError:
            number = None
        if number is None or number < least:
            what = f"{quoted(text)} is not a whole number from {least}" if text else "is blank"
            self.fault(line, column, what)
            return None
        return number
