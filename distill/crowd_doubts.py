"""What the rule of a crowd costs where what the case says is not so.

As in ``doubts``: everybody goes by the case, and three ways of playing are held against each other
in each world. Worlds of a crowd are about what observations are really like and about others who
answer sooner, later, never or at random; a case cannot state worlds of its own here.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass, replace

import numpy as np

from thumbwright.distill.case import Case
from thumbwright.distill.crowd_pricer import CrowdPricer, nobody_seen, played
from thumbwright.distill.crowds import lay_out
from thumbwright.distill.doubts import (
    calibration_laws,
    evidence_laws,
    kept_of,
    moved,
    threshold_moves,
)
from thumbwright.distill.findings import Doubted, Figures
from thumbwright.distill.rules import Rule
from thumbwright.distill.tallies import Tally
from thumbwright.exact.crowd import (
    Crowd,
    CrowdPolicy,
    InPublic,
    Kind,
    Shown,
    exact_member,
)
from thumbwright.exact.engine import Progress
from thumbwright.exact.errors import ModelError
from thumbwright.exact.evidence.law import Law, useless
from thumbwright.exact.group import Agent
from thumbwright.exact.play import NEVER, Act

LawOf = Callable[[Agent], Law | None]


@dataclass(frozen=True)
class _World:
    """What is really so: laws of observations of the agent and the others, and what these do.

    ``others_go_by`` is None where the others reason exactly, by the case. ``signs`` say which way
    their thresholds really are moved, as in ``doubts.moved``.
    """

    name: str
    says: str
    how: str
    own_law: LawOf
    law_of_others: LawOf
    others_go_by: CrowdPolicy | None = None
    signs: tuple[int, int] | None = None


def doubted_crowd(
    pricer: CrowdPricer, case: Case, rule: Rule, progress: Progress | None = None
) -> tuple[tuple[Doubted, ...], tuple[str, ...]]:
    """Price a rule in every doubted world; also sentences on what was left out, and why.

    Raises ModelError where the case states worlds of its own.
    """
    if case.doubts:
        raise ModelError(
            f"doubts.{next(iter(case.doubts))}: the worlds of a crowd cannot be stated; leave them "
            "out, or let the rule tell the others apart"
        )
    worlds = list(_worlds(pricer, case))
    found, left_out = [], []
    for number, world in enumerate(worlds):
        if progress:
            progress("wrong assumptions", number, len(worlds))
        try:
            found.append(_priced(pricer, rule, world))
        except ModelError as refusal:
            left_out.append(f"The doubt “{world.name}” was not priced: {refusal}.")
    if progress:
        progress("wrong assumptions", len(worlds), len(worlds))
    left_out.append(
        "In a crowd what observations tell is doubted, and when the others answer: sooner, later, "
        "never or at random; who sees whom is not."
    )
    return tuple(found), tuple(left_out)


def _worlds(pricer: CrowdPricer, case: Case) -> Iterator[_World]:
    for name, says, how, law in evidence_laws(pricer.group):
        yield _World(name, says, how, law, law)
    for name, says, how, law in calibration_laws(case):
        own = _where_shared(case, law)
        yield _World(name, says, how, own, own)
    everybody = "everybody whom you see"
    agents = [kind.agent for kind in pricer.shown.crowd.kinds]
    for name, short, how, signs in threshold_moves(agents):
        yield _World(f"all-{name}", f"{everybody} {short}", how, _same, _same, signs=signs)
    yield _World("all-absent", f"{everybody} never answers", "", _same, _same, _silent)
    yield _World(
        "all-random",
        f"{everybody} answers at random",
        "by its own observations, which tell nothing, and looking at nobody",
        _same,
        lambda agent: useless(agent.evidence),
        nobody_seen,
    )


def _where_shared(case: Case, law: Callable[[Agent], Law]) -> LawOf:
    """The law of agents that share the evidence of the case; others have their own."""
    return lambda agent: law(agent) if case.agents[agent.id].evidence is None else None


def _same(_agent: Agent) -> None:
    """Observations are what they are taken for."""


def _silent(seen: InPublic) -> Act:
    """Never an answer."""
    return Act(np.zeros(len(seen)), np.array(-NEVER), np.array(NEVER))


def _priced(pricer: CrowdPricer, rule: Rule, world: _World) -> Doubted:
    """The three ways of playing in one doubted world."""
    shown = _shown(pricer, world)
    ways = (pricer.policy(rule), exact_member, nobody_seen)
    by_rule, exact, alone = (played(shown, way)[0] for way in ways)
    there = replace(pricer, exact_tally=exact, alone_tally=alone)

    def figures(tally: Tally) -> Figures:
        return replace(there.figures(tally), benefit_kept=kept_of(pricer, tally, alone))

    return Doubted(
        world.name, world.says, world.how, figures(by_rule), figures(exact), figures(alone)
    )


def _shown(pricer: CrowdPricer, world: _World) -> Shown:
    """What the agent is shown there, itself a kind of its own."""
    old, kinds, sorts, laws = pricer.shown, [], [], []
    policies: list[CrowdPolicy | None] = []
    for sort, kind in enumerate(old.crowd.kinds):
        others = tuple(member for member in kind.members if member != pricer.agent)
        for members in ((pricer.agent,) if len(others) < len(kind.members) else (), others):
            if not members:
                continue
            is_own = members == (pricer.agent,)
            bounds = kind.thresholds
            if world.signs is not None and not is_own:
                bounds = moved(kind.agent, old.prior, world.signs)
            kinds.append(Kind(kind.evidence, bounds, members, kind.looks))
            sorts.append(sort)
            law = world.own_law if is_own else world.law_of_others
            laws.append(law(kinds[-1].agent))
            policies.append(None if is_own else world.others_go_by)
    held = next(k for k, kind in enumerate(kinds) if kind.members == (pricer.agent,))
    given = (Crowd(tuple(kinds)), held, old.prior, old.horizon, old.exchange)
    real = {"policies": policies, "sorts": sorts, "laws": laws, "taken_for": old.crowd.kinds}
    return lay_out(given, pricer.limits, **real)
