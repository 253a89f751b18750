"""Prices for an agent that tells those it sees apart: by the exact solutions of its group."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

import numpy as np

from thumbwright.distill.assemble import Setting
from thumbwright.distill.costs import Inexact, Pricer
from thumbwright.distill.findings import Agreed, RowUse
from thumbwright.distill.playing import alone_policy, plain_count_policy, rule_policy, way_policy
from thumbwright.distill.reckoned import Way
from thumbwright.distill.rules import Rule
from thumbwright.distill.situations import Situations, Weighed, situations_of
from thumbwright.distill.tallies import Tally, average, prior_pair, tally
from thumbwright.distill.users import in_the_hands_of
from thumbwright.exact.adopters import Adopters, adopt_together
from thumbwright.exact.agreement import agreement
from thumbwright.exact.arrays import FloatArray
from thumbwright.exact.group import Group
from thumbwright.exact.play import Play, Policy, adopt, difference
from thumbwright.exact.stopping import Cone, Losses

PolicyFor = Callable[[Setting], Policy]


@dataclass(frozen=True)
class NetworkPricer(Pricer):
    """Prices by playing the agent against the display histories of those it sees.

    Attributes
    ----------
    settings : tuple of Setting
    situations : Situations
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
    ) -> NetworkPricer:
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
        values = self.row_values(rule)
        return lambda s: rule_policy(rule, s.solution.group, s.names, values)

    def rule_tally(self, rule: Rule, whole: bool = True) -> Tally:
        """How a rule turns out; ``whole`` as for :meth:`play`."""
        return self.play(self.rule_policies(rule), whole=whole)[0]

    def rule_uses(self, rule: Rule) -> tuple[Tally, tuple[RowUse, ...]]:
        """How a rule turns out and how often each of its rows is in force and decides."""
        found, usage = self.play(self.rule_policies(rule), len(rule.rows))
        assert usage is not None
        return found, tuple(RowUse(float(steps), float(calls)) for steps, calls in usage)

    def way_tally(self, way: Way, whole: bool = True) -> Tally:
        """How any function of a view turns out; ``whole`` as for :meth:`play`."""
        return self.play(lambda s: way_policy(way, self.seen, s.names), whole=whole)[0]

    def plain_count_tally(self) -> Tally:
        """How counting commitments at face value, silence as nothing, turns out."""
        return self.play(lambda s: plain_count_policy(s.solution.group, self.agent))[0]

    def together_tally(self, rule: Rule, users: Sequence[str], others: Rule | None = None) -> Tally:
        """How a rule turns out for its agent where all ``users`` go by it."""
        return self.together_tallies(rule, users, others)[rule.agent]

    def together_tallies(
        self, rule: Rule, users: Sequence[str], others: Rule | None = None
    ) -> dict[str, Tally]:
        """How everybody fares, by id, where all ``users`` go by a rule; see ``together_tally``."""
        parts = self._played_together(rule, users, others)
        return {
            agent.id: average([(w, tally(p.tracks[k], p.off_model)) for w, p in parts])
            for k, agent in enumerate(self.group.agents)
        }

    def situations_among(self, rule: Rule) -> Situations:
        """Situations of the rule's agent where all who can go by the rule and all know."""
        played = self._played_together(rule, self.users(rule), None)
        settings = tuple(
            replace(setting, solution=replace(setting.solution, tracks=one.tracks))
            for setting, (_, one) in zip(self.settings, played, strict=True)
        )
        return situations_of(settings, self.agent)

    def with_situations(self, situations: Weighed) -> NetworkPricer:
        """The same pricer over other situations, to distil from."""
        assert isinstance(situations, Situations)
        return replace(self, situations=situations)

    def _played_together(
        self, rule: Rule, users: Sequence[str], others: Rule | None
    ) -> list[tuple[float, Adopters]]:
        """The play of each setting, with its share."""
        group, parts = self.group, []
        theirs = [] if others is None else [u for u in self.users(others) if u not in users]
        used = [(rule, agent) for agent in users]
        used += [(others, agent) for agent in theirs if others is not None]
        values = {id(one): self.row_values(one) for one, _ in used}
        for setting in self.settings:
            policies = {
                agent: rule_policy(
                    in_the_hands_of(one, agent, group),
                    setting.solution.group,
                    setting.names if agent == self.agent else {},
                    values[id(one)],
                )
                for one, agent in used
            }
            parts.append((setting.weight, adopt_together(setting.solution, policies)))
        return parts

    def agreement(self, rule: Rule) -> Agreed:
        """How a rule compares with exact play on the same observations."""
        policy_for, prior = self.rule_policies(rule), prior_pair(self.prior_plus)
        found = np.zeros(3)
        for setting in self.settings:
            one = agreement(setting.solution, self.agent, policy_for(setting))
            parts = (one.same, one.opposite, one.steps_apart)
            found += setting.weight * np.array([prior @ part[:, 0] for part in parts])
        same, opposite, steps_apart = found.tolist()
        return Agreed(same, opposite, steps_apart)

    def changed(self, one: Rule, other: Rule) -> float:
        """Probability that two rules ever act differently in one outing."""
        first, second = self.rule_policies(one), self.rule_policies(other)
        return sum(
            s.weight * difference(s.solution, self.agent, first(s), second(s))
            for s in self.settings
        )

    def inexact(self) -> Inexact:
        """What in the exact beliefs is not exact."""
        parts = [(s.weight, s.solution) for s in self.settings]
        return Inexact(
            split=any(agent.evidence.split for agent in self.group.agents),
            dropped_mass=sum(w * one.dropped_mass for w, one in parts),
            uncertainty=sum(w * one.uncertainty for w, one in parts),
            near_tie_mass=sum(w * one.near_tie_mass for w, one in parts),
            sampled=None,
        )
