"""What the verbs print on a terminal: plain text from plain data."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path
from typing import Any

from thumbwright.distill.case import Case
from thumbwright.distill.cautions import cautions
from thumbwright.distill.findings import Figures, Findings
from thumbwright.exact.forecast import Forecast
from thumbwright.exact.group import Agent, Group


def columns(rows: Sequence[Sequence[str]], right: Sequence[int] = ()) -> list[str]:
    """Rows of cells as aligned lines; the columns named in ``right`` end flush."""
    widths = [max(len(row[k]) for row in rows) for k in range(len(rows[0]))]
    lines = []
    for row in rows:
        cells = [
            cell.rjust(width) if k in right else cell.ljust(width)
            for k, (cell, width) in enumerate(zip(row, widths, strict=True))
        ]
        lines.append("  ".join(cells).rstrip())
    return lines


def check_text(case: Case, group: Group, expected: Forecast) -> str:
    """The case in short, the engine, the forecast, and what is odd about it."""
    lines = [
        f"{case.title}: “{case.question.plus}” or “{case.question.minus}”?",
        f"case {case.name}, digest {case.digest}",
        "",
        f"Rule for {case.rule_agent} ({case.agents[case.rule_agent].name}), up to "
        f"{case.rule.rows} rows, looking at {', '.join(case.rule.inputs)}; forms: "
        f"{', '.join(case.rule.forms)}.",
        f"{case.time.horizon} steps; what is shown is taken in "
        + ("from the next step on." if case.time.exchange == "once" else "at once, in rounds."),
        "",
        *columns(
            [
                ("agent", "sees", "answers minus at or below", "plus at or above", "evidence"),
                *(_agent_cells(agent) for agent in group.agents),
            ]
        ),
        "",
        "Engine: exact display histories, contracted as matrix products; nothing is sampled.",
        f"Forecast: about {_size(expected.memory)} of memory and {_duration(expected.seconds)} for "
        f"the exact beliefs ({expected.events} display events per agent; widest: agent "
        f"{expected.widest}).",
    ]
    if expected.memory > 1e8:
        lines.append(
            "A shorter horizon, fewer agents in sight of each other, or exchange = “once” would "
            "make it smaller."
        )
    lines += [f"Note: {text}" for text in _oddities(group)]
    return "\n".join(lines)


def _agent_cells(agent: Agent) -> tuple[str, str, str, str, str]:
    low = " or ".join(f"{bound.minus:.4g}" for _, bound in agent.thresholds)
    high = " or ".join(f"{bound.plus:.4g}" for _, bound in agent.thresholds)
    evidence = agent.evidence
    worth = f"{evidence.kind}, {evidence.information():.4g} nats of information each"
    if evidence.split:
        worth += (
            f", split in steps of {evidence.split.step:.4g} nats (twice as fine moves outcomes "
            f"alone by {evidence.split.change:.1g})"
        )
    return agent.id, ", ".join(agent.sees) or "nobody", f"{low} nats", f"{high} nats", worth


def _oddities(group: Group) -> list[str]:
    said = []
    for agent in group.agents:
        for _, bound in agent.thresholds:
            if not bound.minus < group.prior < bound.plus:
                said.append(
                    f"the prior ({group.prior:.4g} nats) is not between the thresholds of "
                    f"{agent.id}; it answers at its first step unless its first observation "
                    "speaks against it"
                )
                break
        if not agent.evidence.informative:
            said.append(
                f"the evidence of {agent.id} carries no information: it can only follow others"
            )
        if agent.evidence.certain_plus or agent.evidence.certain_minus:
            said.append(
                f"some evidence of {agent.id} is certain: one answer makes it impossible, so "
                "whoever meets it answers at once"
            )
    return said


def sheet_text(findings: Findings, written: Sequence[Path]) -> str:
    """What the main job found, in a few lines, and where it is."""
    case = findings.case
    lines = [f"{case.title}: rule for {case.agents[findings.agent].name}", ""]
    named = [
        *(
            (f"{name}, {len(form.rule.rows)} rows", form.figures)
            for name, form in findings.forms.items()
        ),
        ("full calculation", findings.exact),
        ("undecided neighbours ignored", findings.plain_count),
        ("everybody ignored", findings.alone),
    ]
    lines += figures_table(named, case.question.plus, case.question.minus)
    if not findings.watching_is_worth:
        lines.append("Watching is worth nothing here.")
    lines += [f"Note: {text}" for text in findings.caveats]
    lines += ["", *cautions(case.question.stakes), ""]
    lines += [f"Wrote {path}" for path in written]
    return "\n".join(lines)


def figures_table(
    named: Sequence[tuple[str, Figures | dict[str, Any]]], plus: str, minus: str
) -> list[str]:
    """Ways of playing side by side: both kinds of wrong answer, steps, risk, benefit kept."""
    rows = [
        (
            "way of playing",
            f"wrong if “{plus}”",
            f"wrong if “{minus}”",
            "no answer",
            "mean step",
            "risk",
            "benefit kept",
        )
    ]
    for name, figures in named:
        get = figures.__getitem__ if isinstance(figures, dict) else figures.__getattribute__
        none = (get("given_plus")["undecided"] + get("given_minus")["undecided"]) / 2
        kept, risk = get("benefit_kept"), get("risk")
        rows.append(
            (
                name,
                f"{get('wrong_given_plus'):.5f}",
                f"{get('wrong_given_minus'):.5f}",
                f"{none:.5f}",
                f"{get('mean_step'):.3f}",
                "" if risk is None else f"{risk:.6f}",
                "" if kept is None else f"{100 * kept:.2f} %",
            )
        )
    return columns(rows, right=range(1, 7))


def outcomes_text(found: dict[str, Any]) -> str:
    """Outcomes of exact play, one line per agent and answer."""
    rows = [("agent", "given", "plus", "minus", "undecided", "mean step if decided")]
    for agent in found["agents"]:
        for key in ("given_plus", "given_minus"):
            one = agent[key]
            step = one["mean_step_if_decided"]
            rows.append(
                (
                    agent["id"],
                    key.removeprefix("given_"),
                    *(f"{one[name]:.6f}" for name in ("plus", "minus", "undecided")),
                    "never" if step is None else f"{step:.3f}",
                )
            )
    lines = columns(rows, right=range(2, 6))
    lines += _group_lines(found)
    if found["dropped_mass"] > 0:
        lines.append(
            f"dropped on request: probability {found['dropped_mass']:.3g}; any probability may be "
            f"off by up to {found['may_be_off_by']:.3g}"
        )
    if found["near_tie_mass"] > 0:
        lines.append(f"near ties: probability {found['near_tie_mass']:.3g}")
    lines.append("exact" if found["exact"] else "not exact: evidence split, or displays dropped")
    return "\n".join(lines)


_GROUP_WORDS = {
    "mean_step_of_first": "mean step of the first answer",
    "mean_step_of_last": "mean step of the last answer, where all answer",
    "mean_followers_at_once": "mean number that follow the first at once",
    "nobody": "nobody answers",
    "not_everybody": "somebody stays undecided",
    "right_majority": "more right answers than wrong",
    "wrong_majority": "more wrong answers than right",
    "tie": "as many right as wrong",
    "split": "both answers given",
    "all_right": "all right",
    "all_wrong": "all wrong",
}


def _group_lines(found: dict[str, Any]) -> list[str]:
    """The group's figures side by side, or why there are none."""
    group = found["group"]
    if group is None:
        why = found.get("why_no_group")
        return [] if why is None else ["", f"no figures for the group as a whole: {why}", ""]
    rows = [("the group", "given plus", "given minus")]
    for name, words in _GROUP_WORDS.items():
        cells = [group[key][name] for key in ("given_plus", "given_minus")]
        plus, minus = ("never" if cell is None else f"{cell:.6f}" for cell in cells)
        rows.append((words, plus, minus))
    return ["", *columns(rows, right=(1, 2)), ""]


def price_text(found: dict[str, Any]) -> str:
    """A price beside the other ways of playing, then the use of each row and what is odd."""
    named = [(f"this rule ({found['rule']})", found["figures"]), *found["others"].items()]
    lines = [f"{found['case']}: {found['agent']} uses the rule, the others stay exact", ""]
    lines += figures_table(named, "plus", "minus")
    figures = found["figures"]
    lines.append("")
    lines.append(
        f"accuracy lost {signed(figures['accuracy_lost'], 6)}, delay added "
        f"{signed(figures['delay_added'], 4)} steps, against exact"
    )
    if not found["watching_is_worth_something"]:
        lines.append("watching is worth nothing here: no benefit is given in per cent")
    if found["rows"]:
        uses = [("row", "steps in force per outing", "answers given under it, of 100")]
        uses += [
            (str(row["row"]), f"{row['steps_in_force']:.4f}", f"{100 * row['calls']:.3f}")
            for row in found["rows"]
        ]
        lines += ["", *columns(uses, right=range(3))]
    losses = found["losses"]
    if losses is not None:
        lines += ["", _losses_text(losses)]
    lines += [f"Note: {text}" for text in found["remarks"]]
    lines.append(
        "exact" if found["exact"] else "not exact: evidence split, or displays read off-model"
    )
    return "\n".join(lines)


def signed(number: float, digits: int) -> str:
    """A number with its sign; what rounds to zero has none."""
    return f"{number:+.{digits}f}" if round(number, digits) else f"{0:.{digits}f}"


def _losses_text(losses: dict[str, Any]) -> str:
    text = (
        f"losses: false plus {losses['false_plus']:.4g}, false minus {losses['false_minus']:.4g}, "
        f"{losses['per_step']:.4g} per step"
    )
    if not losses["inferred"]:
        return text + ", as stated"
    low, high = losses["loss_ratio_range"]
    cheap, dear = losses["per_step_range"]
    text += (
        f", the middle of those that make the thresholds best alone (ratio {low:.4g} to "
        f"{high:.4g}, per step {cheap:.4g} to {dear:.4g}"
    )
    kept = losses["benefit_kept_range"]
    if kept is not None:
        text += f"; benefit kept {100 * kept[0]:.2f} to {100 * kept[1]:.2f} %"
    return text + ")"


def _size(size: float) -> str:
    for unit, one in (("GB", 1e9), ("MB", 1e6)):
        if size >= one:
            return f"{size / one:.3g} {unit}"
    return "less than 1 MB"


def _duration(seconds: float) -> str:
    return "less than a second" if seconds < 1 else f"{seconds:.2g} seconds"
