"""What has happened in public histories of a crowd, many side by side."""

from __future__ import annotations

from dataclasses import dataclass, fields
from typing import Any

import numpy as np
from numpy.typing import NDArray

from thumbwright.exact.arrays import BoolArray, FloatArray, IntArray


@dataclass
class Record:
    """What has happened so far in each of H public histories; the last axis is the history.

    Attributes
    ----------
    label : ndarray of int, shape (H,)
        Number of the sampled history; 0 where histories are enumerated.
    log_weight : ndarray of float, shape (2, H)
        Log probability given plus and given minus; not kept up where histories are sampled.
    plus, minus : ndarray of int, shape (K, H)
        Members of each kind that have committed.
    steps : ndarray of int, shape (K, H)
        Sum of the steps at which they did.
    first, first_round, last : ndarray of int, shape (H,)
        Step and round of the first commitment and step of the last so far; 0 where there is none.
    followers : ndarray of int, shape (H,)
        Commitments in the step of the first, after its round.
    first_plus, first_minus : ndarray of int, shape (H,)
        Commitments to plus and to minus at the very moment of the first.
    origin : ndarray of int, shape (H,)
        Where the history, or the one it goes on from, stood when this was last written down.
    odd : ndarray of float, shape (H,)
        How often exact members, still undecided, were shown an answer that their model calls
        impossible just then.
    near : ndarray of float, shape (2, H)
        Expected number of members decided by the tie rule and no clear margin, given the history.
    lean : ndarray of float, shape (K, 3, 2, H)
        Expected number undecided at the horizon whose belief favours plus, minus, neither; given
        plus and given minus.
    ratio : ndarray of float, shape (H,)
        Log ratio (nats) of the probability given plus and given minus, once the history is over.
    """

    label: IntArray
    log_weight: FloatArray
    plus: IntArray
    minus: IntArray
    steps: IntArray
    first: IntArray
    first_round: IntArray
    last: IntArray
    followers: IntArray
    first_plus: IntArray
    first_minus: IntArray
    origin: IntArray
    odd: FloatArray
    near: FloatArray
    lean: FloatArray
    ratio: FloatArray

    @classmethod
    def blank(cls, kinds: int, label: IntArray) -> Record:
        """Nothing has happened yet."""
        size = len(label)
        sizes = {"plus": (kinds, size), "minus": (kinds, size), "steps": (kinds, size)}
        names = ("first", "first_round", "last", "followers", "first_plus", "first_minus", "origin")
        times = dict.fromkeys(names, (size,))
        whole = {name: np.zeros(shape, dtype=np.int64) for name, shape in (sizes | times).items()}
        return cls(
            label=label,
            log_weight=np.zeros((2, size)),
            odd=np.zeros(size),
            near=np.zeros((2, size)),
            lean=np.zeros((kinds, 3, 2, size)),
            ratio=np.zeros(size),
            **whole,
        )

    def take(self, index: IntArray | BoolArray) -> Record:
        """The chosen histories, some perhaps several times."""
        return Record(**{name: array[..., index] for name, array in self.arrays().items()})

    def note(
        self, columns: IntArray, plus: IntArray, minus: IntArray, step: int, round_: int
    ) -> None:
        """Count commitments, shape (K, number of columns), of one round."""
        self.plus[:, columns] += plus
        self.minus[:, columns] += minus
        self.steps[:, columns] += step * (plus + minus)
        total = (plus + minus).sum(axis=0)
        moved, number = columns[total > 0], total[total > 0]
        new = self.first[moved] == 0
        at_once = ~new & (self.first[moved] == step)
        self.followers[moved[at_once]] += number[at_once]
        self.first[moved[new]], self.first_round[moved[new]] = step, round_
        for came, said in ((self.first_plus, plus), (self.first_minus, minus)):
            came[moved[new]] = said.sum(axis=0)[total > 0][new]
        self.last[moved] = step

    def arrays(self) -> dict[str, NDArray[Any]]:
        """All of them by name."""
        return {field.name: getattr(self, field.name) for field in fields(self)}

    @staticmethod
    def join(records: list[Record]) -> Record:
        """All histories of several records."""
        parts = [record.arrays() for record in records]
        return Record(
            **{name: np.concatenate([part[name] for part in parts], axis=-1) for name in parts[0]}
        )
