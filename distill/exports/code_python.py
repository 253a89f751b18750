"""The rule as a Python module: the standard library alone, arrays where numpy is there."""

from __future__ import annotations

from thumbwright.distill.code.spelling import Spelling, spelled
from thumbwright.distill.findings import Findings

NAME = "rule as Python"

SPELLING = Spelling(
    language="Python",
    file="watch_rule.py",
    comment="#",
    constant="_",
    equals="==",
    both=" & ",
    either=" | ",
    always="True",
    infinity='float("inf")',
    brackets=True,
    values="A float; where an argument is a list or an array, an array (this needs numpy).",
    answers='"plus", "minus" or "undecided"; likewise an array of these. States, first answers and'
    " thresholds are handed over by name or by code. ValueError for anything else.",
    alone="python watch_rule.py",
)


def render(findings: Findings) -> dict[str, str | bytes]:
    """Return ``watch_rule.py``."""
    return spelled(findings, SPELLING)
