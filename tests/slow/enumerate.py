"""The model played by its words: every observation sequence of every agent, one by one.

This is the slow counterpart of the engine and shares nothing with it. A *branch* is one joint
sequence of private observations together with what it made the agents show; it carries its
probability under plus and under minus side by side. Branches are never merged.

Beliefs are taken from their definition. What agent i makes of a shown history h is

    social_i(h) = ln P(h | plus, i made to show undecided)
                - ln P(h | minus, i made to show undecided)

so beside the branches of actual play there is one further set per agent, in which that agent is
held undecided and does not observe. All sets go forward together, moment by moment (a moment is
a step and a round): what was shown before a moment gives every agent's social value at it, and
these values then say who commits at it.

What no agent can be shown under the model (possible only when somebody plays by a rule, or is
held undecided beyond what its thresholds allow) is read as follows. A commitment of probability
zero is the same commitment at the latest earlier moment that the model allows; where there is
none, the agent is taken to be still undecided. Silence of probability zero leaves the social
value where it was.

Cost: the product over agents and steps of the number of values. Three agents with two values
reach about six steps, two agents about ten.
"""

from __future__ import annotations

import math
from collections import defaultdict
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field
from itertools import product
from typing import NamedTuple

from tests.slow.group import Event, Group, Moment, Outcome, Rule, Shown, Thresholds, Worth

TIE = 1e-9
"""A belief this close to a threshold (nats) has reached it; part of the model."""
NEAR = 1e-12
"""Decided further than this from the threshold, yet within TIE: a near tie."""


class Branch(NamedTuple):
    """One joint observation sequence; ``tally`` is per agent, in nats.

    The last two say how often a commitment, and whether a silence, was met by an undecided agent
    that the model gives probability zero.
    """

    plus: float
    minus: float
    kind: tuple[int, ...]
    observed: tuple[tuple[int, ...], ...]
    tally: tuple[float, ...]
    shown: Shown
    odd_commitments: int = 0
    odd_silence: bool = False


@dataclass
class Tables:
    """The social values of all agents at the moments reached so far, and how to read others."""

    sees: tuple[tuple[int, ...], ...]
    moments: list[Moment] = field(default_factory=list)
    worths: dict[tuple[int, int, int, Shown], Worth] = field(default_factory=dict)
    _known: dict[tuple[int, int, Shown], tuple[Shown, float, bool]] = field(default_factory=dict)

    def seen(self, agent: int, shown: Shown) -> Shown:
        """Return what the agent sees of all that is shown."""
        return tuple(shown[other] for other in self.sees[agent])

    def read(self, agent: int, index: int, seen: Shown) -> tuple[Shown, float, bool]:
        """Return the history as the model can place it, its social value, and odd silence.

        ``index`` counts the model's moments from 0; ``seen`` is what has been shown before the
        moment, or before a round that follows it and that the model does not hold.
        """
        key = (agent, index, seen)
        if key not in self._known:
            self._known[key] = self._read(agent, index, seen)
        return self._known[key]

    def _read(self, agent: int, index: int, seen: Shown) -> tuple[Shown, float, bool]:
        if index == 0:
            nothing: Shown = (None,) * len(seen)
            return nothing, self.worths[(agent, *self.moments[0], nothing)].worth, False
        last = self.moments[index - 1]
        before = tuple(e if e is not None and e.moment < last else None for e in seen)
        base, level, _ = self.read(agent, index - 1, before)
        options: list[list[Event | None]] = []
        for old, event in zip(base, seen, strict=True):
            if event is None or event.moment < last:
                options.append([old])
            else:
                back = (m for m in reversed(self.moments[:index]) if m <= event.moment)
                options.append([*(Event(*moment, event.answer) for moment in back), None])
        for reading in product(*options):
            found = self.worths.get((agent, *self.moments[index], reading))
            if found is not None:
                return reading, found.worth, False
        return tuple(choice[-1] for choice in options), level, True


@dataclass(frozen=True)
class Enumeration:
    """Everything the enumeration of one group says.

    Attributes
    ----------
    given_plus, given_minus : per agent, its outcomes.
    tables : social values by (agent, step, round, seen history); see :class:`Worth`.
    rounds : per step, the number of rounds held (the last one in a settle step is idle).
    near_tie : per agent, mass (given plus, given minus) decided between 1e-12 and 1e-9 of a
        threshold, on either side.
    narrowest : smallest distance (nats) of any belief, in actual play or in a held set, from
        the exact place where the decision would turn; below about 1e-11 the case is not fit
        for comparison in floating point.
    odd_commitments : expected number (given plus, given minus) of times that an undecided agent
        was shown a commitment that the model gives probability zero.
    odd_silence : probability that an undecided agent was shown such a silence.
    branches : the final branches of actual play.
    """

    given_plus: tuple[Outcome, ...]
    given_minus: tuple[Outcome, ...]
    tables: Tables
    rounds: tuple[int, ...]
    near_tie: tuple[tuple[float, float], ...]
    narrowest: float
    odd_commitments: tuple[float, float]
    odd_silence: tuple[float, float]
    branches: tuple[Branch, ...]

    @property
    def worths(self) -> dict[tuple[int, int, int, Shown], Worth]:
        """Shorthand for the dictionary inside ``tables``."""
        return self.tables.worths

    def worth(self, agent: int, step: int, round_: int, seen: Shown) -> float | None:
        """Social value in nats, or ``None`` for a history of probability zero."""
        found = self.worths.get((agent, step, round_, seen))
        return None if found is None else found.worth


class _Watch:
    """Collects how close decisions came to their thresholds."""

    def __init__(self, agents: int) -> None:
        self.narrowest = math.inf
        self.near = [[0.0, 0.0] for _ in range(agents)]

    def decide(self, belief: float, bars: Thresholds) -> tuple[str | None, bool]:
        """Return the answer, if any, and whether it was a near tie."""
        if math.isnan(belief):
            raise ValueError("certain evidence for both answers met in one belief")
        gaps = (abs(belief - (bars.plus - TIE)), abs(belief - (bars.minus + TIE)))
        self.narrowest = min(self.narrowest, *gaps)
        if belief >= bars.plus - TIE:
            return "plus", NEAR < abs(belief - bars.plus) <= TIE
        if belief <= bars.minus + TIE:
            return "minus", NEAR < abs(belief - bars.minus) <= TIE
        return None, False


def _start(group: Group) -> list[Branch]:
    agents = len(group.sees)
    branches = []
    for kind in product(*(range(len(options)) for options in group.thresholds)):
        share = math.prod(group.thresholds[a][k].share for a, k in enumerate(kind))
        if share > 0.0:
            nothing = ((),) * agents
            none: Shown = (None,) * agents
            branches.append(Branch(share, share, kind, nothing, (0.0,) * agents, none))
    return branches


def _ratio(plus: float, minus: float) -> float:
    """ln(plus/minus), with the infinities that certainty brings; not both zero."""
    if minus == 0.0:
        return math.inf
    return -math.inf if plus == 0.0 else math.log(plus) - math.log(minus)


def _observe(group: Group, branches: Iterable[Branch], held: int | None, step: int) -> list[Branch]:
    """The observations of one step for every undecided agent but the one held."""
    agents = range(len(group.sees))
    looks = [1 if group.looks is None else group.looks[a][step - 1] for a in agents]
    grown = list(branches)
    for turn in range(max(looks)):
        looking = [a for a in agents if looks[a] > turn and a != held]
        grown = _observe_once(group, grown, looking)
    return grown


def _observe_once(group: Group, branches: Iterable[Branch], looking: Sequence[int]) -> list[Branch]:
    """One more observation for those of these agents that are undecided."""
    grown = []
    for branch in branches:
        watching = [a for a in looking if branch.shown[a] is None]
        for values in product(*(range(len(group.evidence[a])) for a in watching)):
            plus, minus = branch.plus, branch.minus
            observed, tally = list(branch.observed), list(branch.tally)
            for agent, value in zip(watching, values, strict=True):
                up, down = group.evidence[agent][value]
                plus, minus = plus * up, minus * down
                if up or down:
                    observed[agent] = (*observed[agent], value)
                    tally[agent] += _ratio(up, down)
            if plus or minus:
                grown.append(
                    branch._replace(
                        plus=plus, minus=minus, observed=tuple(observed), tally=tuple(tally)
                    )
                )
    return grown


def _weigh(tables: Tables, agent: int, branches: Iterable[Branch]) -> dict[Shown, Worth]:
    """Social values of one agent now, from the branches in which it is held undecided."""
    masses: dict[Shown, tuple[list[float], list[float]]] = defaultdict(lambda: ([], []))
    for branch in branches:
        plus, minus = masses[tables.seen(agent, branch.shown)]
        plus.append(branch.plus)
        minus.append(branch.minus)
    totals = {seen: (math.fsum(plus), math.fsum(minus)) for seen, (plus, minus) in masses.items()}
    return {seen: Worth(_ratio(up, down), up, down) for seen, (up, down) in totals.items()}


def _commit(
    group: Group,
    tables: Tables,
    branches: Iterable[Branch],
    watch: _Watch,
    now: Moment,
    last: Moment | None,
    held: int | None = None,
    adopters: Mapping[int, Rule] | None = None,
) -> list[Branch]:
    """Let every undecided agent that is not held decide, all at the same time.

    ``now`` is the moment, ``last`` the one before it in the play at hand.
    """
    index = max(i for i, moment in enumerate(tables.moments) if moment <= now)
    after = []
    for branch in branches:
        shown, odd, silent = list(branch.shown), branch.odd_commitments, branch.odd_silence
        for agent, event in enumerate(branch.shown):
            if event is not None or agent == held or not branch.observed[agent]:
                continue  # nobody commits before its first observation
            seen, tally = tables.seen(agent, branch.shown), branch.tally[agent]
            if adopters is not None and agent in adopters:
                answer = adopters[agent](*now, seen, tally, branch.observed[agent])
            else:
                reading, social, nothing = tables.read(agent, index, seen)
                fresh = (e is not None and e.moment == last for e in seen)
                odd += sum(new and e != r for new, e, r in zip(fresh, seen, reading, strict=True))
                silent |= nothing
                bars = group.thresholds[agent][branch.kind[agent]]
                answer, near = watch.decide(group.prior + tally + social, bars)
                if near and held is None:
                    watch.near[agent][0] += branch.plus
                    watch.near[agent][1] += branch.minus
            if answer is not None:
                shown[agent] = Event(*now, answer)
        after.append(branch._replace(shown=tuple(shown), odd_commitments=odd, odd_silence=silent))
    return after


def _note(tables: Tables, agent: int, before: Sequence[Branch], after: Sequence[Branch]) -> None:
    """Add to the worths of the newest moment who actually got there and who stayed."""
    step, round_ = tables.moments[-1]
    lists: dict[Shown, list[list[float]]] = defaultdict(lambda: [[], [], [], []])
    for old, new in zip(before, after, strict=True):
        if old.shown[agent] is None:
            columns = lists[tables.seen(agent, old.shown)]
            columns[0].append(old.plus)
            columns[1].append(old.minus)
            if new.shown[agent] is None:
                columns[2].append(old.plus)
                columns[3].append(old.minus)
    for seen, columns in lists.items():
        key = (agent, step, round_, seen)
        w = tables.worths[key]
        sums = (math.fsum(column) for column in columns)
        tables.worths[key] = Worth(w.worth, w.shown_plus, w.shown_minus, *sums)


def _outcome(group: Group, agent: int, branches: Sequence[Branch], side: int) -> Outcome:
    ends: dict[str, list[float]] = {"plus": [], "minus": [], "undecided": []}
    steps = []
    for branch in branches:
        event, mass = branch.shown[agent], (branch.plus, branch.minus)[side]
        ends["undecided" if event is None else event.answer].append(mass)
        if event is not None:
            steps.append(mass * event.step)
    plus, minus, undecided = (math.fsum(ends[name]) for name in ends)
    total = math.fsum(steps)
    decided = math.fsum((*ends["plus"], *ends["minus"]))
    mean = total / decided if decided > 0.0 else None
    return Outcome(plus, minus, undecided, mean, total + group.horizon * undecided)


def _finish(
    group: Group, tables: Tables, rounds: Sequence[int], branches: list[Branch], watch: _Watch
) -> Enumeration:
    def expected(number: Sequence[int]) -> tuple[float, float]:
        weighted = list(zip(number, branches, strict=True))
        return math.fsum(n * b.plus for n, b in weighted), math.fsum(
            n * b.minus for n, b in weighted
        )

    agents = range(len(group.sees))
    return Enumeration(
        tuple(_outcome(group, agent, branches, 0) for agent in agents),
        tuple(_outcome(group, agent, branches, 1) for agent in agents),
        tables,
        tuple(rounds),
        tuple((near[0], near[1]) for near in watch.near),
        watch.narrowest,
        expected([branch.odd_commitments for branch in branches]),
        expected([int(branch.odd_silence) for branch in branches]),
        tuple(branches),
    )


def enumerate_group(group: Group) -> Enumeration:
    """Play the group exactly and return outcomes and social values."""
    agents = range(len(group.sees))
    tables, watch = Tables(group.sees), _Watch(len(agents))
    actual = _start(group)
    held = {agent: list(actual) for agent in agents}
    rounds: list[int] = []
    for step in range(1, group.horizon + 1):
        actual = _observe(group, actual, None, step)
        held = {agent: _observe(group, held[agent], agent, step) for agent in agents}
        round_, going = 0, True
        while going:
            last = tables.moments[-1] if tables.moments else None
            tables.moments.append((step, round_))
            now = (step, round_)
            for agent in agents:
                for seen, worth in _weigh(tables, agent, held[agent]).items():
                    tables.worths[(agent, step, round_, seen)] = worth
            after = _commit(group, tables, actual, watch, now, last)
            for agent in agents:
                _note(tables, agent, actual, after)
                held[agent] = _commit(group, tables, held[agent], watch, now, last, held=agent)
            changed = any(a.shown != b.shown for a, b in zip(actual, after, strict=True))
            actual = after
            round_ += 1
            going = group.exchange == "settle" and changed
        rounds.append(round_)
    return _finish(group, tables, rounds, actual, watch)


def play_rule(
    group: Group, model: Enumeration, adopter: int, rule: Rule, rounds: str = "model"
) -> Enumeration:
    """Play the group with one agent following a rule; see :func:`play_rules`."""
    return play_rules(group, model, {adopter: rule}, rounds)


def play_rules(
    group: Group, model: Enumeration, adopters: Mapping[int, Rule], rounds: str = "model"
) -> Enumeration:
    """Play the group with some agents following rules; the others take all for exact.

    The rounds of a settle step are those of the model (``rounds="model"``), which everybody
    expects; or (``"actual"``) the step goes on as long as somebody can commit in this very play,
    and in rounds that the model does not hold the others look up its last moment.
    """
    tables, watch = model.tables, _Watch(len(group.sees))
    actual = _start(group)
    last: Moment | None = None
    held = []
    for step in range(1, group.horizon + 1):
        actual = _observe(group, actual, None, step)
        round_, going = 0, True
        while going:
            now = (step, round_)
            after = _commit(group, tables, actual, watch, now, last, adopters=adopters)
            changed = any(a.shown != b.shown for a, b in zip(actual, after, strict=True))
            actual, last = after, now
            round_ += 1
            if rounds == "model":
                going = round_ < model.rounds[step - 1]
            else:
                going = group.exchange == "settle" and changed
        held.append(round_)
    return _finish(group, tables, held, actual, watch)
