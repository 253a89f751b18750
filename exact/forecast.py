"""How much memory and time an exact run will take, from the network alone.

Estimates, not promises: the number of display events is taken as what the mode of exchange
usually gives; weights, walks, kept moments and the largest intermediate of a contraction follow
from it and from who sees whom.
"""

from __future__ import annotations

import math
import os
from dataclasses import dataclass

from thumbwright.exact.contract import Plan, plan
from thumbwright.exact.errors import ModelError
from thumbwright.exact.group import Group

_EVENTS_PER_STEP = {"once": 2.0, "settle": 4.5}
_ROUNDS = {"once": 1.0, "settle": 3.0}
_FLOPS = 1.5e9
_CALL = 1.5e-4


@dataclass(frozen=True)
class Forecast:
    """What an exact run will take.

    Attributes
    ----------
    events : int
        Display events per agent at the horizon, about.
    memory : float
        Bytes at the peak, about.
    seconds : float
        Time on one core, about.
    widest : str
        Id of the agent whose contraction or walk is largest.
    """

    events: int
    memory: float
    seconds: float
    widest: str


def forecast(group: Group) -> Forecast:
    """Estimate an exact run of a group."""
    events = 1 + group.horizon * _EVENTS_PER_STEP[group.exchange]
    moments = group.horizon * _ROUNDS[group.exchange]
    memory, work, widest, widest_size = 0.0, 0.0, group.agents[0].id, 0.0
    for position, agent in enumerate(group.agents):
        seen = len(agent.sees)
        histories = events**seen
        rows = _rows(group, position)
        recipe = plan(group, position)
        largest, flops = _contraction(group, recipe, events)
        kept = 7.0 * moments * histories / (seen + 1)
        memory += 8.0 * (2 * events * histories * 2 + 4 * rows * histories + kept)
        work += moments * (12 * rows * histories / (seen + 1) + flops / (len(recipe.factors) + 1))
        if largest + rows * histories >= widest_size:
            widest, widest_size = agent.id, largest + rows * histories
        memory += 8.0 * largest
    seconds = work / _FLOPS + moments * len(group.agents) * _CALL
    return Forecast(int(events), memory, seconds, widest)


def _rows(group: Group, position: int) -> float:
    """Rows of a walk: lattice points between the thresholds, and one move beyond."""
    agent = group.agents[position]
    evidence = agent.evidence
    span = max(t.plus for _, t in agent.thresholds) - min(t.minus for _, t in agent.thresholds)
    unit = min((abs(a) for a in evidence.alpha if a), default=1.0)
    width = 2.0 * span / unit + len(evidence.plus)
    width = min(width, group.horizon * max(len(evidence.plus), 2))
    return float(len(agent.thresholds) * width * group.horizon ** (len(evidence.alpha) - 1))


def _contraction(group: Group, recipe: Plan, events: float) -> tuple[float, float]:
    """Entries of the largest intermediate and multiplications of one contraction, both answers."""
    scopes = [frozenset((j, *group.sees[j])) - {recipe.position} for j in recipe.factors]
    largest = max((2 * events ** len(scope) for scope in scopes), default=2.0)
    flops = 2 * events ** len(recipe.seen)
    for out in recipe.summed:
        union = frozenset().union(*(scope for scope in scopes if out in scope))
        flops += 2 * events ** len(union)
        scopes = [scope for scope in scopes if out not in scope] + [union - {out}]
        largest = max(largest, 2 * events ** len(union - {out}))
    return largest, flops


def free_memory() -> float | None:
    """Bytes of memory that are free now, or None where the system does not say."""
    try:
        return float(os.sysconf("SC_AVPHYS_PAGES") * os.sysconf("SC_PAGE_SIZE"))
    except (ValueError, OSError, AttributeError):
        return None


def refuse_too_large(group: Group) -> None:
    """Raise ModelError, before anything is allocated, where a run would need most of the memory."""
    free = free_memory()
    expected = forecast(group)
    if free is None or expected.memory <= free / 2 or math.isnan(expected.memory):
        return
    raise ModelError(
        f"this network needs about {expected.memory / 1e9:.3g} GB, more than half of the "
        f"{free / 1e9:.3g} GB that are free; agent {expected.widest} is the widest. Ways out: a "
        f"horizon below {group.horizon} steps, letting agents see fewer others, or fewer agents"
    )
