"""The chart of sizes: what rules of ever more rows keep or lose, one curve for each form."""

from __future__ import annotations

from collections.abc import Sequence

from thumbwright.distill.findings import Figures, Findings, Size
from thumbwright.distill.sheet.chart import (
    BOTTOM,
    DASHES,
    HEIGHT,
    LABEL_GAP,
    LEFT,
    RIGHT,
    TOP,
    WIDTH,
    axis,
    figure_of,
    path_through,
    spread,
    step_ticks,
)
from thumbwright.distill.sheet.parts import Chart, Curve, Grid, Mark
from thumbwright.distill.sheet.words import five, listing

LOWEST = -0.5
"""Shares of the benefit below this are left out of the drawing, not of the figures."""

Values = list[float | None]
"""One value for each number of rows from 1."""


def sizes_chart(findings: Findings) -> Chart | None:
    """Draw benefit kept, or accuracy lost where no benefit is known, against the number of rows.

    Nothing where no form has sizes to show, or none of more than one row.
    """
    sizes = {name: result.sizes for name, result in findings.forms.items() if result.sizes}
    most = max((size.rows for one in sizes.values() for size in one), default=0)
    if most < 2:
        return None
    every = [size.figures for one in sizes.values() for size in one]
    benefit = all(one.benefit_kept is not None for one in every)
    curves = {name: _values(one, most, benefit) for name, one in sizes.items()}
    drawn = {
        name: [None if v is None or (benefit and v < LOWEST) else v for v in values]
        for name, values in curves.items()
    }
    known = [value for values in drawn.values() for value in values if value is not None]
    low, high, ticks = axis(min([0.0, *known]), max([0.0, *known]))

    def across(rows: float) -> float:
        return LEFT + (rows - 1) / (most - 1) * (RIGHT - LEFT)

    def up(value: float) -> float:
        return BOTTOM - (value - low) / (high - low) * (BOTTOM - TOP)

    ends = [up(values[-1] or 0.0) for values in drawn.values()]
    labels = spread(ends, TOP + 4.0, BOTTOM, LABEL_GAP)
    what = "benefit kept (share)" if benefit else "accuracy lost against exact"
    return Chart(
        width=WIDTH,
        height=HEIGHT,
        left=LEFT,
        right=RIGHT,
        top=TOP,
        bottom=BOTTOM,
        zero_y=f"{up(0.0):.1f}",
        across=tuple(Mark(f"{across(rows):.1f}", str(rows)) for rows in step_ticks(most)),
        up=tuple(Mark(f"{up(tick):.1f}", figure_of(tick)) for tick in ticks),
        curves=tuple(
            Curve(
                label=name,
                path=path_through(
                    [
                        (across(k + 1), None if value is None else up(value))
                        for k, value in enumerate(values)
                    ]
                ),
                rule_path="",
                band="",
                dash=DASHES[place % len(DASHES)],
                end_y=f"{ends[place]:.1f}",
                label_y=f"{labels[place]:.1f}",
            )
            for place, (name, values) in enumerate(drawn.items())
        ),
        across_title="rows of the rule, at most",
        up_title=what,
        title="What each number of rows keeps",
        description="; ".join(_described(name, one, what, benefit) for name, one in sizes.items())
        + ".",
        reading=_reading(findings, sizes, hidden=drawn != curves),
        figures=_figures(sizes, most, benefit),
        key="sizes",
    )


def _measure(figures: Figures, benefit: bool) -> float | None:
    return figures.benefit_kept if benefit else figures.accuracy_lost


def _values(sizes: Sequence[Size], most: int, benefit: bool) -> Values:
    """The measure with at most 1, 2, ... rows; more rows than there are add nothing."""
    values: Values = [None] * most
    for size in sizes:
        values[size.rows - 1 :] = [_measure(size.figures, benefit)] * (most - size.rows + 1)
    return values


def _described(name: str, sizes: Sequence[Size], what: str, benefit: bool) -> str:
    first, last = sizes[0], sizes[-1]
    ends = [f"{five(_measure(s.figures, benefit))} with {s.rows}" for s in (first, last)]
    return f"{name}: {what} {ends[0]}, {ends[1]} rows"


def _reading(findings: Findings, sizes: dict[str, tuple[Size, ...]], hidden: bool) -> str:
    said = [
        "The rules of every size that the search of a form comes by, one adopter. More rows can be"
        " worse where rows are chosen by information and not by risk; past its last row a curve"
        " goes on level."
    ]
    if findings.case.rule.polish:
        said.append("They are those before the polish.")
    if hidden:
        said.append(f"Sizes that keep less than {figure_of(LOWEST)} of the benefit are not drawn.")
    bad = [
        f"{name} with at most {listing(worse)}"
        for name, one in sizes.items()
        if (worse := [str(s.rows) for s in one if s.figures.worse_than(findings.alone)])
    ]
    if bad:
        said.append(f"Worse than ignoring the neighbours: {'; '.join(bad)} rows.")
    if not findings.watching_is_worth:
        said.append("Watching is worth nothing here, at any size.")
    missing = [name for name in findings.forms if name not in sizes]
    if missing:
        said.append(f"Other forms ({listing(missing)}) by size: thumbwright sizes.")
    return " ".join(said)


def _figures(sizes: dict[str, tuple[Size, ...]], most: int, benefit: bool) -> Grid:
    """The same as a table, with accuracy lost beside the benefit."""
    head = ["rows"]
    for name in sizes:
        head += [f"{name}: benefit kept"] if benefit else []
        head.append(f"{name}: accuracy lost")
    rows = []
    for number in range(1, most + 1):
        cells = [str(number)]
        for one in sizes.values():
            here = next((size.figures for size in one if size.rows == number), None)
            if benefit:
                cells.append("" if here is None else five(here.benefit_kept))
            cells.append("" if here is None else five(here.accuracy_lost))
        if any(cells[1:]):
            rows.append(tuple(cells))
    return Grid("The sizes as figures: share of the benefit, probability", tuple(head), tuple(rows))
