"""Who in a group can use a rule that was made for one of its agents."""

from __future__ import annotations

from dataclasses import replace

from thumbwright.distill.rules import Rule
from thumbwright.exact.evidence.base import Evidence
from thumbwright.exact.group import Group


def users_of(rule: Rule, group: Group) -> tuple[str, ...]:
    """Ids of the agents that can use a rule, in the order of the group.

    The rule's own agent can. So can others that see as many as it does, or anybody at all where
    the rule only counts, whose own thresholds are known, who observe at every step, and, for bars,
    whose own count means the same. A rule that looks at thresholds knows those of one agent's
    neighbours only.
    """
    if any(row.thresholds for row in rule.rows):
        return (rule.agent,)
    own = group.agents[group.index[rule.agent]]
    by_name = any(row.shows for row in rule.rows)
    return tuple(
        agent.id
        for agent in group.agents
        if agent.id == rule.agent
        or (
            agent.sees
            and (len(agent.sees) == len(own.sees) or not by_name)
            and len(agent.thresholds) == 1
            and agent.looks is None
            and (not rule.has_bars or _same_count(agent.evidence, own.evidence))
        )
    )


def in_the_hands_of(rule: Rule, agent: str, group: Group) -> Rule:
    """The rule for another agent, its seen agents taken one for one in the order they are named."""
    seen = group.agents[group.index[agent]].sees
    if agent == rule.agent or seen == rule.seen:
        return replace(rule, agent=agent)
    names = dict(zip(rule.seen, seen, strict=False))
    rows = tuple(
        replace(row, shows={names[other]: states for other, states in row.shows.items()})
        for row in rule.rows
    )
    return Rule(rule.form, agent, seen, rows)


def _same_count(one: Evidence, other: Evidence) -> bool:
    return (
        one.on_ladder
        and other.on_ladder
        and bool((one.alpha == other.alpha).all())
        and one.beta == other.beta
    )
