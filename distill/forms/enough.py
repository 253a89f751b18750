"""Whether a rule loses little enough and keeps enough: the limits that a case may set."""

from __future__ import annotations

from thumbwright.distill.costs import Pricer
from thumbwright.distill.forms import Wanted
from thumbwright.distill.tallies import Tally

WORTHLESS = (
    "Watching is worth nothing here, so there is no benefit to keep a share of; min_benefit_kept "
    "is passed over."
)


class Enough:
    """The limits of a case: accuracy that may be lost, share of the benefit that must be kept.

    Where watching is worth nothing there is no such share, and that limit is passed over.

    Attributes
    ----------
    they, it : str
        What rows, and a rule, do that are within the limits, to end a sentence with.
    notes : tuple of str
        What must be said of the limits themselves.
    """

    def __init__(self, pricer: Pricer, wanted: Wanted) -> None:
        self._pricer = pricer
        self._most_lost, self._least_kept = wanted.max_accuracy_lost, wanted.min_benefit_kept
        self.notes: tuple[str, ...] = ()
        if self._least_kept is not None and not pricer.watching_is_worth:
            self._least_kept, self.notes = None, (WORTHLESS,)
        said = []
        if self._most_lost is not None:
            said.append(("stay", "stays", "within the accuracy that may be lost"))
        if self._least_kept is not None:
            said.append(("keep", "keeps", "the share of the benefit that is asked for"))
        self.they = " and ".join(f"{they} {what}" for they, _, what in said)
        self.it = " and ".join(f"{it} {what}" for _, it, what in said)

    def excess(self, found: Tally) -> float:
        """How far a way of playing is beyond the limit that it misses most; within: 0 or less."""
        pricer, beyond = self._pricer, []
        if self._most_lost is not None:
            lost = pricer.accuracy(pricer.exact_tally) - pricer.accuracy(found)
            beyond.append(lost - self._most_lost)
        if self._least_kept is not None:
            assert pricer.losses is not None, "a case that asks for benefit has costs"
            kept = pricer.benefit_kept(found, pricer.losses)
            assert kept is not None, "watching is worth something here"
            beyond.append(self._least_kept - kept)
        return max(beyond, default=0.0)

    def __call__(self, found: Tally) -> bool:
        """Whether a way of playing is within all limits."""
        return self.excess(found) <= 0.0
