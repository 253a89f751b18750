"""The doubted worlds that a case states itself."""

from __future__ import annotations

from dataclasses import replace

from thumbwright.distill.assemble import Setting, thresholds_named
from thumbwright.distill.case import Case
from thumbwright.distill.doubt_keys import Doubt, DoubtedAgent
from thumbwright.distill.evidence_keys import EvidenceKeys
from thumbwright.exact import astray
from thumbwright.exact.engine import solve
from thumbwright.exact.errors import ModelError
from thumbwright.exact.evidence import build
from thumbwright.exact.evidence.base import Evidence
from thumbwright.exact.evidence.law import Law, real_law, useless
from thumbwright.exact.group import Group, same_thresholds


def stated_world(case: Case, doubt: Doubt, setting: Setting) -> astray.World:
    """The world of one [doubts.*] table.

    Raises ModelError where what is really so cannot be played with the case's own counts.
    """
    group = setting.solution.group
    made = astray.as_believed_by(setting.solution)
    if doubt.evidence is not None:
        shared = [key for key, agent in case.agents.items() if agent.evidence is None]
        made = astray.with_laws(made, {one: _law(group, one, doubt.evidence) for one in shared})
    for one, real in doubt.agents.items():
        made = _with_agent(case, made, one, real, group)
    return made


def _with_agent(
    case: Case, made: astray.World, one: str, real: DoubtedAgent, group: Group
) -> astray.World:
    evidence = group.agents[group.index[one]].evidence
    if real.evidence is not None:
        made = astray.with_laws(made, {one: _law(group, one, real.evidence)})
    if real.thresholds is not None:
        bounds = thresholds_named(case, real.thresholds, evidence, group.prior)
        made = astray.with_thresholds(made, one, same_thresholds(bounds))
    if real.sees is not None:
        made = astray.with_links(made, one, solve(with_sight(group, one, tuple(real.sees))))
    if real.answers == "never":
        made = astray.with_habit(made, one, astray.Habit.SILENT)
    elif real.answers == "at random":
        made = at_random(made, one)
    return made


def _law(group: Group, one: str, keys: EvidenceKeys) -> Law:
    stated = keys.model_dump(exclude={"tolerance"}, exclude_none=True)
    real = build(stated.pop("kind"), **stated)
    if not isinstance(real, Evidence):
        raise ModelError("evidence that must be split onto a ladder cannot stand in for other")
    return real_law(group.agents[group.index[one]].evidence, real)


def at_random(world: astray.World, one: str) -> astray.World:
    """An agent that looks at nobody and whose own observations tell nothing."""
    evidence = world.group.agents[world.group.index[one]].evidence
    made = astray.with_habit(world, one, astray.Habit.ALONE)
    return astray.with_laws(made, {one: useless(evidence)})


def with_sight(group: Group, one: str, sees: tuple[str, ...]) -> Group:
    """The same group with an agent that sees these."""
    agents = tuple(replace(a, sees=sees) if a.id == one else a for a in group.agents)
    return replace(group, agents=agents)
