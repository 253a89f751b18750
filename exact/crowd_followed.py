"""One record of what a member of a crowd has been shown, followed through the public histories.

A record says how many others of each kind show what at the end of each step, not in which round of
a step they came to it. Where several rounds may have brought them, all the ways in which the rounds
can add up to what is recorded are kept, each with its own beliefs; their probabilities are added up
when the step ends. The member shows "undecided" throughout, also where exact play would leave it no
chance of that: others then take its silence for no news (see ``crowd_shown``).
"""

from __future__ import annotations

import numpy as np

from thumbwright.exact.arrays import BoolArray, FloatArray, IntArray
from thumbwright.exact.crowd_course import Course, Enumerated, TooMany
from thumbwright.exact.crowd_kinds import Crowd, check_play
from thumbwright.exact.crowd_play import Choice, Histories
from thumbwright.exact.errors import ModelError

MOST_WAYS = 50_000
"""Ways in which a record may have come about that are held unless told otherwise."""


class Agreeing(Enumerated):
    """Goes on with the continuations that can end a step as it is recorded.

    Parameters
    ----------
    size : int
        Agents in the crowd.
    most : int
        TooMany is raised where more histories would be laid out.
    settle : bool
        Whether members may also answer in later rounds of the step.
    asked : ndarray of int, shape (2, K)
        How many others of each kind show plus, and minus, when the step ends.
    """

    def __init__(self, size: int, most: int, settle: bool, asked: IntArray) -> None:
        super().__init__(size, 0.0, most)
        self._settle, self._asked, self._ways = settle, asked, most

    def go_on(self, histories: Histories, choice: Choice, step: int, round_: int) -> IntArray:
        """Lay out what agrees, one kind after another; drop what has ended otherwise."""
        shown = np.stack([histories.record.plus, histories.record.minus])
        missing = self._asked[:, :, None] - shown
        still = (missing == 0).all(axis=(0, 1))
        still[choice.columns[choice.open]] = False
        resting = np.flatnonzero(still)
        at = np.flatnonzero(choice.open)
        weight = histories.record.log_weight[:, choice.columns[at]]
        commits: IntArray = np.zeros((2, 0, len(at)), dtype=np.int64)
        for k, share in enumerate(choice.log_share):
            possible = np.isfinite(share[:2, :, at]).any(axis=1)
            columns = choice.columns[at]
            parent, came = self._lay_out(missing[:, k, columns], possible, len(resting))
            free = histories.free[k, columns[parent]]
            parent, plus, minus, weight = self._weigh(share, free, at, weight, (parent, *came))
            at = at[parent]
            commits = np.concatenate([commits[:, :, parent], np.stack([plus, minus])[:, None]], 1)
        histories.take(np.concatenate([resting, choice.columns[at]]))
        columns = np.arange(len(resting), len(histories))
        histories.show(choice, at, columns, (commits[0], commits[1]), step, round_)
        histories.record.log_weight[:, columns] = weight
        return columns

    def _lay_out(
        self, missing: IntArray, possible: BoolArray, held: int
    ) -> tuple[IntArray, tuple[IntArray, IntArray]]:
        """What members of one kind may do; missing and possible have shape (2, A).

        Returns parents and numbers to plus and to minus, shape (B,).
        """
        if not self._settle:
            fits = np.flatnonzero((possible | (missing == 0)).all(axis=0))
            return fits, (missing[0, fits], missing[1, fits])
        plus, minus = np.where(possible, missing, 0) + 1
        ways = plus * minus
        if ways.sum() + held > self._ways:
            raise TooMany(
                f"there are more than {self._ways:,} ways in which the rounds of a step can have "
                "added up to what is recorded; follow a shorter record, or make the crowd smaller"
            )
        parent = np.repeat(np.arange(len(ways)), ways)
        number = np.arange(len(parent)) - np.repeat(np.cumsum(ways) - ways, ways)
        return parent, (number // minus[parent], number % minus[parent])


class Followed:
    """What a member of a crowd has been shown so far, step by step.

    Parameters
    ----------
    crowd : Crowd
    kind : int
        Which kind the member is of.
    prior : float
        Log-odds of plus (nats).
    horizon : int
    exchange : {"once", "settle"}
    most : int
        Ways in which a record may have come about that are held.

    Raises
    ------
    ModelError
        Where an argument is not allowed.
    """

    def __init__(
        self,
        crowd: Crowd,
        kind: int,
        prior: float,
        horizon: int,
        exchange: str,
        most: int = MOST_WAYS,
    ) -> None:
        check_play(crowd, prior, horizon, exchange)
        self._given = (crowd, kind, prior, horizon, exchange, most)
        self._crowd, self._horizon, self._most = crowd, horizon, most
        self._settle, self._prior = exchange == "settle", prior
        self._step, label = 0, np.zeros(1, dtype=np.int64)
        self._histories = Histories(crowd, prior, horizon, label, kind, lasting=True)
        self._others = np.array([one.size - (k == kind) for k, one in enumerate(crowd.kinds)])
        self._asked: list[IntArray] = [np.zeros((2, len(crowd.kinds)), dtype=np.int64)]

    @property
    def steps(self) -> int:
        """How many steps have ended."""
        return len(self._asked) - 1

    @property
    def ways(self) -> int:
        """In how many ways the record may have come about; 0 where it is impossible."""
        return len(self._histories)

    def go_on(self, plus: IntArray, minus: IntArray) -> None:
        """One more step, after which so many others of each kind show plus and minus, shape (K,).

        Raises
        ------
        ModelError
            Where the record is impossible already, the horizon is past, fewer have answered than
            before or more than there are; the kind ``TooMany`` where it may have come about in too
            many ways.
        """
        asked = np.stack([plus, minus])
        if not self.ways or self.steps == self._horizon:
            raise ModelError("the record has no further step under the model")
        if (asked < self._asked[-1]).any() or (asked.sum(axis=0) > self._others).any():
            raise ModelError("counts of answers never fall and never exceed the others of a kind")
        self._asked.append(asked)
        self._play_step(Agreeing(self._crowd.size, self._most, self._settle, asked))
        record = self._histories.record
        agree = (record.plus == plus[:, None]) & (record.minus == minus[:, None])
        self._histories.take(np.flatnonzero(agree.all(axis=0)))

    def log_shown(self) -> FloatArray:
        """Log probability of what is recorded given plus and given minus, shape (2,)."""
        total: FloatArray = np.logaddexp.reduce(
            self._histories.record.log_weight, axis=1, initial=-np.inf
        )
        return total

    def worth(self) -> float:
        """What is recorded is worth so much to the member (nats).

        Raises
        ------
        ModelError
            Where it is impossible.
        """
        plus, minus = self.log_shown()
        if not self.ways:
            raise ModelError("what is recorded is impossible under the model and worth nothing")
        return float(plus - minus)

    def first_answers(self) -> dict[tuple[int, int], float]:
        """How many said plus, and minus, at the very moment of the first answer.

        Returns the probability of each pair of numbers given the record, under the prior.
        """
        record = self._histories.record
        weight = np.logaddexp(record.log_weight[0] + self._prior, record.log_weight[1])
        share = np.exp(weight - np.logaddexp.reduce(weight, initial=-np.inf))
        found: dict[tuple[int, int], float] = {}
        pairs = zip(record.first_plus.tolist(), record.first_minus.tolist(), strict=True)
        for pair, part in zip(pairs, share.tolist(), strict=True):
            found[pair] = found.get(pair, 0.0) + part
        return dict(sorted(found.items()))

    def allowed(self) -> set[tuple[tuple[int, ...], tuple[int, ...]]] | None:
        """What the last step might have ended with after all that came before it.

        Returns pairs of how many others of each kind show plus and minus; None where they are too
        many to lay out.
        """
        before = Followed(*self._given)
        for plus, minus in self._asked[1:-1]:
            before.go_on(plus, minus)
        try:
            before._play_step(Enumerated(self._crowd.size, 0.0, self._most))
        except TooMany:
            return None
        record = before._histories.record
        plus, minus = record.plus.T.tolist(), record.minus.T.tolist()
        return {(tuple(a), tuple(b)) for a, b in zip(plus, minus, strict=True)}

    def _play_step(self, course: Course) -> None:
        """Observations and rounds of the step that the record has come to."""
        histories, round_ = self._histories, 0
        self._step += 1
        histories.observe(self._step)
        columns: IntArray = np.arange(len(histories))
        while len(columns):
            choice = histories.decide(columns, round_)
            columns = course.go_on(histories, choice, self._step, round_)
            if not self._settle:
                break
            round_ += 1
