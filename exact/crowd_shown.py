"""All that one member of a crowd may be shown, itself made to show undecided, as a tree.

This is what a rule on counts is distilled from and played on. Until it answers the member shows
"undecided", whatever rule it goes by, so what the others do, and how likely it is, is the same for
every rule: the tree is played once, and each rule is then a walk along it (``crowd_adopt``).

The member goes on showing undecided to the horizon, also where exact play would leave it no chance
of that. Others then take its silence for no news.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from functools import cached_property

import numpy as np

from thumbwright.exact.arrays import BoolArray, FloatArray, IntArray
from thumbwright.exact.crowd_among import Among
from thumbwright.exact.crowd_course import (
    MOST,
    Enumerated,
    Sampled,
    TooMany,
    balanced,
    blocks,
    half_of,
    play,
)
from thumbwright.exact.crowd_figures import Weights
from thumbwright.exact.crowd_kinds import Crowd, Kind, check_play
from thumbwright.exact.crowd_play import Choice, Histories
from thumbwright.exact.crowd_policy import CrowdPolicy, InPublic
from thumbwright.exact.crowd_record import Record
from thumbwright.exact.errors import ModelError
from thumbwright.exact.evidence.law import Law

Policies = Sequence[CrowdPolicy | None] | None


@dataclass(frozen=True)
class Showing(InPublic):
    """One round of one step: all histories that the member may have been shown before it.

    Attributes
    ----------
    parent : ndarray of int, shape (H,)
        Which history of the round before each goes on from; zeros at the first.
    log_shown : ndarray of float, shape (2, H)
        Log probability of the history given plus and given minus; zeros where sampled.
    worth : ndarray of float, shape (H,)
        Exact worth (nats); nan where the member's own play leaves it no chance to be undecided.
    log_still : ndarray of float, shape (2, H)
        Log probability that the member is still undecided.
    may : ndarray of bool, shape (2, H)
        Whether the others' model allows the member to say plus, to say minus in this round.
    waiting : ndarray of float, shape (2, H)
        Expected number of others that are undecided after this round.
    """

    parent: IntArray
    log_shown: FloatArray
    worth: FloatArray
    log_still: FloatArray
    may: BoolArray
    waiting: FloatArray


@dataclass(frozen=True)
class Shown:
    """What a member of one kind may be shown.

    Attributes
    ----------
    crowd : Crowd
    kind : int
    prior : float
        Log-odds of plus (nats).
    horizon : int
    exchange : {"once", "settle"}
    parts : tuple of tuple of Showing
        Enumerated histories are one part; sampled ones come in several, one after another, each
        with all of its moments.
    weight : ndarray of float, shape (2, H), or None
        Weights of sampled histories given plus and given minus, over all parts; None if enumerated.
    half : ndarray of bool, shape (H,), or None
        Which sampled histories were drawn given plus.
    dropped : tuple of two floats
        Probability given plus and given minus of the histories that were dropped.
    odd : tuple of two floats
        Expected number of times that exact members, still undecided, were shown an answer of
        another that their model calls impossible just then; given plus and given minus.
    law : Law or None
        What the member's own observations are really like; None is what it takes them for.
    """

    crowd: Crowd
    kind: int
    prior: float
    horizon: int
    exchange: str
    parts: tuple[tuple[Showing, ...], ...]
    weight: FloatArray | None
    half: BoolArray | None
    dropped: tuple[float, float]
    odd: tuple[float, float] = (0.0, 0.0)
    law: Law | None = None

    @property
    def member(self) -> Kind:
        """The kind that the member is of."""
        return self.crowd.kinds[self.kind]

    @cached_property
    def weights(self) -> Weights | None:
        """Weighted sums over sampled histories; None if enumerated."""
        return None if self.weight is None else Weights(self.weight, self.half)

    @property
    def sampled(self) -> bool:
        """Whether histories were sampled."""
        return self.weight is not None

    @property
    def prior_plus(self) -> float:
        """Prior probability of plus."""
        return float(1.0 / (1.0 + np.exp(-self.prior)))


def enumerate_shown(
    crowd: Crowd,
    kind: int,
    prior: float,
    horizon: int,
    exchange: str,
    drop: float = 0.0,
    most: int = MOST,
    policies: Policies = None,
    sorts: Sequence[int] | None = None,
    laws: Sequence[Law | None] | None = None,
    taken_for: Sequence[Kind] | None = None,
) -> Shown:
    """Everything that a member of one kind may be shown.

    Parameters
    ----------
    crowd, prior, horizon, exchange, drop
        As for ``enumerate_crowd``.
    kind : int
        Which kind the member is of.
    most : int
        Histories, and entries of the tree, that may be held.
    policies : sequence, optional
        As for ``Histories``: what each kind goes by, and all know.
    sorts : sequence of int, optional
        If given, nobody knows: exact members take everybody for exact, as in ``Among``, and the
        worth of a history is what they take it to be.
    laws, taken_for : sequence, optional
        As for ``Among``, with ``sorts``: what observations are really like, and what each sort of
        members is taken for.

    Raises
    ------
    ModelError
        Where an argument is not allowed; the kind ``TooMany`` where more would be held.
    """
    _check(crowd, kind, prior, horizon, exchange)
    course, tree = Enumerated(crowd.size, drop, most), _Tree(kind, most)
    labels = np.zeros(1, dtype=np.int64)
    histories = _histories(crowd, prior, horizon, labels, kind, policies, sorts, laws, taken_for)
    record = tree.grow(histories, course, exchange)
    odd = (np.exp(record.log_weight) * record.odd).sum(axis=1)
    return Shown(
        crowd,
        kind,
        prior,
        horizon,
        exchange,
        parts=(tuple(tree.showings),),
        weight=None,
        half=None,
        dropped=_two(course.dropped),
        odd=_two(odd),
        law=laws[kind] if laws else None,
    )


def sample_shown(
    crowd: Crowd,
    kind: int,
    prior: float,
    horizon: int,
    exchange: str,
    histories: int,
    seed: int,
    policies: Policies = None,
    sorts: Sequence[int] | None = None,
    laws: Sequence[Law | None] | None = None,
    taken_for: Sequence[Kind] | None = None,
) -> Shown:
    """What a member of one kind is shown along sampled public histories, half given each answer.

    Parameters
    ----------
    crowd, prior, horizon, exchange, histories, seed
        As for ``sample_crowd``.
    kind : int
        Which kind the member is of.
    policies : sequence, optional
        As for ``Histories``: what each kind goes by, and all know.
    sorts : sequence of int, optional
        If given, nobody knows: exact members take everybody for exact, as in ``Among``, and the
        worth of a history is what they take it to be.
    laws, taken_for : sequence, optional
        As for ``Among``, with ``sorts``: what observations are really like, and what each sort of
        members is taken for.

    Raises
    ------
    ModelError
        Where an argument is not allowed.
    """
    _check(crowd, kind, prior, horizon, exchange)
    half = half_of(histories)
    course, parts, records = Sampled(np.random.default_rng(seed), half), [], []
    for labels in blocks(histories):
        tree = _Tree(kind, None)
        batch = _histories(crowd, prior, horizon, labels, kind, policies, sorts, laws, taken_for)
        records.append(tree.grow(batch, course, exchange))
        parts.append(tuple(tree.showings))
    record = Record.join(records)
    weight = balanced(record.ratio) / histories
    drawn_plus = np.arange(histories) < half
    return Shown(
        crowd,
        kind,
        prior,
        horizon,
        exchange,
        parts=tuple(parts),
        weight=weight,
        half=drawn_plus,
        dropped=(0.0, 0.0),
        odd=_two(Weights(weight, drawn_plus).mean(record.odd)[0]),
        law=laws[kind] if laws else None,
    )


def _two(pair: FloatArray) -> tuple[float, float]:
    return float(pair[0]), float(pair[1])


def _check(crowd: Crowd, kind: int, prior: float, horizon: int, exchange: str) -> None:
    check_play(crowd, prior, horizon, exchange)
    if not 0 <= kind < len(crowd.kinds):
        raise ModelError(f"the crowd has {len(crowd.kinds)} kinds, counted from 0; not {kind}")


def _histories(
    crowd: Crowd,
    prior: float,
    horizon: int,
    labels: IntArray,
    kind: int,
    policies: Policies,
    sorts: Sequence[int] | None,
    laws: Sequence[Law | None] | None,
    taken_for: Sequence[Kind] | None,
) -> Histories:
    given = (crowd, prior, horizon, labels, kind, True)
    if sorts is None:
        return Histories(*given, policies, laws)
    return Among(*given, policies or (None,) * len(crowd.kinds), sorts, laws, taken_for)


@dataclass
class _Tree:
    """Writes down every round of a play."""

    kind: int
    most: int | None
    showings: list[Showing] = field(default_factory=list)
    _held: int = 0
    _log_still: FloatArray = field(default_factory=lambda: np.zeros((2, 0)))
    _worth: FloatArray = field(default_factory=lambda: np.zeros(0))
    _moment: tuple[int, int] = (0, 0)

    def grow(self, histories: Histories, course: Enumerated | Sampled, exchange: str) -> Record:
        """Play; returns what has happened in the end."""
        settle = exchange == "settle"
        horizon = histories.horizon
        return play(histories, course, horizon, settle, self.before, chosen=self.decided)

    def before(self, step: int, round_: int, histories: Histories) -> None:
        """What is known before anybody decides."""
        self._moment = (step, round_)
        self._log_still = histories.log_left[self.kind].copy()
        worth = histories.worth(self.kind, np.arange(len(histories)))
        self._worth = np.where(np.isfinite(self._log_still).any(axis=0), worth, np.nan)

    def decided(self, histories: Histories, choice: Choice) -> None:
        """What may happen, before it is carried out."""
        size, record = len(histories), histories.record
        self._held += size
        if self.most is not None and self._held > self.most:
            raise TooMany(
                f"more than {self.most:,} situations would be held; drop the least likely "
                "histories, sample histories instead, or shorten the horizon"
            )
        may = np.full((2, size), histories.by_policies)
        may[:, choice.columns] = histories.allowed(choice, self.kind)
        stay = np.ones((len(choice.log_share), 2, size))
        stay[..., choice.columns] = np.exp(choice.log_share[:, 2])
        waiting = (histories.free[histories.reads, None] * stay[histories.reads]).sum(axis=0)
        self.showings.append(
            Showing(
                *self._moment,
                plus=record.plus.copy(),
                minus=record.minus.copy(),
                first=record.first.copy(),
                last=record.last.copy(),
                first_plus=record.first_plus.copy(),
                first_minus=record.first_minus.copy(),
                parent=record.origin.copy() if self.showings else np.zeros(size, dtype=np.int64),
                log_shown=record.log_weight.copy(),
                worth=self._worth,
                log_still=self._log_still,
                may=may,
                waiting=waiting,
            )
        )
        record.origin[:] = np.arange(size)
