"""Situations that are told input by input, as they are to an exported function.

In a group the numbers follow from what is shown; a function is handed each by itself.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np

from thumbwright.distill.exports.rule_csv import SHOWS, THRESHOLDS
from thumbwright.distill.rules import FIRST_ANSWER, FIRST_ANSWERS, SHOWN, Rule
from thumbwright.distill.views import NO_ROW, rows_in
from thumbwright.exact.arrays import IntArray

Given = Mapping[str, int | str]
"""What each input is, by its key: a whole number or a name."""


@dataclass(frozen=True)
class Told:
    """A view (``views.View``) of one situation."""

    given: Given

    @property
    def step(self) -> IntArray:
        """Own observations so far."""
        return np.array(self.given["step"], dtype=np.int64)

    @property
    def names(self) -> dict[str, str]:
        """Names of the seen agents' thresholds."""
        ends = [key for key in self.given if key.endswith(THRESHOLDS)]
        return {key.removesuffix(THRESHOLDS): str(self.given[key]) for key in ends}

    def state(self, agent: str) -> IntArray:
        """Code of what a seen agent shows; undecided where that decides nothing and is not told."""
        return np.array(SHOWN.index(str(self.given.get(agent + SHOWS, SHOWN[0]))))

    def number(self, name: str) -> IntArray:
        """One of ``rules.NUMBERS``."""
        return np.array(self.given[name], dtype=np.int64)

    def first_answer(self) -> IntArray:
        """Code of the first answer."""
        return np.array(FIRST_ANSWERS.index(str(self.given[FIRST_ANSWER])))


def row_in(rule: Rule, given: Given) -> int | None:
    """Number of the row that holds, ``None`` where none does."""
    row = int(rows_in(rule, Told(given))[0])
    return None if row == NO_ROW else row
