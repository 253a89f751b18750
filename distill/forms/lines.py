"""The form "lines": bars on the own count per seen state and range of steps; the card.

First the lossless action classes: every situation has the bars that its exact worth yields, and
steps with equal bars are one line. Then lines are merged: those that change fewer than one outing
in 10,000 always; further ones, least added risk first under exact pricing, until the rule has the
rows that are wanted, or the fewest within the accuracy that may be lost. Bars of merged lines are
whole numbers chosen by pricing, never by rounding.

The base line, for situations in which nothing can have been shown yet, is kept apart from later
ones as long as it can be: it is also the line for somebody who is unsure whether anyone is on
watch.
"""

from __future__ import annotations

from collections.abc import Iterable

from thumbwright.distill.costs import Pricer
from thumbwright.distill.forms import Distilled, Wanted
from thumbwright.distill.forms.batch import Batch
from thumbwright.distill.forms.boxes import gain
from thumbwright.distill.forms.runs import Layout, Moves, as_rule, lossless, moved_bars
from thumbwright.exact.engine import Progress
from thumbwright.exact.errors import ModelError

NAME = "lines"

UNNOTICED = 1e-4
"""A line that changes fewer outings than this share is merged."""

MOST_STATES = 27
"""More joint shown states than this do not fit a card of lines."""

PRICED_ONE_BY_ONE = 12
"""So many candidates are priced where each has to be played by itself."""

AT_A_LEVEL = 600
"""About so many layouts are priced for each number of lines in the search for the fewest."""

MOST_MOVES = 200
"""Bars are moved one at a time, at most so often; a search ends long before."""


def distil(pricer: Pricer, wanted: Wanted, progress: Progress | None = None) -> Distilled:
    """The card: at most ``wanted.rows`` lines.

    Raises ModelError where the own count is not one whole number that speaks for plus as it
    grows, or where the agent sees too many others for a card of lines.
    """
    evidence = pricer.group.agents[pricer.group.index[pricer.agent]].evidence
    if not evidence.countable or not evidence.alpha[0] > 0:
        raise ModelError(
            'the form "lines" needs an own count that a person can keep, one whole number that '
            f"speaks for plus as it grows, which {evidence.kind} evidence with these keys has not; "
            'leave "lines" out of the forms, or swap the two answers if the count speaks for minus'
        )
    states = 3 ** len(pricer.seen) if "shown" in wanted.inputs else 1
    if states > MOST_STATES:
        raise ModelError(
            f"{len(pricer.seen)} seen agents have {states} joint states, too many for a card of "
            f'lines (at most {MOST_STATES}); leave "lines" out of the forms'
        )
    layout, mixed = lossless(pricer, wanted.inputs)
    search = Search(pricer, wanted, layout, progress)
    notes = [f"Without merging there are {len(layout)} lines."]
    if wanted.max_accuracy_lost is None:
        search.merge_unnoticed()
    unnoticed = len(layout) - len(search.layout)
    if unnoticed:
        notes.append(
            f"{unnoticed} merged away because together they change fewer than 1 outing in 10,000."
        )
    before = len(search.layout)
    if wanted.max_accuracy_lost is None:
        search.merge_down_to(wanted.rows)
    else:
        notes.append(search.merge_within(wanted.max_accuracy_lost))
    if wanted.max_accuracy_lost is None and len(search.layout) < before:
        notes.append(
            f"{before - len(search.layout)} more merged at the least added risk, their bars set "
            "between the exact ones they cover, where the risk is least."
        )
    if mixed:
        notes.append(
            f"{mixed} combinations of {' and '.join(wanted.inputs)} have exact bars that depend on "
            "more than the card may look at, such as the time of a call; their bars are set "
            "between the exact ones, where the risk is least."
        )
    if wanted.max_accuracy_lost is None:
        search.settle_bars()
    rule = as_rule(pricer, search.layout)
    situations = pricer.situations
    pooled = situations.pooled(situations.rows_of(rule, pricer.settings), len(rule.rows))
    kept = situations.information_kept(float(gain(*pooled).sum()))
    return Distilled(rule, kept, None, tuple(notes))


class Search:
    """Merging lines of one layout, always under exact pricing."""

    def __init__(
        self, pricer: Pricer, wanted: Wanted, layout: Layout, progress: Progress | None
    ) -> None:
        self._pricer, self._wanted, self._progress = pricer, wanted, progress
        self._batch = Batch(pricer)
        self._moves = Moves(pricer, wanted.inputs)
        self._first = layout
        self.layout = layout

    def merge_unnoticed(self) -> None:
        """Merge while the rule stays within UNNOTICED of the lossless one, least change first."""
        while True:
            candidates = self._promising(self.layout.merges(unnoticed=True))
            changed = self._batch.changed(self._first, candidates)
            if not changed or min(changed) >= UNNOTICED:
                return
            self.layout = candidates[changed.index(min(changed))]
            self._tell()

    def merge_down_to(self, rows: int) -> None:
        """Merge at the least added risk until there are no more than ``rows`` lines."""
        while len(self.layout) > rows:
            merged = self._cheapest_merge()
            if merged is None:
                return
            self.layout = merged
            self._tell()

    def merge_within(self, most_lost: float) -> str:
        """Take the fewest lines that lose no more accuracy; returns a sentence on how it went.

        Level by level one line fewer, keeping at each level the layouts that lose least, as many
        as can be priced; of those that qualify on the last level, the one of least risk.
        """
        best, kept = self.layout, [self.layout]
        if self._lost(kept)[0] > most_lost:
            self.merge_down_to(self._wanted.rows)
            return (
                f"No rule of up to {self._wanted.rows} lines was found within the accuracy that may "
                "be lost: even unmerged lines lose more, since they cannot look at all that exact "
                "play looks at."
            )
        while kept:
            width = max(1, AT_A_LEVEL // max(1, sum(1 for _ in kept[0].merges(unnoticed=False))))
            merges = (m for layout in kept[:width] for m in layout.merges(unnoticed=False))
            candidates = self._promising(dict.fromkeys(merges))
            lost = self._lost(candidates)
            order = sorted(range(len(candidates)), key=lambda k: (lost[k], k))
            kept = [candidates[k] for k in order]
            fits = [candidates[k] for k in order if lost[k] <= most_lost]
            if not fits:
                break
            risks = self._batch.objectives(fits)
            best = fits[risks.index(min(risks))]
            self.layout = best
            self._tell()
        self.layout = best
        if len(best) <= self._wanted.rows:
            return "The fewest lines found within the accuracy that may be lost."
        self.merge_down_to(self._wanted.rows)
        return (
            f"No rule of up to {self._wanted.rows} lines was found within the accuracy that may be "
            "lost; this one loses more."
        )

    def _lost(self, layouts: list[Layout]) -> list[float]:
        """Accuracy lost against exact play."""
        exact = self._pricer.accuracy(self._pricer.exact_tally)
        return [exact - self._pricer.accuracy(found) for found in self._batch.tallies(layouts)]

    def _cheapest_merge(self) -> Layout | None:
        candidates = self._promising(self.layout.merges(unnoticed=False))
        if not candidates:
            return None
        risks = self._batch.objectives(candidates)
        return candidates[risks.index(min(risks))]

    def settle_bars(self) -> None:
        """Move bars by one while that lowers the risk, between the exact bars of their line."""
        (risk,) = self._batch.objectives([self.layout])
        for _ in range(MOST_MOVES):
            candidates = self._promising(moved_bars(self._pricer, self._wanted.inputs, self.layout))
            risks = self._batch.objectives(candidates)
            if not risks or min(risks) >= risk - 1e-12:
                return
            risk = min(risks)
            self.layout = candidates[risks.index(risk)].tidied()
            self._tell()

    def _promising(self, candidates: Iterable[Layout]) -> list[Layout]:
        """All candidates where pricing is cheap; else those that move the fewest bars by least."""
        every = list(candidates)
        if self._batch.together or len(every) <= PRICED_ONE_BY_ONE:
            return every
        moves = [self._moves.between(self.layout, layout) for layout in every]
        order = sorted(range(len(every)), key=lambda k: (moves[k], k))
        return [every[k] for k in order[:PRICED_ONE_BY_ONE]]

    def _tell(self) -> None:
        if self._progress:
            todo = max(len(self._first) - self._wanted.rows, 1)
            self._progress("lines", min(len(self._first) - len(self.layout), todo), todo)
