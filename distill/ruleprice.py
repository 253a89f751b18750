"""Pricing a rule that somebody hands in: is it whole, what does it cost, is every row used?"""

from __future__ import annotations

import math
from dataclasses import asdict, dataclass
from pathlib import Path
from typing import Any

import numpy as np

from thumbwright.distill.case import Case
from thumbwright.distill.costs import Pricer
from thumbwright.distill.faults import Faults
from thumbwright.distill.network_pricer import NetworkPricer
from thumbwright.distill.rule_reading import read_rule
from thumbwright.distill.rules import SHOWN, Rule
from thumbwright.distill.situations import Weighed
from thumbwright.distill.tallies import Tally
from thumbwright.exact.arrays import BoolArray

MOST_TOLD = 5000
"""So many situations that no row, or more than one, holds in are looked at to count them."""

MOST_NAMED = 12
"""So many agents are named in a message."""

KNOWN = ("exact", "plain-count", "alone")
"""Ways of playing that have a name and need no file."""


@dataclass(frozen=True)
class Use:
    """In whose hands a rule is.

    Attributes
    ----------
    by : str
        "one", the rule's agent alone; "everybody" who can use it; or ids joined by commas.
    others : str or None
        Path of a rule that all others go by who can; None is exact play.
    """

    by: str = "one"
    others: str | None = None


ALONE_IN_USE = Use()


def priced(case: Case, pricer: Pricer, rule: str, use: Use = ALONE_IN_USE) -> dict[str, Any]:
    """Figures of a rule beside exact play, plain count and being alone.

    Parameters
    ----------
    case : Case
    pricer : Pricer
    rule : str
        One of :data:`KNOWN`, or the path of a CSV file.
    use : Use
        Who else goes by it, and by what the rest go.

    Returns
    -------
    dict
        ``figures``, ``others`` (name to figures), ``rows``, ``remarks``, ``basis``; of a rule from
        a file ``agreement`` with exact play; where more than its agent use it ``used_by``, and in
        a network ``agents``, how each of them fares.

    Raises
    ------
    Faults
        Where the file cannot be read as a rule of this case, its rows leave gaps or overlap, or it
        cannot be used by those who are to.
    """
    more: dict[str, Any] = {}
    plain = pricer.plain_count_tally()
    others = {"exact": pricer.exact_tally, "plain-count": plain, "alone": pricer.alone_tally}
    rows: list[dict[str, Any]] = []
    remarks: list[str] = []
    if rule in KNOWN:
        if use != ALONE_IN_USE:
            raise Faults([f"{rule}: only a rule from a file can be in several hands"])
        tally = others[rule]
    else:
        read, remarks = handed_in(case, pricer, rule)
        tally, uses = pricer.rule_uses(read)
        rows_here = pricer.situations.rows_of(read)
        for number, (row, in_force) in enumerate(zip(read.rows, uses, strict=True)):
            rows.append({"row": number + 1, **_plain_row(row), **asdict(in_force)})
            if not (rows_here == number).any():
                remarks.append(f"row {number + 1} never applies: no such situation can arise")
        more["agreement"] = asdict(pricer.agreement(read))
        if use != ALONE_IN_USE:
            tally, told = _in_use(case, pricer, read, use)
            more |= told
            remarks.append("how often rows are used, and agreement, are those of a single user")
    figures = pricer.figures(tally)
    if figures.worse_than(pricer.figures(pricer.alone_tally)):
        remarks.append("this rule is worse than ignoring the neighbours")
    return {
        "figures": asdict(figures),
        "others": {name: asdict(pricer.figures(one)) for name, one in others.items()},
        "rows": rows,
        "remarks": remarks,
        "basis": pricer.basis(tally),
        **more,
    }


def handed_in(case: Case, pricer: Pricer, path: str) -> tuple[Rule, list[str]]:
    """Read a rule that must be whole, with remarks on what it is.

    Raises Faults where the file cannot be read as a rule of this case, or its rows leave gaps or
    overlap.
    """
    read = _read(case, pricer, path)
    faults = _gaps_and_overlaps(pricer, read, path)
    if faults:
        raise Faults(faults)
    return read, _refused_bars(pricer, path) if read.has_bars else []


def _share(text: str, agent: str, able: tuple[str, ...]) -> tuple[str, ...]:
    """A share of those who can use a rule: its agent, then the others in their order.

    Raises Faults where it is no share.
    """
    try:
        share = float(text[:-1]) / 100.0
    except ValueError:
        share = math.nan
    if not 0.0 < share <= 1.0:
        raise Faults([f"--used-by: {text} is no share (allowed: above 0% to 100%)"])
    in_order = [agent, *(key for key in able if key != agent)]
    chosen = set(in_order[: max(1, round(share * len(able)))])
    return tuple(key for key in able if key in chosen)


def _in_use(case: Case, pricer: Pricer, rule: Rule, use: Use) -> tuple[Tally, dict[str, Any]]:
    """How the rule's agent fares where others use it too, and how they do."""
    able = pricer.users(rule)
    users = {"one": (pricer.agent,), "everybody": able}.get(use.by)
    if use.by.endswith("%"):
        users = _share(use.by, pricer.agent, able)
    if users is None:
        asked = [name.strip() for name in use.by.split(",")]
        some = ", ".join(able[:MOST_NAMED]) + (", ..." if len(able) > MOST_NAMED else "")
        allowed = f"(allowed: one, everybody, a share such as 25%, or some of {some})"
        unable = [name for name in asked if name not in able]
        if unable:
            raise Faults([f"--used-by: {', '.join(unable)} cannot use this rule {allowed}"])
        if pricer.agent not in asked:
            raise Faults(
                [f"--used-by: {pricer.agent}, whose figures are priced, is missing {allowed}"]
            )
        users = tuple(name for name in able if name in asked)
    others = None
    if use.others is not None:
        others, _ = handed_in(case, pricer, use.others)
    told: dict[str, Any] = {"used_by": list(users), "rule_of_others": use.others}
    told["everybody"] = len(users) == len(pricer.group.agents)
    if isinstance(pricer, NetworkPricer):
        tallies = pricer.together_tallies(rule, users, others)
        told["agents"] = {
            key: {
                side: {
                    name: float(getattr(one, name)[k])
                    for name in ("plus", "minus", "undecided", "steps")
                }
                for k, side in enumerate(("given_plus", "given_minus"))
            }
            for key, one in tallies.items()
        }
        return tallies[pricer.agent], told
    return pricer.together_tally(rule, users, others), told


def _read(case: Case, pricer: Pricer, path: str) -> Rule:
    if not Path(path).exists() and not path.lower().endswith(".csv"):
        raise Faults(
            [f"{path}: no such rule (allowed: the path of a CSV file, or {', '.join(KNOWN)})"]
        )
    evidence = pricer.group.agents[pricer.group.index[pricer.agent]].evidence
    return read_rule(
        path,
        seen=pricer.seen,
        threshold_names=case.rule.covers,
        agent=pricer.agent,
        alpha=float(evidence.alpha[0]) if evidence.kind == "coin" else None,
    )


def _refused_bars(pricer: Pricer, path: str) -> list[str]:
    evidence = pricer.group.agents[pricer.group.index[pricer.agent]].evidence
    if not evidence.on_ladder:
        raise Faults(
            [
                f"{path}: bars on the own count need evidence whose own count is one whole number, "
                f"which this {evidence.kind} evidence has not; give values in nats instead"
            ]
        )
    if evidence.split:
        return [f"bars are on the tally in steps of {evidence.split.step:.6g} nats"]
    return []


def _gaps_and_overlaps(pricer: Pricer, rule: Rule, path: str) -> list[str]:
    """One message with an example for gaps, and one for overlaps, among what can arise."""
    situations = pricer.situations
    count = situations.held_by(rule)[1]
    none, several = count == 0, count > 1
    faults = []
    if none.any():
        faults.append(
            f"{path}: rows: no row holds {_where(situations, none)}; add one, or widen a row"
        )
    if several.any():
        numbers = situations.held_in(rule, int(np.flatnonzero(several)[0]))
        faults.append(
            f"{path}: rows {' and '.join(str(n + 1) for n in numbers)} all hold "
            f"{_where(situations, several)}; narrow all but one"
        )
    return faults


def _where(situations: Weighed, mask: BoolArray) -> str:
    """An example of the masked situations in words, and how many others like it there are."""
    which = np.flatnonzero(mask)
    others = {situations.said(int(one)) for one in which[:MOST_TOLD]}
    more = len(others) - 1
    at_least = "at least " if len(which) > MOST_TOLD else ""
    return f"at {situations.said(int(which[0]))}" + (
        f" (and in {at_least}{more} more situations)" if more else ""
    )


def _plain_row(row: Any) -> dict[str, Any]:
    return {
        "step_from": row.step_from,
        "step_to": row.step_to,
        "shows": {agent: [s for s in SHOWN if s in states] for agent, states in row.shows.items()},
        "ranges": {name: list(ends) for name, ends in row.ranges.items()},
        "first_answer": None if row.first_answer is None else sorted(row.first_answer),
        "thresholds": {agent: sorted(names) for agent, names in row.thresholds.items()},
        "nats": row.value,
        "minus_at_or_below": row.minus_at,
        "plus_at_or_above": row.plus_at,
    }
