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

from collections.abc import Callable, Iterable, Iterator

from thumbwright.distill.costs import Pricer
from thumbwright.distill.forms import Distilled, Sized, Wanted
from thumbwright.distill.forms.batch import Batch
from thumbwright.distill.forms.boxes import gain
from thumbwright.distill.forms.enough import Enough
from thumbwright.distill.forms.runs import Layout, Moves, as_rule, lossless, moved_bars
from thumbwright.distill.network_pricer import NetworkPricer
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
"""At most about so many layouts are priced for each number of lines."""

WORK_AT_A_LEVEL = 500_000
"""Fewer where layouts times steps times own counts would exceed this."""

SETTLED = 5
"""The bars of so many of the best layouts are settled before the best is taken."""

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
    others = [name for name in wanted.inputs if name not in ("step", "shown", "thresholds")]
    if others:
        raise ModelError(
            f'the form "lines" looks at step, shown and thresholds, not at {", ".join(others)}; '
            'use the form "table" for these'
        )
    if not isinstance(pricer, NetworkPricer):
        raise ModelError(
            f'the form "lines" tells the seen agents apart, and {len(pricer.seen)} in a crowd are '
            'too many for that; use the form "table" with plus_shown and minus_shown as inputs'
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
    if not wanted.limited:
        search.merge_unnoticed()
    unnoticed = len(layout) - len(search.layout)
    if unnoticed:
        notes.append(
            f"{unnoticed} merged away because together they change fewer than 1 outing in 10,000."
        )
    before = len(search.layout)
    if wanted.limited:
        notes += search.merge_within(Enough(pricer, wanted))
    else:
        search.merge_down_to(wanted.rows)
    if not wanted.limited and len(search.layout) < before:
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
    if not wanted.limited:
        search.settle_bars()
    rule, kept = sized(pricer, search.layout)
    sizes: list[Sized] = []
    if wanted.every_size:
        again = Search(pricer, wanted, layout, progress)
        again.merge_unnoticed()
        sizes = [sized(pricer, one) for one in again.every_size(wanted.rows)]
    return Distilled(rule, kept, None, tuple(notes), tuple(sizes))


def sized(pricer: NetworkPricer, layout: Layout) -> Sized:
    """A layout as a rule, and the share of information that its lines keep."""
    rule = as_rule(pricer, layout)
    situations = pricer.situations
    pooled = situations.pooled(situations.rows_of(rule), len(rule.rows))
    return rule, situations.information_kept(float(gain(*pooled).sum()))


class Search:
    """Merging lines of one layout, always under exact pricing."""

    def __init__(
        self, pricer: NetworkPricer, wanted: Wanted, layout: Layout, progress: Progress | None
    ) -> None:
        self._pricer, self._wanted, self._progress = pricer, wanted, progress
        self._batch = Batch(pricer)
        self._moves = Moves(pricer, wanted.inputs)
        self._first = layout
        self._last: list[Layout] = []
        work = pricer.group.horizon * self._batch.counts(layout)
        self._at_a_level = min(AT_A_LEVEL, WORK_AT_A_LEVEL // work)
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
        for layouts in self._levels(self._batch.objectives):
            if len(self.layout) <= rows:
                return
            self.layout = layouts[0]
            self._last = layouts[:SETTLED]
            self._tell()

    def every_size(self, rows: int) -> Iterator[Layout]:
        """What :meth:`merge_down_to` and :meth:`settle_bars` lead to, for ever fewer lines."""
        if len(self.layout) <= rows:
            yield self._settled(self.layout)[1]
        for layouts in self._levels(self._batch.objectives):
            self.layout = layouts[0]
            self._tell()
            if len(self.layout) <= rows:
                settled = [self._settled(layout) for layout in layouts[:SETTLED]]
                yield min(settled, key=lambda pair: pair[0])[1]

    def merge_within(self, enough: Enough) -> tuple[str, ...]:
        """Take the fewest lines that are within limits; returns sentences on how it went.

        Of those that qualify with so many lines, the one of least risk.
        """

        def excess(layouts: list[Layout]) -> list[float]:
            return [enough.excess(found) for found in self._batch.tallies(layouts)]

        fits = excess([self.layout])[0] <= 0.0
        for layouts in self._levels(excess):
            beyond = excess(layouts)
            within = [one for one, much in zip(layouts, beyond, strict=True) if much <= 0.0]
            if within:
                risks = self._batch.objectives(within)
                self.layout, fits = within[risks.index(min(risks))], True
                self._tell()
        if fits and len(self.layout) <= self._wanted.rows:
            said = (f"The fewest lines found that {enough.they}.",) if enough.they else ()
            return (*said, *enough.notes)
        self.merge_down_to(self._wanted.rows)
        return (
            f"No rule of up to {self._wanted.rows} lines was found that {enough.it}; this one "
            "does not.",
        )

    def _levels(self, loss: Callable[[list[Layout]], list[float]]) -> Iterator[list[Layout]]:
        """Layouts with one line fewer, two fewer and so on, those of least loss first.

        Each level is made by merging the best layouts of the one before, as many of them as keeps
        the number of layouts to price near AT_A_LEVEL.
        """
        kept = [self.layout]
        while kept:
            branches = sum(1 for _ in kept[0].merges(unnoticed=False))
            width = self._at_a_level // max(branches, 1) if self._batch.together else 1
            merges = (m for one in kept[: max(width, 1)] for m in one.merges(unnoticed=False))
            candidates = self._promising(dict.fromkeys(merges))
            losses = loss(candidates)
            order = sorted(range(len(candidates)), key=lambda k: (losses[k], k))
            kept = [candidates[k] for k in order]
            if kept:
                yield kept

    def settle_bars(self) -> None:
        """Move bars by one while that lowers the risk, between the exact bars of their line."""
        settled = [self._settled(layout) for layout in self._last or [self.layout]]
        self.layout = min(settled, key=lambda pair: pair[0])[1]

    def _settled(self, layout: Layout) -> tuple[float, Layout]:
        (risk,) = self._batch.objectives([layout])
        for _ in range(MOST_MOVES):
            moved = moved_bars(self._pricer, self._wanted.inputs, layout)
            candidates = self._promising(moved)
            risks = self._batch.objectives(candidates)
            if not risks or min(risks) >= risk - 1e-12:
                break
            risk = min(risks)
            layout = candidates[risks.index(risk)].tidied()
        return risk, layout

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
