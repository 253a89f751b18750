"""The main job: from a case to its findings.

Exact beliefs, then each rule form asked for, each priced, beside exact play, plain count and being
alone; then what the sheet needs to explain itself: worth curves, an example, caveats.
"""

from __future__ import annotations

from dataclasses import replace
from importlib.metadata import version

import numpy as np

from thumbwright.distill.assemble import NO_LIMITS, Limits
from thumbwright.distill.case import Case
from thumbwright.distill.costs import Pricer
from thumbwright.distill.crowd_doubts import doubted_crowd
from thumbwright.distill.crowd_pricer import CrowdPricer
from thumbwright.distill.crowds import HISTORIES
from thumbwright.distill.doubts import doubted
from thumbwright.distill.example import example
from thumbwright.distill.findings import (
    Doubted,
    Figures,
    Findings,
    FormResult,
    ReckonedResult,
    WorthCurve,
)
from thumbwright.distill.forms import MODULES, Distilled, Wanted
from thumbwright.distill.forms.making import make, wanted_of
from thumbwright.distill.forms.runs import alone_rows
from thumbwright.distill.network_pricer import NetworkPricer
from thumbwright.distill.pricing import pricer_of
from thumbwright.distill.rules import SHOWN, Rule
from thumbwright.distill.situations import Situations, Weighed, values_of
from thumbwright.distill.sizes import come_free, priced_sizes
from thumbwright.distill.tallies import Tally
from thumbwright.exact.engine import Progress
from thumbwright.exact.errors import ModelError
from thumbwright.exact.evidence.base import Evidence
from thumbwright.exact.group import Group

MOST_CURVES = 9
"""Joint shown states that get a curve of their own, the most frequent first."""


def gather(case: Case, progress: Progress | None = None, limits: Limits = NO_LIMITS) -> Findings:
    """Everything that is printed about the rule's agent of a case."""
    pricer, missing = pricer_of(case, progress, limits)
    wanted = wanted_of(case, pricer)
    made, reckoned, left_out = _forms(pricer, case, wanted, progress)
    forms = {name: one for name, (one, _) in made.items()}
    main, main_tally = next(iter(made.values()))
    exact = pricer.figures(pricer.exact_tally)
    plain = pricer.figures(pricer.plain_count_tally())
    alone = pricer.figures(pricer.alone_tally)
    evidence = _evidence(pricer)
    figures = [f.figures for f in forms.values()] + [f.figures for f in reckoned.values()]
    figures += [plain, alone]
    figures += [f.everybody for f in forms.values() if f.everybody is not None]
    caveats = (*_caveats(pricer, figures, missing), *left_out)
    doubts, not_doubted = _doubts(pricer, case, main.rule, limits, progress)
    return Findings(
        case=case,
        digest=case.digest,
        version=version("thumbwright"),
        agent=pricer.agent,
        seen=pricer.seen,
        forms=forms,
        exact=exact,
        plain_count=plain,
        alone=alone,
        costs=pricer.basis(main_tally),
        watching_is_worth=pricer.watching_is_worth,
        count_is_whole=evidence.countable,
        alpha=float(evidence.alpha[0]) if evidence.on_ladder else None,
        beta=evidence.beta if evidence.on_ladder else None,
        prior=_firm(pricer.group.prior),
        bounds=_bounds(pricer),
        value_offsets=tuple(map(int, evidence.offsets[:, 0])) if evidence.countable else None,
        leans=_leans(pricer.group, pricer.seen),
        alone_rows=alone_rows(pricer) if evidence.countable and evidence.alpha[0] > 0 else (),
        worth_curves=worth_curves(pricer, case),
        labels=evidence.labels,
        is_exact=_is_exact(pricer, figures),
        caveats=caveats,
        near_tie_mass=pricer.inexact().near_tie_mass,
        example=example(pricer, main.rule) if isinstance(pricer, NetworkPricer) else (),
        reckoned=reckoned,
        doubts=doubts,
        not_doubted=not_doubted,
    )


def _doubts(
    pricer: Pricer, case: Case, rule: Rule, limits: Limits, progress: Progress | None
) -> tuple[tuple[Doubted, ...], tuple[str, ...]]:
    if isinstance(pricer, NetworkPricer):
        return doubted(pricer, case, rule, limits, progress)
    assert isinstance(pricer, CrowdPricer)
    return doubted_crowd(pricer, case, rule, progress)


def _forms(
    pricer: Pricer, case: Case, wanted: Wanted, progress: Progress | None
) -> tuple[dict[str, tuple[FormResult, Tally]], dict[str, ReckonedResult], tuple[str, ...]]:
    """Every form asked for that this case can have; sentences on those it cannot.

    Raises ModelError where it can have none of rows.
    """
    forms: dict[str, tuple[FormResult, Tally]] = {}
    reckoned: dict[str, ReckonedResult] = {}
    refusals: list[ModelError] = []
    for name in MODULES:
        if name in case.rule.forms:
            try:
                asked = replace(wanted, every_size=come_free(name, pricer, wanted))
                made = make(name, pricer, asked, progress)
            except ModelError as refusal:
                refusals.append(refusal)
                continue
            if isinstance(made.rule, Rule):
                forms[name] = _form_result(pricer, made.rule, made, progress)
            else:
                figures = pricer.price(made.rule)
                kept = made.information_kept
                reckoned[name] = ReckonedResult(made.rule, figures, kept, made.notes)
    if not forms:
        raise refusals[0]
    return forms, reckoned, tuple(f"A form is left out: {refusal}." for refusal in refusals)


def _form_result(
    pricer: Pricer, rule: Rule, made: Distilled, progress: Progress | None
) -> tuple[FormResult, Tally]:
    found, uses = pricer.rule_uses(rule)
    result = FormResult(
        rule,
        pricer.figures(found),
        uses,
        made.information_kept,
        made.information_ceiling,
        made.notes,
        pricer.agreement(rule),
        _everybody(pricer, rule, progress),
        priced_sizes(pricer, made.sizes),
    )
    return result, found


def _everybody(pricer: Pricer, rule: Rule, progress: Progress | None) -> Figures | None:
    """How the agent fares where all who can use its rule do; None where that is nobody else."""
    users = pricer.users(rule)
    if len(users) < 2:
        return None
    if progress:
        progress("everybody", 0, 1)
    try:
        found = pricer.figures(pricer.together_tally(rule, users))
    except ModelError:
        found = None
    if progress:
        progress("everybody", 1, 1)
    return found


def _evidence(pricer: Pricer) -> Evidence:
    return pricer.group.agents[pricer.group.index[pricer.agent]].evidence


def _bounds(pricer: Pricer) -> tuple[float, float]:
    own = pricer.group.agents[pricer.group.index[pricer.agent]].thresholds[0][1]
    return _firm(own.minus), _firm(own.plus)


def _firm(belief: float) -> float:
    """A belief to twelve digits: the last ones of a double differ between machines."""
    return float(f"{belief:.12g}")


def _leans(group: Group, seen: tuple[str, ...]) -> dict[str, str]:
    leans = {}
    for other in seen:
        bounds = group.agents[group.index[other]].thresholds
        up = sum(share * bound.plus for share, bound in bounds) - group.prior
        down = group.prior - sum(share * bound.minus for share, bound in bounds)
        near = abs(up - down) <= 1e-9 * max(abs(up), abs(down))
        leans[other] = "even" if near else "minus" if down < up else "plus"
    return leans


def _is_exact(pricer: Pricer, figures: list[Figures]) -> bool:
    sampled = any(f.errors is not None for f in figures)
    odd = any(f.off_model > 0.0 for f in figures)
    return pricer.inexact().nothing and not sampled and not odd


def _caveats(pricer: Pricer, figures: list[Figures], missing: str | None) -> tuple[str, ...]:
    """Plain sentences on what in the figures is not exact, or rests on a convention."""
    said = []
    for evidence in {id(a.evidence): a.evidence for a in pricer.group.agents}.values():
        if evidence.split:
            said.append(
                f"{evidence.kind.capitalize()} evidence was split onto a ladder with steps of "
                f"{evidence.split.step:.4g} nats; a ladder about twice as fine moved error "
                f"probabilities and mean steps of an agent alone by less than "
                f"{evidence.split.change:.2g} (relative)."
            )
        if evidence.kind == "poisson":
            said.append("Counts in the tail of the Poisson law, below 1e-15, were cut.")
    inexact = pricer.inexact()
    if inexact.dropped_mass > 0:
        said.append(
            f"Display events of probability {inexact.dropped_mass:.3g} in all were dropped on "
            f"request; any probability here may be off by up to {inexact.uncertainty:.3g}."
        )
    if inexact.sampled:
        histories, seed = inexact.sampled
        said.append(
            f"What the others show was sampled: {histories:,} public histories with seed {seed}, "
            "the beliefs along each of them exact. Figures carry standard errors and are not exact."
        )
    elif any(f.errors is not None for f in figures):
        said.append(
            f"What happens where everybody uses the rule was sampled, {HISTORIES:,} public "
            "histories of too many to enumerate; those figures carry standard errors and are not "
            "exact."
        )
    odd = max((f.off_model for f in figures), default=0.0)
    if odd > 0:
        said.append(
            "Others take the agent for exact; by a rule it shows them what their model calls "
            f"impossible up to {odd:.3g} times per outing, which they read as the same call at the "
            "latest earlier moment at which the model allowed it, or as no news."
        )
    if missing:
        said.append(missing)
    if not pricer.watching_is_worth:
        said.append(
            "Watching is worth nothing here: exact watching saves less than 1 % of the risk."
        )
    return tuple(said)


def worth_curves(pricer: Pricer, case: Case) -> tuple[WorthCurve, ...]:
    """The pooled worth of each joint shown state over the steps, with the span of histories."""
    situations = pricer.situations
    joint = situations.joint
    mass = np.bincount(joint, situations.plus + situations.minus)
    often = sorted(range(len(mass)), key=lambda k: (-mass[k], k))[:MOST_CURVES]
    steps = tuple(range(1, pricer.group.horizon + 1))
    curves = []
    for code in sorted(k for k in often if mass[k] > 0):
        here = joint == code
        label, states, counts = _state_label(case, situations, int(np.flatnonzero(here)[0]))
        columns: list[list[float | None]] = [[], [], []]
        for step in steps:
            cell = here & (situations.step == step)
            if not cell.any():
                numbers: list[float | None] = [None, None, None]
            else:
                pooled = values_of(
                    situations.plus[cell].sum(keepdims=True),
                    situations.minus[cell].sum(keepdims=True),
                )
                worths = situations.worth[cell]
                numbers = [_clean(x) for x in (pooled[0], worths.min(), worths.max())]
            for column, number in zip(columns, numbers, strict=True):
                column.append(number)
        worth, low, high = map(tuple, columns)
        curves.append(WorthCurve(label, states, steps, worth, low, high, counts))
    return tuple(curves)


def _clean(worth: float) -> float:
    """A worth to print; what is rounding only is nothing."""
    return 0.0 if abs(worth) < 1e-12 else float(worth)


def _state_label(
    case: Case, situations: Weighed, which: int
) -> tuple[str, tuple[str, ...], tuple[int, int] | None]:
    """What is shown in a situation: in the words of the case, by agent, and counted in a crowd."""
    words = {
        "undecided": case.words.shows_nothing,
        "plus": case.words.shows_plus,
        "minus": case.words.shows_minus,
    }
    if isinstance(situations, Situations):
        states = tuple(SHOWN[s] for s in situations.states[which])
        if len(states) == 1:
            return words[states[0]], states, None
        pairs = zip(situations.seen, states, strict=True)
        told = "; ".join(f"{case.agents[agent].name}: {words[state]}" for agent, state in pairs)
        return told, states, None
    plus, minus = (int(situations.number(f"{name}_shown")[which]) for name in ("plus", "minus"))
    counted = [f"{n} {words[name]}" for name, n in (("plus", plus), ("minus", minus)) if n]
    return "; ".join(counted) or f"all {words['undecided']}", (), (plus, minus)
