"""The rule as R: functions of vectors, base R alone."""

from __future__ import annotations

from thumbwright.distill.code.spelling import Spelling, spelled
from thumbwright.distill.findings import Findings

NAME = "rule as R"

SPELLING = Spelling(
    language="R",
    file="watch_rule.R",
    comment="#",
    constant=".",
    equals="==",
    both=" & ",
    either=" | ",
    always="TRUE",
    infinity="Inf",
    brackets=True,
    values="Arguments are vectors of one length, or single values.",
    answers='"plus", "minus" or "undecided" for each. States, first answers and thresholds are'
    " handed over by name or by code. Stops at anything else.",
    alone="Rscript watch_rule.R",
)


def render(findings: Findings) -> dict[str, str | bytes]:
    """Return ``watch_rule.R``."""
    return spelled(findings, SPELLING)
