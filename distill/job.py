"""One function per verb of the command line, each from a case to plain data or text."""

from __future__ import annotations

from dataclasses import asdict
from pathlib import Path
from typing import TYPE_CHECKING, Any

from thumbwright.distill import texts
from thumbwright.distill.assemble import assemble, settings_of
from thumbwright.distill.case import Case
from thumbwright.distill.exports import render_all
from thumbwright.distill.gather import gather, pricer_of
from thumbwright.distill.ruleprice import priced
from thumbwright.distill.writing import write_files
from thumbwright.exact.engine import Progress, solve
from thumbwright.exact.forecast import forecast
from thumbwright.exact.outcomes import outcomes as exact_outcomes

if TYPE_CHECKING:
    import pandas as pd


def check(case: Case) -> str:
    """What a case holds, what will be computed from it, and how long that takes."""
    group = assemble(case)
    return texts.check_text(case, group, forecast(group))


def sheet(case: Case, into: Path, progress: Progress | None = None) -> str:
    """The main job: write sheet and exports into a folder; returns a summary to print."""
    findings = gather(case, progress)
    written = write_files(into, render_all(findings))
    return texts.sheet_text(findings, written)


def jumps(case: Case, progress: Progress | None = None) -> pd.DataFrame:
    """The worth of every seen history; one more column per seen agent where thresholds vary."""
    import pandas as pd

    from thumbwright.exact.jumps import jumps as table_of

    frames = []
    for setting in settings_of(case, progress):
        table = table_of(setting.solution)
        for position, (other, name) in enumerate(setting.names.items()):
            table.insert(position + 1, f"{other}_thresholds", name)
        frames.append(table)
    return frames[0] if len(frames) == 1 else pd.concat(frames, ignore_index=True)


def outcomes(case: Case) -> dict[str, Any]:
    """What each agent ends up doing when all reason exactly, in the order of the case."""
    solution = solve(assemble(case))
    agents = []
    for track, given in zip(solution.tracks, exact_outcomes(solution), strict=True):
        entry: dict[str, Any] = {
            "id": track.agent.id,
            "name": case.agents[track.agent.id].name,
        }
        for key, one in zip(("given_plus", "given_minus"), given, strict=True):
            entry[key] = {
                "plus": one.plus,
                "minus": one.minus,
                "undecided": one.undecided,
                "mean_step_if_decided": one.mean_step_if_decided,
                "mean_steps_used": one.mean_steps,
            }
        agents.append(entry)
    return {
        "case": case.name,
        "digest": case.digest,
        "agents": agents,
        "dropped_mass": 0.0,
        "near_tie_mass": solution.near_tie_mass,
        "exact": not any(agent.evidence.split for agent in solution.group.agents),
    }


def outcomes_text(found: dict[str, Any]) -> str:
    """Outcomes as lines to read."""
    return texts.outcomes_text(found)


def price(case: Case, rule: str, progress: Progress | None = None) -> dict[str, Any]:
    """The cost of a rule: a CSV file, or exact, plain-count or alone."""
    pricer, missing = pricer_of(case, progress)
    found = priced(case, pricer, rule)
    basis = found.pop("basis")
    return {
        "case": case.name,
        "digest": case.digest,
        "agent": pricer.agent,
        "rule": rule,
        **found,
        "losses": None if basis is None else asdict(basis),
        "watching_is_worth_something": pricer.watching_is_worth,
        "near_tie_mass": sum(s.weight * s.solution.near_tie_mass for s in pricer.settings),
        "exact": not any(agent.evidence.split for agent in pricer.group.agents)
        and found["figures"]["off_model"] == 0.0,
        "remarks": [*found["remarks"], *([missing] if missing else [])],
    }


def price_text(found: dict[str, Any]) -> str:
    """A price as lines to read."""
    return texts.price_text(found)
