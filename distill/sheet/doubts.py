"""What the card costs where the case is not right: a table for the back, a line for the front."""

from __future__ import annotations

from collections.abc import Callable

from thumbwright.distill.findings import Doubted, Figures, Findings
from thumbwright.distill.sheet.parts import Grid
from thumbwright.distill.sheet.words import clean

MOST_NAMED = 2
"""Wrong assumptions that the front names."""

Measure = Callable[[Figures], float | None]

MEASURES: tuple[tuple[str, Measure], ...] = (
    ("wrong, given plus", lambda way: way.wrong_given_plus),
    ("wrong, given minus", lambda way: way.wrong_given_minus),
    ("mean steps", lambda way: way.mean_step),
    ("risk", lambda way: way.risk),
    ("benefit kept", lambda way: way.benefit_kept),
    ("read off-model", lambda way: way.off_model),
)


def doubts_grid(findings: Findings) -> Grid:
    """Return the three ways of playing in every doubted world, three figures to a cell."""
    name, result = next(iter(findings.forms.items()))
    rows = [("as the case says", *_cells((result.figures, findings.exact, findings.alone)))]
    for one in findings.doubts:
        said = clean(one.says) + (f" ({clean(one.how)})" if one.how else "")
        rows.append((said, *_cells((one.rule, one.exact, one.alone))))
    return Grid(
        f"In each cell: the rule ({name}) / the full calculation under the wrong assumption / "
        "nobody looked at",
        ("what is really so", *(label for label, _ in MEASURES)),
        tuple(rows),
    )


def _cells(ways: tuple[Figures, Figures, Figures]) -> list[str]:
    return [" / ".join(_short(measure(way)) for way in ways) for _, measure in MEASURES]


def _short(number: float | None) -> str:
    """Three digits after the point at most; what rounds to nothing is 0."""
    if number is None:
        return "none"
    text = f"{abs(number):.3f}" if abs(number) < 10 else f"{abs(number):.1f}"
    if float(text) == 0.0:
        return "0" if number == 0.0 else "<0.001"
    return ("−" if number < 0 else "") + text


def doubts_notes(findings: Findings) -> tuple[str, ...]:
    """Say how to read the table, what its figures range over, and what was left out."""
    said = []
    if findings.doubts:
        said.append(
            "Everybody goes by the case all the same: thresholds, what an observation is worth"
            " and what others are worth are those of the case, for all agents. Benefit kept is"
            " here the risk saved over looking at nobody in the same world, as a share of what"
            " exact play saves where the case is right; below 0, looking is worse than not looking."
        )
        said += [_ranges(findings.doubts), _harm(findings)]
        if any(not one.is_exact for one in findings.doubts):
            said.append(
                "Where something was read off-model (answers per outing that undecided agents"
                " met and their model calls impossible) figures rest on that convention and are"
                " not exact."
            )
    return tuple(clean(text) for text in (*said, *findings.not_doubted) if text)


def _ranges(doubts: tuple[Doubted, ...]) -> str:
    parts = []
    for label, measure in MEASURES[:5]:
        both = []
        for ways in ([one.rule for one in doubts], [one.exact for one in doubts]):
            known = [number for number in map(measure, ways) if number is not None]
            if len(known) == len(ways):
                both.append(f"{_short(min(known))} to {_short(max(known))}")
        if both:
            parts.append(f"{label} {' / '.join(both)}")
    return f"Ranges over these worlds, rule / full calculation: {'; '.join(parts)}."


def harmful(findings: Findings) -> list[Doubted]:
    """The worlds in which the rule is worse than looking at nobody, the worst first."""
    found = [one for one in findings.doubts if one.harms]
    return sorted(found, key=lambda one: (one.rule.benefit_kept or 0.0, one.name))


def _harm(findings: Findings) -> str:
    worst = harmful(findings)
    if not worst:
        return ""
    where = "; where ".join(one.says for one in worst)
    return f"The rule is worse than looking at nobody where {where}."


def doubts_front(findings: Findings) -> str:
    """One sentence on when to look at nobody; "" where no doubt makes looking harmful."""
    worst = harmful(findings)[:MOST_NAMED]
    if not worst:
        return ""
    return f"Better to look at nobody where {', or where '.join(clean(one.says) for one in worst)}."
