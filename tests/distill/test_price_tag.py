from __future__ import annotations

from dataclasses import replace

from tests.distill.exports import sample
from thumbwright.distill.price_tag import price_tag

FOUND = sample.findings()


def test_what_a_rule_costs_in_sentences() -> None:
    figures = sample.figures(0.79, wrong_given_plus=0.123456, wrong_given_minus=0.2, mean_step=6.5)
    result = replace(FOUND.forms["lines"], figures=figures)
    said = price_tag(FOUND, result)
    assert said[0] == (
        "Costs, where only Mill field uses the rule and the others reason exactly, by step 40:"
    )
    assert said[1] == (
        "This rule: wrong with probability 0.12346 where the truth is “frost” and 0.20000 where it"
        " is “no frost”, mean step 6.500, 33.33 % of the benefit of watching kept."
    )
    assert [line.split(":")[0] for line in said[2:5]] == [
        "The full calculation",
        "Undecided neighbours ignored",
        "Everybody ignored",
    ]
    assert said[5] == "These figures are not exact: made up"


def test_exact_figures_say_so_and_no_benefit_is_made_up() -> None:
    figures = sample.figures(benefit_kept=None)
    found = replace(FOUND, is_exact=True, exact=figures)
    said = price_tag(found, FOUND.forms["lines"])
    assert said[2].endswith("mean step 7.250.")
    assert said[5] == "Nothing in these figures was split, dropped, sampled or read by convention."
