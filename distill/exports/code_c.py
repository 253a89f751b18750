"""The rule as C99: two functions that keep no state and need no library to link."""

from __future__ import annotations

from thumbwright.distill.code.spelling import Spelling, spelled
from thumbwright.distill.findings import Findings

NAME = "rule as C"

SPELLING = Spelling(
    language="C99",
    file="watch_rule.c",
    comment="//",
    constant="WATCH_",
    equals="==",
    both=" && ",
    either=" || ",
    always="1",
    infinity="INFINITY",
    brackets=False,
    values="NAN where an argument is none that it may be, or no row holds.",
    answers="WATCH_PLUS, WATCH_MINUS or WATCH_UNDECIDED; WATCH_REFUSED where an argument is none"
    " that it may be, or no row holds. States, first answers and thresholds are handed over as the"
    " constants below. Compile this file with the rest and declare the functions as here; with"
    " several rules, name them apart (-Dvalue=frost_value -Ddecide=frost_decide).",
    alone="cc -std=c99 -DSELF_CHECK watch_rule.c && ./a.out",
    names_as_codes=True,
)


def render(findings: Findings) -> dict[str, str | bytes]:
    """Return ``watch_rule.c``."""
    return spelled(findings, SPELLING)
