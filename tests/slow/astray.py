"""Agents who go by one model in a world that is another, played by their words.

Built on the branches and tables of ``enumerate``: every joint observation sequence of the real
world is followed, while each agent adds up what it takes its observations for and looks up what it
is shown in the tables of the model that it goes by.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from tests.slow.enumerate import (
    Branch,
    Enumeration,
    Tables,
    _finish,
    _observe,
    _start,
    _Watch,
    enumerate_group,
)
from tests.slow.group import Event, Group, Moment, Shown

ALONE, SILENT = "alone", "silent"


@dataclass(frozen=True)
class Mind:
    """What an agent goes by: tables of a model, or ``ALONE`` or ``SILENT``.

    ``worths`` is what it takes each of its values for (nats), infinite for proof.
    """

    tables: Tables | str
    worths: tuple[float, ...]


def allowed(model: Enumeration) -> Tables:
    """The tables of a model without answers that nobody ever gives in it.

    A held agent can be shown answers that would only follow on a silence which it never keeps. The
    engine does not hold them.
    """
    real = {
        (agent, event)
        for branch in model.branches
        if branch.plus or branch.minus
        for agent, event in enumerate(branch.shown)
        if event is not None
    }
    tables = model.tables
    kept = {
        key: worth
        for key, worth in tables.worths.items()
        if all(
            event is None or (other, event) in real
            for other, event in zip(tables.sees[key[0]], key[3], strict=True)
        )
    }
    return Tables(tables.sees, tables.moments, kept)


def play_astray(world: Group, minds: Sequence[Mind]) -> Enumeration:
    """Play the real group; its thresholds and whom each agent sees are the real ones."""
    watch, actual = _Watch(len(world.sees)), _start(world)
    none = Tables(world.sees)
    last: Moment | None = None
    rounds = []
    for step in range(1, world.horizon + 1):
        actual = _observe(world, actual, None, step)
        round_, going = 0, True
        while going:
            now = (step, round_)
            after = [_decided(world, minds, branch, watch, now, last) for branch in actual]
            changed = any(a.shown != b.shown for a, b in zip(actual, after, strict=True))
            actual, last = after, now
            round_ += 1
            going = world.exchange == "settle" and changed
        rounds.append(round_)
    return _finish(world, none, rounds, actual, watch)


def _decided(
    world: Group,
    minds: Sequence[Mind],
    branch: Branch,
    watch: _Watch,
    now: Moment,
    last: Moment | None,
) -> Branch:
    shown, odd = list(branch.shown), branch.odd_commitments
    silent = branch.odd_silence
    for agent, event in enumerate(branch.shown):
        mind = minds[agent]
        if event is not None or mind.tables == SILENT or not branch.observed[agent]:
            continue
        tally = sum(mind.worths[value] for value in branch.observed[agent])
        social = 0.0
        if isinstance(mind.tables, Tables):
            seen: Shown = tuple(branch.shown[other] for other in world.sees[agent])
            index = max(i for i, moment in enumerate(mind.tables.moments) if moment <= now)
            reading, social, nothing = mind.tables.read(agent, index, seen)
            fresh = (e is not None and e.moment == last for e in seen)
            odd += sum(new and e != r for new, e, r in zip(fresh, seen, reading, strict=True))
            silent |= nothing
        bars = world.thresholds[agent][branch.kind[agent]]
        answer, _ = watch.decide(world.prior + tally + social, bars)
        if answer is not None:
            shown[agent] = Event(*now, answer)
    return branch._replace(shown=tuple(shown), odd_commitments=odd, odd_silence=silent)


def model_of(group: Group) -> tuple[Tables, float]:
    """The tables by which an agent of this group reads, and the narrowest margin in its play."""
    model = enumerate_group(group)
    return allowed(model), model.narrowest
