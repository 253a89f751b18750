"""Reading a rule from a CSV file, with every fault in it reported at once.

The columns are those that :mod:`thumbwright.distill.exports.rule_csv` writes, in any order;
``step_from``, ``step_to``, ``ID_shows``, ``ID_thresholds``, the ranges of counts such as
``plus_shown_from`` and ``plus_shown_to``, and ``first_answer`` may be left out, which is the same
as blank. In place of ``nats`` a table may give its worths as ``observations``, in units
of one observation. Whether the rows cover every situation exactly once is not a question of
the file alone, and is answered where the rule is priced.
"""

from __future__ import annotations

import csv
import io
import math
from collections.abc import Iterator, Sequence
from pathlib import Path

from thumbwright.distill.exports.rule_csv import FROM, JOIN, SHOWS, THRESHOLDS, TO
from thumbwright.distill.faults import Faults, clean, fault_line, hint, quoted
from thumbwright.distill.rules import FIRST_ANSWER, FIRST_ANSWERS, NUMBERS, SHOWN, Row, Rule

_STEPS = ("step_from", "step_to")
_BARS = ("minus_at_or_below", "plus_at_or_above")
_WORTHS = ("nats", "observations")


def read_rule(
    path: Path | str,
    *,
    seen: Sequence[str],
    threshold_names: Sequence[str] = (),
    agent: str = "",
    alpha: float | None = None,
) -> Rule:
    """Read the rule in ``path``.

    Parameters
    ----------
    path : Path or str
        A CSV file: UTF-8 (with or without a byte order mark), commas, a header line; blank
        lines are ignored.
    seen : sequence of str
        Ids of the agents that the rule's agent sees; they name the columns.
    threshold_names : sequence of str
        Names that ``ID_thresholds`` may hold.
    agent : str
        Id of the agent the rule is for; it is not in the file.
    alpha : float, optional
        What one observation is worth, in nats, where the evidence has one such worth; needed
        for a column ``observations`` only.

    Returns
    -------
    Rule
        Its ``form`` is the name of the file. ``base`` is not in the file and left False.

    Raises
    ------
    Faults
        With one message ``FILE:LINE: column: what is wrong (allowed ...)`` for each fault.
    """
    path = Path(path)
    reader = _Reader(str(path), tuple(seen), tuple(threshold_names), alpha)
    rows = reader.rows(reader.text(path))
    if reader.faults:
        raise Faults(reader.faults)
    return Rule(form=path.name, agent=agent, seen=tuple(seen), rows=rows)


class _Reader:
    """One pass over one file; gathers faults instead of stopping at the first."""

    def __init__(
        self, source: str, seen: tuple[str, ...], names: tuple[str, ...], alpha: float | None
    ) -> None:
        self.source = source
        self.seen = seen
        self.names = names
        self.alpha = alpha
        self.faults: list[str] = []

    def fault(self, line: int | None, column: str, what: str) -> None:
        self.faults.append(fault_line(self.source, line, clean(column), what))

    def text(self, path: Path) -> str:
        try:
            content = path.read_bytes()
        except OSError as error:
            reason = error.strerror or "cannot be read"
            self.fault(None, "", f"{reason} (RULE is a CSV file, or exact, plain-count, alone)")
            raise Faults(self.faults) from error
        try:
            return content.decode("utf-8-sig")
        except UnicodeDecodeError as error:
            line = content.count(b"\n", 0, error.start) + 1
            what = f"byte 0x{content[error.start]:02x} is not UTF-8 (save the file as UTF-8)"
            self.fault(line, "", what)
            raise Faults(self.faults) from error

    def rows(self, text: str) -> tuple[Row, ...]:
        records = self.records(text)
        first = next(records, None)
        if first is None:
            if not self.faults:
                self.fault(1, "", "empty file (the first line names the columns)")
            return ()
        line, header = first[0], [name.strip() for name in first[1]]
        if not self.header_is_sound(line, header):
            return ()
        rows = [self.row(line, header, cells) for line, cells in records]
        if not rows and not self.faults:
            self.fault(line, "", "a header but no rows (one line per row follows it)")
        return tuple(rows)

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

    def allowed_columns(self) -> list[str]:
        columns = list(_STEPS)
        if self.seen:
            columns += [name + end for name in NUMBERS for end in (FROM, TO)] + [FIRST_ANSWER]
        for agent in self.seen:
            columns += [agent + SHOWS, agent + THRESHOLDS] if self.names else [agent + SHOWS]
        return [*columns, *_WORTHS, *_BARS]

    def header_is_sound(self, line: int, header: list[str]) -> bool:
        """Report faults of the header; without a sound one the rows cannot be read."""
        before = len(self.faults)
        allowed = self.allowed_columns()
        if len(header) == 1 and any(mark in header[0] for mark in ";\t"):
            self.fault(line, "", "columns are separated by commas, not ; or tabs")
            return False
        for name in dict.fromkeys(header):
            if header.count(name) > 1:
                self.fault(line, name, f"column stands {header.count(name)} times")
            if name not in allowed:
                self.fault(line, name, "unknown column" + hint(name, allowed))
        worths = [name for name in _WORTHS if name in header]
        bars = [name for name in _BARS if name in header]
        choice = "one of nats, observations, or both minus_at_or_below and plus_at_or_above"
        if len(worths) > 1 or (worths and bars):
            found = " and ".join(worths + bars)
            self.fault(line, "", f"{found} cannot stand together (give {choice})")
        elif not worths and not bars:
            self.fault(line, "", f"no column says what a row does (give {choice})")
        elif len(bars) == 1:
            missing = next(name for name in _BARS if name not in bars)
            self.fault(line, missing, f"column is missing beside {bars[0]} (blank is: never)")
        if "observations" in worths and self.alpha is None:
            what = "this case has no single worth of an observation (give nats)"
            self.fault(line, "observations", what)
        return len(self.faults) == before

    def row(self, line: int, header: list[str], cells: list[str]) -> Row:
        if len(cells) != len(header):
            self.fault(line, "", f"{len(cells)} cells where the header has {len(header)}")
            return Row()
        cell = dict(zip(header, (text.strip() for text in cells), strict=True))
        start, end = (self.whole(line, name, cell, 1) for name in _STEPS)
        if start is not None and end is not None and start > end:
            self.fault(line, "step_from", f"{start} is after step_to, {end}")
        shows, thresholds = {}, {}
        for agent in self.seen:
            accepted = self.names_in(line, agent + SHOWS, cell, SHOWN)
            if accepted is not None:
                shows[agent] = accepted
            accepted = self.names_in(line, agent + THRESHOLDS, cell, self.names)
            if accepted is not None:
                thresholds[agent] = accepted
        ranges = {}
        for name in NUMBERS:
            ends = (self.whole(line, name + FROM, cell, 0), self.whole(line, name + TO, cell, 0))
            if ends[0] is not None and ends[1] is not None and ends[0] > ends[1]:
                self.fault(line, name + FROM, f"{ends[0]} is above {name + TO}, {ends[1]}")
            if ends != (None, None):
                ranges[name] = ends
        minus, plus = (self.whole(line, name, cell, None) for name in _BARS)
        if minus is not None and plus is not None and minus >= plus:
            what = f"{minus} is not below plus_at_or_above, {plus}"
            self.fault(line, "minus_at_or_below", what)
        return Row(
            step_from=start,
            step_to=end,
            shows=shows,
            thresholds=thresholds,
            value=self.worth(line, cell),
            minus_at=minus,
            plus_at=plus,
            ranges=ranges,
            first_answer=self.names_in(line, FIRST_ANSWER, cell, FIRST_ANSWERS),
        )

    def whole(self, line: int, name: str, cell: dict[str, str], least: int | None) -> int | None:
        text = cell.get(name, "")
        if not text:
            return None
        try:
            number = int(_ascii(text))
        except ValueError:
            self.fault(line, name, f"{quoted(text)} is not a whole number")
            return None
        if least is not None and number < least:
            what = "the first step" if least else "a number of agents or steps"
            self.fault(line, name, f"{number} is below {least}, {what}")
            return None
        return number

    def worth(self, line: int, cell: dict[str, str]) -> float | None:
        """Return the worth of a row in nats, ``None`` in a file of bars."""
        name = next((name for name in _WORTHS if name in cell), None)
        if name is None:
            return None
        text = cell[name]
        try:
            number = float(_ascii(text))
        except ValueError:
            number = math.nan
        if math.isnan(number) or (math.isinf(number) and "inf" not in text.lower()):
            self.fault(line, name, f"{quoted(text)} is not a number" if text else "is blank")
            return None
        return number * self.alpha if name == "observations" and self.alpha else number

    def names_in(
        self, line: int, column: str, cell: dict[str, str], allowed: Sequence[str]
    ) -> frozenset[str] | None:
        text = cell.get(column, "")
        if not text:
            return None
        names = [name.strip() for name in text.split(JOIN)]
        for name in dict.fromkeys(names):
            if name not in allowed:
                self.fault(line, column, f"{quoted(name)} is unknown" + hint(name, allowed))
        return frozenset(names)


def _ascii(text: str) -> str:
    """Return ``text`` with a typeset minus sign made plain.

    Raises ``ValueError`` for an underscore, which Python reads over within numbers and which
    in a table is more likely a slip.
    """
    if "_" in text:
        raise ValueError(text)
    return text.replace("\N{MINUS SIGN}", "-")
