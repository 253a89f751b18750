"""How often a rule and exact play end alike on the same observations, and how far apart in time.

Both ways of playing that are compared have the same observations and are shown the same as long as
neither has answered. When one of them answers its end is known; the other goes on in the world in
which it still shows undecided. So both are met by the histories that an agent is shown that is held
to showing undecided, and a walk of pairs along these is exact, whoever watches the agent. The
exception is a silence that exact play calls impossible: others read it by a convention.

The walk has five blocks of rows: both undecided, and one of the two having said plus or minus while
the other is undecided. What both have answered is counted up and taken out.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from thumbwright.exact.arrays import BoolArray, FloatArray
from thumbwright.exact.crowd_policy import CrowdPolicy, reached
from thumbwright.exact.crowd_shown import Showing, Shown
from thumbwright.exact.engine import Moment, Solution
from thumbwright.exact.group import Agent
from thumbwright.exact.play import Policy, RuleReader
from thumbwright.exact.player import Reading, Scene, by_value
from thumbwright.exact.walk import Walk

_BOTH, _FIRST_PLUS, _FIRST_MINUS, _SECOND_PLUS, _SECOND_MINUS = range(5)


@dataclass(frozen=True)
class Agreement:
    """How two ways of playing compare on the same observations.

    Every array has given plus and given minus along its first axis and the histories along its
    second: one entry for each where they are sampled, else one for all.

    Attributes
    ----------
    same : ndarray of float, shape (2, H)
        Probability that both end with the same answer, or both with none.
    opposite : ndarray of float, shape (2, H)
        Probability that one says plus and the other minus.
    steps_apart : ndarray of float, shape (2, H)
        Mean absolute difference of the steps used; who is undecided at the horizon has used all.
    """

    same: FloatArray
    opposite: FloatArray
    steps_apart: FloatArray


def agreement(solution: Solution, agent: str, policy: Policy) -> Agreement:
    """Compare a policy with exact play, for one agent of a network.

    Parameters
    ----------
    solution : Solution
        The exact play of the group.
    agent : str
        Id of the agent that uses the policy; its own thresholds must be known.
    policy : callable
        ``policy(situation) -> act``.
    """
    group = solution.group
    position = group.index[agent]
    seen = tuple(solution.tracks[other].events for other in group.sees[position])
    moments, reader = solution.tracks[position].moments, RuleReader(policy)
    pairs = _Pairs(group.agents[position], group.horizon, by_history=False)
    shape = (1,) * len(seen)
    for number, moment in enumerate(moments):
        new = moment.log_shown.shape[1:]
        for axis, length in enumerate(new):
            if length > shape[axis]:
                pairs.walk.grow(shape, axis, length - shape[axis])
                shape = (*shape[:axis], length, *shape[axis + 1 :])
        pairs.begin(moment.step)
        scene = Scene(moment.step, moment.round, seen, moment.log_shown, pairs.walk, group.prior)
        ways = reader.read(scene), by_value(scene, moment.value.ravel())
        pairs.decide(*ways, moment.log_shown.reshape(2, -1), _ends(moments, number))
    return pairs.finished()


def crowd_agreement(shown: Shown, policy: CrowdPolicy) -> Agreement:
    """Compare a policy with exact play, for one member of a crowd."""
    parts = []
    for part in shown.parts:
        pairs = _Pairs(shown.member.agent, shown.horizon, by_history=shown.sampled)
        for number, showing in enumerate(part):
            walk = pairs.walk
            walk.mass, walk.log_scale = walk.mass[:, showing.parent], walk.log_scale[showing.parent]
            pairs.begin(showing.step)
            act, size = policy(showing), len(showing.parent)
            rule = Reading(*reached(walk, shown.prior, act, size), showing.worth)
            scene = Scene(showing.step, showing.round, (), showing.log_shown, walk, shown.prior)
            ways = rule, by_value(scene, showing.worth)
            pairs.decide(*ways, showing.log_shown, _ends(part, number))
        parts.append(pairs.finished())
    names = ("same", "opposite", "steps_apart")
    return Agreement(*(np.concatenate([getattr(p, n) for p in parts], axis=-1) for n in names))


def _ends(moments: list[Moment] | tuple[Showing, ...], number: int) -> bool:
    """Whether a moment is the last of its step."""
    return number + 1 == len(moments) or moments[number + 1].step != moments[number].step


class _Pairs:
    """A walk of pairs, and what it has brought so far."""

    def __init__(self, agent: Agent, horizon: int, by_history: bool) -> None:
        self._agent, self._horizon, self._by_history = agent, horizon, by_history
        ((_, bounds),) = agent.thresholds
        blocks = tuple((float(block == _BOTH), bounds) for block in range(5))
        self.walk = Walk(agent.evidence, blocks, agent.observed_by(horizon))
        self._step = 0
        self._met: list[tuple[int, int, FloatArray]] = []
        # Added up over moments; they take their width from what is added at the horizon.
        self._same: FloatArray = np.zeros((2, 1))
        self._opposite, self._apart = self._same, self._same

    def begin(self, step: int) -> None:
        """The private observations of a step, where it is a new one."""
        if step == self._step:
            return
        self._step, evidence = step, self._agent.evidence
        for _ in range(self._agent.looks_at(step)):
            for side, proof in enumerate((evidence.certain_plus, evidence.certain_minus)):
                if proof:
                    for block in range(5):
                        log = self.walk.log_where(self._rows(block)) + np.log(proof)
                        log[1 - side] = -np.inf
                        self._met.append((block, side, log))
            self.walk.observe()

    def decide(self, rule: Reading, exact: Reading, log_weight: FloatArray, ends: bool) -> None:
        """Let both decide; ``log_weight`` is of every history, shape (2, C)."""
        self._resolve_certain(log_weight)
        if self.walk.observed:
            self._resolve(rule, exact, log_weight)
        if ends and self._step < self._horizon:
            waiting = self._in_block(_FIRST_PLUS, log_weight)
            for block in (_FIRST_MINUS, _SECOND_PLUS, _SECOND_MINUS):
                waiting = waiting + self._in_block(block, log_weight)
            self._apart = self._apart + waiting
        elif ends:
            self._same = self._same + self._in_block(_BOTH, log_weight)

    def finished(self) -> Agreement:
        """What it has brought."""
        return Agreement(*np.broadcast_arrays(self._same, self._opposite, self._apart))

    def _resolve(self, rule: Reading, exact: Reading, log_weight: FloatArray) -> None:
        block = self.walk.block[:, None]
        both = block == _BOTH
        said = {
            _FIRST_PLUS: (both & rule.plus) | (block == _FIRST_PLUS),
            _FIRST_MINUS: (both & rule.minus) | (block == _FIRST_MINUS),
            _SECOND_PLUS: (both & exact.plus) | (block == _SECOND_PLUS),
            _SECOND_MINUS: (both & exact.minus) | (block == _SECOND_MINUS),
        }
        # Who has not answered before may do so now.
        for name, way, waits in (
            (_FIRST_PLUS, rule.plus, (_SECOND_PLUS, _SECOND_MINUS)),
            (_FIRST_MINUS, rule.minus, (_SECOND_PLUS, _SECOND_MINUS)),
            (_SECOND_PLUS, exact.plus, (_FIRST_PLUS, _FIRST_MINUS)),
            (_SECOND_MINUS, exact.minus, (_FIRST_PLUS, _FIRST_MINUS)),
        ):
            said[name] = said[name] | (np.isin(block, waits) & way)
        same = (said[_FIRST_PLUS] & said[_SECOND_PLUS]) | (said[_FIRST_MINUS] & said[_SECOND_MINUS])
        opposite = (said[_FIRST_PLUS] & said[_SECOND_MINUS]) | (
            said[_FIRST_MINUS] & said[_SECOND_PLUS]
        )
        out = same | opposite
        moved = [(name, both & mask & ~out) for name, mask in said.items()]
        if not out.any() and not any(mask.any() for _, mask in moved):
            return
        self._same = self._same + self._summed(self.walk.log_where(same) + log_weight)
        self._opposite = self._opposite + self._summed(self.walk.log_where(opposite) + log_weight)
        self.walk.carry(out, moved)

    def _resolve_certain(self, log_weight: FloatArray) -> None:
        """Whoever has met certain evidence answers what it proves."""
        for block, side, log in self._met:
            opposite = block in ((_FIRST_MINUS, _SECOND_MINUS), (_FIRST_PLUS, _SECOND_PLUS))[side]
            amount = self._summed(log + log_weight)
            if opposite:
                self._opposite = self._opposite + amount
            else:
                self._same = self._same + amount
        self._met = []

    def _rows(self, block: int) -> BoolArray:
        return np.broadcast_to((self.walk.block == block)[:, None], self.walk.mass.shape)

    def _in_block(self, block: int, log_weight: FloatArray) -> FloatArray:
        return self._summed(self.walk.log_where(self._rows(block)) + log_weight)

    def _summed(self, log: FloatArray) -> FloatArray:
        probability = np.exp(log)
        return probability if self._by_history else probability.sum(axis=-1, keepdims=True)
