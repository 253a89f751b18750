"""Crowds in a case: which groups are played as one, and whether their histories are enumerated.

A group of four or more in which everybody sees everybody is a crowd, unless the rule is to tell its
members apart. Its public histories are enumerated where they are few enough, otherwise sampled.
"""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from typing import Any

from thumbwright.distill.assemble import Limits
from thumbwright.distill.case import CROWD, Case
from thumbwright.exact.crowd import (
    Crowd,
    CrowdPlay,
    Kind,
    Shown,
    TooMany,
    enumerate_crowd,
    enumerate_shown,
    kinds_of,
    sample_crowd,
    sample_shown,
)
from thumbwright.exact.engine import Progress
from thumbwright.exact.errors import ModelError
from thumbwright.exact.group import Group

ENUMERATED = 200_000
"""Most public histories, or situations of one member, that are enumerated."""

HISTORIES = 4_000
"""So many are sampled where there are more."""

# Measured on one core of a small machine.
_BYTES, _BYTES_PER_KIND = 140.0, 40.0
_SECONDS = 1.2e-5


def crowd_in(group: Group) -> Crowd | None:
    """The crowd that a group is, or None where it is none or too small to need to be one."""
    return kinds_of(group) if len(group.agents) >= CROWD else None


def crowd_of(case: Case, group: Group) -> Crowd | None:
    """The crowd that the rule of a case is to be made for, or None."""
    return None if {"shown", "thresholds"} & set(case.rule.inputs) else crowd_in(group)


@contextmanager
def naming_counts(case: Case, group: Group) -> Iterator[None]:
    """Add to a refusal the way out that a crowd has whose rule tells its members apart."""
    try:
        yield
    except ModelError as refusal:
        if crowd_of(case, group) is None and crowd_in(group) is not None:
            raise ModelError(
                f"{refusal}. As everybody here sees everybody, a rule that counts the others and "
                'does not tell them apart is far easier: inputs = ["step", "plus_shown", '
                '"minus_shown"]'
            ) from refusal
        raise


def play_of(crowd: Crowd, group: Group, limits: Limits) -> CrowdPlay:
    """What the crowd ends up doing; sampled where its histories are too many to enumerate."""
    if limits.histories is None:
        try:
            return enumerate_crowd(
                crowd, group.prior, group.horizon, group.exchange, limits.drop, ENUMERATED
            )
        except TooMany:
            pass
    histories = limits.histories or HISTORIES
    return sample_crowd(crowd, group.prior, group.horizon, group.exchange, histories, limits.seed)


def shown_of(
    crowd: Crowd, agent: str, group: Group, limits: Limits, progress: Progress | None = None
) -> Shown:
    """What a member may be shown; sampled where its situations are too many to enumerate."""
    kind = next(k for k, one in enumerate(crowd.kinds) if agent in one.members)
    if progress:
        progress("crowd", 0, 1)
    shown = _shown(crowd, kind, group, limits)
    if progress:
        progress("crowd", 1, 1)
    return shown


def _shown(crowd: Crowd, kind: int, group: Group, limits: Limits) -> Shown:
    given = (crowd, kind, group.prior, group.horizon, group.exchange)
    return lay_out(given, limits)


Given = tuple[Crowd, int, float, int, str]
"""A crowd, which kind a member is of, prior, horizon and exchange."""


def lay_out(given: Given, limits: Limits, **what: Any) -> Shown:
    """What a member may be shown: enumerated where it is little enough, and not to be sampled.

    ``what`` is handed on to ``exact.crowd_shown``: who goes by what, and what is really so.
    """
    if limits.histories is None:
        try:
            return enumerate_shown(*given, drop=limits.drop, most=ENUMERATED, **what)
        except TooMany:
            pass
    return sample_shown(*given, limits.histories or HISTORIES, limits.seed, **what)


@dataclass(frozen=True)
class CrowdEngine:
    """How a crowd will be played.

    Attributes
    ----------
    kinds, members : int
    entries : int
        Moments of public histories of one member that are held.
    sampled : tuple of two ints, or None
        Number of sampled histories and the seed; None where all are enumerated.
    largest : int or None
        Most members of a crowd like this that would be enumerated, where this one is sampled and
        all are of one kind.
    memory, seconds : float
        What that takes, about.
    """

    kinds: int
    members: int
    entries: int
    sampled: tuple[int, int] | None
    largest: int | None
    memory: float
    seconds: float


def engine_of(crowd: Crowd, agent: str, group: Group, limits: Limits) -> CrowdEngine:
    """How a crowd will be played; found by laying out what the rule's agent may be shown."""
    shown = shown_of(crowd, agent, group, limits)
    entries = sum(len(showing.parent) for part in shown.parts for showing in part)
    sampled = largest = None
    if shown.weight is not None:
        sampled = (shown.weight.shape[1], limits.seed)
        largest = largest_enumerated(crowd, group, limits)
    kinds = len(crowd.kinds)
    return CrowdEngine(
        kinds,
        crowd.size,
        entries,
        sampled,
        largest,
        entries * (_BYTES + _BYTES_PER_KIND * kinds),
        entries * _SECONDS * kinds,
    )


def largest_enumerated(crowd: Crowd, group: Group, limits: Limits) -> int | None:
    """Most members of a crowd of one kind whose situations would be enumerated; else None."""
    if len(crowd.kinds) > 1:
        return None
    one, size = crowd.kinds[0], 1
    while size < crowd.size:
        smaller = Crowd((Kind(one.evidence, one.thresholds, one.members[: size + 1], one.looks),))
        try:
            enumerate_shown(
                smaller, 0, group.prior, group.horizon, group.exchange, limits.drop, ENUMERATED
            )
        except TooMany:
            break
        size += 1
    return size
