"""What each agent, and the group, ends up doing under exact play, as plain data."""

from __future__ import annotations

from dataclasses import fields
from typing import Any

from thumbwright.distill.case import Case
from thumbwright.exact.arrays import FloatArray
from thumbwright.exact.crowd import CrowdPlay
from thumbwright.exact.engine import Solution
from thumbwright.exact.errors import ModelError
from thumbwright.exact.outcomes import Outcome, outcomes
from thumbwright.exact.together import Together, together

GIVEN = ("given_plus", "given_minus")

LAWS = ("first", "last", "followers")
"""Figures of a group that are whole distributions."""

SHARES = tuple(field.name for field in fields(Together) if field.name not in LAWS)
"""Shares of groups, by the names that ``exact.together`` gives them."""

Pair = tuple[float | None, float | None]


def ends_of_network(case: Case, solution: Solution) -> dict[str, Any]:
    """Agents and group of an exact solution."""
    agents = [
        _agent(case, track.agent.id, given)
        for track, given in zip(solution.tracks, outcomes(solution), strict=True)
    ]
    split = any(agent.evidence.split for agent in solution.group.agents)
    return {
        "case": case.name,
        "digest": case.digest,
        "agents": agents,
        **_group_of_network(solution),
        "dropped_mass": solution.dropped_mass,
        "may_be_off_by": solution.uncertainty,
        "near_tie_mass": solution.near_tie_mass,
        "exact": not split and solution.dropped_mass == 0.0,
    }


def ends_of_crowd(case: Case, play: CrowdPlay, seed: int) -> dict[str, Any]:
    """Members and group of a crowd, with standard errors beside them where it was sampled."""
    kinds = {
        member: (kind_play, number)
        for number, (kind, kind_play) in enumerate(zip(play.crowd.kinds, play.kinds, strict=True))
        for member in kind.members
    }
    agents = []
    for member in case.agents:
        kind_play, number = kinds[member]
        entry = _agent(case, member, kind_play.given)
        entry["kind"] = number + 1
        if play.sampled:
            entry["errors"] = {
                key: _outcome(one) for key, one in zip(GIVEN, kind_play.errors, strict=True)
            }
        agents.append(entry)
    means = (play.first.value, play.last.value, play.followers.value)
    found: dict[str, Any] = {"group": _group(play.together, means)}
    if play.sampled:
        errors = (play.first.error, play.last.error, play.followers.error)
        found["group_errors"] = _group(play.errors, errors)
    split = any(kind.evidence.split for kind in play.crowd.kinds)
    return {
        "case": case.name,
        "digest": case.digest,
        "agents": agents,
        **found,
        "histories": play.histories,
        "sampled_with_seed": seed if play.sampled else None,
        "dropped_mass": play.dropped_mass,
        "may_be_off_by": play.dropped_mass,
        "near_tie_mass": play.near_tie_mass,
        "exact": not split and play.dropped_mass == 0.0 and not play.sampled,
    }


def _agent(case: Case, key: str, given: tuple[Outcome, Outcome]) -> dict[str, Any]:
    entry: dict[str, Any] = {"id": key, "name": case.agents[key].name}
    return entry | {side: _outcome(one) for side, one in zip(GIVEN, given, strict=True)}


def _outcome(one: Outcome) -> dict[str, float | None]:
    return {
        "plus": one.plus,
        "minus": one.minus,
        "undecided": one.undecided,
        "mean_step_if_decided": one.mean_step_if_decided,
        "mean_steps_used": one.mean_steps,
    }


def _group_of_network(solution: Solution) -> dict[str, Any]:
    """The group's figures; or why there are none, where its displays are too wide to be joined."""
    if len(solution.tracks) < 2:
        return {"group": None}
    try:
        found = together(solution)
    except ModelError as reason:
        return {"group": None, "why_no_group": str(reason)}
    means = found.mean_step("first"), found.mean_step("last"), found.mean_followers()
    return {"group": _group(found, means)}


def _group(found: Together, means: tuple[Pair, Pair, Pair]) -> dict[str, dict[str, Any]]:
    """Mean steps and followers, shares of groups, and whole distributions."""
    figures: dict[str, dict[str, Any]] = {key: {} for key in GIVEN}
    names = ("mean_step_of_first", "mean_step_of_last", "mean_followers_at_once")
    for name, pair in zip(names, means, strict=True):
        for key, mean in zip(GIVEN, pair, strict=True):
            figures[key][name] = mean
    for name in SHARES:
        for key, share in zip(GIVEN, getattr(found, name), strict=True):
            figures[key][name] = float(share)
    for name in LAWS:
        law: FloatArray = getattr(found, name)
        for key, row in zip(GIVEN, law, strict=True):
            figures[key][f"law_of_{name}"] = [float(p) for p in row]
    return figures
