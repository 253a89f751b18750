"""What one run of the main job found: the plain data that the sheet and every export read.

Built once by ``distill.job``; frozen; no export computes a figure of its own.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

from thumbwright.distill.case import Case
from thumbwright.distill.reckoned import Reckoned
from thumbwright.distill.rules import Row, Rule


@dataclass(frozen=True)
class Figures:
    """How one way of playing turns out (probabilities; steps).

    ``given_plus`` and ``given_minus`` each hold the keys ``plus``, ``minus``, ``undecided``
    (what the agent has shown by the horizon) and ``steps`` (mean number of steps used; an
    agent that is undecided at the horizon has used all of them). ``wrong_given_plus`` and
    ``wrong_given_minus`` count the answers shown, not those forced at the horizon.
    ``risk`` is ``None`` only where no costs are known or could be inferred. ``errors`` holds
    standard errors of figures by name, where histories were sampled.
    """

    given_plus: dict[str, float]
    given_minus: dict[str, float]
    wrong_given_plus: float
    wrong_given_minus: float
    accuracy: float
    mean_step: float
    risk: float | None
    accuracy_lost: float
    delay_added: float
    benefit_kept: float | None
    off_model: float
    errors: dict[str, float] | None = None

    def worse_than(self, other: Figures) -> bool:
        """Whether these have a noticeably larger risk; False where none is known."""
        if self.risk is None or other.risk is None:
            return False
        return self.risk > other.risk + 1e-9 * abs(other.risk)


@dataclass(frozen=True)
class RowUse:
    """How often a row is in force: mean steps per outing, and share of outings it decides."""

    steps_in_force: float
    calls: float


@dataclass(frozen=True)
class Agreed:
    """How a rule and exact play compare on the same observations, averaged over the prior.

    Attributes
    ----------
    same, opposite : float
        Probability that both end alike, and that one says plus and the other minus.
    steps_apart : float
        Mean absolute difference of the steps used.
    errors : mapping of str to float, or None
        Standard errors, where histories were sampled.
    """

    same: float
    opposite: float
    steps_apart: float
    errors: dict[str, float] | None = None


@dataclass(frozen=True)
class Size:
    """What a rule of so many rows costs, and the share of information that it keeps."""

    rows: int
    figures: Figures
    information_kept: float | None


@dataclass(frozen=True)
class FormResult:
    """A distilled rule with its price.

    ``notes`` are plain sentences on how it was chosen (rows merged, ceiling met or not).
    ``information_ceiling`` is the most that any grouping into as many rows could keep. ``agreed``
    compares it with exact play on the same observations. ``everybody`` is how its agent fares where
    all who can use the rule do; None where there is nobody else, or it could not be worked out.
    ``sizes`` are rules of fewer and fewer rows, those of one search, before any polish; empty where
    they would have taken long.
    """

    rule: Rule
    figures: Figures
    uses: tuple[RowUse, ...]
    information_kept: float | None
    information_ceiling: float | None
    notes: tuple[str, ...]
    agreed: Agreed | None = None
    everybody: Figures | None = None
    sizes: tuple[Size, ...] = ()


@dataclass(frozen=True)
class ReckonedResult:
    """A rule that is reckoned and not looked up in rows, with its price."""

    rule: Reckoned
    figures: Figures
    information_kept: float | None
    notes: tuple[str, ...]


@dataclass(frozen=True)
class CostBasis:
    """The losses used: stated in the case, or inferred from the agent's thresholds.

    ``inferred`` is False where the case states them. ``loss_ratio`` (false_plus over
    false_minus) and ``per_step`` ranges are ``(low, high)``, losses scaled so that their
    mean is 1; ``None`` where costs were stated.
    """

    false_plus: float
    false_minus: float
    per_step: float
    undecided: float | None
    inferred: bool
    loss_ratio_range: tuple[float, float] | None
    per_step_range: tuple[float, float] | None
    benefit_kept_range: tuple[float, float] | None


@dataclass(frozen=True)
class WorthCurve:
    """The worth of one joint shown state over the steps, for the modeller's chart (nats).

    ``low`` and ``high`` span the histories that show the same states; equal where the time
    of a commitment does not matter. Steps at which the state cannot occur hold ``None``. In a
    crowd nobody is told apart: ``shows`` is empty, and ``counts`` says how many show plus and how
    many minus.
    """

    label: str
    shows: tuple[str, ...]
    steps: tuple[int, ...]
    worth: tuple[float | None, ...]
    low: tuple[float | None, ...]
    high: tuple[float | None, ...]
    counts: tuple[int, int] | None = None

    @property
    def plus_and_minus(self) -> tuple[int, int]:
        """How many of the seen agents show plus, and how many minus."""
        return self.counts or (self.shows.count("plus"), self.shows.count("minus"))


@dataclass(frozen=True)
class Doubted:
    """What a rule costs in a world that is not what the case says.

    Everybody goes by the case all the same; ``exact`` is the full calculation under the wrong
    assumptions, and what is lost and added is against it. ``benefit_kept`` is the risk saved over
    ``alone`` in that world, as a share of what exact play saves where the case is right: it is
    negative where looking does harm. ``off_model`` counts what was read by the off-model
    convention.

    ``name`` is for files, ``says`` a plain phrase on what is really so, and ``how`` says how much;
    it may be empty.
    """

    name: str
    says: str
    how: str
    rule: Figures
    exact: Figures
    alone: Figures

    @property
    def is_exact(self) -> bool:
        """Whether nothing in it was read by the off-model convention."""
        return not any(way.off_model for way in (self.rule, self.exact, self.alone))

    @property
    def harms(self) -> bool:
        """Whether the rule is worse than looking at nobody, by risk."""
        return self.rule.benefit_kept is not None and self.rule.benefit_kept < -1e-9


@dataclass(frozen=True)
class Findings:
    """Everything a sheet prints about one agent of one case.

    Attributes
    ----------
    costs : CostBasis or None
        None where the case states no costs and none could be inferred; then no risk is known.
    watching_is_worth : bool
        False where exact watching saves less than 1 % of the risk alone.
    count_is_whole : bool
        Whether a person can keep the own count.
    alpha, beta : float or None
        Worth (nats) of one count and of one step; None off a ladder.
    prior : float
        Log-odds of plus before anybody has observed anything (nats).
    bounds : tuple of float
        The agent's own thresholds: it answers minus at the first belief or below, plus at the
        second or above (nats).
    value_offsets : tuple of int or None
        By how much each possible observation moves the own count, in the order of ``labels``.
    leans : mapping of agent id to "minus", "plus" or "even"
        Which of its thresholds a seen agent reaches more easily, counted from the prior.
    alone_rows : tuple of Row
        The bars of exact play with nobody to watch, by range of steps: for an agent that is unsure
        whether anyone is on watch. Empty where there is no whole count.
    is_exact : bool
        Whether nothing in any figure was split, dropped, sampled or read off-model.
    doubts : tuple of Doubted
        The rule of the first form where the case is not right.
    not_doubted : tuple of str
        Plain sentences on what was left out of that.
    example : tuple of dict
        A made-up run: ``step``, ``shows`` (id to state), ``sign`` ("plus", "minus" or a label),
        ``peg`` (own count), ``line`` (row number), ``act`` ("watch", "plus", "minus"). Steps at
        which nothing changes may be left out.
    """

    case: Case
    digest: str
    version: str
    agent: str
    seen: tuple[str, ...]
    forms: dict[str, FormResult]
    exact: Figures
    plain_count: Figures
    alone: Figures
    costs: CostBasis | None
    watching_is_worth: bool
    count_is_whole: bool
    alpha: float | None
    beta: float | None
    prior: float
    bounds: tuple[float, float]
    value_offsets: tuple[int, ...] | None
    leans: dict[str, str]
    alone_rows: tuple[Row, ...]
    worth_curves: tuple[WorthCurve, ...]
    labels: tuple[str, ...]
    is_exact: bool
    caveats: tuple[str, ...]
    near_tie_mass: float
    example: tuple[dict[str, Any], ...]
    reckoned: dict[str, ReckonedResult] = field(default_factory=dict)
    doubts: tuple[Doubted, ...] = ()
    not_doubted: tuple[str, ...] = ()

    def _repr_html_(self) -> str:
        """Tables and the chart, for notebooks."""
        from thumbwright.distill.sheet.notebook import findings_html

        return findings_html(self)

    @property
    def worse_than_alone(self) -> tuple[str, ...]:
        """Names of the forms whose rule has a larger risk than ignoring everybody."""
        figures = {name: one.figures for name, one in self.forms.items()}
        figures |= {name: one.figures for name, one in self.reckoned.items()}
        return tuple(name for name, one in figures.items() if one.worse_than(self.alone))
