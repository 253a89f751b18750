"""The form "formula": the worth of what is shown in closed form, with few numbers.

A small family of shapes is fitted to the weighted situations by log loss: silence as nothing, as a
constant or as a curve that rises to a limit; answers as constants, or straight lines in the present
step or in that of the first answer; and something more for the answer that came first. Each shape
is priced exactly. A number is taken as long as it saves enough risk, and is then written with the
fewest digits that keep the price within a tolerance.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator
from dataclasses import replace
from itertools import product
from math import ceil, floor, log, log10

import numpy as np

from thumbwright.distill.costs import Pricer
from thumbwright.distill.forms import Distilled, Wanted
from thumbwright.distill.forms.axes import grid_axes
from thumbwright.distill.forms.cells import Cells
from thumbwright.distill.forms.enough import Enough
from thumbwright.distill.forms.fitting import everywhere, fitted, information_of, kinds, log_loss
from thumbwright.distill.formula import Formula, Term
from thumbwright.distill.rules import FIRST_ANSWER
from thumbwright.distill.tallies import Tally
from thumbwright.distill.views import View
from thumbwright.exact.arrays import FloatArray, sums
from thumbwright.exact.engine import Progress
from thumbwright.exact.errors import ModelError

NAME = "formula"

WORTH_A_NUMBER = 0.005
"""A number is taken if it saves at least this share of what exact watching saves."""

TOLERANCE = 0.001
"""Rounding may cost this share of what exact watching saves."""

DIGITS = 6
"""At most so many significant digits are tried, before ten are kept."""

READS = ("step", "shown", "plus_shown", "minus_shown", "undecided_shown", "steps_since_first")
"""What a formula may look at, besides the first answer."""


def distil(pricer: Pricer, wanted: Wanted, progress: Progress | None = None) -> Distilled:
    """The formula of at most ``wanted.rows`` numbers.

    Raises ModelError where the rule may look at what a formula cannot, or not at what is shown.
    """
    others = [name for name in wanted.inputs if name not in (*READS, FIRST_ANSWER)]
    if others or not _states(wanted.inputs):
        found = f", not at {', '.join(others)}" if others else ""
        raise ModelError(
            f'the form "{NAME}" looks at {", ".join(READS)} and {FIRST_ANSWER}, at what is shown '
            f'in any case{found}; change the inputs, or leave "{NAME}" out of the forms'
        )
    search = Search(pricer, wanted)
    shapes = list(search.shapes())
    for done, shape in enumerate(shapes):
        if progress:
            progress(NAME, done, len(shapes))
        search.take(shape)
    best, notes = search.chosen()
    rule, rounding = search.rounded(best)
    if progress:
        progress(NAME, len(shapes), len(shapes))
    kept = information_of(pricer, everywhere(pricer, rule))
    return Distilled(rule, kept, None, (*notes, rounding))


def _states(inputs: Iterable[str]) -> list[str]:
    """States that a formula with these inputs can tell."""
    named = "shown" in inputs
    return [s for s in ("plus", "minus", "undecided") if named or f"{s}_shown" in inputs]


class Search:
    """Fits shapes, prices them and writes the numbers of the best."""

    def __init__(self, pricer: Pricer, wanted: Wanted) -> None:
        self._pricer, self._wanted = pricer, wanted
        self._enough = Enough(pricer, wanted)
        group = pricer.group
        evidence = group.agents[group.index[pricer.agent]].evidence
        in_counts = evidence.on_ladder and not evidence.beta and evidence.alpha[0] > 0
        unit = float(evidence.alpha[0]) if in_counts else 1.0
        self._nothing = Formula(pricer.agent, pricer.seen, unit, ())
        self._cells = Cells.of(pricer, wanted.inputs)
        exact, alone = (pricer.objective(t) for t in (pricer.exact_tally, pricer.alone_tally))
        self._saved = max(alone - exact, 0.0)
        self._tallies: dict[Formula, Tally] = {}
        self._taken = [self._nothing]
        # Situations that the inputs do not tell apart are put together.
        where = np.stack([axis.where for axis in grid_axes(pricer, wanted.inputs)], axis=1)
        _, self._first, group_of = np.unique(where, axis=0, return_index=True, return_inverse=True)
        s = pricer.situations
        self._plus, self._minus = (sums(group_of.ravel(), side) for side in (s.plus, s.minus))

    def shapes(self) -> Iterator[Formula]:
        """Every shape that the inputs allow, numbers still to be fitted."""
        inputs, states = self._wanted.inputs, _states(self._wanted.inputs)
        silences = [""]
        if "undecided" in states:
            silences += ["constant", *(["saturating", "known"] if "step" in inputs else [])]
        lines = [""]
        if "step" in inputs:
            lines += ["step", *(["first_step"] if "steps_since_first" in inputs else [])]
        firsts = [False, *([True] if FIRST_ANSWER in inputs else [])]
        every = kinds(self._pricer, "shown" not in inputs)
        for silence, line, first in product(silences, lines, firsts):
            terms: list[Term] = []
            for agents in every:
                for state in states:
                    if state != "undecided":
                        terms.append(Term("constant", state, agents))
                        terms += [Term(line, state, agents)] if line else []
                    elif silence == "known":
                        terms += self._known(agents)
                    elif silence:
                        half = 1.0 if silence == "saturating" else None
                        terms.append(Term(silence, state, agents, half=half))
            if silence == "known" and not any(term.known for term in terms):
                continue
            if first:
                terms += [Term("first_answer", answer) for answer in ("plus", "minus")]
            yield replace(self._nothing, terms=tuple(terms))

    def _known(self, agents: tuple[str, ...]) -> list[Term]:
        """Silence that rises to its known limit: (m+ + m-) / 2 counts where that is whole.

        It holds for an agent that watches nobody, with a coin and thresholds m+ and m- counts from
        the prior; silence is then worth nothing at first and tends there in the end.
        """
        group = self._pricer.group
        if not agents:
            return []
        agent = group.agents[group.index[agents[0]]]
        if agent.sees or agent.evidence.kind != "coin" or len(agent.thresholds) > 1:
            return []
        bounds, alpha = agent.thresholds[0][1], float(agent.evidence.alpha[0])
        up = ceil((bounds.plus - group.prior) / alpha - 1e-9)
        down = floor((bounds.minus - group.prior) / alpha + 1e-9)
        if (up + down) % 2:
            return []
        limit = (up + down) / 2 * alpha / self._nothing.unit
        return [Term("saturating", "undecided", agents, limit, 1.0, known=True)] if limit else []

    def take(self, shape: Formula) -> None:
        """Fit a shape and price it."""
        if shape.terms and shape.fitted <= self._wanted.rows:
            self._taken.append(self._fitted(shape))

    def _fitted(self, shape: Formula) -> Formula:
        if not any(term.half is not None for term in shape.terms):
            return self._fitted_line(shape)[1]
        from scipy.optimize import minimize_scalar

        ends = log(0.1), log(2.0 * self._pricer.group.horizon)
        found = minimize_scalar(
            lambda size: self._fitted_line(shape.with_half(float(np.exp(size))))[0],
            bounds=ends,
            method="bounded",
            options={"xatol": 1e-4},
        )
        return self._fitted_line(shape.with_half(float(np.exp(found.x))))[1]

    def _fitted_line(self, shape: Formula) -> tuple[float, Formula]:
        """The numbers that lose least, half times given; and the loss."""
        free = [place for place, term in enumerate(shape.terms) if not term.known]
        known = replace(shape, terms=tuple(term for term in shape.terms if term.known))
        given = self._read(known)
        columns = [self._read(shape.terms[place].amount) for place in free]
        terms: FloatArray = shape.unit * np.stack(columns, axis=1)
        numbers = fitted(terms, self._plus, self._minus, given)
        for place, number in zip(free, numbers, strict=True):
            shape = shape.with_number(place, float(f"{number:.10g}"))
        return log_loss(given + terms @ numbers, self._plus, self._minus), shape

    def _read(self, read: Callable[[View], FloatArray]) -> FloatArray:
        return everywhere(self._pricer, read)[self._first]

    def _tally(self, formula: Formula) -> Tally:
        if formula not in self._tallies:
            if self._cells is None:
                found = self._pricer.way_tally(formula, whole=False)
            else:
                (found,) = self._cells.tallies([self._cells.of_way(formula)])
            self._tallies[formula] = found
        return self._tallies[formula]

    def _risk(self, formula: Formula) -> float:
        return self._pricer.objective(self._tally(formula))

    def _within(self, formula: Formula) -> bool:
        """Whether a formula is within the limits of the case."""
        return self._enough(self._tally(formula))

    def chosen(self) -> tuple[Formula, list[str]]:
        """The formula whose numbers are all worth it, or the shortest that loses little enough."""
        allowed = [one for one in self._taken if one.fitted <= self._wanted.rows]
        order = sorted(allowed, key=lambda one: (one.fitted, self._risk(one)))
        said = ", ".join(
            f"{size} with {min(self._risk(one) for one in order if one.fitted == size):.6f}"
            for size in dict.fromkeys(one.fitted for one in order)
        )
        notes = [f"Least risk by how many numbers are fitted: {said}."]
        if self._wanted.limited:
            enough = self._enough
            notes += enough.notes
            fits = [one for one in order if self._within(one)]
            if fits:
                fewest = [f"The fewest numbers that {enough.they}."] if enough.they else []
                return fits[0], [*fewest, *notes]
            none = f"No formula of up to {self._wanted.rows} numbers {enough.it}."
            return min(order, key=self._risk), [none, *notes]
        best = order[0]
        while True:
            longer = [one for one in order if one.fitted > best.fitted]
            if not longer:
                return best, notes
            rates = [
                (self._risk(best) - self._risk(one)) / (one.fitted - best.fitted) for one in longer
            ]
            if max(rates) <= max(WORTH_A_NUMBER * self._saved, 1e-12):
                return best, notes
            best = longer[rates.index(max(rates))]

    def rounded(self, formula: Formula) -> tuple[Formula, str]:
        """The formula with the fewest digits that keep its price, and a sentence on that."""
        most = self._risk(formula) + TOLERANCE * self._saved
        within = self._within(formula)

        def keeps(one: Formula) -> bool:
            return self._risk(one) <= most + 1e-12 and (not within or self._within(one))

        rule = next(filter(keeps, _all_to(formula)), formula)
        for place, term in enumerate(formula.terms):
            if not term.known:
                options = (rule.with_number(place, x) for x in shorter(term.number))
                rule = next(filter(keeps, options), rule)
        half = next((term.half for term in formula.terms if term.half is not None), None)
        if half is not None:
            rule = next(filter(keeps, (rule.with_half(x) for x in shorter(half))), rule)
        lost = self._risk(rule) - self._risk(formula)
        return rule, (
            f"Digits kept as far as they matter: shorter numbers would cost more than "
            f"{100 * TOLERANCE:g} % of what exact watching saves; these "
            f"{'cost' if lost > 0 else 'save'} {abs(lost):.2g} against unrounded ones."
        )


def _all_to(formula: Formula) -> Iterator[Formula]:
    """All numbers to ever more digits at once: numbers that cancel out go on doing so."""
    for digits in range(1, DIGITS + 1):
        rule = formula
        for place, term in enumerate(formula.terms):
            if not term.known:
                rule = rule.with_number(place, float(f"{term.number:.{digits}g}"))
        yield rule


def shorter(number: float) -> Iterator[float]:
    """The number with ever more significant digits, to either side, the nearer first."""
    if number == 0.0:
        return
    for digits in range(1, DIGITS + 1):
        size = 10.0 ** (floor(log10(abs(number))) + 1 - digits)
        sides = {floor(number / size) * size, ceil(number / size) * size} - {0.0}
        for side in sorted(sides, key=lambda x: (abs(x - number), abs(x))):
            yield float(f"{side:.10g}")
