"""What the verbs print on a terminal: plain text from plain data."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path
from typing import Any

from thumbwright.distill.case import Case, is_crowd
from thumbwright.distill.cautions import cautions
from thumbwright.distill.columns import columns
from thumbwright.distill.doubts_text import doubts_text
from thumbwright.distill.findings import Figures, Findings


def owner_of(case: Case) -> str:
    """Whom the rule is for: one agent by name, or anybody in a crowd of which all are meant."""
    if case.rule.agent == "any" and is_crowd(case.agents):
        return f"any of the {len(case.agents)}"
    return case.agents[case.rule_agent].name


def sheet_text(findings: Findings, written: Sequence[Path]) -> str:
    """What the main job found, in a few lines, and where it is."""
    case = findings.case
    lines = [f"{case.title}: rule for {owner_of(case)}", ""]
    named = [
        *(
            (f"{name}, {len(form.rule.rows)} rows", form.figures)
            for name, form in findings.forms.items()
        ),
        *(
            (f"{name}, {len(one.rule.parameters)} numbers", one.figures)
            for name, one in findings.reckoned.items()
        ),
        ("full calculation", findings.exact),
        ("undecided neighbours ignored", findings.plain_count),
        ("everybody ignored", findings.alone),
    ]
    lines += figures_table(named, case.question.plus, case.question.minus)
    lines += [
        f"The {name} is worse than ignoring the neighbours." for name in findings.worse_than_alone
    ]
    if not findings.watching_is_worth:
        lines.append("Watching is worth nothing here.")
    lines += doubts_text(findings)
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
    sampled = False
    for name, figures in named:
        get = figures.__getitem__ if isinstance(figures, dict) else figures.__getattribute__
        errors = get("errors") or {}
        sampled |= bool(errors)
        none = (get("given_plus")["undecided"] + get("given_minus")["undecided"]) / 2
        kept, risk = get("benefit_kept"), get("risk")
        rows.append(
            (
                name,
                with_error(get("wrong_given_plus"), errors.get("wrong_given_plus"), 5),
                with_error(get("wrong_given_minus"), errors.get("wrong_given_minus"), 5),
                f"{none:.5f}",
                with_error(get("mean_step"), errors.get("mean_step"), 3),
                "" if risk is None else with_error(risk, errors.get("risk"), 6),
                "" if kept is None else with_error(kept, errors.get("benefit_kept"), 2, " %"),
            )
        )
    lines = columns(rows, right=range(1, 7))
    return [*lines, "(± is one standard error: histories were sampled)"] if sampled else lines


def with_error(number: float, error: float | None, digits: int, unit: str = "") -> str:
    """A number with its standard error, where it has one; per cent where that is the unit."""
    factor = 100.0 if unit else 1.0
    text = f"{factor * number:.{digits}f}"
    if error is not None:
        text += f" ± {factor * error:.{digits}f}"
    return text + unit


def outcomes_text(found: dict[str, Any]) -> str:
    """Outcomes of exact play, one line per agent, or per kind of a crowd, and answer."""
    rows: list[tuple[str, ...]] = [
        ("agent", "given", "plus", "minus", "undecided", "mean step if decided")
    ]
    for name, agent in _told_apart(found["agents"]):
        for key in ("given_plus", "given_minus"):
            one, error = agent[key], agent.get("errors", {}).get(key, {})
            step = one["mean_step_if_decided"]
            rows.append(
                (
                    name,
                    key.removeprefix("given_"),
                    *(
                        with_error(one[end], error.get(end), 6)
                        for end in ("plus", "minus", "undecided")
                    ),
                    "never"
                    if step is None
                    else with_error(step, error.get("mean_step_if_decided"), 3),
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
    if found.get("sampled_with_seed") is not None:
        lines.append(
            f"{found['histories']:,} public histories sampled with seed "
            f"{found['sampled_with_seed']}, the beliefs along each exact; ± is one standard error"
        )
    lines.append("exact" if found["exact"] else INEXACT)
    return "\n".join(lines)


INEXACT = "not exact: evidence split, or histories dropped or sampled"


def _told_apart(agents: list[dict[str, Any]]) -> list[tuple[str, dict[str, Any]]]:
    """Agents by name; members of one kind of a crowd together."""
    if not any("kind" in agent for agent in agents):
        return [(agent["id"], agent) for agent in agents]
    kinds: dict[int, list[dict[str, Any]]] = {}
    for agent in agents:
        kinds.setdefault(agent["kind"], []).append(agent)
    return [
        (f"{like[0]['id']}, one of {len(like)} alike" if len(like) > 1 else like[0]["id"], like[0])
        for like in kinds.values()
    ]


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
    errors = found.get("group_errors", {})
    for name, words in _GROUP_WORDS.items():
        plus, minus = (
            "never"
            if group[key][name] is None
            else with_error(group[key][name], errors.get(key, {}).get(name), 6)
            for key in ("given_plus", "given_minus")
        )
        rows.append((words, plus, minus))
    return ["", *columns(rows, right=(1, 2)), ""]


def price_text(found: dict[str, Any]) -> str:
    """A price beside the other ways of playing, then the use of each row and what is odd."""
    named = [(f"this rule ({found['rule']})", found["figures"]), *found["others"].items()]
    lines = [f"{found['case']}: {_who_uses(found)}", ""]
    lines += figures_table(named, "plus", "minus")
    figures = found["figures"]
    lines.append("")
    lines.append(
        f"accuracy lost {signed(figures['accuracy_lost'], 6)}, delay added "
        f"{signed(figures['delay_added'], 4)} steps, against exact"
    )
    agreed = found.get("agreement")
    if agreed is not None:
        errors = agreed["errors"] or {}
        same, opposite = (
            with_error(agreed[name], errors.get(name), 2, " %") for name in ("same", "opposite")
        )
        apart = with_error(agreed["steps_apart"], errors.get("steps_apart"), 3)
        lines.append(
            f"on the same observations it ends as exact play does in {same} of outings, opposite "
            f"in {opposite}; {apart} steps apart"
        )
    if not found["watching_is_worth_something"]:
        lines.append("watching is worth nothing here: no benefit is given in per cent")
    if "agents" in found:
        rows = [("agent", "given", "plus", "minus", "undecided", "mean step")]
        for name, sides in found["agents"].items():
            for key, one in sides.items():
                ends = (f"{one[end]:.6f}" for end in ("plus", "minus", "undecided"))
                rows.append((name, key.removeprefix("given_"), *ends, f"{one['steps']:.3f}"))
        lines += ["", *columns(rows, right=range(2, 6))]
    if found["rows"]:
        uses = [("row", "steps in force per outing", "answers given under it, of 100")]
        uses += [
            (str(row["row"]), f"{row['steps_in_force']:.4f}", f"{100 * row['calls']:.3f}")
            for row in found["rows"]
        ]
        lines += ["", *columns(uses, right=range(3))]
    losses = found["losses"]
    if losses is not None:
        lines += ["", losses_text(losses)]
    lines += [f"Note: {text}" for text in found["remarks"]]
    lines.append("exact" if found["exact"] else f"{INEXACT}, or displays read off-model")
    return "\n".join(lines)


MOST_USERS = 12
"""More users of a rule than this are counted and not named."""


def _who_uses(found: dict[str, Any]) -> str:
    users, others = found.get("used_by"), found.get("rule_of_others")
    rest = ", the others stay exact" if others is None else f", the others who can go by {others}"
    if not users or users == [found["agent"]]:
        return f"{found['agent']} uses the rule{rest}"
    if found["everybody"]:
        return f"everybody uses the rule; the figures are those of {found['agent']}"
    who = ", ".join(users) if len(users) <= MOST_USERS else f"{users[0]} and {len(users) - 1} more"
    return f"{who} use the rule{rest}; the figures are those of {found['agent']}"


def signed(number: float, digits: int) -> str:
    """A number with its sign; what rounds to zero has none."""
    return f"{number:+.{digits}f}" if round(number, digits) else f"{0:.{digits}f}"


def losses_text(losses: dict[str, Any]) -> str:
    """The losses used, with their ranges where they were inferred."""
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
