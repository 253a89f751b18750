"""What a way of playing costs one adopter: exact, a rule, plain count, alone.

The agent plays, the others stay exact and take it for exact. All figures are exact sums over the
walk of the agent; what is lost and added is held against its exact play, which is a benchmark and
not a ceiling, since its thresholds are not chosen anew for company.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

import numpy as np

from thumbwright.distill.assemble import Setting
from thumbwright.distill.findings import CostBasis, Figures, RowUse
from thumbwright.distill.playing import alone_policy, plain_count_policy, rule_policy
from thumbwright.distill.rules import Rule
from thumbwright.distill.situations import Situations, situations_of, values_of
from thumbwright.exact.arrays import FloatArray
from thumbwright.exact.engine import Track
from thumbwright.exact.group import Group
from thumbwright.exact.outcomes import outcome
from thumbwright.exact.play import Play, Policy, adopt, difference
from thumbwright.exact.stopping import Cone, Losses

WORTH_WATCHING = 0.01
"""Below this share of the risk alone, what exact watching saves is called nothing."""

PolicyFor = Callable[[Setting], Policy]


@dataclass(frozen=True)
class Tally:
    """Plain probabilities of how one way of playing turns out, averaged over settings.

    ``plus``, ``minus``, ``undecided``, ``steps`` have shape (2,), given plus and given minus.
    ``lean_plus``, ``lean_minus``, also (2,), are the undecided at the horizon whose belief favours
    plus or minus; one that favours neither counts half for each.
    """

    plus: FloatArray
    minus: FloatArray
    undecided: FloatArray
    steps: FloatArray
    lean_plus: FloatArray
    lean_minus: FloatArray
    off_model: float = 0.0

    def risk(self, losses: Losses, prior_plus: float) -> float:
        """Expected loss, averaged over the prior."""
        says_plus, says_minus = self.plus[1], self.minus[0]
        undecided = self.undecided
        horizon = 0.0
        if losses.undecided is None:
            says_plus, says_minus = says_plus + self.lean_plus[1], says_minus + self.lean_minus[0]
        else:
            share = prior_plus * undecided[0] + (1 - prior_plus) * undecided[1]
            horizon = losses.undecided * float(share)
        return float(
            losses.false_plus * (1 - prior_plus) * says_plus
            + losses.false_minus * prior_plus * says_minus
            + losses.per_step * (prior_plus * self.steps[0] + (1 - prior_plus) * self.steps[1])
            + horizon
        )


def _difference(one: float, other: float) -> float:
    """One less the other; what is rounding only is nothing."""
    return 0.0 if abs(one - other) <= 1e-12 * max(1.0, abs(one)) else one - other


def tally(track: Track, off_model: float = 0.0) -> Tally:
    """Count up a track."""
    given = outcome(track)
    half = track.leaning[2] / 2.0
    return Tally(
        plus=np.array([o.plus for o in given]),
        minus=np.array([o.minus for o in given]),
        undecided=np.array([o.undecided for o in given]),
        steps=np.array([o.mean_steps for o in given]),
        lean_plus=track.leaning[0] + half,
        lean_minus=track.leaning[1] + half,
        off_model=off_model,
    )


def average(parts: Sequence[tuple[float, Tally]]) -> Tally:
    """The mean of several tallies with these shares."""
    names = ("plus", "minus", "undecided", "steps", "lean_plus", "lean_minus", "off_model")
    return Tally(**{name: sum(w * getattr(part, name) for w, part in parts) for name in names})


@dataclass(frozen=True)
class Pricer:
    """Prices ways of playing for one agent of a case, against its exact play.

    Attributes
    ----------
    agent : str
    settings : tuple of Setting
    situations : Situations
    losses : Losses or None
        None where costs are neither stated nor could be inferred; then no risk is given.
    cone : Cone or None
        Where the losses come from thresholds, all the costs they could come from.
    """

    agent: str
    settings: tuple[Setting, ...]
    situations: Situations
    losses: Losses | None
    cone: Cone | None
    exact_tally: Tally
    alone_tally: Tally

    @classmethod
    def build(
        cls,
        agent: str,
        settings: tuple[Setting, ...],
        losses: Losses | None,
        cone: Cone | None = None,
    ) -> Pricer:
        """Play exactly and alone once; everything else is held against these."""
        exact, alone = [], []
        for setting in settings:
            solution = setting.solution
            exact.append((setting.weight, tally(solution.tracks[solution.group.index[agent]])))
            played = adopt(solution, agent, alone_policy)
            alone.append((setting.weight, tally(played.track, played.off_model)))
        situations = situations_of(settings, agent)
        return cls(agent, settings, situations, losses, cone, average(exact), average(alone))

    @property
    def group(self) -> Group:
        """The group of the first setting; settings differ in thresholds only."""
        return self.settings[0].solution.group

    @property
    def seen(self) -> tuple[str, ...]:
        """Ids of the agents that this one sees, in its own order."""
        return self.group.agents[self.group.index[self.agent]].sees

    @property
    def prior_plus(self) -> float:
        """Prior probability of plus."""
        return self.group.prior_plus

    def play(
        self, policy_for: PolicyFor, rows: int = 0, whole: bool = True
    ) -> tuple[Tally, FloatArray | None]:
        """Play a policy in every setting; its tally and, with ``rows``, the use of each row.

        Without ``whole`` it is not counted how often others are shown what they call impossible.
        """
        plays: list[tuple[float, Play]] = [
            (s.weight, adopt(s.solution, self.agent, policy_for(s), rows, whole))
            for s in self.settings
        ]
        usage = np.zeros((rows, 2)) if rows else None
        for weight, played in plays:
            if usage is not None and played.usage is not None:
                usage += weight * played.usage
        return average([(w, tally(p.track, p.off_model)) for w, p in plays]), usage

    def rule_policies(self, rule: Rule) -> PolicyFor:
        """The rule as a policy in each setting; rows of bars get their pooled worth."""
        values = None
        if rule.has_bars:
            rows = self.situations.rows_of(rule, self.settings)
            values = values_of(*self.situations.pooled(rows, len(rule.rows)))
        return lambda s: rule_policy(rule, s.solution.group, s.names, values)

    def rule_tally(self, rule: Rule, whole: bool = True) -> Tally:
        """How a rule turns out; ``whole`` as for :meth:`play`."""
        return self.play(self.rule_policies(rule), whole=whole)[0]

    def rule_uses(self, rule: Rule) -> tuple[Tally, tuple[RowUse, ...]]:
        """How a rule turns out and how often each of its rows is in force and decides."""
        found, usage = self.play(self.rule_policies(rule), len(rule.rows))
        assert usage is not None
        return found, tuple(RowUse(float(steps), float(calls)) for steps, calls in usage)

    def plain_count_tally(self) -> Tally:
        """How counting commitments at face value, silence as nothing, turns out."""
        return self.play(lambda s: plain_count_policy(s.solution.group, self.agent))[0]

    def changed(self, one: Rule, other: Rule) -> float:
        """Probability that two rules ever act differently in one outing."""
        first, second = self.rule_policies(one), self.rule_policies(other)
        return sum(
            s.weight * difference(s.solution, self.agent, first(s), second(s))
            for s in self.settings
        )

    def objective(self, found: Tally) -> float:
        """What a search minimises: the risk; without costs, wrong answers and undecided ends."""
        if self.losses is not None:
            return found.risk(self.losses, self.prior_plus)
        return 1.0 - self.accuracy(found)

    def accuracy(self, found: Tally) -> float:
        """Probability of having given the right answer by the horizon."""
        return float(self.prior_plus * found.plus[0] + (1 - self.prior_plus) * found.minus[1])

    def mean_step(self, found: Tally) -> float:
        """Mean number of steps used."""
        return float(self.prior_plus * found.steps[0] + (1 - self.prior_plus) * found.steps[1])

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
