"""From a case to the rules it asks for: what is wanted, and each form made and polished."""

from __future__ import annotations

from dataclasses import replace

from thumbwright.distill.case import Case
from thumbwright.distill.costs import Pricer
from thumbwright.distill.forms import Distilled, Wanted, form
from thumbwright.exact.engine import Progress
from thumbwright.exact.errors import ModelError


def wanted_of(case: Case, pricer: Pricer) -> Wanted:
    """What a case asks of its rule.

    Raises ModelError where it asks for what needs costs, and none are known.
    """
    rule = case.rule
    if pricer.losses is None:
        needs = {"min_benefit_kept": rule.min_benefit_kept is not None, "polish": rule.polish}
        for key in (key for key, is_set in needs.items() if is_set):
            raise ModelError(
                f"rule.{key}: needs costs, and none are stated or make the thresholds best for an "
                "agent alone; state them under [costs], or leave the key out"
            )
    return Wanted(
        rule.rows, tuple(rule.inputs), rule.max_accuracy_lost, rule.min_benefit_kept, rule.polish
    )


def make(name: str, pricer: Pricer, wanted: Wanted, progress: Progress | None = None) -> Distilled:
    """The rule of one form, polished where that is wanted.

    Raises ModelError where the form cannot be had of this case.
    """
    made: Distilled = form(name).distil(pricer, wanted, progress)
    if not wanted.polish:
        return made
    from thumbwright.distill.forms.polish import polished

    return polished(pricer, wanted, made, progress)


def without_limits(wanted: Wanted) -> Wanted:
    """The same without limits that pick the number of rows."""
    return replace(wanted, max_accuracy_lost=None, min_benefit_kept=None)
