"""A rule of few numbers: the worth of what is shown as a sum of terms in closed form."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from thumbwright.distill.rules import FIRST_ANSWERS, SHOWN
from thumbwright.distill.views import View
from thumbwright.exact.arrays import FloatArray, IntArray


@dataclass(frozen=True)
class Term:
    """One number, and how much of it a situation has.

    With c the number of agents concerned that show ``shows`` and n the step, a situation has

    - ``"constant"``: c
    - ``"step"``: c n
    - ``"first_step"``: c times the step at which the first answer was given
    - ``"saturating"``: c (n - 1) / (n - 1 + half); nothing at the first step, all of it in the end
    - ``"first_answer"``: 1 where the first answer given was ``shows``, else 0

    Attributes
    ----------
    of : str
    shows : str
        Member of ``SHOWN``.
    agents : tuple of str
        Ids of the agents concerned; empty: all are counted, nobody is told apart.
    number : float
        In units of the formula.
    half : float or None
        For ``"saturating"``: after so many steps half of it is there.
    known : bool
        Whether the number follows from the model and was not fitted.
    """

    of: str
    shows: str
    agents: tuple[str, ...] = ()
    number: float = 1.0
    half: float | None = None
    known: bool = False

    @property
    def name(self) -> str:
        """What the number is called."""
        what = "_".join((self.shows, *self.agents))
        return what if self.of == "constant" else f"{what}_{self.of}"

    def amount(self, view: View) -> FloatArray:
        """How much of the number each situation of a view has."""
        if self.of == "first_answer":
            came = view.first_answer() == FIRST_ANSWERS.index(self.shows)
            return np.asarray(came, dtype=np.float64)
        count: FloatArray | IntArray
        if self.agents:
            code = SHOWN.index(self.shows)
            count = np.asarray(sum((view.state(a) == code).astype(float) for a in self.agents))
        else:
            count = view.number(f"{self.shows}_shown")
        amount: FloatArray = np.asarray(count, dtype=float) * self._by_time(view)
        return amount

    def _by_time(self, view: View) -> FloatArray:
        step: FloatArray = np.asarray(view.step, dtype=float)
        if self.of == "step":
            return step
        if self.of == "first_step":
            return np.asarray(step - view.number("steps_since_first") + 1.0)
        if self.of == "saturating":
            assert self.half is not None
            return np.asarray((step - 1.0) / (step - 1.0 + self.half))
        return np.ones(())

    def sentence(self) -> str:
        """The term in words; agents by their ids."""
        number = f"{self.number:.10g}"
        if self.of == "first_answer":
            return f"The first answer given was {self.shows}: {number}."
        if len(self.agents) == 1:
            lead = f"{self.agents[0]} shows {self.shows}"
        else:
            who = f"of {', '.join(self.agents)}" if self.agents else "agent"
            lead = f"for each {who} that shows {self.shows}"
        times = {
            "constant": "",
            "step": " times n",
            "first_step": " times the step of the first answer",
            "saturating": f" times (n - 1) / (n - 1 + {self.half or 0:.10g})",
        }[self.of]
        return f"{lead[:1].upper()}{lead[1:]}: {number}{times}."


@dataclass(frozen=True)
class Formula:
    """The worth of a situation: unit times the sum of number times amount over all terms.

    Attributes
    ----------
    agent : str
    seen : tuple of str
    unit : float
        Nats per unit of the numbers: the worth of one own count, or 1.
    terms : tuple of Term
    """

    agent: str
    seen: tuple[str, ...]
    unit: float
    terms: tuple[Term, ...]
    form: str = "formula"

    @property
    def parameters(self) -> dict[str, float]:
        """Numbers by name; those that are known from the model included."""
        named: dict[str, float] = {}
        for term in self.terms:
            named[term.name] = term.number
            if term.half is not None:
                named["half"] = term.half
        return named

    @property
    def fitted(self) -> int:
        """How many numbers were fitted; a half time that terms share counts once."""
        halves = {term.half for term in self.terms if term.half is not None}
        return sum(not term.known for term in self.terms) + len(halves)

    def __call__(self, view: View) -> FloatArray:
        """Worth (nats) of every situation of a view."""
        total: FloatArray = np.zeros(())
        for term in self.terms:
            total = total + term.number * term.amount(view)
        return self.unit * total

    def with_number(self, place: int, number: float) -> Formula:
        """The same with the number of one term replaced."""
        term = replace(self.terms[place], number=number)
        return replace(self, terms=(*self.terms[:place], term, *self.terms[place + 1 :]))

    def with_half(self, half: float) -> Formula:
        """The same with another half time for all terms that have one."""
        terms = (replace(t, half=half) if t.half is not None else t for t in self.terms)
        return replace(self, terms=tuple(terms))

    def sentences(self) -> tuple[str, ...]:
        """What the numbers count, then one sentence for each term."""
        if not self.terms:
            return ("What others show is worth nothing.",)
        unit = "nats" if self.unit == 1.0 else f"own counts, {self.unit:.5g} nats each"
        lead = f"Worth in {unit}; what applies is added up; n is the step."
        return (lead, *(term.sentence() for term in self.terms))
