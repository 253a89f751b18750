"""One function per verb of the command line, each from a case to plain data or text."""

from __future__ import annotations

from dataclasses import asdict
from pathlib import Path
from typing import TYPE_CHECKING, Any

from thumbwright.distill import texts
from thumbwright.distill.assemble import NO_LIMITS, Limits, assemble, settings_of
from thumbwright.distill.case import Case
from thumbwright.distill.crowds import (
    crowd_in,
    crowd_of,
    engine_of,
    naming_counts,
    play_of,
    shown_of,
)
from thumbwright.distill.ends import ends_of_crowd, ends_of_network
from thumbwright.distill.exports import render_all
from thumbwright.distill.gather import gather
from thumbwright.distill.network_pricer import NetworkPricer
from thumbwright.distill.pricing import pricer_of
from thumbwright.distill.record_reading import read_record
from thumbwright.distill.replay import follow
from thumbwright.distill.replay_rule import refuse_crowd, remarks_on, rule_to_follow
from thumbwright.distill.replay_text import replay_record, replay_text as texts_of_replay
from thumbwright.distill.ruleprice import ALONE_IN_USE, Use, priced
from thumbwright.distill.signs import signs_of
from thumbwright.distill.writing import write_files
from thumbwright.exact.engine import Progress, solve
from thumbwright.exact.forecast import forecast, refuse_too_large

if TYPE_CHECKING:
    import pandas as pd


def check(case: Case, limits: Limits = NO_LIMITS) -> str:
    """What a case holds, what will be computed from it, and how long that takes.

    Raises ModelError where the exact beliefs would need more memory than they may take.
    """
    group = assemble(case)
    crowd = crowd_of(case, group)
    if crowd is not None:
        engine = engine_of(crowd, case.rule_agent, group, limits)
        return texts.check_text(case, group, texts.crowd_engine(engine))
    with naming_counts(case, group):
        refuse_too_large(group, limits.memory)
    return texts.check_text(case, group, texts.network_engine(forecast(group)))


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
    """The worth of every seen history; one more column per seen agent where thresholds vary.

    In a crowd the first member of each kind stands for all, and others are counted.
    """
    import pandas as pd

    from thumbwright.exact.crowd_jumps import crowd_jumps
    from thumbwright.exact.jumps import jumps as table_of

    group = assemble(case)
    crowd = crowd_of(case, group)
    if crowd is not None:
        members = [kind.members[0] for kind in crowd.kinds]
        return crowd_jumps([shown_of(crowd, one, group, limits, progress) for one in members])
    frames = []
    with naming_counts(case, group):
        settings = settings_of(case, progress, limits)
    for setting in settings:
        table = table_of(setting.solution)
        for position, (other, name) in enumerate(setting.names.items()):
            table.insert(position + 1, f"{other}_thresholds", name)
        frames.append(table)
    return frames[0] if len(frames) == 1 else pd.concat(frames, ignore_index=True)


def outcomes(case: Case, limits: Limits = NO_LIMITS) -> dict[str, Any]:
    """What each agent, and the group, ends up doing when all reason exactly."""
    group = assemble(case)
    crowd = crowd_in(group)
    if crowd is not None:
        return ends_of_crowd(case, play_of(crowd, group, limits), limits.seed)
    return ends_of_network(case, solve(group, drop=limits.drop, memory=limits.memory))


def outcomes_text(found: dict[str, Any]) -> str:
    """Outcomes as lines to read."""
    return texts.outcomes_text(found)


def price(
    case: Case,
    rule: str,
    progress: Progress | None = None,
    limits: Limits = NO_LIMITS,
    use: Use = ALONE_IN_USE,
) -> dict[str, Any]:
    """The cost of a rule, a CSV file, or exact, plain-count or alone; and who else uses it."""
    pricer, missing = pricer_of(case, progress, limits)
    found = priced(case, pricer, rule, use)
    basis = found.pop("basis")
    inexact = pricer.inexact()
    return {
        "case": case.name,
        "digest": case.digest,
        "agent": pricer.agent,
        "rule": rule,
        **found,
        "losses": None if basis is None else asdict(basis),
        "watching_is_worth_something": pricer.watching_is_worth,
        "dropped_mass": inexact.dropped_mass,
        "near_tie_mass": inexact.near_tie_mass,
        "sampled_histories_and_seed": inexact.sampled,
        "exact": inexact.nothing
        and found["figures"]["off_model"] == 0.0
        and found["figures"]["errors"] is None,
        "remarks": [*found["remarks"], *([missing] if missing else [])],
    }


def sizes(
    case: Case, progress: Progress | None = None, limits: Limits = NO_LIMITS
) -> dict[str, Any]:
    """What each number of rows costs, for each form; ``complete`` is False if it was stopped."""
    from thumbwright.distill.sizes import sizes as found_by_size

    return found_by_size(case, progress, limits)


def sizes_text(case: Case, found: dict[str, Any]) -> str:
    """Sizes as lines to read."""
    from thumbwright.distill.sizes_text import sizes_text as told

    return told(case, found)


def price_text(found: dict[str, Any]) -> str:
    """A price as lines to read."""
    return texts.price_text(found)


def replay(
    case: Case,
    events: Path,
    rule: str | None = None,
    progress: Progress | None = None,
    limits: Limits = NO_LIMITS,
) -> dict[str, Any]:
    """What a rule, and the exact agent, make of a record; ``rule`` is the path of a CSV file.

    Without one the rule is the one that the case distils: the first of its forms.

    Raises Faults for what is wrong in the files, ModelError where a record cannot be followed.
    """
    group = assemble(case)
    agent = case.rule_agent
    refuse_crowd(case, group)
    me = group.agents[group.index[agent]]
    record = read_record(events, case, me.sees, signs_of(case, agent, me.evidence))
    pricer, _ = pricer_of(case, progress, limits)
    assert isinstance(pricer, NetworkPricer)
    followed, remarks = rule_to_follow(case, pricer, rule, progress)
    setting = next(one for one in pricer.settings if one.names == record.names)
    steps = follow(setting.solution, agent, followed, setting.names, record)
    remarks += remarks_on(setting.solution, agent, steps)
    return replay_record(case, agent, followed, steps, remarks)


def replay_text(case: Case, found: dict[str, Any]) -> str:
    """A followed record as lines to read."""
    return texts_of_replay(case, found)
