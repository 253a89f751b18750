"""Reading a record of a member of a crowd: how many others show what, or who shows what.

The columns are those of ``record_reading`` but for what is shown. There either

- ``plus_shown`` and ``minus_shown``: how many of the others show which answer when ours decides;
  blank: as in the line before; or
- ``ID_shows`` for every other member. It must be these where the others differ in evidence,
  thresholds or timetable: there it matters who showed what.

In which round of a step an answer came is not told; all rounds that are possible are weighed
together.
"""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path

from thumbwright.distill.case import Case
from thumbwright.distill.exports.rule_csv import SHOWS
from thumbwright.distill.record_reading import (
    COUNTS,
    SIGN,
    SIGN_NATS,
    STEP,
    Line,
    Reader,
    Record,
)
from thumbwright.distill.signs import Sign
from thumbwright.exact.crowd import Crowd


def read_crowd_record(
    path: Path | str, case: Case, crowd: Crowd, agent: str, signs: Mapping[str, Sign]
) -> Record:
    """Read the record in ``path``.

    Parameters
    ----------
    path : Path or str
    case : Case
    crowd : Crowd
    agent : str
        Whose record it is.
    signs : mapping of str to Sign
        What the agent may observe, by name; empty where it is given in nats.

    Returns
    -------
    Record
        Lines with ``counts``, or with ``states`` in the order of the case.

    Raises
    ------
    Faults
        With one message ``FILE:LINE: column: what is wrong (allowed ...)`` for each fault.
    """
    others = tuple(case.agents[agent].sees)
    kinds = sum(1 for kind in crowd.kinds if set(kind.members) - {agent})
    return _CrowdReader(str(path), case, others, signs, kinds).read()


class _CrowdReader(Reader):
    """One pass over one file; which columns it has is found in its header."""

    def __init__(
        self,
        source: str,
        case: Case,
        seen: tuple[str, ...],
        signs: Mapping[str, Sign],
        kinds: int,
    ) -> None:
        super().__init__(source, case, seen, signs)
        self.kinds, self.counts = kinds, False

    def columns(self, header: list[str]) -> tuple[list[str], list[str]]:
        """Counts where the header has none of the others' names, and they may be counted."""
        who = [one + SHOWS for one in self.seen]
        self.counts = self.kinds == 1 and not set(who) & set(header)
        shown = list(COUNTS) if self.counts else who
        needed = [STEP, SIGN if self.signs else SIGN_NATS, *shown]
        return needed, needed

    def why_not(self, column: str) -> str | None:
        """Counts beside names, and counts where names are needed."""
        if column == "undecided_shown":
            return "leave it out (it follows from the other counts)"
        if column not in COUNTS:
            return None
        if self.kinds > 1:
            return (
                f"the other members are of {self.kinds} kinds, so it matters who shows what "
                "(give ID_shows for every other member)"
            )
        return "stands beside ID_shows (give plus_shown and minus_shown, or who shows what)"

    def line(self, line: int, step: int, cell: dict[str, str], before: Line | None) -> Line:
        """One line of either sort."""
        if not self.counts:
            return super().line(line, step, cell, before)
        old = before.counts if before and before.counts else (0, 0)
        plus, minus = (
            self.count(line, column, cell[column], was)
            for column, was in zip(COUNTS, old, strict=True)
        )
        if plus + minus > len(self.seen):
            what = f"{plus} showing plus and {minus} showing minus, of {len(self.seen)} others"
            self.fault(line, COUNTS[minus > old[1]], what)
            plus, minus = old
        return Line(step, self.sign(line, cell), (), (), (plus, minus))

    def count(self, line: int, column: str, text: str, before: int) -> int:
        """How many show an answer; where that cannot be, as many as before."""
        if not text:
            return before
        number = self.whole(line, column, text, least=0)
        if number is None:
            return before
        if number < before:
            self.fault(line, column, f"{number} after {before}: an answer is never taken back")
            return before
        return number
