"""Pricers of small groups with coin evidence, for tests of rules and costs."""

from __future__ import annotations

import math
from collections.abc import Sequence

from tests.slow import pair_walk as walk
from thumbwright.distill.assemble import Setting
from thumbwright.distill.network_pricer import NetworkPricer
from thumbwright.distill.playing import lay_out
from thumbwright.distill.rules import Rule
from thumbwright.distill.views import NO_ROW
from thumbwright.exact.engine import solve
from thumbwright.exact.evidence.base import Evidence
from thumbwright.exact.evidence.binary import coin
from thumbwright.exact.group import Agent, Group, Thresholds, same_thresholds
from thumbwright.exact.stopping import Losses

ALPHA = math.log(1.5)
"""Worth of one sign of the coin 0.6, nats."""

EVEN = Losses(1.0, 1.0, 0.015)

Bars = tuple[float, float]


def coin_group(
    bars: Sequence[Bars],
    sees: Sequence[Sequence[int]],
    horizon: int,
    exchange: str = "once",
    evidence: Evidence | None = None,
    prior: float = 0.0,
) -> Group:
    """Agents a0, a1, ... with thresholds (minus, plus) in coin signs on the belief."""
    agents = [
        Agent(
            f"a{number}",
            evidence or coin(0.6),
            same_thresholds(Thresholds(low * ALPHA, high * ALPHA)),
            tuple(f"a{k}" for k in seen),
        )
        for number, ((low, high), seen) in enumerate(zip(bars, sees, strict=True))
    ]
    return Group(tuple(agents), prior, horizon, exchange)


def pricer_of_group(group: Group, agent: str, losses: Losses | None = EVEN) -> NetworkPricer:
    """One setting only."""
    return NetworkPricer.build(agent, (Setting(1.0, {}, solve(group)),), losses)


def one_way(
    watched: Bars,
    observer: Bars,
    horizon: int,
    exchange: str = "once",
    losses: Losses | None = EVEN,
) -> NetworkPricer:
    """The observer is a1 and watches a0."""
    group = coin_group([watched, observer], [(), (0,)], horizon, exchange)
    return pricer_of_group(group, "a1", losses)


def covering(
    named: dict[str, Bars], observer: Bars, horizon: int, losses: Losses | None = EVEN
) -> NetworkPricer:
    """The observer a1 watches a0, whose thresholds are any of these, equally likely."""
    settings = []
    for name, bars in named.items():
        group = coin_group([bars, observer], [(), (0,)], horizon)
        settings.append(Setting(1.0 / len(named), {"a0": name}, solve(group)))
    return NetworkPricer.build("a1", tuple(settings), losses)


def pair(watched: Bars, observer: Bars, horizon: int, exchange: str = "once") -> walk.Pair:
    """The same one-way pair for the slow walk."""
    low, high = ((m * ALPHA, p * ALPHA) for m, p in (watched, observer))
    return walk.Pair(walk.coin(0.6), low, walk.coin(0.6), high, horizon, exchange)


def as_slow(rule: Rule) -> walk.Rule:
    """A rule of bars that watches one agent, read row by row with no grid."""
    (seen,) = rule.seen

    def decide(step: int, shown: walk.Call | None, count: int) -> str | None:
        state = "undecided" if shown is None else shown.answer
        for row in rule.rows:
            first = 1 if row.step_from is None else row.step_from
            last = math.inf if row.step_to is None else row.step_to
            if first <= step <= last and (seen not in row.shows or state in row.shows[seen]):
                if row.plus_at is not None and count >= row.plus_at:
                    return "plus"
                if row.minus_at is not None and count <= row.minus_at:
                    return "minus"
                return None
        raise AssertionError(f"no row at step {step} with {state}")

    return decide


def faults_of_cover(pricer: NetworkPricer, rule: Rule) -> int:
    """Number of possible situations that do not meet exactly one row."""
    situations = pricer.situations
    wrong = 0
    for number, setting in enumerate(pricer.settings):
        grid = lay_out(rule, pricer.group.horizon, setting.names)
        here = situations.setting == number
        cell = (situations.step[here], *situations.states[here].T)
        wrong += int(((grid.count[cell] != 1) | (grid.row[cell] == NO_ROW)).sum())
    return wrong
