"""Prices for a member of a crowd: what it is shown is played once, each rule is a walk along it."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np

from thumbwright.distill.assemble import Limits
from thumbwright.distill.costs import Inexact, Pricer
from thumbwright.distill.crowd_situations import Counted, CrowdSituations
from thumbwright.distill.crowds import lay_out
from thumbwright.distill.findings import Agreed, RowUse
from thumbwright.distill.playing import acts
from thumbwright.distill.reckoned import Way, act_of
from thumbwright.distill.rules import Rule
from thumbwright.distill.situations import Weighed
from thumbwright.distill.tallies import PARTS, Sampled, Tally, prior_pair
from thumbwright.exact.agreement import crowd_agreement
from thumbwright.exact.arrays import FloatArray
from thumbwright.exact.crowd import (
    Crowd,
    CrowdPolicy,
    InPublic,
    Kind,
    Shown,
    adopt_crowd,
    exact_member,
)
from thumbwright.exact.group import Group
from thumbwright.exact.play import Act
from thumbwright.exact.stopping import Cone, Losses


@dataclass(frozen=True)
class CrowdPricer(Pricer):
    """Prices by playing a member against the public histories of its crowd.

    Attributes
    ----------
    shown : Shown
        What the member may be shown.
    near_tie_mass : float
        Expected number of members that the tie rule decides, from exact play of the crowd.
    seed : int
        With which histories were sampled, where they were.
    drop : float
        Below which probability histories were dropped.
    """

    agent: str
    situations: CrowdSituations
    losses: Losses | None
    cone: Cone | None
    exact_tally: Tally
    alone_tally: Tally
    shown: Shown
    whole_group: Group
    near_tie_mass: float
    seed: int
    drop: float

    @classmethod
    def build(
        cls,
        group: Group,
        agent: str,
        shown: Shown,
        losses: Losses | None,
        cone: Cone | None,
        near_tie_mass: float,
        seed: int,
        drop: float = 0.0,
    ) -> CrowdPricer:
        """Play exactly and alone once; everything else is held against these."""
        exact, _ = played(shown, exact_member)
        alone, _ = played(shown, nobody_seen)
        situations = CrowdSituations.of(shown)
        parts = (situations, losses, cone, exact, alone, shown)
        return cls(agent, *parts, group, near_tie_mass, seed, drop)

    @property
    def group(self) -> Group:
        """The crowd as a group."""
        return self.whole_group

    def rule_tally(self, rule: Rule, whole: bool = True) -> Tally:
        """How a rule turns out; it is always counted how often others are shown odd answers."""
        return played(self.shown, self.policy(rule))[0]

    def rule_uses(self, rule: Rule) -> tuple[Tally, tuple[RowUse, ...]]:
        """How a rule turns out and how often each of its rows is in force and decides."""
        found, uses = played(self.shown, self.policy(rule), len(rule.rows))
        return found, uses

    def way_tally(self, way: Way, whole: bool = True) -> Tally:
        """How any function of a view turns out; see :meth:`rule_tally` for ``whole``."""
        others = self.shown.crowd.size - 1
        return played(self.shown, lambda showing: _whole(way, Counted.of(showing, others)))[0]

    def plain_count_tally(self) -> Tally:
        """How counting commitments at face value, silence as nothing, turns out."""
        return played(self.shown, self._plain_count)[0]

    def together_tally(self, rule: Rule, users: Sequence[str], others: Rule | None = None) -> Tally:
        """How a rule turns out for its agent where all ``users`` go by it.

        Where all members go by rules, all know; else the exact ones take everybody for exact, and
        may be shown what their model calls impossible.
        """
        if tuple(users) == (self.agent,) and others is None:
            return self.rule_tally(rule)
        goes_by = dict.fromkeys(users, rule)
        if others is not None:
            goes_by |= {key: others for key in self.users(others) if key not in goes_by}
        return played(self._shown_where(goes_by), self.policy(rule))[0]

    def among(self, rule: Rule) -> Shown:
        """What a member is shown where all who can go by a rule and all know."""
        return self._shown_where(dict.fromkeys(self.users(rule), rule), aware=True)

    def _shown_where(self, goes_by: Mapping[str, Rule], aware: bool = False) -> Shown:
        """What the member is shown where these go by rules, and the rest play exactly.

        If ``aware`` these know who goes by what; else they take everybody for exact.

        There may be too many histories to enumerate even if exact play has few enough; then they
        are sampled.
        """
        shown = self.shown
        kinds: list[Kind] = []
        policies: list[CrowdPolicy | None] = []
        sorts: list[int] = []
        for sort, kind in enumerate(shown.crowd.kinds):
            by_rule: dict[int, list[str]] = {}
            for member in kind.members:
                by_rule.setdefault(id(goes_by.get(member)), []).append(member)
            for members in by_rule.values():
                rule = goes_by.get(members[0])
                kinds.append(Kind(kind.evidence, kind.thresholds, tuple(members), kind.looks))
                policies.append(None if rule is None else self.policy(rule))
                sorts.append(sort)
        held = next(k for k, kind in enumerate(kinds) if self.agent in kind.members)
        given = (Crowd(tuple(kinds)), held, shown.prior, shown.horizon, shown.exchange)
        known = None if aware or all(policy is not None for policy in policies) else sorts
        return lay_out(given, self.limits, policies=policies, sorts=known)

    @property
    def limits(self) -> Limits:
        """Under which other plays of this crowd are laid out: sampled where this one was."""
        weight = self.shown.weight
        histories = None if weight is None else weight.shape[1]
        return Limits(self.drop, None, histories, self.seed)

    def situations_among(self, rule: Rule) -> CrowdSituations:
        """Situations of the rule's agent where all go by the rule and all know."""
        return CrowdSituations.of(self.among(rule))

    def with_situations(self, situations: Weighed) -> CrowdPricer:
        """The same pricer over other situations, to distil from."""
        assert isinstance(situations, CrowdSituations)
        return replace(self, situations=situations)

    def agreement(self, rule: Rule) -> Agreed:
        """How a rule compares with exact play on the same observations."""
        found = crowd_agreement(self.shown, self.policy(rule))
        prior, weights = prior_pair(self.prior_plus), self.shown.weights
        parts = {name: getattr(found, name) for name in ("same", "opposite", "steps_apart")}
        if weights is None:
            same, opposite, apart = (float(prior @ part[:, 0]) for part in parts.values())
            return Agreed(same, opposite, apart)
        errors = {n: weights.total_error(prior[:, None] * part) for n, part in parts.items()}
        same, opposite, apart = (float(prior @ weights.mean(p)[0]) for p in parts.values())
        return Agreed(same, opposite, apart, errors)

    def inexact(self) -> Inexact:
        """What in the exact beliefs is not exact."""
        shown = self.shown
        dropped = float(np.array([self.prior_plus, 1.0 - self.prior_plus]) @ shown.dropped)
        histories = 0 if shown.weight is None else shown.weight.shape[1]
        return Inexact(
            split=any(kind.evidence.split for kind in shown.crowd.kinds),
            dropped_mass=dropped,
            uncertainty=dropped,
            near_tie_mass=self.near_tie_mass,
            sampled=(histories, self.seed) if shown.sampled else None,
        )

    def policy(self, rule: Rule) -> CrowdPolicy:
        """A rule as a policy of members of this crowd."""
        values, others = self.row_values(rule), self.shown.crowd.size - 1
        return lambda seen: acts(rule, Counted.of(seen, others), values)

    def _plain_count(self, seen: InPublic) -> Act:
        worth: FloatArray = np.zeros(len(seen))
        for kind, plus, minus in zip(self.shown.crowd.kinds, seen.plus, seen.minus, strict=True):
            up = sum(share * bound.plus for share, bound in kind.thresholds) - self.shown.prior
            down = sum(share * bound.minus for share, bound in kind.thresholds) - self.shown.prior
            worth = worth + plus * up + minus * down
        return Act(worth)


def _whole(way: Way, view: Counted) -> Act:
    """What a way of playing says, one entry for each situation."""
    said, shape = act_of(way(view)), view.step.shape
    value = np.broadcast_to(np.asarray(said.value, dtype=float), shape)
    if said.minus_at is None or said.plus_at is None:
        return Act(value)
    return Act(value, np.broadcast_to(said.minus_at, shape), np.broadcast_to(said.plus_at, shape))


def nobody_seen(_seen: InPublic) -> Act:
    """Nobody is looked at."""
    return Act(np.zeros(()))


def played(shown: Shown, policy: CrowdPolicy, rows: int = 0) -> tuple[Tally, tuple[RowUse, ...]]:
    """A member's tally with a policy, and the use of each of its rows."""
    found = adopt_crowd(shown, policy, rows)
    half = found.leaning[2] / 2.0
    parts = {
        "plus": found.plus,
        "minus": found.minus,
        "undecided": found.undecided,
        "steps": found.steps,
        "lean_plus": found.leaning[0] + half,
        "lean_minus": found.leaning[1] + half,
    }
    assert tuple(parts) == PARTS
    weights = shown.weights
    prior = np.array([shown.prior_plus, 1.0 - shown.prior_plus])

    def mean(x: FloatArray) -> FloatArray:
        return x[..., 0] if weights is None else weights.mean(x)[0]

    tally = Tally(
        **{name: mean(x) for name, x in parts.items()},
        off_model=float(prior @ mean(found.off_model) + prior @ np.array(shown.odd)),
        sampled=None if weights is None else Sampled(**parts, weights=weights),
    )
    uses = () if found.usage is None else found.usage
    return tally, tuple(
        RowUse(*(float(prior @ mean(of_one)) for of_one in of_row)) for of_row in uses
    )
