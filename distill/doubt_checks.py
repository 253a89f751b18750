"""Checks of the doubted worlds of a case. Part of ``distill.crosschecks``."""

from __future__ import annotations

from collections.abc import Callable, Iterator

from thumbwright.distill.faults import Key, hint, quoted
from thumbwright.distill.group_checks import known_thresholds, network_agents
from thumbwright.distill.plain import Plain

Found = Iterator[tuple[Key, str]]

TWO_VALUED = ("bernoulli", "calibration")


def doubts(plain: Plain, evidence: Callable[..., Found]) -> Found:
    """A doubt says something, of agents there are; ``evidence`` checks one piece of evidence."""
    for name in plain.table("doubts"):
        place = ("doubts", name)
        if not plain.has(*place, "evidence") and not plain.table(*place, "agents"):
            yield place, f"doubts nothing; write evidence, or [doubts.{name}.agents.ID]"
        if plain.has(*place, "evidence"):
            yield from evidence(plain, *place, "evidence")
            yield from _same_kind(plain, (*place, "evidence"), ("evidence",))
        for agent in plain.table(*place, "agents"):
            yield from _agent(plain, place, agent, evidence)


def _agent(plain: Plain, doubt: Key, agent: str, evidence: Callable[..., Found]) -> Found:
    place = (*doubt, "agents", agent)
    others = list(plain.table("agents")) or list(network_agents(plain) or {})
    if others and agent not in others:
        yield place, f"there is no agent {quoted(agent)}{hint(agent, others)}"
        return
    stated = [key for key in ("thresholds", "sees", "evidence") if plain.has(*place, key)]
    if not stated and not plain.has(*place, "answers"):
        yield place, "doubts nothing (allowed thresholds, sees, evidence, answers)"
    if stated and plain.has(*place, "answers"):
        yield (
            (*place, "answers"),
            f"whoever answers so makes nothing of {stated[0]}; keep one of the two",
        )
    own = [key for key in ("thresholds", "sees", "answers") if plain.has(*place, key)]
    if own and agent == plain.text("rule", "agent"):
        yield (
            (*place, own[0]),
            "the rule is for this agent, and it knows its own; only its evidence can be doubted",
        )
    name = plain.text(*place, "thresholds")
    if name is not None:
        yield from known_thresholds(plain, (*place, "thresholds"), name)
    met: set[str] = set()
    for number, other in plain.texts(*place, "sees") or []:
        key = (*place, "sees", number)
        if other == agent:
            yield key, "an agent cannot see itself; it knows its own state without looking"
        elif others and other not in others:
            yield key, f"there is no agent {quoted(other)}{hint(other, others)}"
        elif other in met:
            yield key, f"{quoted(other)} is listed twice; once is enough"
        met.add(other)
    if plain.has(*place, "evidence"):
        yield from evidence(plain, *place, "evidence")
        has_own = plain.has("agents", agent, "evidence")
        stated_at: Key = ("agents", agent, "evidence") if has_own else ("evidence",)
        yield from _same_kind(plain, (*place, "evidence"), stated_at)


def _same_kind(plain: Plain, place: Key, believed: Key) -> Found:
    """Evidence is doubted in its numbers only."""
    real, said = plain.text(*place, "kind"), plain.text(*believed, "kind")
    alike = real == said or (real in TWO_VALUED and said in TWO_VALUED)
    if real is not None and said is not None and not alike:
        yield (
            (*place, "kind"),
            f"{quoted(real)} is another kind than that of the case (allowed {said})",
        )
    elif said == "normal":
        yield place, "normal evidence cannot be doubted here: it is split onto a ladder of its own"
