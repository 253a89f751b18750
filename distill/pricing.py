"""From a case to the pricer of its rule: by display histories, or by the counts of a crowd."""

from __future__ import annotations

from thumbwright.distill.assemble import NO_LIMITS, Limits, assemble, losses_of, settings_of
from thumbwright.distill.case import Case
from thumbwright.distill.costs import Pricer
from thumbwright.distill.crowd_pricer import CrowdPricer
from thumbwright.distill.crowds import crowd_of, naming_counts, play_of, shown_of
from thumbwright.distill.network_pricer import NetworkPricer
from thumbwright.distill.reading import read_case
from thumbwright.exact.engine import Progress
from thumbwright.exact.errors import ModelError
from thumbwright.exact.group import Agent, Group
from thumbwright.exact.stopping import Cone, Losses, costs_behind

NO_COSTS = (
    "No costs are stated, and none make the thresholds best for an agent alone; rules are compared "
    "by wrong answers only."
)


def pricer_for(name_or_path: str) -> Pricer:
    """The pricer of a case file or starter, to price any rule or function of a view by.

    Raises
    ------
    Faults
        Where the case has any.
    ModelError
        As for :func:`pricer_of`.
    """
    return pricer_of(read_case(name_or_path))[0]


def pricer_of(
    case: Case, progress: Progress | None = None, limits: Limits = NO_LIMITS
) -> tuple[Pricer, str | None]:
    """Exact play and the costs to price by; a sentence where no costs could be found.

    Raises ModelError where the rule's agent has thresholds that are unknown, or a timetable of its
    own.
    """
    group = assemble(case)
    own = _own(case, group)
    losses, cone = losses_of(case), None
    if losses is None:
        losses, cone = _inferred(group, own)
    missing = NO_COSTS if losses is None else None
    crowd = crowd_of(case, group)
    if crowd is None:
        with naming_counts(case, group):
            settings = settings_of(case, progress, limits)
        return NetworkPricer.build(case.rule_agent, settings, losses, cone), missing
    shown = shown_of(crowd, case.rule_agent, group, limits, progress)
    near = play_of(crowd, group, limits).near_tie_mass
    pricer = CrowdPricer.build(
        group, case.rule_agent, shown, losses, cone, near, limits.seed, limits.drop
    )
    return pricer, missing


def _own(case: Case, group: Group) -> Agent:
    """The agent that the rule is for; refused where a rule cannot be for it."""
    agent = case.rule_agent
    own = group.agents[group.index[agent]]
    if len(own.thresholds) > 1:
        raise ModelError(
            f"agents.{agent}: the rule is for {agent}, so its own thresholds must be known; give "
            "it one name under thresholds"
        )
    if own.looks is not None:
        raise ModelError(
            f"agents.{agent}: a rule counts one observation at every step, so its agent cannot "
            "have first_step, looks_every or looks_per_step; give them to the agents it sees"
        )
    return own


def _inferred(group: Group, own: Agent) -> tuple[Losses | None, Cone | None]:
    """Costs under which the agent's own thresholds are best for it alone."""
    cone = costs_behind(own.evidence, own.thresholds[0][1], group.prior, group.horizon)
    return (None, None) if cone is None else (cone.middle, cone)
