"""Rule forms: one file per form behind one small interface.

A form module has ``NAME`` and

    distil(pricer: Pricer, wanted: Wanted, progress) -> Distilled

It makes a rule of at most ``wanted.rows`` rows, or numbers, from the exact situations in ``pricer``
and says in plain sentences how it was chosen. It prices candidates through the pricer and computes
no probabilities of its own. To add a form, write the module and name it in :data:`MODULES`.
"""

from __future__ import annotations

from dataclasses import dataclass
from importlib import import_module
from types import ModuleType

from thumbwright.distill.reckoned import Reckoned
from thumbwright.distill.rules import Rule

MODULES = ("lines", "table", "table-by-risk", "table-for-all", "tree", "shifts", "formula")
"""The forms of this package, in the order in which they are printed; a hyphen in a name is an
underscore in that of its module."""


@dataclass(frozen=True)
class Wanted:
    """What a case asks of a rule.

    Attributes
    ----------
    rows : int
        Most rows.
    inputs : tuple of str
        What it may look at: "step", "shown", "thresholds".
    max_accuracy_lost : float or None
        Largest loss of accuracy against exact play; a form then takes the fewest rows within it.
    min_benefit_kept : float or None
        Least share of the benefit of watching; a form then takes the fewest rows that keep it.
    polish : bool
        Whether the rule is searched further, by single moves, for less risk.
    every_size : bool
        Whether to tell the rule of every smaller number of rows too, where that costs little.
    """

    rows: int
    inputs: tuple[str, ...]
    max_accuracy_lost: float | None = None
    min_benefit_kept: float | None = None
    polish: bool = False
    every_size: bool = False

    @property
    def limited(self) -> bool:
        """Whether the fewest rows are wanted that lose little enough, not as many as allowed."""
        return self.max_accuracy_lost is not None or self.min_benefit_kept is not None


Sized = tuple[Rule, float | None]
"""The rule of one number of rows, and the share of information that it keeps."""


@dataclass(frozen=True)
class Distilled:
    """A rule and how it came about.

    ``information_kept`` and ``information_ceiling`` are shares of the log-loss gain of exact
    worths over the best single value; None where that gain is nil or the form has no values.
    ``sizes`` are the rules of every number of rows, where they were asked for and come with it.
    """

    rule: Rule | Reckoned
    information_kept: float | None
    information_ceiling: float | None
    notes: tuple[str, ...]
    sizes: tuple[Sized, ...] = ()

    @property
    def in_rows(self) -> Rule:
        """The rule of a form that makes rows."""
        assert isinstance(self.rule, Rule), "this form is reckoned and has no rows"
        return self.rule


def form(name: str) -> ModuleType:
    """The module of a form, imported when it is needed."""
    return import_module(f"{__name__}.{name.replace('-', '_')}")
