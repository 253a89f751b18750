"""The form "shifts": bars, and by how many whole boxes each agent shifts them by what it shows.

For many neighbours, where neither lines nor tables stay short: a shift holds for every agent of a
kind, and shifts add up. A rule is built line by line: of all lines that could be added, the one of
least risk; then every whole number is moved by single boxes while that lowers the risk; at the end
lines that are hardly worth their place go. All of it under exact pricing, nothing by rounding.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Iterator
from dataclasses import replace

import numpy as np

from thumbwright.distill.costs import Pricer
from thumbwright.distill.forms import Distilled, Wanted
from thumbwright.distill.forms.cells import Cells
from thumbwright.distill.forms.enough import Enough
from thumbwright.distill.forms.fitting import everywhere, fitted, information_of, kinds
from thumbwright.distill.shifts import Base, Move, Shifts
from thumbwright.distill.tallies import Tally
from thumbwright.distill.views import View
from thumbwright.exact.arrays import FloatArray
from thumbwright.exact.engine import Progress
from thumbwright.exact.errors import ModelError
from thumbwright.exact.walk import TIE

NAME = "shifts"

COUNTS = ("plus_shown", "minus_shown", "undecided_shown")

WORTH_A_LINE = 0.002
"""A line stays if it saves at least this share of what exact watching saves."""

MOST_PRICED, TOGETHER = 600, 6_000
"""A search ends after about so many rules; the second where they can be priced together."""

STEPS = (2, 3, 5, 8, 13, 21, 34, 55, 89)
"""Steps from which something new is tried to hold, before they are moved one by one."""


def distil(pricer: Pricer, wanted: Wanted, progress: Progress | None = None) -> Distilled:
    """Bars and shifts of at most ``wanted.rows`` lines.

    Raises ModelError where the own count is not one whole number in even steps, or where the rule
    may look at other things than steps and what is shown.
    """
    _refuse(pricer, wanted)
    search = Search(pricer, wanted, progress)
    rule, notes = search.built()
    return Distilled(
        rule,
        information_of(pricer, everywhere(pricer, lambda view: rule.unit * rule.down(view))),
        None,
        (*notes, search.against_unrounded(rule)),
    )


def _refuse(pricer: Pricer, wanted: Wanted) -> None:
    evidence = pricer.group.agents[pricer.group.index[pricer.agent]].evidence
    if not evidence.countable or not evidence.alpha[0] > 0 or evidence.beta:
        raise ModelError(
            f'the form "{NAME}" needs an own count that a person can keep and bars that do not '
            f"drift with the steps, as with a coin, which {evidence.kind} evidence with these "
            f'keys has not; use "table" or "tree", or leave "{NAME}" out of the forms'
        )
    others = [name for name in wanted.inputs if name not in ("step", "shown", *COUNTS)]
    if others or not {"shown", "plus_shown", "minus_shown"} & set(wanted.inputs):
        found = f", not at {', '.join(others)}" if others else ""
        raise ModelError(
            f'the form "{NAME}" looks at step, and at shown or at {", ".join(COUNTS)}{found}; '
            f'change the inputs, or leave "{NAME}" out of the forms'
        )


class Search:
    """Builds the rule line by line."""

    def __init__(self, pricer: Pricer, wanted: Wanted, progress: Progress | None) -> None:
        self._pricer, self._wanted, self._progress = pricer, wanted, progress
        self._inputs = wanted.inputs
        group = pricer.group
        own = group.agents[group.index[pricer.agent]]
        self._unit = float(own.evidence.alpha[0])
        bounds = own.thresholds[0][1]
        bars = (
            math.floor((bounds.minus - group.prior + TIE) / self._unit),
            math.ceil((bounds.plus - group.prior - TIE) / self._unit),
        )
        self._alone = Shifts(pricer.agent, pricer.seen, (Base(None, *bars),), (), self._unit)
        self._cells = Cells.of(pricer, wanted.inputs)
        self._tallies: dict[Shifts, Tally] = {}
        exact, alone = (pricer.objective(t) for t in (pricer.exact_tally, pricer.alone_tally))
        self._worth_a_line = WORTH_A_LINE * max(alone - exact, 0.0)
        self._worths = self._fitted()

    def _fitted(self) -> list[tuple[Move, float]]:
        """A move for every kind of agent and every state, with its fitted worth in boxes."""
        named = "shown" in self._inputs
        states = [
            s for s in ("plus", "minus", "undecided") if named or f"{s}_shown" in self._inputs
        ]
        moves = [Move(state, of, 1) for of in kinds(self._pricer, not named) for state in states]
        terms = np.stack([everywhere(self._pricer, self._with([m]).down) for m in moves], axis=1)
        s = self._pricer.situations
        worths = fitted(terms, s.plus, s.minus) / self._unit
        return list(zip(moves, worths.tolist(), strict=True))

    def _with(self, moves: Iterable[Move]) -> Shifts:
        return replace(self._alone, moves=tuple(moves))

    def built(self) -> tuple[Shifts, list[str]]:
        """The rule, and sentences on how it came about."""
        pricer, wanted = self._pricer, self._wanted
        rule, enough = self._polished(self._alone), Enough(pricer, wanted)
        while rule.rows < wanted.rows and not (wanted.limited and enough(self._tally(rule))):
            added = self._best(self._longer(rule))
            if added is None or self._risk(added) >= self._risk(rule) - 1e-12:
                break
            rule = self._polished(added)
            if self._progress:
                self._progress(NAME, rule.rows, wanted.rows)
        notes = [f"Whole numbers chosen by exact price among {len(self._tallies)} rules."]
        if not wanted.limited:
            return self._pruned(rule), notes
        notes += enough.notes
        if not enough(self._tally(rule)):
            return rule, [
                f"No rule of up to {wanted.rows} lines was found that {enough.it}.",
                *notes,
            ]
        said = [f"The fewest lines found that {enough.they}."] if enough.they else []
        return rule, [*said, *notes]

    def _price(self, rules: Iterable[Shifts]) -> None:
        """Price what is not yet priced, together where that is possible."""
        fresh = [rule for rule in dict.fromkeys(rules) if rule not in self._tallies]
        if self._cells is not None:
            found = self._cells.tallies([self._cells.of_way(rule) for rule in fresh])
        else:
            found = [self._pricer.way_tally(rule, whole=False) for rule in fresh]
        self._tallies.update(zip(fresh, found, strict=True))

    def _tally(self, rule: Shifts) -> Tally:
        self._price([rule])
        return self._tallies[rule]

    def _risk(self, rule: Shifts) -> float:
        return self._pricer.objective(self._tally(rule))

    def _best(self, rules: Iterable[Shifts]) -> Shifts | None:
        listed = list(rules)
        self._price(listed)
        return min(listed, key=self._risk) if listed else None

    def _longer(self, rule: Shifts) -> Iterator[Shifts]:
        """Every rule with one line more."""
        steps = [s for s in STEPS if s < self._pricer.group.horizon]
        steps = steps if "step" in self._inputs else []
        known = {(move.shows, move.agents) for move in rule.moves}
        for move, worth in self._worths:
            if (move.shows, move.agents) in known:
                continue
            if move.shows == "undecided":
                options = [(down, step) for down in (-1, 1) for step in steps or [1]]
            else:
                options = [(down, 1) for down in {math.floor(worth), math.ceil(worth)} - {0}]
            for down, step in options:
                more = replace(move, down=down, step_from=step)
                yield replace(rule, moves=(*rule.moves, more))
        last = rule.base[-1]
        for step in steps:
            if len(rule.base) == 1:
                for low, high in ((-1, 0), (1, 0), (0, -1), (0, 1)):
                    other = replace(last, minus_at=last.minus_at + low, plus_at=last.plus_at + high)
                    yield replace(rule, base=(replace(last, step_to=step), other))

    def _polished(self, rule: Shifts) -> Shifts:
        """Every whole number moved, one at a time or, where that is cheap, two."""
        while len(self._tallies) < (MOST_PRICED if self._cells is None else TOGETHER):
            near = list(self._near(rule))
            best = self._best(near)
            if self._cells is not None and best and self._risk(best) >= self._risk(rule) - 1e-12:
                best = self._best(two for one in near for two in self._near(one))
            if best is None or self._risk(best) >= self._risk(rule) - 1e-12:
                break
            rule = best
        return rule

    def _near(self, rule: Shifts) -> Iterator[Shifts]:
        horizon = self._pricer.group.horizon
        for number, move in enumerate(rule.moves):
            changed = [replace(move, down=move.down + by) for by in (-1, 1)]
            if move.step_from > 1:
                steps = [move.step_from + by for by in (-1, 1)]
                changed += [replace(move, step_from=s) for s in steps if 1 < s <= horizon]
            for other in changed:
                if other.down:
                    moves = (*rule.moves[:number], other, *rule.moves[number + 1 :])
                    yield replace(rule, moves=moves)
        for number, base in enumerate(rule.base):
            moved = [replace(base, minus_at=base.minus_at + by) for by in (-1, 1)]
            moved += [replace(base, plus_at=base.plus_at + by) for by in (-1, 1)]
            if base.step_to is not None:
                steps = [base.step_to + by for by in (-1, 1)]
                moved += [replace(base, step_to=s) for s in steps if 0 < s < horizon]
            for one in moved:
                if one.minus_at < one.plus_at:
                    bases = (*rule.base[:number], one, *rule.base[number + 1 :])
                    yield replace(rule, base=bases)

    def _pruned(self, rule: Shifts) -> Shifts:
        """Without lines that save less than a line is worth."""
        while rule.moves:
            shorter = [
                replace(rule, moves=(*rule.moves[:n], *rule.moves[n + 1 :]))
                for n in range(len(rule.moves))
            ]
            if len(rule.base) > 1:
                shorter += [replace(rule, base=(replace(b, step_to=None),)) for b in rule.base]
            best = self._best(map(self._polished, shorter))
            if best is None or self._risk(best) > self._risk(rule) + self._worth_a_line:
                break
            rule = best
        return rule

    def against_unrounded(self, rule: Shifts) -> str:
        """What whole boxes lose against the worths that they stand for."""

        def unrounded(view: View) -> FloatArray:
            parts = [w * self._with([move]).down(view) for move, w in self._worths]
            return np.asarray(self._unit * sum(parts[1:], start=parts[0]))

        found = self._pricer.objective(self._pricer.way_tally(unrounded, whole=False))
        worths = "; ".join(
            f"{move.shows}{''.join(' of ' + ', '.join(move.agents) if move.agents else '')} "
            f"{worth:.4g}"
            for move, worth in self._worths
        )
        what = "risk" if self._pricer.losses is not None else "wrong or missing answers"
        lost = self._risk(rule) - found
        verb = "loses" if lost > 0 else "saves"
        return (
            f"Fitted worths in boxes, unrounded: {worths}. Played as they are they have a {what} "
            f"of {found:.6f}; this rule {verb} {abs(lost):.6f} against it."
        )
