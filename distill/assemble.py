"""From a case to the exact objects: evidence, thresholds, group, and the settings a rule covers.

A *setting* is one assignment of thresholds to the seen agents that the rule must tell apart
(``covers``); a case without ``covers`` has a single one.
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import product

from thumbwright.distill.case import Case, Thresholds as Stated
from thumbwright.distill.evidence_keys import EvidenceKeys
from thumbwright.exact import thresholds as units
from thumbwright.exact.engine import Progress, Solution, solve
from thumbwright.exact.errors import ModelError
from thumbwright.exact.evidence import build
from thumbwright.exact.evidence.base import Evidence, Loose
from thumbwright.exact.group import Agent, Group, Thresholds, replace_thresholds
from thumbwright.exact.splitting import settle
from thumbwright.exact.stopping import Losses, best_alone


@dataclass(frozen=True)
class Limits:
    """What a run may take, and leave out.

    Attributes
    ----------
    drop : float
        Display events of less probability than this are dropped; the dropped mass is stated.
    memory : float or None
        Bytes that a run may take; None is half of what is free.
    histories : int or None
        Public histories of a crowd to sample; None is to enumerate them where they are few enough.
    seed : int
        With which they are sampled.
    """

    drop: float = 0.0
    memory: float | None = None
    histories: int | None = None
    seed: int = 1


NO_LIMITS = Limits()


@dataclass(frozen=True)
class Setting:
    """One exact solution that the rule must serve.

    Attributes
    ----------
    weight : float
        Share of this setting; all shares sum to 1.
    names : dict of str to str
        Thresholds of each seen agent by name, where the rule may look at them; else empty.
    solution : Solution
    """

    weight: float
    names: dict[str, str]
    solution: Solution


def prior_of(case: Case) -> float:
    """Prior log-odds of plus (nats)."""
    return units.log_odds(case.question.prior_plus)


def losses_of(case: Case) -> Losses | None:
    """The costs that the case states, or None."""
    costs = case.costs
    if costs is None:
        return None
    return Losses(costs.false_plus, costs.false_minus, costs.per_step, costs.undecided)


def assemble(case: Case) -> Group:
    """The group of a case; raises ModelError for what the model refuses."""
    prior = prior_of(case)
    by_agent = {key: _evidence_keys(case, key) for key in case.agents}
    made: dict[str, Evidence] = {}
    for keys in by_agent.values():
        mark = keys.model_dump_json()
        if mark not in made:
            owners = [key for key in case.agents if by_agent[key] == keys]
            made[mark] = _on_ladder(case, keys, owners, prior)
    evidence = {key: made[keys.model_dump_json()] for key, keys in by_agent.items()}
    # Thresholds from costs take a search: once per name and evidence, not once per agent.
    known: dict[tuple[str, str], Thresholds] = {}
    agents = []
    for key, agent in case.agents.items():
        shares = []
        for name, share in _shares(agent.thresholds).items():
            pair = (name, by_agent[key].model_dump_json())
            if pair not in known:
                known[pair] = thresholds_named(case, name, evidence[key], prior)
            shares.append((share, known[pair]))
        looks = agent.looks(case.time.horizon)
        agents.append(Agent(key, evidence[key], tuple(shares), tuple(agent.sees), looks))
    return Group(tuple(agents), prior, case.time.horizon, case.time.exchange)


def settings_of(
    case: Case, progress: Progress | None = None, limits: Limits = NO_LIMITS
) -> tuple[Setting, ...]:
    """Solve the group for every combination of thresholds that the rule must tell apart."""
    group = assemble(case)
    seen = group.agents[group.index[case.rule_agent]].sees
    if "thresholds" not in case.rule.inputs:
        return (Setting(1.0, {}, solve(group, progress, limits.drop, limits.memory)),)
    combinations = list(product(case.rule.covers, repeat=len(seen)))
    settings = []
    for names in combinations:
        known = {
            other: thresholds_named(
                case, name, group.agents[group.index[other]].evidence, group.prior
            )
            for other, name in zip(seen, names, strict=True)
        }
        exact = replace_thresholds(group, known)
        solution = solve(exact, progress, limits.drop, limits.memory)
        settings.append(
            Setting(1.0 / len(combinations), dict(zip(seen, names, strict=True)), solution)
        )
    return tuple(settings)


def thresholds_named(case: Case, name: str, evidence: Evidence, prior: float) -> Thresholds:
    """The thresholds of that name as beliefs (nats), for an agent with this evidence."""
    stated = case.thresholds[name]
    if stated.unit == "observations":
        assert stated.minus is not None
        assert stated.plus is not None
        return units.from_observations(stated.minus, stated.plus, evidence, prior)
    return _without_evidence(stated, prior) or _from_costs(case, evidence)


def _without_evidence(stated: Stated, prior: float) -> Thresholds | None:
    """Thresholds that can be stated in nats without knowing the evidence, else None."""
    if stated.false_plus is not None and stated.false_minus is not None:
        return units.from_error_rates(stated.false_plus, stated.false_minus, prior)
    if stated.minus is not None and stated.plus is not None:
        if stated.unit == "probability":
            return units.from_probability(stated.minus, stated.plus)
        if stated.unit == "nats":
            return Thresholds(stated.minus, stated.plus)
    return None


def _from_costs(case: Case, evidence: Evidence) -> Thresholds:
    losses = losses_of(case)
    assert losses is not None, "a case with thresholds from costs has costs"
    return best_alone(evidence, losses)


def _evidence_keys(case: Case, agent: str) -> EvidenceKeys:
    return case.agents[agent].evidence or case.evidence


def _shares(uses: str | dict[str, float]) -> dict[str, float]:
    return {uses: 1.0} if isinstance(uses, str) else uses


def _on_ladder(case: Case, keys: EvidenceKeys, agents: list[str], prior: float) -> Evidence:
    """Build evidence; split it, where needed, for the thresholds of all agents that have it."""
    stated = keys.model_dump(exclude={"tolerance"}, exclude_none=True)
    built = build(stated.pop("kind"), **stated)
    if isinstance(built, Evidence):
        return built
    names = dict.fromkeys(n for agent in agents for n in _shares(case.agents[agent].thresholds))
    names.update(dict.fromkeys(case.rule.covers))
    bounds = [_bounds_for_split(case, name, built, prior) for name in names]
    looks = [case.agents[agent].looks(case.time.horizon) for agent in agents]
    most = max(case.time.horizon if look is None else sum(look) for look in looks)
    return settle(built, bounds, prior, most, keys.tolerance)


def _bounds_for_split(case: Case, name: str, loose: Loose, prior: float) -> Thresholds:
    bounds = _without_evidence(case.thresholds[name], prior)
    if bounds is None:
        raise ModelError(
            f"thresholds.{name}: {loose.kind} evidence has no ladder before its thresholds are "
            "known; state them in nats, as probabilities or as tolerated error rates"
        )
    return bounds
