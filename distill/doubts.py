"""What the rule costs where what the case says is not so: worlds to doubt it by, and their price.

Everybody in a doubted world goes by the case: thresholds in nats, what an observation is worth and
what a neighbour's answer or silence is worth are those of the case, for the rule's agent and for
all others. Only an agent that sees somebody it is not said to see knows that it does. In each world
three ways of playing are held against each other: the rule, the full calculation under the wrong
assumptions, and looking at nobody.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass, replace

from thumbwright.distill.assemble import Limits, Setting
from thumbwright.distill.case import Case
from thumbwright.distill.costs import Pricer
from thumbwright.distill.evidence_keys import CalibrationEvidence
from thumbwright.distill.findings import Doubted, Figures
from thumbwright.distill.network_pricer import NetworkPricer
from thumbwright.distill.playing import alone_policy
from thumbwright.distill.rules import Rule
from thumbwright.distill.stated_doubts import at_random, stated_world, with_sight
from thumbwright.distill.tallies import Tally, average, tally
from thumbwright.exact import astray
from thumbwright.exact.engine import Progress, solve
from thumbwright.exact.errors import ModelError
from thumbwright.exact.evidence.base import Evidence
from thumbwright.exact.evidence.binary import bernoulli
from thumbwright.exact.evidence.law import Law, real_law, stretched
from thumbwright.exact.forecast import forecast
from thumbwright.exact.group import Agent, Group, Thresholds

WorldFor = Callable[[Setting], astray.World]

MOST_ONE_BY_ONE = 2
"""So many seen agents are doubted one by one; more are doubted all at once."""

MOST_SECONDS = 0.1
"""Worlds are worked out unasked where exact play is forecast to take no longer than this."""

HALF, TWICE = 0.5**0.5, 2.0**0.5
"""Worth of an observation, as a factor, at which it has about half or twice the information."""

TAILS = (0.05, 0.95)
"""Quantiles of what calibration counts leave open."""

PRIOR_COUNT = 0.5
"""Added to each calibration count: the prior Beta(1/2, 1/2) of Jeffreys, for each of the two."""

NEARER = 0.2
"""Share of its distance from the prior by which a threshold that is no whole count is moved."""


@dataclass(frozen=True)
class Doubt:
    """One way in which the case may be wrong.

    Attributes
    ----------
    name : str
        For files.
    says, how : str
        What is really so, in plain words; how much exactly, "" where nothing is to be added.
    world : callable
        ``world(setting) -> World``; raises ModelError where the engine knows no such world.
    """

    name: str
    says: str
    how: str
    world: WorldFor


def doubted(
    pricer: NetworkPricer,
    case: Case,
    rule: Rule,
    limits: Limits,
    progress: Progress | None = None,
) -> tuple[tuple[Doubted, ...], tuple[str, ...]]:
    """Price a rule in every doubted world.

    Returns
    -------
    tuple of Doubted
    tuple of str
        Plain sentences on what was left out, and why.

    Raises
    ------
    ModelError
        Where a world that the case itself states cannot be played.
    """
    if any(setting.solution.dropped_mass > 0 for setting in pricer.settings):
        return (), ("Wrong assumptions were not priced, since rare events were dropped.",)
    stated = [_stated(case, name) for name in case.doubts]
    ours, left_out = _doubts(pricer, case)
    doubts = [*stated, *(one for one in ours if one.name not in case.doubts)]
    found = []
    for number, doubt in enumerate(doubts):
        if progress:
            progress("wrong assumptions", number, len(doubts))
        try:
            found.append(_priced(pricer, rule, doubt, limits))
        except ModelError as refusal:
            if doubt.name in case.doubts:
                raise ModelError(f"doubts.{doubt.name}: {refusal}") from refusal
            left_out.append(f"The doubt “{doubt.name}” was not priced: {refusal}.")
    if progress:
        progress("wrong assumptions", len(doubts), len(doubts))
    return tuple(found), tuple(left_out)


def _priced(pricer: NetworkPricer, rule: Rule, doubt: Doubt, limits: Limits) -> Doubted:
    """The three ways of playing in one doubted world, averaged over the settings."""
    policies = pricer.rule_policies(rule)
    parts: list[list[tuple[float, Tally]]] = [[], [], []]
    for setting in pricer.settings:
        ways = (policies(setting), None, alone_policy)
        fates = astray.fates(doubt.world(setting), pricer.agent, ways, limits.memory)
        for part, fate in zip(parts, fates, strict=True):
            part.append((setting.weight, tally(fate.track, fate.off_model)))
    by_rule, exact, alone = (average(part) for part in parts)
    there = replace(pricer, exact_tally=exact, alone_tally=alone)

    def figures(played: Tally) -> Figures:
        return replace(there.figures(played), benefit_kept=kept_of(pricer, played, alone))

    return Doubted(
        doubt.name, doubt.says, doubt.how, figures(by_rule), figures(exact), figures(alone)
    )


def kept_of(pricer: Pricer, played: Tally, alone: Tally) -> float | None:
    """Risk saved over looking at nobody, as a share of what exact watching was to save."""
    if pricer.losses is None or not pricer.watching_is_worth:
        return None
    losses, prior = pricer.losses, pricer.prior_plus
    expected = pricer.alone_tally.risk(losses, prior) - pricer.exact_tally.risk(losses, prior)
    return (alone.risk(losses, prior) - played.risk(losses, prior)) / expected


def _stated(case: Case, name: str) -> Doubt:
    """A world that the case states itself."""
    doubt = case.doubts[name]
    return Doubt(name, doubt.says or name, "", lambda s: stated_world(case, doubt, s))


def _doubts(pricer: NetworkPricer, case: Case) -> tuple[list[Doubt], list[str]]:
    """All doubts of a case, and sentences on those that are left out."""
    group = pricer.group
    if not pricer.seen:
        return [], []
    seconds = forecast(group).seconds * len(pricer.settings)
    if seconds > MOST_SECONDS:
        return [], [
            "Wrong assumptions were not priced: there are about twenty worlds to play, and exact "
            f"play of one takes about {seconds:.0f} seconds."
        ]
    found = [*_evidence_doubts(group), *_calibration_doubts(case, group)]
    one_by_one = len(pricer.seen) <= MOST_ONE_BY_ONE
    for who in [(one,) for one in pricer.seen] if one_by_one else [pricer.seen]:
        names = [case.agents[agent].name for agent in who]
        said = names[0] if len(names) == 1 else "everybody whom you see"
        mark = who[0] if len(who) == 1 else "all"
        found += _neighbour_doubts(group, who, mark, said)
        if one_by_one:
            found += _link_doubts(pricer, case, who[0])
    return found, []


def _evidence_doubts(group: Group) -> Iterator[Doubt]:
    """Observations of everybody that tell less, or more, than everybody takes them for."""
    for name, says, how, law in evidence_laws(group):
        yield Doubt(name, says, how, _with_laws(law, group))


def evidence_laws(group: Group) -> Iterator[tuple[str, str, str, Callable[[Agent], Law]]]:
    """Name, what is really so, how much exactly, and the law of an agent's observations."""
    if any(a.evidence.certain_plus + a.evidence.certain_minus > 0 for a in group.agents):
        return
    for name, factor, words in (("weaker", HALF, "half"), ("stronger", TWICE, "twice")):
        said = f"observations tell {'less' if factor < 1 else 'more'} than everybody takes them for"
        how = f"each is worth {factor:.2f} of it, about {words} the information"
        coins = {id(a.evidence): a.evidence for a in group.agents}
        if all(one.kind == "coin" for one in coins.values()) and len(coins) == 1:
            right = stretched(group.agents[0].evidence, factor).plus[1]
            how += f"; a sign is right with probability {right:.3g}"
        yield f"evidence-{name}", said, how, _stretched_by(factor)


def _stretched_by(factor: float) -> Callable[[Agent], Law]:
    return lambda agent: stretched(agent.evidence, factor)


def _with_laws(
    law: Callable[[Agent], Law], group: Group, who: Sequence[str] | None = None
) -> WorldFor:
    """Worlds in which the observations of some agents, or all, follow another law."""
    laws = {a.id: law(a) for a in group.agents if who is None or a.id in who}
    return lambda setting: astray.with_laws(astray.as_believed_by(setting.solution), laws)


def _calibration_doubts(case: Case, group: Group) -> Iterator[Doubt]:
    """What earlier cases leave open about the chances of a sign under either answer."""
    who = [key for key, agent in case.agents.items() if agent.evidence is None]
    for name, says, how, law in calibration_laws(case):
        yield Doubt(name, says, how, _with_laws(law, group, who))


def calibration_laws(case: Case) -> Iterator[tuple[str, str, str, Callable[[Agent], Law]]]:
    """As :func:`evidence_laws`, for the agents that share the evidence of the case."""
    counts = case.evidence
    shared = any(agent.evidence is None for agent in case.agents.values())
    if not isinstance(counts, CalibrationEvidence) or not shared:
        return
    plus = posterior(counts.hits, counts.misses)
    minus = posterior(counts.false_alarms, counts.correct_rejections)
    corners = {
        "signs-worse": ("tell less", plus[0], minus[1]),
        "signs-better": ("tell more", plus[1], minus[0]),
        "signs-rarer": ("are rarer", plus[0], minus[0]),
        "signs-commoner": ("are commoner", plus[1], minus[1]),
    }
    for name, (words, p_plus, p_minus) in corners.items():
        said = f"signs {words} than the counts of earlier cases say"
        how = (
            f"probability {p_plus:.3g} given plus and {p_minus:.3g} given minus, the 5 % or 95 % "
            "quantile that these counts leave (prior Beta(1/2, 1/2))"
        )
        yield name, said, how, _really(bernoulli(p_plus, p_minus))


def _really(real: Evidence) -> Callable[[Agent], Law]:
    return lambda agent: real_law(agent.evidence, real)


def posterior(seen: float, not_seen: float) -> tuple[float, float]:
    """The two quantiles of a chance of which these counts are known.

    Beta(seen + 1/2, not_seen + 1/2) is what the counts leave of the prior of Jeffreys.
    """
    from scipy.special import betaincinv

    low, high = (
        float(f"{betaincinv(seen + PRIOR_COUNT, not_seen + PRIOR_COUNT, tail):.9g}")
        for tail in TAILS
    )
    return low, high


def _neighbour_doubts(group: Group, who: Sequence[str], mark: str, said: str) -> Iterator[Doubt]:
    """What may be otherwise about agents that are seen."""
    agents = [group.agents[group.index[one]] for one in who]
    for name, short, how, signs in threshold_moves(agents):
        yield Doubt(f"{mark}-{name}", f"{said} {short}", how, _with_moves(who, signs))
    yield Doubt(
        f"{mark}-absent", f"{said} never answers", "", _with_habit(who, astray.Habit.SILENT)
    )
    yield Doubt(
        f"{mark}-random",
        f"{said} answers at random",
        "by its own observations, which tell nothing, and looking at nobody",
        _with_habit(who, astray.Habit.ALONE),
    )


def threshold_moves(
    agents: Sequence[Agent],
) -> Iterator[tuple[str, str, str, tuple[int, int]]]:
    """Name, what these really do, how much exactly, and the signs of the two moves."""
    whole = all(_whole_counts(agent.evidence) for agent in agents)
    far = "one observation" if whole else f"{NEARER:.0%}"
    moves = {
        "nearer": ("answers sooner", f"both thresholds {far} nearer to the prior", (1, 1)),
        "further": ("answers later", f"both thresholds {far} further from the prior", (-1, -1)),
        "readier-for-plus": (
            "is readier to answer plus",
            f"that threshold {far} nearer to the prior, the other further",
            (-1, 1),
        ),
        "readier-for-minus": (
            "is readier to answer minus",
            f"that threshold {far} nearer to the prior, the other further",
            (1, -1),
        ),
    }
    for name, (short, how, signs) in moves.items():
        yield name, short, how, signs


def _whole_counts(evidence: Evidence) -> bool:
    return evidence.countable and evidence.beta == 0.0


def _with_moves(who: Sequence[str], signs: tuple[int, int]) -> WorldFor:
    """Worlds with the thresholds of some agents moved; +1 is nearer to the prior.

    ``signs`` are for minus and for plus.
    """

    def world(setting: Setting) -> astray.World:
        made = astray.as_believed_by(setting.solution)
        group = setting.solution.group
        for one in who:
            agent = group.agents[group.index[one]]
            made = astray.with_thresholds(made, one, moved(agent, group.prior, signs))
        return made

    return world


def moved(
    agent: Agent, prior: float, signs: tuple[int, int]
) -> tuple[tuple[float, Thresholds], ...]:
    """Its possible thresholds, moved; refused where one would reach the prior."""
    found = []
    for share, bound in agent.thresholds:
        ends = []
        for away, sign in zip((prior - bound.minus, bound.plus - prior), signs, strict=True):
            evidence = agent.evidence
            step = abs(evidence.alpha[0]) if _whole_counts(evidence) else NEARER * abs(away)
            if away - sign * step <= 1e-9:
                raise ModelError(f"a threshold of {agent.id} would reach the prior")
            ends.append(float(away - sign * step))
        found.append((share, Thresholds(prior - ends[0], prior + ends[1])))
    return tuple(found)


def _with_habit(who: Sequence[str], habit: astray.Habit) -> WorldFor:
    """Worlds with agents that never answer, or do so at random."""

    def world(setting: Setting) -> astray.World:
        made = astray.as_believed_by(setting.solution)
        for one in who:
            silent = habit is astray.Habit.SILENT
            made = astray.with_habit(made, one, habit) if silent else at_random(made, one)
        return made

    return world


def _link_doubts(pricer: NetworkPricer, case: Case, one: str) -> Iterator[Doubt]:
    """A seen agent that sees the rule's agent, or others who are seen, and is not said to."""
    group, name = pricer.group, case.agents[one].name
    sees = group.agents[group.index[one]].sees
    links = {
        f"{one}-sees-{pricer.agent}": ((pricer.agent,), "sees you"),
        f"{one}-sees-others": (pricer.seen, "sees the others whom you see"),
    }
    for mark, (others, words) in links.items():
        more = tuple(other for other in others if other not in sees and other != one)
        if more:
            how = f"only {name} knows"
            yield Doubt(mark, f"{name} {words}", how, with_sees(one, (*sees, *more)))


def with_sees(one: str, sees: tuple[str, ...]) -> WorldFor:
    """Worlds in which an agent sees others than it is said to, and reads them as if all knew."""

    def world(setting: Setting) -> astray.World:
        linked = with_sight(setting.solution.group, one, sees)
        seconds = forecast(linked).seconds
        if seconds > MOST_SECONDS:
            raise ModelError(f"exact play of that group takes about {seconds:.0f} seconds")
        return astray.with_links(astray.as_believed_by(setting.solution), one, solve(linked))

    return world
