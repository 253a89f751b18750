"""What each number of rows costs, for each rule form that a case asks for."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import asdict, dataclass, replace
from typing import Any

from thumbwright.distill.assemble import NO_LIMITS, Limits
from thumbwright.distill.case import Case
from thumbwright.distill.costs import Pricer
from thumbwright.distill.findings import Size
from thumbwright.distill.forms import MODULES, Distilled, Sized, Wanted
from thumbwright.distill.forms.batch import Batch
from thumbwright.distill.forms.enough import Enough
from thumbwright.distill.forms.making import make, wanted_of, without_limits
from thumbwright.distill.network_pricer import NetworkPricer
from thumbwright.distill.pricing import pricer_of
from thumbwright.distill.rules import Rule
from thumbwright.distill.shifts import Shifts
from thumbwright.distill.tallies import Tally
from thumbwright.exact.engine import Progress
from thumbwright.exact.errors import ModelError

FROM_ONE_SEARCH = ("table", "tree", "lines")
"""Forms of which one search finds the rules of all sizes."""

AT_HAND, LINES_AT_HAND = 1_000_000, 50_000
"""Sizes are worked out for a sheet up to so many rows times situations: a few seconds; lines, which
are merged and settled under exact pricing at every size, up to the second."""


def come_free(name: str, pricer: Pricer, wanted: Wanted) -> bool:
    """Whether all sizes of a form cost a sheet no more than some seconds.

    Decided by what there is to do and not by a clock, so that a sheet is the same on any machine.
    """
    work = wanted.rows * len(pricer.situations.step)
    if name != "lines":
        return name in FROM_ONE_SEARCH and work <= AT_HAND
    # Pricing many lines is quick only where they are priced together.
    return work <= LINES_AT_HAND and isinstance(pricer, NetworkPricer) and Batch(pricer).together


def priced_sizes(pricer: Pricer, sizes: tuple[Sized, ...]) -> tuple[Size, ...]:
    """The rules of all sizes with their prices, fewest rows first.

    Off-model readings are not counted.
    """
    found = [
        Size(len(rule.rows), pricer.figures(pricer.rule_tally(rule, whole=False)), kept)
        for rule, kept in sizes
    ]
    return tuple(sorted(found, key=lambda size: size.rows))


@dataclass(frozen=True)
class _Priced:
    """A size, and whether it is within the limits of the case (None where it sets none)."""

    size: Size
    tally: Tally
    enough: bool | None


def sizes(
    case: Case, progress: Progress | None = None, limits: Limits = NO_LIMITS
) -> dict[str, Any]:
    """What every number of rows up to that of the case costs, for each of its forms.

    A run that is stopped (KeyboardInterrupt) once the exact beliefs are there gives the sizes that
    were finished, and ``complete`` is then False.

    Raises ModelError where the case can have none of its forms, or asks for what needs costs where
    none are known.
    """
    pricer, missing = pricer_of(case, progress, limits)
    wanted = wanted_of(case, pricer)
    found: dict[str, dict[int, _Priced]] = {}
    left_out: dict[str, str] = {}
    complete = True
    try:
        _fill(case, pricer, wanted, found, left_out, progress)
    except KeyboardInterrupt:
        complete = False
    if complete and not any(found.values()):
        raise ModelError(next(iter(left_out.values())))
    return _told(case, pricer, wanted, found, left_out, complete, missing)


def _fill(
    case: Case,
    pricer: Pricer,
    wanted: Wanted,
    found: dict[str, dict[int, _Priced]],
    left_out: dict[str, str],
    progress: Progress | None,
) -> None:
    """Price one size after the other, so that what is there counts if the run is stopped."""
    enough = Enough(pricer, wanted) if wanted.limited else None
    for name in (name for name in MODULES if name in case.rule.forms):
        here = found.setdefault(name, {})
        try:
            for number, made in enumerate(_by_size(name, pricer, wanted, progress)):
                if progress:
                    progress(f"sizes, {name}", min(number + 1, wanted.rows), wanted.rows)
                tally = _tally(pricer, made)
                size = Size(_rows(made), pricer.figures(tally), made.information_kept)
                one = _Priced(size, tally, None if enough is None else enough(tally))
                other = here.get(size.rows)
                # A search may come to as many rows twice.
                if other is None or pricer.objective(tally) < pricer.objective(other.tally):
                    here[size.rows] = one
        except ModelError as refusal:
            left_out[name] = str(refusal)
            del found[name]


def _tally(pricer: Pricer, made: Distilled) -> Tally:
    rule = made.rule
    return pricer.rule_tally(rule) if isinstance(rule, Rule) else pricer.way_tally(rule)


def _rows(made: Distilled) -> int:
    """Rows of a rule, lines of shifts, numbers of a formula."""
    rule = made.rule
    if isinstance(rule, Rule):
        return len(rule.rows)
    return rule.rows if isinstance(rule, Shifts) else len(rule.parameters)


def _by_size(
    name: str, pricer: Pricer, wanted: Wanted, progress: Progress | None
) -> Iterator[Distilled]:
    """The rules of a form for each number of rows, whatever the limits of the case."""
    plain = without_limits(wanted)
    if name not in FROM_ONE_SEARCH:
        for rows in range(1, wanted.rows + 1):
            yield make(name, pricer, replace(plain, rows=rows), progress)
        return
    made = make(name, pricer, replace(plain, every_size=True, polish=False), progress)
    for rule, kept in sorted(made.sizes, key=lambda one: len(one[0].rows)) or [
        (made.in_rows, made.information_kept)
    ]:
        one = Distilled(rule, kept, None, ())
        if wanted.polish:
            from thumbwright.distill.forms.polish import polished

            one = polished(pricer, plain, one, progress)
        yield one


def _told(
    case: Case,
    pricer: Pricer,
    wanted: Wanted,
    found: dict[str, dict[int, _Priced]],
    left_out: dict[str, str],
    complete: bool,
    missing: str | None,
) -> dict[str, Any]:
    alone = pricer.figures(pricer.alone_tally)
    exact, plain = pricer.exact_tally, pricer.plain_count_tally()
    forms = {}
    for name, here in found.items():
        ordered = [here[rows] for rows in sorted(here)]
        forms[name] = {
            "sizes": [
                {
                    "rows": one.size.rows,
                    "within_limits": one.enough,
                    "information_kept": one.size.information_kept,
                    **asdict(one.size.figures),
                    "worse_than_alone": one.size.figures.worse_than(alone),
                }
                for one in ordered
            ],
            "fewest_rows_within_limits": next((o.size.rows for o in ordered if o.enough), None),
        }
    basis, inexact = pricer.basis(exact), pricer.inexact()
    figures = [one.size.figures for here in found.values() for one in here.values()]
    remarks = [missing] if missing else []
    if wanted.limited:
        remarks += Enough(pricer, wanted).notes
    return {
        "case": case.name,
        "digest": case.digest,
        "agent": pricer.agent,
        "complete": complete,
        "most_rows": wanted.rows,
        "polished": wanted.polish,
        "limits": {
            "max_accuracy_lost": wanted.max_accuracy_lost,
            "min_benefit_kept": wanted.min_benefit_kept,
        },
        "forms": forms,
        "left_out": left_out,
        "others": {
            "exact": asdict(pricer.figures(exact)),
            "plain-count": asdict(pricer.figures(plain)),
            "alone": asdict(alone),
        },
        # The range of benefit is that of one rule; here there are many.
        "losses": None if basis is None else asdict(replace(basis, benefit_kept_range=None)),
        "watching_is_worth_something": pricer.watching_is_worth,
        "dropped_mass": inexact.dropped_mass,
        "near_tie_mass": inexact.near_tie_mass,
        "sampled_histories_and_seed": inexact.sampled,
        "exact": inexact.nothing and all(one.off_model == 0.0 for one in figures),
        "remarks": remarks,
    }
