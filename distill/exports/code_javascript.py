"""The rule as a JavaScript module, for browsers and for node."""

from __future__ import annotations

from thumbwright.distill.code.spelling import Spelling, spelled
from thumbwright.distill.findings import Findings

NAME = "rule as JavaScript"

SPELLING = Spelling(
    language="JavaScript",
    file="watch_rule.mjs",
    comment="//",
    constant="_",
    equals="===",
    both=" && ",
    either=" || ",
    always="true",
    infinity="Infinity",
    brackets=False,
    values="A number.",
    answers='"plus", "minus" or "undecided". States, first answers and thresholds are handed over'
    " by name or by code. Throws a RangeError at anything else.",
    alone="node watch_rule.mjs",
)


def render(findings: Findings) -> dict[str, str | bytes]:
    """Return ``watch_rule.mjs``."""
    return spelled(findings, SPELLING)
