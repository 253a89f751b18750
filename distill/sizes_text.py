"""What ``sizes`` prints on a terminal."""

from __future__ import annotations

from typing import Any

from thumbwright.distill.case import Case
from thumbwright.distill.cautions import cautions
from thumbwright.distill.columns import columns
from thumbwright.distill.texts import INEXACT, figures_table, losses_text, with_error

HEAD = (
    "rows",
    "wrong if “{plus}”",
    "wrong if “{minus}”",
    "mean step",
    "accuracy lost",
    "delay added",
    "risk",
    "benefit kept",
    "information kept",
    "",
)


def sizes_text(case: Case, found: dict[str, Any]) -> str:
    """One table for each form, then the other ways of playing and what is to be said of them."""
    question = case.question
    lines = [f"{found['case']}: {found['agent']} uses the rule, the others stay exact"]
    if found["polished"]:
        lines.append("each rule polished: moved for less risk, one bar, value or cut at a time")
    for name, form in found["forms"].items():
        head = tuple(cell.format(plus=question.plus, minus=question.minus) for cell in HEAD)
        if name == "formula":
            head = ("numbers", *head[1:])
        rows = [_row(size, form["fewest_rows_within_limits"]) for size in form["sizes"]]
        lines += ["", name]
        lines += columns([head, *rows], right=range(9)) if rows else ["no size was finished"]
        lines += _limits_said(name, form, found)
    lines += ["", *figures_table(list(found["others"].items()), question.plus, question.minus)]
    if not found["watching_is_worth_something"]:
        lines.append("watching is worth nothing here: no benefit is given in per cent")
    lines.append("")
    if found["losses"] is not None:
        lines.append(losses_text(found["losses"]))
    lines += [f"Note: {name} is left out: {why}" for name, why in found["left_out"].items()]
    lines += [f"Note: {text}" for text in found["remarks"]]
    lines.append("exact" if found["exact"] else f"{INEXACT}, or displays read off-model")
    lines += ["", *cautions(question.stakes)]
    if not found["complete"]:
        lines += ["", "INCOMPLETE: stopped before all sizes were worked out."]
    return "\n".join(lines)


def _row(size: dict[str, Any], fewest: int | None) -> tuple[str, ...]:
    errors, risk = size["errors"] or {}, size["risk"]
    kept, information = size["benefit_kept"], size["information_kept"]
    remarks = []
    if size["rows"] == fewest:
        remarks.append("fewest within the limits")
    if size["worse_than_alone"]:
        remarks.append("worse than ignoring the neighbours")
    return (
        str(size["rows"]),
        with_error(size["wrong_given_plus"], errors.get("wrong_given_plus"), 5),
        with_error(size["wrong_given_minus"], errors.get("wrong_given_minus"), 5),
        with_error(size["mean_step"], errors.get("mean_step"), 3),
        with_error(size["accuracy_lost"], errors.get("accuracy_lost"), 6),
        with_error(size["delay_added"], errors.get("delay_added"), 3),
        "" if risk is None else with_error(risk, errors.get("risk"), 6),
        "" if kept is None else with_error(kept, errors.get("benefit_kept"), 2, " %"),
        "" if information is None else f"{abs(100 * information):.2f} %",
        "; ".join(remarks),
    )


def _limits_said(name: str, form: dict[str, Any], found: dict[str, Any]) -> list[str]:
    limits = [f"{key} = {value:g}" for key, value in found["limits"].items() if value is not None]
    if not limits or form["fewest_rows_within_limits"] is not None or not form["sizes"]:
        return []
    return [f"no {name} of up to {found['most_rows']} rows is within {' and '.join(limits)}"]
