"""The chart of worths: numbers to SVG path data, in the user units of its view box.

Coordinates are written with one decimal, so the same findings give the same bytes on every
machine. Curves are told apart by dash pattern and by a name at their end, not by colour.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from typing import TypeGuard

from thumbwright.distill.findings import Findings, WorthCurve
from thumbwright.distill.rules import SHOWN, Rule
from thumbwright.distill.sheet.parts import Chart, Curve, Grid, Mark
from thumbwright.distill.sheet.voice import Voice
from thumbwright.distill.sheet.words import five

WIDTH, HEIGHT = 480, 300
LEFT, RIGHT, TOP, BOTTOM = 46, 452, 12, 256
LABEL_GAP = 13.0
DASHES = ("", "8 4", "2 3", "10 3 2 3", "14 5", "5 2", "1 5", "12 3 2 3 2 3", "4 6")
MOST_ROWS = 60

Place = Callable[[float], float]


def chart(findings: Findings, voice: Voice) -> Chart | None:
    """Draw the worth of every shown state over the steps; nothing where there is no curve."""
    curves = findings.worth_curves
    table = findings.forms.get("table")
    rule = None if table is None else table.rule
    values = [value for curve in curves for value in _all_values(curve, rule) if _is_real(value)]
    if not values:
        return None
    low, high, ticks = axis(min(0.0, *values), max(0.0, *values))
    last = max(max(curve.steps) for curve in curves)

    def across(step: float) -> float:
        return LEFT + (step - 1) / max(last - 1, 1) * (RIGHT - LEFT)

    def up(value: float) -> float:
        return BOTTOM - (value - low) / (high - low) * (BOTTOM - TOP)

    names = [_name(curve, voice) for curve in curves]
    ends = [_end(curve) for curve in curves]
    places = spread([up(end) for end in ends], TOP + 4.0, BOTTOM, LABEL_GAP)
    drawn = tuple(
        Curve(
            label=name,
            path=path_through(
                [(across(s), None if v is None else up(v)) for s, v in _points(curve)]
            ),
            rule_path=_stepspath_through(curve, rule, across, up),
            band=_band(curve, across, up),
            dash=DASHES[place % len(DASHES)],
            end_y=f"{up(ends[place]):.1f}",
            label_y=f"{places[place]:.1f}",
        )
        for place, (curve, name) in enumerate(zip(curves, names, strict=True))
    )
    return Chart(
        width=WIDTH,
        height=HEIGHT,
        left=LEFT,
        right=RIGHT,
        top=TOP,
        bottom=BOTTOM,
        zero_y=f"{up(0.0):.1f}",
        across=tuple(Mark(f"{across(step):.1f}", str(step)) for step in step_ticks(last)),
        up=tuple(Mark(f"{up(tick):.1f}", figure_of(tick)) for tick in ticks),
        curves=drawn,
        across_title="step (own observations so far, this one included)",
        up_title="worth (nats)",
        title="Worth of what is shown, over the steps",
        description="; ".join(map(_described, curves, names)) + ".",
        reading=_reading(drawn),
        figures=_figures(curves, names),
    )


def axis(low: float, high: float) -> tuple[float, float, tuple[float, ...]]:
    """Return the ends of an axis that holds ``low`` to ``high``, and its ticks."""
    # Ticks are 1, 2 or 5 times a power of ten, about six of them.
    if high - low < 1e-6:
        low, high = low - 0.5, high + 0.5
    rough = (high - low) / 6.0
    power = 10.0 ** math.floor(math.log10(rough))
    step = next(size * power for size in (1.0, 2.0, 5.0, 10.0) if rough <= size * power * 1.0000001)
    first, final = math.floor(low / step + 1e-9), math.ceil(high / step - 1e-9)
    ticks = tuple(round(place * step, 10) for place in range(first, final + 1))
    return ticks[0], ticks[-1], ticks


def step_ticks(last: int) -> tuple[int, ...]:
    """Return the steps that are marked: 1, some round ones, and the last."""
    if last <= 10:
        return tuple(range(1, last + 1))
    size = next(size for size in (2, 5, 10, 20, 25, 50, 100, 200, 500) if last <= 10 * size)
    inner = [step for step in range(size, last, size) if last - step >= size / 2]
    return tuple(dict.fromkeys([1, *inner, last]))


def spread(places: Sequence[float], low: float, high: float, gap: float) -> list[float]:
    """Move labels apart to at least ``gap``, keeping their order and as near as may be.

    Where there is no room for the gap they are set evenly from ``low`` to ``high``.
    """
    order = sorted(range(len(places)), key=lambda place: (places[place], place))
    gap = min(gap, (high - low) / max(len(places) - 1, 1))
    moved = [0.0] * len(places)
    at = low - gap
    for place in order:
        at = max(places[place], at + gap)
        moved[place] = at
    at = high + gap
    for place in reversed(order):
        at = min(moved[place], at - gap)
        moved[place] = at
    return moved


def _name(curve: WorthCurve, voice: Voice) -> str:
    """Name what a curve is about: by agent, or by how many where nobody is told apart."""
    if curve.counts is None:
        return joint_state(curve.shows, voice)
    said = zip(("plus", "minus"), curve.counts, strict=True)
    return ", ".join(f"{n} {voice.shows_short[state]}" for state, n in said if n) or "nobody yet"


def joint_state(shows: Sequence[str], voice: Voice) -> str:
    """Name a joint shown state, agents in the order of the case."""
    states = [frozenset({state}) for state in shows]
    return voice.situation(dict(zip(voice.seen, states, strict=True)))


def value_at(
    rule: Rule, shows: Sequence[str], step: int, counts: tuple[int, int] | None = None
) -> float | None:
    """Return what a rule of values says for one joint state and step; None where rows differ.

    ``counts``, how many show plus and minus, stands for ``shows`` where nobody is told apart. Rows
    that look at thresholds, or at when something was shown, do not speak for a state alone.
    """
    plus, minus = counts or (shows.count("plus"), shows.count("minus"))
    numbers = {"plus_shown": plus, "minus_shown": minus}
    numbers["undecided_shown"] = len(rule.seen) - plus - minus
    for row in rule.rows:
        if row.thresholds or row.first_answer is not None or set(row.ranges) - set(numbers):
            continue
        ranges = {"step": (row.step_from, row.step_to), **row.ranges}
        if not all(_within({"step": step, **numbers}[n], ends) for n, ends in ranges.items()):
            continue
        if counts is not None:
            return row.value
        if all(s in row.shows.get(agent, SHOWN) for agent, s in zip(rule.seen, shows, strict=True)):
            return row.value
    return None


def _within(number: int, ends: tuple[int | None, int | None]) -> bool:
    least, most = ends
    return (least is None or number >= least) and (most is None or number <= most)


def _reading(curves: Sequence[Curve]) -> str:
    """Say what the different strokes mean."""
    said = "Thick: the exact worth of what is shown, by number."
    if any(curve.rule_path for curve in curves):
        said += " Thin: what the table puts in its place."
    if any(curve.band for curve in curves):
        said += " Shaded: where the worth depends on when it was shown, from lowest to highest."
    return said


def _is_real(value: float | None) -> TypeGuard[float]:
    return value is not None and math.isfinite(value)


def _points(curve: WorthCurve) -> list[tuple[int, float | None]]:
    return [
        (step, value if _is_real(value) else None)
        for step, value in zip(curve.steps, curve.worth, strict=True)
    ]


def _all_values(curve: WorthCurve, rule: Rule | None) -> list[float]:
    found = [*curve.worth, *curve.low, *curve.high]
    if rule is not None:
        known = [step for step, value in _points(curve) if value is not None]
        found += [value_at(rule, curve.shows, step, curve.counts) for step in known]
    return [value for value in found if value is not None]


def _end(curve: WorthCurve) -> float:
    known = [value for _, value in _points(curve) if value is not None]
    return known[-1] if known else 0.0


def path_through(points: Sequence[tuple[float, float | None]]) -> str:
    """Return the path through the points, lifted where one is missing; lone points get a dot."""
    parts: list[str] = []
    down = False
    for place, (x, y) in enumerate(points):
        if y is None:
            down = False
            continue
        parts.append(f"{'L' if down else 'M'}{x:.1f} {y:.1f}")
        alone = not down and (place + 1 == len(points) or points[place + 1][1] is None)
        if alone:
            parts.append("h0.1")
        down = True
    return "".join(parts)


def _stepspath_through(curve: WorthCurve, rule: Rule | None, across: Place, up: Place) -> str:
    """Return the table's values for this state as a path; "" where there is no table."""
    if rule is None:
        return ""
    runs: list[list[tuple[float, float | None]]] = []
    before: float | None = None
    for step, value in _points(curve):
        said = None if value is None else value_at(rule, curve.shows, step, curve.counts)
        if said != before or not runs:
            runs.append([])
        runs[-1].append((across(step), up(said) if _is_real(said) else None))
        before = said
    return "".join(path_through(run) for run in runs)


def _band(curve: WorthCurve, across: Place, up: Place) -> str:
    """Return closed shapes from low to high over each run of steps where they differ."""
    runs: list[list[tuple[float, float, float]]] = [[]]
    for step, low, high in zip(curve.steps, curve.low, curve.high, strict=True):
        if low is None or high is None or not (math.isfinite(low) and math.isfinite(high)):
            runs.append([])
            continue
        runs[-1].append((across(step), up(low), up(high)))
    shapes = []
    for run in runs:
        if len(run) > 1 and any(bottom - top > 0.2 for _, bottom, top in run):
            forth = "L".join(f"{x:.1f} {top:.1f}" for x, _, top in run)
            back = "L".join(f"{x:.1f} {bottom:.1f}" for x, bottom, _ in reversed(run))
            shapes.append(f"M{forth}L{back}Z")
    return "".join(shapes)


def figure_of(tick: float) -> str:
    """Write the figure of a tick."""
    return f"{tick:g}".replace("-", "−")


def _described(curve: WorthCurve, name: str) -> str:
    known = [(step, value) for step, value in _points(curve) if value is not None]
    if not known:
        return f"{name}: never met"
    (first, start), (last, end) = known[0], known[-1]
    if first == last:
        return f"{name}: {five(start)} nats at step {first}"
    return f"{name}: from {five(start)} nats at step {first} to {five(end)} at step {last}"


def _figures(curves: Sequence[WorthCurve], names: Sequence[str]) -> Grid:
    """Return the worths as a table; of long horizons, the first 20 steps and then even ones."""
    steps = sorted({step for curve in curves for step in curve.steps})
    if len(steps) > MOST_ROWS:
        stride = math.ceil((len(steps) - 20) / (MOST_ROWS - 20))
        steps = sorted({*steps[:20], *steps[20::stride], steps[-1]})
    by_step = [
        {
            step: (worth, low, high)
            for step, worth, low, high in zip(
                curve.steps, curve.worth, curve.low, curve.high, strict=True
            )
        }
        for curve in curves
    ]
    rows = tuple(
        (str(step), *(_cell(known.get(step, (None, None, None))) for known in by_step))
        for step in steps
    )
    return Grid("The chart as figures: worth in nats", ("step", *names), rows)


def _cell(values: tuple[float | None, float | None, float | None]) -> str:
    worth, low, high = values
    if worth is None:
        return "cannot be met"
    if low is not None and high is not None and high - low > 1e-9:
        return f"{five(worth)} ({five(low)} to {five(high)})"
    return five(worth)
