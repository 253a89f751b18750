"""A made-up run through the card: short, ending in a call, passing through as many lines as it can.

Paths are tried in a fixed order, so the same case gives the same run. They are possible paths, not
likely ones: the sheet calls the run made up.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from itertools import combinations, product
from typing import Any

import numpy as np

from thumbwright.distill.network_pricer import NetworkPricer
from thumbwright.distill.playing import lay_out
from thumbwright.distill.rules import SHOWN, Rule
from thumbwright.distill.views import NO_ROW
from thumbwright.exact.arrays import IntArray
from thumbwright.exact.evidence.base import Evidence

SHORT = 7
"""Runs of a symmetric count are tried in full up to this many steps."""

LONG = 60
"""Runs of a count that only goes up may take this many steps; quiet ones are not printed."""


@dataclass(frozen=True)
class _Path:
    signs: tuple[int, ...]
    call_step: int
    call: int


def example(pricer: NetworkPricer, rule: Rule) -> tuple[dict[str, Any], ...]:
    """The run, as the findings print it; empty where the rule has no bars."""
    evidence = pricer.group.agents[pricer.group.index[pricer.agent]].evidence
    if not rule.has_bars or not rule.is_grid or len(evidence.plus) < 2:
        return ()
    names = pricer.settings[0].names
    grid = lay_out(rule, pricer.group.horizon, names).row
    quiet = bool((evidence.offsets >= 0).all())
    best: tuple[tuple[int, ...], list[dict[str, Any]]] | None = None
    for path in _paths(pricer, evidence, quiet):
        run = _walk(pricer, rule, grid, evidence, path)
        if not run or run[-1]["act"] == "watch":
            continue
        lines = {entry["line"] for entry in run}
        steadied = sum(1 for entry in run if _would_have_answered(rule, entry))
        score = (len(lines), min(steadied, 1), -len(run))
        if best is None or score > best[0]:
            best = (score, run)
    if best is None:
        return ()
    run = best[1]
    return tuple(run if not quiet else _notable(run))


def _paths(pricer: NetworkPricer, evidence: Evidence, quiet: bool) -> Iterator[_Path]:
    """Candidate runs: the signs, and when the first seen agent calls what."""
    horizon = pricer.group.horizon
    up, down = _telling_values(evidence)
    calls = _calls(pricer, LONG if quiet else SHORT)
    if not quiet:
        length = min(SHORT, horizon)
        for signs in product((down, up), repeat=length):
            for call_step, call in calls:
                yield _Path(signs, call_step, call)
        return
    length = min(LONG, horizon)
    marks = [step for step in (2, 5, 9, 14, 20, 27) if step <= length]
    for count in (1, 2, 0):
        for ups in combinations(marks, count):
            signs = tuple(up if step in ups else down for step in range(1, length + 1))
            for call_step, call in calls:
                yield _Path(signs, call_step, call)


def _telling_values(evidence: Evidence) -> tuple[int, int]:
    """The values (by position) that stand for a sign for plus and one for minus."""
    worths = evidence.worths()
    if len(worths) == 2:
        return int(np.argmax(worths)), int(np.argmin(worths))
    return int(np.argmax(evidence.plus)), int(np.argmax(evidence.minus))


def _calls(pricer: NetworkPricer, latest: int) -> list[tuple[int, int]]:
    """Possible commitments of the first seen agent as (step from which it is seen, state)."""
    if not pricer.seen:
        return [(latest + 1, 0)]
    group = pricer.group
    events = pricer.settings[0].solution.tracks[group.index[pricer.seen[0]]].events
    found = {
        (step + 1, state)
        for step, state in zip(events.step[1:], events.state[1:], strict=True)
        if step < latest
    }
    return [*sorted(found), (latest + 1, 0)]


def _walk(
    pricer: NetworkPricer, rule: Rule, grid: IntArray, evidence: Evidence, path: _Path
) -> list[dict[str, Any]]:
    run: list[dict[str, Any]] = []
    peg = 0
    two_valued = len(evidence.plus) == 2
    worths = evidence.worths()
    for step, sign in enumerate(path.signs, start=1):
        states = [0] * len(pricer.seen)
        if states and step >= path.call_step:
            states[0] = path.call
        peg += int(evidence.offsets[sign, 0])
        line = int(grid[(step, *states)])
        if line == NO_ROW:
            return []
        row = rule.rows[line]
        act = "watch"
        if row.plus_at is not None and peg >= row.plus_at:
            act = "plus"
        elif row.minus_at is not None and peg <= row.minus_at:
            act = "minus"
        told = ("plus" if worths[sign] > 0 else "minus") if two_valued else evidence.labels[sign]
        run.append(
            {
                "step": step,
                "shows": {a: SHOWN[s] for a, s in zip(pricer.seen, states, strict=True)},
                "sign": told,
                "peg": peg,
                "line": line,
                "act": act,
            }
        )
        if act != "watch":
            return run
    return run


def _would_have_answered(rule: Rule, entry: dict[str, Any]) -> bool:
    """Whether the agent keeps watching here where the base line would have had it answer."""
    if entry["act"] != "watch" or rule.rows[entry["line"]].base:
        return False
    return any(
        row.base
        and (
            (row.minus_at is not None and entry["peg"] <= row.minus_at)
            or (row.plus_at is not None and entry["peg"] >= row.plus_at)
        )
        for row in rule.rows
    )


def _notable(run: list[dict[str, Any]]) -> list[dict[str, Any]]:
    """The steps of a long run at which something changes."""
    kept = []
    for before, entry in zip([None, *run[:-1]], run, strict=True):
        keys = ("shows", "line", "act")
        changed = before is None or any(entry[key] != before[key] for key in keys)
        if changed or entry["sign"] == "plus" or entry is run[-1]:
            kept.append(entry)
    return kept
