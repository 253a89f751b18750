"""Made-up findings for tests of exports: plain data, no figure in them was computed."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

from thumbwright.distill.case import Case
from thumbwright.distill.findings import CostBasis, Figures, Findings, FormResult, RowUse
from thumbwright.distill.rules import Row, Rule


def case(**changes: Any) -> Case:
    """Return a small case: "mill" watches "upper" and "lower"."""
    parts: dict[str, Any] = {
        "name": "sample",
        "title": "Frost, “=1+1” in the fields",
        "question": {"plus": "frost", "minus": "no frost", "stakes": "property"},
        "evidence": {"kind": "coin", "p": 0.6},
        "time": {"horizon": 40, "step_label": "10 minutes"},
        "thresholds": {
            "even": {"plus": 3, "minus": -3, "unit": "observations"},
            "early": {"plus": 1, "minus": -2, "unit": "observations"},
        },
        "agents": {
            "upper": {"name": "Upper field", "thresholds": "even", "sees": []},
            "lower": {"name": "Lower field", "thresholds": "early", "sees": []},
            "mill": {"name": "Mill field", "thresholds": "even", "sees": ["upper", "lower"]},
        },
        "rule": {"agent": "mill"},
    }
    return Case.model_validate(parts | changes)


def figures(accuracy: float = 0.8, **changes: Any) -> Figures:
    """Return figures with the given ones changed."""
    given = {"plus": accuracy, "minus": 0.1, "undecided": 0.9 - accuracy, "steps": 7.25}
    made = Figures(
        given_plus=given,
        given_minus=given,
        wrong_given_plus=0.1,
        wrong_given_minus=0.1,
        accuracy=accuracy,
        mean_step=7.25,
        risk=0.2,
        accuracy_lost=0.0,
        delay_added=-0.5,
        benefit_kept=1 / 3,
        off_model=0.0,
    )
    return replace(made, **changes)


def rule_of_bars() -> Rule:
    """Return three rows with bars, open steps and a bar that is never met."""
    undecided = frozenset({"undecided"})
    lit = frozenset({"plus"})
    rows = (
        Row(step_to=2, shows={"upper": undecided}, minus_at=-3, plus_at=3, base=True),
        Row(step_from=3, shows={"upper": undecided}, minus_at=-4, plus_at=3),
        Row(shows={"upper": lit, "lower": undecided | lit}, minus_at=None, plus_at=-1),
    )
    return Rule(form="lines", agent="mill", seen=("upper", "lower"), rows=rows)


def rule_of_worths() -> Rule:
    """Return rows with worths that also look at thresholds."""
    rows = (
        Row(thresholds={"lower": frozenset({"early"})}, value=0.1 + 0.2),
        Row(step_from=2, thresholds={"lower": frozenset({"even", "early"})}, value=-1e-9),
        Row(shows={"lower": frozenset({"minus"})}, value=float("-inf")),
    )
    return Rule(form="table", agent="mill", seen=("upper", "lower"), rows=rows)


def result(rule: Rule) -> FormResult:
    """Price ``rule`` with made-up figures."""
    return FormResult(
        rule=rule,
        figures=figures(0.79),
        uses=tuple(RowUse(steps_in_force=2.5, calls=0.25) for _ in rule.rows),
        information_kept=0.9,
        information_ceiling=0.95,
        notes=("made up",),
    )


def findings(**changes: Any) -> Findings:
    """Return findings with both forms."""
    made_case = case()
    made = Findings(
        case=made_case,
        digest=made_case.digest,
        version="9.9",
        agent="mill",
        seen=("upper", "lower"),
        forms={"lines": result(rule_of_bars()), "table": result(rule_of_worths())},
        exact=figures(),
        plain_count=figures(0.7),
        alone=figures(0.6, benefit_kept=0.0),
        costs=CostBasis(
            false_plus=1.1,
            false_minus=0.9,
            per_step=0.015,
            undecided=None,
            inferred=True,
            loss_ratio_range=(1.0, float("inf")),
            per_step_range=(0.01, 0.02),
            benefit_kept_range=None,
        ),
        watching_is_worth=True,
        count_is_whole=True,
        alpha=0.4054651081081644,
        beta=0.0,
        prior=0.0,
        bounds=(-1.2163953243, 1.2163953243),
        value_offsets=(-1, 1),
        leans={"upper": "minus", "lower": "even"},
        alone_rows=(),
        worth_curves=(),
        labels=(),
        is_exact=False,
        caveats=("made up",),
        near_tie_mass=1e-14,
        example=(),
    )
    return replace(made, **changes)
