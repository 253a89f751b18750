"""Which rule a record is followed by, and what must be said beside it."""

from __future__ import annotations

from collections.abc import Sequence

from thumbwright.distill.case import Case
from thumbwright.distill.costs import Pricer
from thumbwright.distill.crowds import crowd_of
from thumbwright.distill.faults import Faults
from thumbwright.distill.forms import MODULES, Wanted, form
from thumbwright.distill.replay import WATCH, Step
from thumbwright.distill.ruleprice import handed_in
from thumbwright.distill.rules import Rule
from thumbwright.exact.engine import Progress, Solution
from thumbwright.exact.errors import ModelError
from thumbwright.exact.evidence.base import Evidence
from thumbwright.exact.group import Group


def refuse_crowd(case: Case, group: Group) -> None:
    """Raise ModelError where the rule counts the others instead of telling them apart."""
    if crowd_of(case, group) is not None:
        raise ModelError(
            "a record is followed by who showed what and when, but the rule of this case counts "
            'the others; give inputs = ["step", "shown"], which tells them apart'
        )


def rule_to_follow(
    case: Case, pricer: Pricer, path: str | None, progress: Progress | None = None
) -> tuple[Rule, list[str]]:
    """The rule in a CSV file, or else the first form that the case can have; with remarks.

    Bars need an own count, so a case whose evidence has none is followed by a form with worths.

    Raises
    ------
    Faults
        Where the file cannot be read as a rule of this case, is not whole, or holds bars without
        there being an own count.
    ModelError
        Where the case can have no form that a record can be followed by.
    """
    evidence = pricer.group.agents[pricer.group.index[pricer.agent]].evidence
    counted = _has_count(evidence)
    if path is not None:
        rule, remarks = handed_in(case, pricer, path)
        if rule.has_bars and not counted:
            raise Faults(
                [
                    f"{path}: bars need an own count, which signs of this evidence have not; give "
                    "nats"
                ]
            )
        return rule, remarks
    wanted = Wanted(case.rule.rows, tuple(case.rule.inputs), case.rule.max_accuracy_lost)
    refusal = None
    for name in MODULES:
        if name not in case.rule.forms:
            continue
        try:
            rule = form(name).distil(pricer, wanted, progress).rule
        except ModelError as reason:
            refusal = refusal or reason
            continue
        if counted or not rule.has_bars:
            return rule, []
    raise refusal or ModelError(
        "rule.forms: signs of this evidence have no own count, so a record needs a form with "
        'worths: add "table"'
    )


def _has_count(evidence: Evidence) -> bool:
    return evidence.on_ladder and evidence.split is None


def remarks_on(solution: Solution, agent: str, steps: Sequence[Step]) -> list[str]:
    """What in a followed record rests on a convention or is not exact."""
    group = solution.group
    position = group.index[agent]
    said = []
    ended = {one.step for one in steps if one.rule.does not in (WATCH, None)}
    if ended and steps[-1].step > min(ended) and group.influences(position):
        said.append(
            f"what {agent} shows comes back to it through others; the full calculation takes it "
            "for still undecided after the rule has answered"
        )
    splits = [one.evidence.split for one in group.agents if one.evidence.split]
    if splits:
        said.append(
            "the worth of what is shown rests on evidence split onto a ladder with steps of "
            f"{splits[0].step:.4g} nats; the agent's own observations are taken as recorded"
        )
    if solution.dropped_mass > 0:
        said.append(
            f"display events of probability {solution.dropped_mass:.3g} in all were dropped on "
            "request: what is called impossible may be one of them"
        )
    return said
