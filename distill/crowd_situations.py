"""The situations of a member of a crowd: how many others show what, at which step, with weights.

The masses are those of ``situations``: with P+ and P- the probabilities of a public history, the
member held to showing undecided, and omega the probability that it is still undecided there, omega
P+ and omega P-. Along sampled histories their weights stand for P+ and P-.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from types import MappingProxyType

import numpy as np

from thumbwright.distill.situations import Weighed
from thumbwright.distill.views import View, coded_answer
from thumbwright.exact.arrays import FloatArray, IntArray
from thumbwright.exact.crowd import InPublic, Shown
from thumbwright.exact.crowd_course import balanced
from thumbwright.exact.errors import ModelError


@dataclass(frozen=True)
class Counted:
    """A view of agents that are counted and not told apart.

    Attributes
    ----------
    step : ndarray of int, shape (R,)
    others : int
        How many agents are seen.
    plus, minus : ndarray of int, shape (R,)
        How many of them show plus and minus.
    first, last : ndarray of int, shape (R,)
        Step of the first and of the latest answer; 0 where there is none.
    first_plus, first_minus : ndarray of int, shape (R,)
        How many gave either answer at the moment of the first.
    """

    step: IntArray
    others: int
    plus: IntArray
    minus: IntArray
    first: IntArray
    last: IntArray
    first_plus: IntArray
    first_minus: IntArray

    @property
    def names(self) -> Mapping[str, str]:
        """Nobody's thresholds can be looked at."""
        return MappingProxyType({})

    @classmethod
    def of(cls, seen: InPublic, others: int) -> Counted:
        """What a member sees of one round."""
        return cls(
            np.full(len(seen), seen.step),
            others,
            seen.plus.sum(axis=0),
            seen.minus.sum(axis=0),
            seen.first,
            seen.last,
            seen.first_plus,
            seen.first_minus,
        )

    def state(self, agent: str) -> IntArray:
        """Refused: nobody is told apart."""
        raise ModelError(
            f"in a crowd nobody is told apart, so a rule cannot look at what {agent} shows; let it "
            "look at plus_shown and minus_shown"
        )

    def number(self, name: str) -> IntArray:
        """One of ``rules.NUMBERS``."""
        anybody = self.first > 0
        return {
            "plus_shown": self.plus,
            "minus_shown": self.minus,
            "undecided_shown": self.others - self.plus - self.minus,
            "steps_since_first": np.where(anybody, self.step - self.first + 1, 0),
            "steps_since_last": np.where(anybody, self.step - self.last + 1, 0),
            "came_first": self.first_plus + self.first_minus,
        }[name]

    def first_answer(self) -> IntArray:
        """Codes, in the order of ``rules.FIRST_ANSWERS``."""
        return coded_answer(self.first_plus > 0, self.first_minus > 0)


@dataclass(frozen=True)
class CrowdSituations(Weighed):
    """The situations in which a member, playing exactly, may still be undecided; R of them."""

    counted: Counted
    step: IntArray
    round: IntArray
    plus: FloatArray
    minus: FloatArray
    worth: FloatArray

    @classmethod
    def of(cls, shown: Shown) -> CrowdSituations:
        """Collect them from all that the member may be shown."""
        others, columns = shown.crowd.size - 1, []
        for part in shown.parts:
            rounds = Counter(showing.step for showing in part)
            for showing in part:
                told = np.flatnonzero(~np.isnan(showing.worth))
                worth = showing.worth[told]
                if shown.weight is None:
                    weight = np.exp(showing.log_shown[:, told])
                else:
                    weight = balanced(worth) / shown.weight.shape[1]
                # A step that is held in several rounds is still one step spent undecided.
                still = np.exp(showing.log_still[:, told]).mean(axis=0) / rounds[showing.step]
                view = Counted.of(showing, others)
                told_of = [getattr(view, name)[told] for name in _COLUMNS]
                when = np.full(len(told), showing.round)
                columns.append((*told_of, when, *(weight * still), worth))
        joined = [np.concatenate(column) for column in zip(*columns, strict=True)]
        step, *told_of = joined[: len(_COLUMNS)]
        counted = Counted(step, others, *told_of)
        return cls(counted, counted.step, *joined[len(_COLUMNS) :])

    @property
    def joint(self) -> IntArray:
        """One number per pair of counts, shape (R,); 0 is everybody undecided."""
        return self.counted.plus * (self.counted.others + 1) + self.counted.minus

    def views(self) -> Iterator[tuple[IntArray, View]]:
        """One group: nothing else varies."""
        yield np.arange(len(self.step)), self.counted

    def said(self, which: int) -> str:
        """Step and counts."""
        plus, minus = int(self.counted.plus[which]), int(self.counted.minus[which])
        return f"step {int(self.step[which])} with {plus} showing plus and {minus} showing minus"


_COLUMNS = ("step", "plus", "minus", "first", "last", "first_plus", "first_minus")
