"""One function per verb of the command line, each from a case to plain data or text."""

from __future__ import annotations

from dataclasses import asdict
from pathlib import Path
from typing import TYPE_CHECKING, Any

from thumbwright.distill import texts
from thumbwright.distill.assemble import NO_LIMITS, Limits, assemble, settings_of
from thumbwright.distill.case import Case
from thumbwright.distill.exports import render_all
from thumbwright.distill.gather import gather, pricer_of
from thumbwright.distill.ruleprice import priced
from thumbwright.distill.writing import write_files
from thumbwright.exact.engine import Progress, Solution, solve
from thumbwright.exact.errors import ModelError
from thumbwright.exact.forecast import forecast, refuse_too_large
from thumbwright.exact.outcomes import outcomes as exact_outcomes
from thumbwright.exact.together import together

if TYPE_CHECKING:
    import pandas as pd

GIVEN = ("given_plus", "given_minus")

GROUP_SHARES = (
    "nobody",
    "not_everybody",
    "right_majority",
    "wrong_majority",
    "tie",
    "split",
    "all_right",
    "all_wrong",
)
"""Shares of groups that are printed, by the names that ``exact.together`` gives them."""


def check(case: Case, limits: Limits = NO_LIMITS) -> str:
    """What a case holds, what will be computed from it, and how long that takes.

    Raises ModelError where the exact beliefs would need more memory than they may take.
    """
    group = assemble(case)
    refuse_too_large(group, limits.memory)
    return texts.check_text(case, group, forecast(group))


def sheet(
    case: Case,
    into: Path,
    progress: Progress | None = None,
    limits: Limits = NO_LIMITS,
    templates: Path | None = None,
    pdf: bool = False,
) -> str:
    """The main job: write sheet and exports into a folder; returns a summary to print.

    Parameters
    ----------
    templates : Path, optional
        Folder of templates that stand in for ours by name.
    pdf : bool
        Whether to write the sheet as PDF too, with the extra ``pdf``.

    Raises
    ------
    Faults
        If a template is none of ours or cannot be filled, or the extra is not installed.
    """
    from thumbwright.distill.exports import sheet_pdf
    from thumbwright.distill.sheet.templates import OURS, in_place_of_ours, read_templates

    own = OURS if templates is None else read_templates(templates)
    if pdf:
        sheet_pdf.layout()  # told before the long work, not after it
    findings = gather(case, progress, limits)
    with in_place_of_ours(own):
        files = render_all(findings) | (sheet_pdf.render(findings) if pdf else {})
    written = write_files(into, files)
    return texts.sheet_text(findings, written)


def jumps(case: Case, progress: Progress | None = None, limits: Limits = NO_LIMITS) -> pd.DataFrame:
    """The worth of every seen history; one more column per seen agent where thresholds vary."""
    import pandas as pd

    from thumbwright.exact.jumps import jumps as table_of

    frames = []
    for setting in settings_of(case, progress, limits):
        table = table_of(setting.solution)
        for position, (other, name) in enumerate(setting.names.items()):
            table.insert(position + 1, f"{other}_thresholds", name)
        frames.append(table)
    return frames[0] if len(frames) == 1 else pd.concat(frames, ignore_index=True)


def outcomes(case: Case, limits: Limits = NO_LIMITS) -> dict[str, Any]:
    """What each agent, and the group, ends up doing when all reason exactly."""
    solution = solve(assemble(case), drop=limits.drop, memory=limits.memory)
    agents = []
    for track, given in zip(solution.tracks, exact_outcomes(solution), strict=True):
        entry: dict[str, Any] = {
            "id": track.agent.id,
            "name": case.agents[track.agent.id].name,
        }
        for key, one in zip(GIVEN, given, strict=True):
            entry[key] = {
                "plus": one.plus,
                "minus": one.minus,
                "undecided": one.undecided,
                "mean_step_if_decided": one.mean_step_if_decided,
                "mean_steps_used": one.mean_steps,
            }
        agents.append(entry)
    split = any(agent.evidence.split for agent in solution.group.agents)
    return {
        "case": case.name,
        "digest": case.digest,
        "agents": agents,
        **_group_outcomes(solution),
        "dropped_mass": solution.dropped_mass,
        "may_be_off_by": solution.uncertainty,
        "near_tie_mass": solution.near_tie_mass,
        "exact": not split and solution.dropped_mass == 0.0,
    }


def _group_outcomes(solution: Solution) -> dict[str, Any]:
    """The group's figures; or why there are none, where its displays are too wide to be joined."""
    if len(solution.tracks) < 2:
        return {"group": None}
    try:
        found = together(solution)
    except ModelError as reason:
        return {"group": None, "why_no_group": str(reason)}
    figures: dict[str, dict[str, Any]] = {key: {} for key in GIVEN}
    for which in ("first", "last"):
        for key, mean in zip(GIVEN, found.mean_step(which), strict=True):
            figures[key][f"mean_step_of_{which}"] = mean
    for key, mean in zip(GIVEN, found.mean_followers(), strict=True):
        figures[key]["mean_followers_at_once"] = mean
    for name in GROUP_SHARES:
        for key, share in zip(GIVEN, getattr(found, name), strict=True):
            figures[key][name] = float(share)
    for name in ("first", "last", "followers"):
        for key, law in zip(GIVEN, getattr(found, name), strict=True):
            figures[key][f"law_of_{name}"] = [float(p) for p in law]
    return {"group": figures}


def outcomes_text(found: dict[str, Any]) -> str:
    """Outcomes as lines to read."""
    return texts.outcomes_text(found)


def price(
    case: Case, rule: str, progress: Progress | None = None, limits: Limits = NO_LIMITS
) -> dict[str, Any]:
    """The cost of a rule: a CSV file, or exact, plain-count or alone."""
    pricer, missing = pricer_of(case, progress, limits)
    found = priced(case, pricer, rule)
    basis = found.pop("basis")
    dropped = sum(s.weight * s.solution.dropped_mass for s in pricer.settings)
    return {
        "case": case.name,
        "digest": case.digest,
        "agent": pricer.agent,
        "rule": rule,
        **found,
        "losses": None if basis is None else asdict(basis),
        "watching_is_worth_something": pricer.watching_is_worth,
        "dropped_mass": dropped,
        "near_tie_mass": sum(s.weight * s.solution.near_tie_mass for s in pricer.settings),
        "exact": not any(agent.evidence.split for agent in pricer.group.agents)
        and dropped == 0.0
        and found["figures"]["off_model"] == 0.0,
        "remarks": [*found["remarks"], *([missing] if missing else [])],
    }


def price_text(found: dict[str, Any]) -> str:
    """A price as lines to read."""
    return texts.price_text(found)
