"""Prices for a member of a crowd: what it is shown is played once, each rule is a walk along it."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from thumbwright.distill.costs import Inexact, Pricer
from thumbwright.distill.crowd_situations import Counted, CrowdSituations
from thumbwright.distill.findings import RowUse
from thumbwright.distill.playing import acts
from thumbwright.distill.reckoned import Way, act_of
from thumbwright.distill.rules import Rule
from thumbwright.distill.tallies import PARTS, Sampled, Tally
from thumbwright.exact.arrays import FloatArray
from thumbwright.exact.crowd import (
    CrowdPolicy,
    Showing,
    Shown,
    Weights,
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
    ) -> CrowdPricer:
        """Play exactly and alone once; everything else is held against these."""
        exact, _ = _played(shown, exact_member)
        alone, _ = _played(shown, _alone)
        situations = CrowdSituations.of(shown)
        return cls(agent, situations, losses, cone, exact, alone, shown, group, near_tie_mass, seed)

    @property
    def group(self) -> Group:
        """The crowd as a group."""
        return self.whole_group

    @property
    def weights(self) -> Weights | None:
        """Weights of sampled histories; None where they are enumerated."""
        return _weights(self.shown)

    def rule_tally(self, rule: Rule, whole: bool = True) -> Tally:
        """How a rule turns out; it is always counted how often others are shown odd answers."""
        return _played(self.shown, self._policy(rule))[0]

    def rule_uses(self, rule: Rule) -> tuple[Tally, tuple[RowUse, ...]]:
        """How a rule turns out and how often each of its rows is in force and decides."""
        found, uses = _played(self.shown, self._policy(rule), len(rule.rows))
        return found, uses

    def way_tally(self, way: Way, whole: bool = True) -> Tally:
        """How any function of a view turns out; see :meth:`rule_tally` for ``whole``."""
        others = self.shown.crowd.size - 1
        return _played(self.shown, lambda showing: _whole(way, Counted.of(showing, others)))[0]

    def plain_count_tally(self) -> Tally:
        """How counting commitments at face value, silence as nothing, turns out."""
        return _played(self.shown, self._plain_count)[0]

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

    def _policy(self, rule: Rule) -> CrowdPolicy:
        values, others = self.row_values(rule), self.shown.crowd.size - 1
        return lambda showing: acts(rule, Counted.of(showing, others), values)

    def _plain_count(self, showing: Showing) -> Act:
        worth: FloatArray = np.zeros(len(showing.parent))
        for kind, plus, minus in zip(
            self.shown.crowd.kinds, showing.plus, showing.minus, strict=True
        ):
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


def _alone(_showing: Showing) -> Act:
    """Nobody is looked at."""
    return Act(np.zeros(()))


def _weights(shown: Shown) -> Weights | None:
    return None if shown.weight is None else Weights(shown.weight, shown.half)


def _played(shown: Shown, policy: CrowdPolicy, rows: int = 0) -> tuple[Tally, tuple[RowUse, ...]]:
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
    weights = _weights(shown)
    prior = np.array([shown.prior_plus, 1.0 - shown.prior_plus])

    def mean(x: FloatArray) -> FloatArray:
        return x[..., 0] if weights is None else weights.mean(x)[0]

    tally = Tally(
        **{name: mean(x) for name, x in parts.items()},
        off_model=float(prior @ mean(found.off_model)),
        sampled=None if weights is None else Sampled(**parts),
    )
    uses = () if found.usage is None else found.usage
    return tally, tuple(
        RowUse(*(float(prior @ mean(of_one)) for of_one in of_row)) for of_row in uses
    )
