"""How public histories of a crowd go on: into all that may follow, or into one that is drawn.

Enumeration keeps count histories: how many of each kind committed to what, in which round. Which
members they were does not matter, so a history stands for all of that shape, with the multinomial
number of them in its weight. Sampling draws the counts; the numbers drawn per round do not depend
on the size of the crowd.
"""

from __future__ import annotations

from abc import ABC, abstractmethod
from collections.abc import Callable, Iterator
from functools import lru_cache

import numpy as np

from thumbwright.exact.arrays import BoolArray, FloatArray, IntArray
from thumbwright.exact.crowd_play import Choice, Histories, times
from thumbwright.exact.crowd_record import Record
from thumbwright.exact.errors import ModelError

Watch = Callable[[int, int, Histories], None]
"""Told step, round and the histories before anybody decides."""

MOST = 1_000_000
"""Public histories that an enumeration holds unless told otherwise."""

_BLOCK = 2_000
"""Sampled histories that are played side by side."""

_AT_ONCE = 1_000_000
"""Continuations that are laid out at a time, most of which may be dropped."""


class TooMany(ModelError):
    """There are more histories than may be held; sampling them is a way out."""


class Course(ABC):
    """One way of going on."""

    @abstractmethod
    def go_on(self, histories: Histories, choice: Choice, step: int, round_: int) -> IntArray:
        """Show what is shown in a round; returns the histories in which another round follows."""

    def end(self, record: Record) -> None:
        """Told of histories that are over."""


class Rounds:
    """How many rounds each step has in a play: a watch that counts them."""

    def __init__(self) -> None:
        self._of: dict[int, int] = {}

    def __call__(self, step: int, round_: int, histories: Histories) -> None:
        """One more round has come."""
        self._of[step] = max(self._of.get(step, 0), round_ + 1)

    def goes_on(self, step: int, round_: int) -> bool:
        """Whether the step has a round after this one."""
        return round_ + 1 < self._of.get(step, 0)


def play(
    histories: Histories,
    course: Course,
    horizon: int,
    settle: bool,
    watch: Watch | None = None,
    rounds: Rounds | None = None,
    chosen: Callable[[Histories, Choice], None] | None = None,
) -> Record:
    """Play to the horizon and return what has happened in all histories that are over.

    Parameters
    ----------
    histories : Histories
    course : Course
    horizon : int
    settle : bool
    watch : callable, optional
        Told about every round.
    rounds : Rounds, optional
        If given, every history has at least these rounds, and all have the rounds that one has:
        then each moment of the model can be told of whole.
    chosen : callable, optional
        Told, in every round, what may happen in it.

    Raises
    ------
    ModelError
        Where nothing is left of what was to be played.
    """
    ends = []
    for step in range(1, horizon + 1):
        histories.observe(step)
        columns, round_ = np.arange(len(histories)), 0
        while len(columns):
            if watch:
                watch(step, round_, histories)
            choice = histories.decide(columns, round_)
            if chosen:
                chosen(histories, choice)
            columns = course.go_on(histories, choice, step, round_)
            if not settle:
                break
            if rounds and (len(columns) or rounds.goes_on(step, round_)):
                columns = np.arange(len(histories))
            round_ += 1
        if step == horizon:
            histories.lean()
        going = histories.going_on()
        over = np.ones_like(going) if step == horizon else ~going
        if over.any():
            ends.append(histories.over(over))
            course.end(ends[-1])
            histories.take(~over)
        if not len(histories):
            break
    if not ends:
        raise ModelError(
            "every public history was less likely than what is to be dropped; drop less, or sample "
            "histories instead"
        )
    return Record.join(ends)


class Sampled(Course):
    """Draws one continuation of every history; the first ``half`` labels are given plus."""

    def __init__(self, rng: np.random.Generator, half: int) -> None:
        self._rng, self._half = rng, half

    def go_on(self, histories: Histories, choice: Choice, step: int, round_: int) -> IntArray:
        """Draw who goes on undecided, then who of the others says plus."""
        at = np.flatnonzero(choice.open)
        columns = choice.columns[at]
        if len(at):
            given = (histories.record.label[columns] >= self._half).astype(np.int64)
            chance = np.exp(choice.log_share[:, :, given, at])
            number = histories.free[:, columns]
            leave = chance[:, :2].sum(axis=1)
            stay = _share(chance[:, 2], leave + chance[:, 2])
            leaving = number - self._rng.binomial(number, stay)
            plus = self._rng.binomial(leaving, _share(chance[:, 0], leave))
            histories.show(choice, at, columns, (plus, leaving - plus), step, round_)
        return columns


def half_of(histories: int) -> int:
    """Half of the histories that are to be sampled.

    Raises
    ------
    ModelError
        Where they have no halves, or too few to say how far off they may be.
    """
    if histories < 4 or histories % 2:
        raise ModelError(
            f"the number of histories to sample must be even and at least 4, not {histories}"
        )
    return histories // 2


def blocks(histories: int) -> Iterator[IntArray]:
    """The labels of sampled histories, as many at a time as are played side by side."""
    for start in range(0, histories, _BLOCK):
        yield np.arange(start, min(start + _BLOCK, histories))


def balanced(ratio: FloatArray) -> FloatArray:
    """Weights given plus and given minus, shape (2, H), of histories drawn half given each.

    Parameters
    ----------
    ratio : ndarray of float, shape (H,)
        Log ratio (nats) of the probability of each history given plus and given minus.
    """
    # That is 2 / (1 + e^-x), without overflow.
    return np.asarray(2.0 * np.exp(-np.logaddexp(0.0, np.stack([-ratio, ratio]))))


def _share(part: FloatArray, whole: FloatArray) -> FloatArray:
    return np.minimum(np.divide(part, whole, out=np.zeros_like(part), where=whole > 0), 1.0)


class Enumerated(Course):
    """Goes on with every continuation, but for those of small probability under both answers.

    Parameters
    ----------
    size : int
        Agents in the crowd.
    drop : float
        Probability below which a history is dropped.
    most : int
        TooMany is raised where more histories than this would be held.

    Attributes
    ----------
    dropped : ndarray of float, shape (2,)
        Probability of all that was dropped, given plus and given minus.
    """

    def __init__(self, size: int, drop: float, most: int) -> None:
        if not 0.0 <= drop < 1.0:
            raise ModelError(
                f"what may be dropped is a probability from 0 to below 1, not {drop:g}"
            )
        self._log_drop = np.log(drop) if drop else -np.inf
        self._drop, self._most, self._over = drop, most, 0
        logs = np.log(np.arange(1, size + 1))
        self._log_factorial = np.concatenate([[0.0], np.cumsum(logs)])
        self.dropped: FloatArray = np.zeros(2)

    def end(self, record: Record) -> None:
        """Histories that are over are still held."""
        self._over += len(record.label)

    def go_on(self, histories: Histories, choice: Choice, step: int, round_: int) -> IntArray:
        """Lay out all continuations, one kind after another."""
        still = np.ones(len(histories), dtype=bool)
        still[choice.columns[choice.open]] = False
        resting = np.flatnonzero(still)
        at = np.flatnonzero(choice.open)
        if not len(at):
            return at
        weight = histories.record.log_weight[:, choice.columns[at]]
        commits = (np.zeros((0, len(at)), dtype=np.int64),) * 2
        for k in range(len(choice.log_share)):
            free = histories.free[k, choice.columns]
            parent, plus, minus, weight = self._spread(
                choice.log_share[k], free, at, weight, self._over + len(resting)
            )
            at = at[parent]
            commits = (
                np.concatenate([commits[0][:, parent], plus[None]]),
                np.concatenate([commits[1][:, parent], minus[None]]),
            )
        histories.take(np.concatenate([resting, choice.columns[at]]))
        columns = np.arange(len(resting), len(histories))
        histories.show(choice, at, columns, commits, step, round_)
        histories.record.log_weight[:, columns] = weight
        return columns

    def _spread(
        self, log_share: FloatArray, free: IntArray, at: IntArray, weight: FloatArray, held: int
    ) -> tuple[IntArray, IntArray, IntArray, FloatArray]:
        """What the free members of one kind may do.

        Returns parents (positions in ``at``), numbers to plus and to minus, and log weights, of
        what is kept.
        """
        if not len(at):
            return at, at, at, weight
        possible = np.isfinite(log_share).any(axis=1)
        code = np.concatenate([free[None], possible])[:, at]
        cases, case = np.unique(code, axis=1, return_inverse=True)
        found: list[tuple[IntArray, IntArray, IntArray, FloatArray]] = []
        for number, (n, *ways) in enumerate(cases.T):
            plus, minus = _ways(int(n), bool(ways[0]), bool(ways[1]), bool(ways[2]))
            here = np.flatnonzero(case.ravel() == number)
            size = max(1, _AT_ONCE // len(plus))
            for start in range(0, len(here), size):
                part = here[start : start + size]
                parent = np.repeat(part, len(plus))
                a, b = np.tile(plus, len(part)), np.tile(minus, len(part))
                found.append(self._weigh(log_share, int(n), at, weight, (parent, a, b)))
                held += len(found[-1][0])
                if held > self._most:
                    raise TooMany(
                        f"more than {self._most:,} public histories of this crowd would be held; "
                        "drop the least likely ones, sample histories instead, or shorten the "
                        "horizon"
                    )
        parents, pluses, minuses, weights = zip(*found, strict=True)
        return (
            np.concatenate(parents),
            np.concatenate(pluses),
            np.concatenate(minuses),
            np.concatenate(weights, axis=1),
        )

    def _weigh(
        self,
        log_share: FloatArray,
        n: int | IntArray,
        at: IntArray,
        weight: FloatArray,
        laid: tuple[IntArray, IntArray, IntArray],
    ) -> tuple[IntArray, IntArray, IntArray, FloatArray]:
        """Weigh what is laid out and drop what is impossible or too unlikely."""
        parent, plus, minus = laid
        rest = n - plus - minus
        share = log_share[:, :, at[parent]]
        log = self._log_factorial
        ways = log[n] - log[plus] - log[minus] - log[rest]
        new = weight[:, parent] + ways
        for number, one in zip((plus, minus, rest), share, strict=True):
            new = new + times(number, one)
        keep: BoolArray = np.asarray(new.max(axis=0) > -np.inf)
        if self._drop:
            small = new.max(axis=0) < self._log_drop
            self.dropped += np.exp(new[:, small]).sum(axis=1)
            keep &= ~small
        return parent[keep], plus[keep], minus[keep], new[:, keep]


@lru_cache(maxsize=512)
def _ways(n: int, plus: bool, minus: bool, rest: bool) -> tuple[IntArray, IntArray]:
    """All numbers of n members to plus and to minus, where these and going on are possible."""
    a, b = np.meshgrid(
        np.arange(n + 1 if plus else 1), np.arange(n + 1 if minus else 1), indexing="ij"
    )
    fits = a + b <= n if rest else a + b == n
    return a[fits], b[fits]
