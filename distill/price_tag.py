"""What a rule costs, in sentences that travel with it wherever it goes without its sheet."""

from __future__ import annotations

from thumbwright.distill.findings import Figures, Findings, FormResult


def price_tag(findings: Findings, result: FormResult) -> tuple[str, ...]:
    """Say what a rule costs beside other ways of playing, one sentence each.

    Probabilities have five decimals and mean steps three. The setting is always that the rule's
    agent alone uses it while the others reason exactly.
    """
    question = findings.case.question
    ways = (
        ("This rule", result.figures),
        ("The full calculation", findings.exact),
        ("Undecided neighbours ignored", findings.plain_count),
        ("Everybody ignored", findings.alone),
    )
    said = [
        f"Costs, where only {findings.case.agents[findings.agent].name} uses the rule and the"
        f" others reason exactly, by step {findings.case.time.horizon}:"
    ]
    said += [
        f"{name}: {_figures(figures, question.plus, question.minus)}." for name, figures in ways
    ]
    said.append(
        "Nothing in these figures was split, dropped, sampled or read by convention."
        if findings.is_exact
        else "These figures are not exact: " + " ".join(findings.caveats)
    )
    return tuple(said)


def _figures(figures: Figures, plus: str, minus: str) -> str:
    parts = [
        f"wrong with probability {figures.wrong_given_plus:.5f} where the truth is “{plus}” and"
        f" {figures.wrong_given_minus:.5f} where it is “{minus}”",
        f"mean step {figures.mean_step:.3f}",
    ]
    if figures.benefit_kept is not None:
        parts.append(f"{100 * figures.benefit_kept:.2f} % of the benefit of watching kept")
    return ", ".join(parts)
