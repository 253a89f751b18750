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

from thumbwright.distill.costs import Pricer
from thumbwright.distill.forms import Distilled, Wanted
from thumbwright.distill.forms.batch import Batch
from thumbwright.distill.forms.boxes import gain
from thumbwright.distill.forms.runs import Layout, as_rule, lossless, moved_bars
from thumbwright.exact.engine import Progress
from thumbwright.exact.errors import ModelError

NAME = "lines"

UNNOTICED = 1e-4
"""A line that changes fewer outings than this share is merged."""

MOST_STATES = 27
"""More joint shown states than this do not fit a card of lines."""

MOST_MOVES = 200
"""Bars are moved one at a time, at most so often; a search ends long before."""


def distil(pricer: Pricer, wanted: Wanted, progress: Progress | None = None) -> Distilled:
    """The card: at most ``wanted.rows`` lines.

    Raises ModelError where the own count is not one whole number that speaks for plus as it
    grows, or where the agent sees too many others for a card of lines.
    """
    evidence = pricer.group.agents[pricer.group.index[pricer.agent]].evidence
    if not evidence.on_ladder or not evidence.alpha[0] > 0:
        raise ModelError(
            'the form "lines" needs an own count that is one whole number and speaks for plus as '
            f'it grows, which {evidence.kind} evidence with these keys has not; leave "lines" out '
            "of the forms, or swap the two answers if the count speaks for minus"
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
    search.merge_unnoticed()
    unnoticed = len(layout) - len(search.layout)
    if unnoticed:
        notes.append(
            f"{unnoticed} merged away because together they change fewer than 1 outing in 10,000."
        )
    before = len(search.layout)
    if wanted.max_accuracy_lost is not None:
        notes.append(search.merge_within(wanted.max_accuracy_lost))
    else:
        search.merge_down_to(wanted.rows)
    if len(search.layout) < before:
        notes.append(
            f"{before - len(search.layout)} more merged at the least added risk, and bars set "
            "between the exact ones of each line, where the risk is least."
        )
        search.settle_bars()
    if mixed:
        notes.append(
            f"{mixed} combinations of {' and '.join(wanted.inputs)} have exact bars that depend on "
            "more than the card may look at, such as the time of a call; they have the bars of "
            "their pooled worth."
        )
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
        self._first = layout
        self.layout = layout

    def merge_unnoticed(self) -> None:
        """Merge while the rule stays within UNNOTICED of the lossless one, least change first."""
        while True:
            candidates = list(self.layout.merges(keep_base=True))
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
        """Merge as far as the accuracy lost allows; returns a sentence on how it went."""
        exact = self._pricer.accuracy(self._pricer.exact_tally)
        while (merged := self._cheapest_merge()) is not None:
            (found,) = self._batch.tallies([merged])
            if exact - self._pricer.accuracy(found) > most_lost:
                break
            self.layout = merged
            self._tell()
        if len(self.layout) <= self._wanted.rows:
            return "The fewest lines found within the accuracy that may be lost."
        self.merge_down_to(self._wanted.rows)
        return (
            f"No rule of up to {self._wanted.rows} lines was found within the accuracy that may be "
            "lost; this one loses more."
        )

    def _cheapest_merge(self) -> Layout | None:
        candidates = list(self.layout.merges(keep_base=False))
        if not candidates:
            return None
        risks = self._batch.objectives(candidates)
        return candidates[risks.index(min(risks))]

    def settle_bars(self) -> None:
        """Move bars by one while that lowers the risk, between the exact bars of their line."""
        (risk,) = self._batch.objectives([self.layout])
        for _ in range(MOST_MOVES):
            candidates = list(moved_bars(self._pricer, self._wanted.inputs, self.layout))
            risks = self._batch.objectives(candidates)
            if not risks or min(risks) >= risk - 1e-12:
                return
            risk = min(risks)
            self.layout = candidates[risks.index(risk)].tidied()
            self._tell()

    def _tell(self) -> None:
        if self._progress:
            todo = max(len(self._first) - self._wanted.rows, 1)
            self._progress("lines", min(len(self._first) - len(self.layout), todo), todo)
