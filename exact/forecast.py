"""How much memory and time an exact run will take, and what would make it smaller.

How many display events there will be depends on evidence, thresholds, exchange and network
together. So the first steps are played, for as long as they are small, and what they show of each
agent's events and rounds per step is carried on to the horizon. All sizes follow from that and from
who sees whom.
"""

from __future__ import annotations

import math
import os
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace

from thumbwright.exact.alike import likeness
from thumbwright.exact.errors import ModelError
from thumbwright.exact.group import Group
from thumbwright.exact.player import ExactReader
from thumbwright.exact.stage import Stage, TooLarge
from thumbwright.exact.store import SPARE

_PILOT_ENTRIES = 5e5
_PILOT_DECISIONS = 1000
_FEW_STEPS = 4
_WAYS_OUT = 3

# Measured on one core of a small machine.
_SECONDS_PER_DECISION = 1.5e-4
_SECONDS_PER_BYTE = 4e-9
_SECONDS_PER_ROW = 2.0e-8
_BYTES_PER_DECISION = 1200.0
_BYTES_PER_WAIT = 150.0


@dataclass(frozen=True)
class Forecast:
    """What an exact run will take.

    Attributes
    ----------
    events : int
        Display events of the agent that has most, at the horizon, about.
    memory : float
        Bytes at the peak, about.
    seconds : float
        Time on one core, about.
    widest : str
        Id of the agent that takes most of the memory.
    """

    events: int
    memory: float
    seconds: float
    widest: str


@dataclass(frozen=True)
class _Course:
    """What the first steps showed: per step and agent, and in the end per agent."""

    stage: Stage
    events: list[list[float]]
    decisions: list[list[float]]
    rounds: list[float]
    rows: list[float]


def forecast(group: Group) -> Forecast:
    """Estimate an exact run of a group."""
    return _carried_on(group, _first_steps(group), group.horizon)


def _first_steps(group: Group) -> _Course:
    size = len(group.agents)
    readers = [ExactReader() for _ in group.agents]
    stage = Stage(group, readers, most_entries=_PILOT_ENTRIES, likeness=likeness(group))
    course = _Course(stage, [[1.0] * size], [[0.0] * size], [0.0], [1.0] * size)
    for step in range(1, group.horizon + 1):
        try:
            stage.step(step)
            whole = True
        except TooLarge:
            whole = False
        tracks = [player.track for player in stage.players]
        eventful = sum(max(row) > 1 for row in course.events)
        if whole or eventful < _FEW_STEPS:
            # A step that was broken off says too little, but more than nothing.
            course.events.append([float(len(track.events)) for track in tracks])
            course.decisions.append([float(player.decisions) for player in stage.players])
            course.rounds.append(float(max(len(track.moments) for track in tracks)))
            for i, player in enumerate(stage.players):
                course.rows[i] = max(course.rows[i], float(len(player.walk.count)))
        leads = [stage.players[i] for i in stage.leads]
        kept = sum(player.decisions * math.prod(player.shape) for player in leads)
        much = kept > _PILOT_ENTRIES or sum(p.decisions for p in leads) > _PILOT_DECISIONS
        enough = eventful >= _FEW_STEPS and much
        if enough or not whole:
            break
    return course


def _at(numbers: Sequence[float], step: int) -> float:
    """The number at a step that may lie beyond those known, at the greatest pace so far."""
    last = len(numbers) - 1
    if step <= last:
        return numbers[step]
    # Of two steps together: on a ladder every second step often brings less.
    pace = max((numbers[t] - numbers[max(t - 2, 0)]) / min(t, 2) for t in range(1, last + 1))
    return numbers[last] + (step - last) * pace


def _carried_on(group: Group, course: _Course, horizon: int) -> Forecast:
    """What the run would take up to a horizon."""
    size = len(group.agents)
    events = [_at([row[i] for row in course.events], horizon) for i in range(size)]
    rounds = _at(course.rounds, horizon)
    # Those that are worked out for another agent hold next to nothing of their own.
    slack, own, seconds = (1.0 + SPARE) / 2.0, [_BYTES_PER_WAIT * rounds] * size, 0.0
    for i in course.stage.leads:
        seen = group.sees[i]
        histories = math.prod(events[k] for k in seen)
        decisions = _at([row[i] for row in course.decisions], horizon)
        shows = 16.0 * events[i] * histories
        stores = sum(1 for store in course.stage.contractions.displays[i].stores())
        own[i] = (
            shows * slack * stores
            + 8.0 * histories * (4.0 * course.rows[i] + 7.0 * decisions / (len(seen) + 1))
            + _BYTES_PER_DECISION * decisions
            + _BYTES_PER_WAIT * (rounds - decisions)
        )
        handled = course.rows[i] * histories * horizon / (len(seen) + 1)
        seconds += decisions * _SECONDS_PER_DECISION + handled * _SECONDS_PER_ROW
    held, passing = course.stage.contractions.entries(events)
    memory = sum(own) + 8.0 * (slack * held + 2.0 * passing)
    seconds += memory * _SECONDS_PER_BYTE
    widest = max(range(size), key=lambda i: own[i])
    return Forecast(int(max(events)), memory, seconds, group.agents[widest].id)


def free_memory() -> float | None:
    """Bytes of memory that are free now, or None where the system does not say."""
    try:
        return float(os.sysconf("SC_AVPHYS_PAGES") * os.sysconf("SC_PAGE_SIZE"))
    except (ValueError, OSError, AttributeError):
        return None


def refuse_too_large(group: Group, limit: float | None = None) -> None:
    """Refuse, before any of it is allocated, a run that would need too much memory.

    Parameters
    ----------
    group : Group
    limit : float, optional
        Bytes that the run may take; if None, half of what is free, where the system says so.

    Raises
    ------
    ModelError
        Says what the run would need, and up to three ways out with what each would need.
    """
    free = free_memory()
    if limit is None and free is None:
        return
    allowed = limit if limit is not None else (free or 0.0) / 2.0
    if _surely_small(group, allowed):
        return
    course = _first_steps(group)
    expected = _carried_on(group, course, group.horizon)
    if expected.memory <= allowed:
        return
    which = "that are allowed" if limit is not None else "that are half of what is free"
    ways = [
        way for _, way in zip(range(_WAYS_OUT), _ways_out(group, course, allowed), strict=False)
    ]
    raise ModelError(
        f"this network needs about {_size(expected.memory)} of memory, more than the "
        f"{_size(allowed)} {which}; agent {expected.widest} takes most of it. "
        + (f"Ways out: {'; '.join(ways)}" if ways else "No smaller version of it fits either")
    )


def _surely_small(group: Group, allowed: float) -> bool:
    """Whether even many more events than usual would fit many times over."""
    per_step = 2.0 if group.exchange == "once" else 2.0 * (len(group.agents) + 1)
    events = 1.0 + per_step * group.horizon
    entries = sum(events ** (1 + len(seen)) for seen in group.sees)
    moments = sum(events * events ** len(seen) for seen in group.sees)
    return 8.0 * (8.0 * entries + 8.0 * moments) < allowed


def _ways_out(group: Group, course: _Course, allowed: float) -> Iterator[str]:
    """What would fit, each with what it needs; the mildest change first."""
    fits, fails = 0, group.horizon
    while fails - fits > 1:
        middle = (fits + fails) // 2
        if _carried_on(group, course, middle).memory <= allowed:
            fits = middle
        else:
            fails = middle
    if fits:
        steps = "1 step" if fits == 1 else f"{fits} steps"
        yield f"a horizon of {steps} (about {_size(_carried_on(group, course, fits).memory)})"
    if group.exchange == "settle":
        needed = forecast(replace(group, exchange="once")).memory
        if needed <= allowed:
            yield f'exchange "once" instead of "settle" (about {_size(needed)})'
    most = max(len(seen) for seen in group.sees)
    for count in range(most - 1, -1, -1):
        agents = tuple(replace(agent, sees=agent.sees[:count]) for agent in group.agents)
        needed = forecast(replace(group, agents=agents)).memory
        if needed <= allowed:
            others = "nobody" if count == 0 else f"at most {count} other{'s' * (count > 1)}"
            yield f"agents that see {others} (about {_size(needed)})"
            break
    for count in range(len(group.agents) - 1, 0, -1):
        needed = forecast(_first(group, count)).memory
        if needed <= allowed:
            agents_left = "the first agent alone" if count == 1 else f"the first {count} agents"
            yield f"only {agents_left} (about {_size(needed)})"
            break


def _first(group: Group, count: int) -> Group:
    """The first agents of a group, the others left out."""
    ids = {agent.id for agent in group.agents[:count]}
    agents = tuple(
        replace(agent, sees=tuple(other for other in agent.sees if other in ids))
        for agent in group.agents[:count]
    )
    return replace(group, agents=agents)


def _size(bytes_: float) -> str:
    if bytes_ > 1e15:
        return "over 1000 TB"
    for unit, name in ((1e12, "TB"), (1e9, "GB"), (1e6, "MB")):
        if bytes_ >= unit:
            return f"{bytes_ / unit:.3g} {name}"
    return f"{bytes_ / 1e3:.3g} kB"
