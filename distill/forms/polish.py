"""Polish: the search, from a rule that a form has made, for less risk by single moves.

Moves are those of ``moved_lines`` (a bar by one count, the border of two lines by some steps) and
of ``moved_boxes`` (a value to another action class, a cut by some cells). Every rule is priced
exactly, and a move is made only where it lowers the risk, so that a polish never makes it larger;
the number of rows stays, or falls where lines have become equal. It ends where no single move
lowers the risk further, or after so many rules; it finds no guaranteed optimum.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace
from typing import Generic, Protocol, TypeVar

from thumbwright.distill.costs import Pricer
from thumbwright.distill.forms import Distilled, Wanted
from thumbwright.distill.forms.enough import Enough
from thumbwright.distill.forms.moved_boxes import BoxMoves
from thumbwright.distill.forms.moved_lines import LineMoves
from thumbwright.distill.network_pricer import NetworkPricer
from thumbwright.distill.rules import Rule
from thumbwright.distill.tallies import Tally
from thumbwright.exact.engine import Progress

MOST_PRICED, ONE_BY_ONE = 12_000, 300
"""A polish ends after about so many rules; the second where each has to be played by itself."""

AT_ONCE = 2_000
"""So many are priced before the best of them is taken; one where each is played by itself."""

FOR_ALL = "table-for-all"
"""The form that is made for all to use, which a polish for a single user would spoil."""

SAME = 1e-12
"""Risks that differ by less are equal."""

Shape = TypeVar("Shape")
"""What a rule is while it is moved: a layout of lines, or valued boxes."""


class Moves(Protocol[Shape]):
    """How rules of one shape are moved and priced."""

    start: Shape
    together: bool

    def moves(self, one: Shape, /) -> Iterator[Shape]:
        """Every rule that is one move away."""

    def tallies(self, many: Sequence[Shape], /) -> list[Tally]:
        """How each turns out."""

    def tidied(self, one: Shape, /) -> Shape:
        """The same rule with no more rows than it needs."""

    def rule(self, one: Shape, /) -> Rule:
        """As rows."""

    def information_kept(self, one: Shape, /) -> float | None:
        """Share of information that it keeps."""


def polished(
    pricer: Pricer, wanted: Wanted, made: Distilled, progress: Progress | None = None
) -> Distilled:
    """The rule after the search, with a note on what that gained.

    A rule that is within the limits of the case stays within them. Needs costs.
    """
    rule = made.rule
    if not isinstance(rule, Rule):
        note = "Not polished: it has no rows; its numbers are chosen by exact price as it is."
        return replace(made, notes=(*made.notes, note))
    if rule.form == FOR_ALL:
        note = "Not polished: the price of a single user is not what it is made for."
        return replace(made, notes=(*made.notes, note))
    if rule.has_bars:
        assert isinstance(pricer, NetworkPricer)
        return _searched(
            _Search(pricer, wanted, LineMoves(pricer, wanted.inputs, rule)), made, progress
        )
    return _searched(_Search(pricer, wanted, BoxMoves(pricer, wanted.inputs, rule)), made, progress)


@dataclass(frozen=True)
class _Best(Generic[Shape]):
    """A rule while it is searched for, its tally and its risk."""

    shape: Shape
    tally: Tally
    risk: float


class _Search(Generic[Shape]):
    def __init__(self, pricer: Pricer, wanted: Wanted, moves: Moves[Shape]) -> None:
        self.pricer, self.moves = pricer, moves
        self.priced, self.ended = 0, False
        (self.first,) = self._best([moves.start])
        enough = Enough(pricer, wanted)
        # A rule that is beyond the limits anyway is moved without regard to them.
        self._enough = enough if enough(self.first.tally) else None

    def descend(self, label: str, progress: Progress | None) -> _Best[Shape]:
        """Move as long as that lowers the risk."""
        most = MOST_PRICED if self.moves.together else ONE_BY_ONE
        size = AT_ONCE if self.moves.together else 1
        best, place = self.first, 0
        while self.priced < most:
            candidates = list(dict.fromkeys(self.moves.moves(best.shape)))
            # Where each is priced by itself, go on from the move that was tried last.
            place %= max(len(candidates), 1)
            candidates = candidates[place:] + candidates[:place]
            for start in range(0, len(candidates), size):
                part = candidates[start : start + size]
                found = min(self._best(part), key=lambda one: one.risk)
                if progress:
                    progress(f"{label}, polish", min(self.priced, most), most)
                if found.risk < best.risk - SAME:
                    best, place = found, place + start
                    break
                if self.priced >= most:
                    return best
            else:
                self.ended = True
                break
        return best

    def _best(self, shapes: Sequence[Shape]) -> list[_Best[Shape]]:
        """Those that are within limits, priced; none of them can be taken if none is."""
        self.priced += len(shapes)
        return [
            _Best(shape, found, self._risk(found))
            for shape, found in zip(shapes, self.moves.tallies(shapes), strict=True)
        ]

    _enough: Enough | None = None

    def _risk(self, found: Tally) -> float:
        if self._enough is not None and not self._enough(found):
            return float("inf")
        return self.pricer.objective(found)

    def tidied(self, best: _Best[Shape]) -> _Best[Shape]:
        """With no more rows than needed, where that does not raise the risk."""
        shape = self.moves.tidied(best.shape)
        if shape == best.shape:
            return best
        (found,) = self._best([shape])
        return found if found.risk <= best.risk + SAME else best


def _searched(search: _Search[Shape], made: Distilled, progress: Progress | None) -> Distilled:
    pricer, first = search.pricer, search.first
    found = search.descend(made.rule.form, progress)
    how = f"{search.priced:,} rules priced, one bar, value or cut moved at a time"
    if not search.ended:
        how += "; ended before all moves from the last one were tried"
    if found is first:
        note = f"Polish found nothing better than risk {first.risk:.6f} ({how})."
        return replace(made, notes=(*made.notes, note))
    found = search.tidied(found)
    note = f"Polished ({how}): risk {first.risk:.6f} before, {found.risk:.6f} after"
    if pricer.losses is not None:
        kept = [pricer.benefit_kept(one.tally, pricer.losses) for one in (first, found)]
        if kept[0] is not None and kept[1] is not None:
            note += f"; benefit kept {kept[0]:.4f} before, {kept[1]:.4f} after"
    return replace(
        made,
        rule=search.moves.rule(found.shape),
        information_kept=search.moves.information_kept(found.shape),
        notes=(*made.notes, f"{note}."),
    )
