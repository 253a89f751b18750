"""Results as a notebook shows them: tables and the picture, in place of a line of Python."""

from __future__ import annotations

from collections.abc import Sequence

from thumbwright.distill.findings import Findings
from thumbwright.distill.rules import FIRST_ANSWERS, NUMBERS, SHOWN, Rule
from thumbwright.distill.sheet.parts import Chart, Grid
from thumbwright.distill.sheet.templates import rendered
from thumbwright.distill.sheet.view import sheet
from thumbwright.distill.sheet.words import clean, five, range_words


def findings_html(findings: Findings) -> str:
    """Return cautions, costs, every form with its use, all figures and the chart as HTML."""
    made = sheet(findings)
    back = made.modeller
    title = f"{made.title} Rule for {made.owner}, watching {made.watching}"
    grids = [made.costs, *back.rules, back.figures, back.losses]
    text = _filled(title, made.cautions, grids, back.chart, made.foot)
    # Several results may stand on one page, and each picture is named by its own title.
    return text.replace("chart-t", f"chart-{findings.digest}-t")


def rule_html(rule: Rule) -> str:
    """Return the rows of a rule as HTML."""
    return _filled("", (), [rule_grid(rule)], None, "")


def rule_grid(rule: Rule) -> Grid:
    """Return the rows of a rule with only the columns that some row uses."""
    rows = rule.rows
    head, columns = ["row"], [[str(place + 1) for place in range(len(rows))]]
    head.append("steps")
    columns.append([range_words(row.step_from or 1, row.step_to, "on") for row in rows])
    for agent in rule.seen:
        if any(agent in row.shows for row in rows):
            head.append(f"{agent} shows")
            columns.append([_either(SHOWN, row.shows.get(agent)) for row in rows])
        names = sorted({name for row in rows for name in row.thresholds.get(agent, ())})
        if names:
            head.append(f"{agent} thresholds")
            columns.append([_either(names, row.thresholds.get(agent)) for row in rows])
    for name in NUMBERS:
        if any(name in row.ranges for row in rows):
            head.append(name.replace("_", " "))
            ends = [row.ranges.get(name, (None, None)) for row in rows]
            columns.append([range_words(least, most) for least, most in ends])
    if any(row.first_answer is not None for row in rows):
        head.append("first answer")
        columns.append([_either(FIRST_ANSWERS, row.first_answer) for row in rows])
    if rule.has_bars:
        head += ["minus at or below", "plus at or above"]
        columns += [
            ["never" if bar is None else str(bar) for bar in bars]
            for bars in ([row.minus_at for row in rows], [row.plus_at for row in rows])
        ]
    else:
        head.append("nats")
        columns.append([five(row.value) for row in rows])
    cells = tuple(tuple(clean(cell) for cell in row) for row in zip(*columns, strict=True))
    return Grid(f"Rule for {rule.agent} ({clean(rule.form)})", tuple(head), cells)


def _either(order: Sequence[str], accepted: frozenset[str] | None) -> str:
    if accepted is None or accepted >= set(order):
        return "any"
    return " or ".join(name for name in order if name in accepted)


def _filled(
    title: str, cautions: Sequence[str], grids: Sequence[Grid], chart: Chart | None, foot: str
) -> str:
    values = {"title": title, "cautions": cautions, "grids": grids, "chart": chart, "foot": foot}
    return rendered("notebook.html.j2", values)
