"""What a way of playing costs one adopter: exact, a rule, plain count, alone.

The agent plays, the others stay exact and take it for exact. All figures are exact sums over the
walk of the agent; what is lost and added is held against its exact play, which is a benchmark and
not a ceiling, since its thresholds are not chosen anew for company.
"""

from __future__ import annotations

from abc import ABC, abstractmethod
from collections.abc import Sequence
from dataclasses import dataclass, replace

from thumbwright.distill.findings import Agreed, CostBasis, Figures, RowUse
from thumbwright.distill.reckoned import Way
from thumbwright.distill.rules import Rule
from thumbwright.distill.situations import Weighed, values_of
from thumbwright.distill.tallies import (
    Figure,
    Tally,
    accuracy_of,
    error_of,
    error_of_difference,
    mean_step_of,
    risk_of,
    wrong_of,
)
from thumbwright.distill.users import users_of
from thumbwright.exact.arrays import FloatArray
from thumbwright.exact.group import Group
from thumbwright.exact.stopping import Cone, Losses

WORTH_WATCHING = 0.01
"""Below this share of the risk alone, what exact watching saves is called nothing."""


@dataclass(frozen=True)
class Inexact:
    """What in the exact beliefs of a case is not exact.

    Attributes
    ----------
    split : bool
        Whether somebody's evidence was split onto a ladder.
    dropped_mass, uncertainty : float
        Probability that was dropped on request, and what that can change a probability by.
    near_tie_mass : float
    sampled : tuple of two ints, or None
        Number of sampled histories and the seed.
    """

    split: bool
    dropped_mass: float
    uncertainty: float
    near_tie_mass: float
    sampled: tuple[int, int] | None

    @property
    def nothing(self) -> bool:
        """Whether they are exact."""
        return not self.split and self.dropped_mass == 0.0 and self.sampled is None


def _difference(one: float, other: float) -> float:
    """One less the other; what is rounding only is nothing."""
    return 0.0 if abs(one - other) <= 1e-12 * max(1.0, abs(one)) else one - other


class Pricer(ABC):
    """Prices ways of playing for one agent of a case, against its exact play.

    Attributes
    ----------
    agent : str
    situations : Weighed
    losses : Losses or None
        None where costs are neither stated nor could be inferred; then no risk is given.
    cone : Cone or None
        Where the losses come from thresholds, all the costs they could come from.
    exact_tally, alone_tally : Tally
    """

    agent: str
    situations: Weighed
    losses: Losses | None
    cone: Cone | None
    exact_tally: Tally
    alone_tally: Tally

    @property
    @abstractmethod
    def group(self) -> Group:
        """The group; where several settings differ in thresholds, that of the first."""

    @property
    def seen(self) -> tuple[str, ...]:
        """Ids of the agents that this one sees, in its own order."""
        return self.group.agents[self.group.index[self.agent]].sees

    @property
    def prior_plus(self) -> float:
        """Prior probability of plus."""
        return self.group.prior_plus

    @abstractmethod
    def rule_tally(self, rule: Rule, whole: bool = True) -> Tally:
        """How a rule turns out.

        Without ``whole`` it need not be counted how often others are shown what they call
        impossible.
        """

    @abstractmethod
    def rule_uses(self, rule: Rule) -> tuple[Tally, tuple[RowUse, ...]]:
        """How a rule turns out and how often each of its rows is in force and decides."""

    @abstractmethod
    def way_tally(self, way: Way, whole: bool = True) -> Tally:
        """How any function of a view turns out; ``whole`` as for :meth:`rule_tally`."""

    def price(self, way: Rule | Way) -> Figures:
        """Figures of a rule, or of any function of a view (see ``reckoned``)."""
        found = self.rule_tally(way) if isinstance(way, Rule) else self.way_tally(way)
        return self.figures(found)

    @abstractmethod
    def plain_count_tally(self) -> Tally:
        """How counting commitments at face value, silence as nothing, turns out."""

    def users(self, rule: Rule) -> tuple[str, ...]:
        """Ids of the agents that can use a rule, its own among them."""
        return users_of(rule, self.group)

    @abstractmethod
    def together_tally(self, rule: Rule, users: Sequence[str], others: Rule | None = None) -> Tally:
        """How a rule turns out for its agent where all ``users`` go by it.

        The others play exactly and take everyone for exact; or, where a rule is given for
        ``others``, those of them that can go by that.

        Raises
        ------
        ModelError
            Where this cannot be worked out for this group.
        """

    @abstractmethod
    def situations_among(self, rule: Rule) -> Weighed:
        """Situations of the rule's agent where all who can go by the rule and all know.

        Their weights and worths are those of what then happens. Raises ModelError as
        :meth:`together_tally`.
        """

    @abstractmethod
    def with_situations(self, situations: Weighed) -> Pricer:
        """The same pricer over other situations, to distil from."""

    @abstractmethod
    def agreement(self, rule: Rule) -> Agreed:
        """How a rule compares with exact play on the same observations."""

    @abstractmethod
    def inexact(self) -> Inexact:
        """What in the exact beliefs is not exact."""

    def row_values(self, rule: Rule) -> FloatArray | None:
        """Pooled worth of each row of bars (nats); None for a rule of values."""
        if not rule.has_bars:
            return None
        return values_of(*self.situations.pooled(self.situations.rows_of(rule), len(rule.rows)))

    def objective(self, found: Tally) -> float:
        """What a search minimises: the risk; without costs, wrong answers and undecided ends."""
        if self.losses is not None:
            return found.risk(self.losses, self.prior_plus)
        return 1.0 - self.accuracy(found)

    def accuracy(self, found: Tally) -> float:
        """Probability of having given the right answer by the horizon."""
        return accuracy_of(self.prior_plus).of(found)

    def mean_step(self, found: Tally) -> float:
        """Mean number of steps used."""
        return mean_step_of(self.prior_plus).of(found)

    def _errors(self, found: Tally) -> dict[str, float] | None:
        """Standard errors of the figures that are printed; None where nothing is sampled."""
        if found.sampled is None:
            return None
        accuracy, step = accuracy_of(self.prior_plus), mean_step_of(self.prior_plus)
        errors = {
            "wrong_given_plus": error_of(wrong_of(0), found),
            "wrong_given_minus": error_of(wrong_of(1), found),
            "accuracy": error_of(accuracy, found),
            "mean_step": error_of(step, found),
            "accuracy_lost": error_of_difference(accuracy, found, self.exact_tally),
            "delay_added": error_of_difference(step, found, self.exact_tally),
        }
        if self.losses is not None:
            risk = risk_of(self.losses, self.prior_plus)
            errors["risk"] = error_of(risk, found)
            kept = self._benefit_error(found, risk)
            if kept is not None:
                errors["benefit_kept"] = kept
        return errors

    def _benefit_error(self, found: Tally, risk: Figure) -> float | None:
        """Error of a ratio of two differences, linearised; paired where histories are the same."""
        assert self.losses is not None
        kept = self.benefit_kept(found, self.losses)
        if kept is None or found.sampled is None:
            return None
        saved = risk.of(self.alone_tally) - risk.of(self.exact_tally)
        played = [one.sampled for one in (self.alone_tally, found, self.exact_tally)]
        if all(one is not None and one.weights is found.sampled.weights for one in played):
            alone, rule, exact = (risk.by_history(one) for one in played if one is not None)
            residue = (alone - rule - kept * (alone - exact)) / saved
            return found.sampled.weights.total_error(residue)
        return error_of(risk, found) / abs(saved)

    def figures(self, found: Tally) -> Figures:
        """The figures that are printed, held against exact play."""
        given_plus, given_minus = (
            {
                name: float(getattr(found, name)[k])
                for name in ("plus", "minus", "undecided", "steps")
            }
            for k in (0, 1)
        )
        risk = None if self.losses is None else found.risk(self.losses, self.prior_plus)
        return Figures(
            given_plus=given_plus,
            given_minus=given_minus,
            wrong_given_plus=given_plus["minus"],
            wrong_given_minus=given_minus["plus"],
            accuracy=self.accuracy(found),
            mean_step=self.mean_step(found),
            risk=risk,
            accuracy_lost=_difference(self.accuracy(self.exact_tally), self.accuracy(found)),
            delay_added=_difference(self.mean_step(found), self.mean_step(self.exact_tally)),
            benefit_kept=None if self.losses is None else self.benefit_kept(found, self.losses),
            off_model=found.off_model,
            errors=self._errors(found),
        )

    def benefit_kept(self, found: Tally, losses: Losses) -> float | None:
        """Share of what exact watching saves over being alone; None where it saves nothing."""
        alone = self.alone_tally.risk(losses, self.prior_plus)
        saved = alone - self.exact_tally.risk(losses, self.prior_plus)
        if saved < WORTH_WATCHING * alone:
            return None
        return (alone - found.risk(losses, self.prior_plus)) / saved

    @property
    def watching_is_worth(self) -> bool:
        """Whether exact watching saves a noticeable share of the risk alone."""
        if self.losses is None:
            return True
        return self.benefit_kept(self.exact_tally, self.losses) is not None

    def basis(self, found: Tally) -> CostBasis | None:
        """The losses used, with their ranges where they were inferred, for one rule."""
        if self.losses is None:
            return None
        basis = CostBasis(
            self.losses.false_plus,
            self.losses.false_minus,
            self.losses.per_step,
            self.losses.undecided,
            inferred=self.cone is not None,
            loss_ratio_range=None,
            per_step_range=None,
            benefit_kept_range=None,
        )
        if self.cone is None:
            return basis
        ends = [self.benefit_kept(found, corner) for corner in self.cone.corners]
        known = [end for end in ends if end is not None]
        return replace(
            basis,
            loss_ratio_range=self.cone.ratio,
            per_step_range=self.cone.per_step,
            benefit_kept_range=(min(known), max(known)) if len(known) == len(ends) else None,
        )
