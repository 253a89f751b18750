"""One agent's private walk: its own tally, one observation at a time, for every seen history.

The walk holds sub-probabilities of being still undecided with a given own count, for each
history that the agent may have been shown. Rows are lattice points of the own count (kept only
where there is mass), columns are seen histories; the layout is ``[rows, histories]`` so that a
step is a few shifted additions at memory speed.

Under plus and minus the mass at tally y differs by the factor e^y exactly, so one measure m is
held, q+ = m e^(y/2) and q- = m e^(-y/2) (see ``evidence.base``). Columns that grow small are
rescaled and the scale kept as a logarithm: nothing underflows, however long the silence.

Where others do not know the agent's thresholds, each possibility is a block of rows of its own
with its own thresholds.

An agent may be mistaken about its observations. Then the measure and its two masses follow the law
of what it really observes, and the tally, which is what it believes, the evidence that it takes
them for (see ``astray``).
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import TypeVar

import numpy as np
from numpy.typing import NDArray

from thumbwright.exact.arrays import BoolArray, FloatArray, IntArray
from thumbwright.exact.evidence.base import Evidence
from thumbwright.exact.evidence.law import Law, as_believed
from thumbwright.exact.group import Thresholds

TIE = 1e-9
"""A belief within this many nats of a threshold has reached it: part of the model."""

NEAR = 1e-12
"""Decisions further than this from a threshold, but within TIE, are reported as near ties."""

Kind = TypeVar("Kind", bound=np.generic)

_BLOCK = np.int64(1) << 52
_SMALL = 1e-120
_FEW = 8
_NARROW = 4
_SLAB = 512
_HALVES = np.array([[0.5], [-0.5]])


class Walk:
    """The walk of one agent over all seen histories at once.

    Attributes
    ----------
    count : ndarray of int, shape (R,)
        Own count S of each row on a ladder; on a lattice of several axes a code of the counts.
    tally : ndarray of float, shape (R,)
        Sum of the worths of the own observations (nats) of each row, as the agent takes them.
    bars : ndarray of float, shape (2, R)
        Thresholds on the belief (nats) that hold for each row, the lower ones first.
    mass : ndarray of float, shape (R, C)
        The measure m of each row and column, before ``exp(log_scale)``.
    log_scale : ndarray of float, shape (C,)
    observed : int
        Own observations made so far.
    """

    def __init__(
        self,
        evidence: Evidence,
        thresholds: tuple[tuple[float, Thresholds], ...],
        horizon: int,
        law: Law | None = None,
    ) -> None:
        self._evidence = evidence
        self._law = law or as_believed(evidence)
        self._mistaken = law is not None
        self._root_mass = np.sqrt(self._law.plus * self._law.minus)
        axes = evidence.alpha.shape[0]
        # On several axes all offsets are 0 or 1, so strides of horizon + 1 never run over.
        self._strides = (horizon + 1) ** np.arange(axes, dtype=np.int64)
        self._moves: IntArray = self._law.offsets @ self._strides
        self._bounds = np.array([[t.minus for _, t in thresholds], [t.plus for _, t in thresholds]])
        blocks = np.arange(len(thresholds), dtype=np.int64)
        self._code: IntArray = blocks * _BLOCK + _BLOCK // 2
        self.mass: FloatArray = np.array([[share] for share, _ in thresholds], dtype=float)
        self.log_scale: FloatArray = np.zeros(1)
        self.observed = 0
        self._describe()

    @property
    def low(self) -> FloatArray:
        """Lower threshold on the belief (nats) of each row, shape (R,)."""
        lower: FloatArray = self.bars[0]
        return lower

    @property
    def high(self) -> FloatArray:
        """Upper threshold on the belief (nats) of each row, shape (R,)."""
        upper: FloatArray = self.bars[1]
        return upper

    def _describe(self) -> None:
        block, inner = np.divmod(self._code, _BLOCK)
        self.count: IntArray = inner - _BLOCK // 2
        self.bars: FloatArray = self._bounds[:, block]
        self.tally: FloatArray = self._valued(self._evidence)
        real = self._valued(self._law) if self._mistaken else self.tally
        # Row 0 turns the measure into mass given plus, row 1 into mass given minus.
        self._given: FloatArray = np.exp(_HALVES * real)

    def _valued(self, evidence: Evidence | Law) -> FloatArray:
        """What the own observations of each row are worth as this evidence (nats), shape (R,)."""
        alpha, steps = evidence.alpha, evidence.beta * self.observed
        if len(alpha) == 1:
            ladder: FloatArray = alpha[0] * self.count + steps
            return ladder
        rest, tally = self.count.copy(), np.full(len(self.count), 0.0)
        for stride, worth in zip(self._strides[::-1], alpha[::-1], strict=True):
            taken, rest = np.divmod(rest, stride)
            tally += taken * worth
        return tally + steps

    def observe(self) -> FloatArray:
        """Make one private observation.

        Returns
        -------
        ndarray of float, shape (2, 2, C)
            Log weight of having met certain evidence: axis 0 is the answer it proves (plus,
            minus), axis 1 the answer that is given; ``-inf`` throughout for ordinary evidence.
        """
        certain = np.full((2, 2, self.mass.shape[1]), -np.inf)
        proof = self._law.proof
        if proof.any():
            before = self.log_undecided()
            for side, given in np.argwhere(proof):
                certain[side, given] = before[given] + np.log(proof[side, given])
        if len(self._moves) > _FEW and len(self._code):
            self._move_many()
        else:
            self._move_each()
        self.observed += 1
        self._rescale()
        self._describe()
        return certain

    def _move_each(self) -> None:
        """One shifted addition per value: for evidence with few values, on any lattice."""
        codes = _distinct((self._code[:, None] + self._moves[None, :]).ravel())
        mass = np.zeros((len(codes), self.mass.shape[1]))
        for move, weight in zip(self._moves, self._root_mass, strict=True):
            target = np.searchsorted(codes, self._code + move)
            if len(target) and target[-1] - target[0] == len(target) - 1:
                mass[target[0] : target[-1] + 1] += weight * self.mass
            else:
                mass[target] += weight * self.mass
        self._code, self.mass = codes, mass

    def _move_many(self) -> None:
        """One matrix product per block: for evidence with many values, which is on a ladder."""
        low, width = int(self._moves[0]), int(self._moves[-1] - self._moves[0]) + 1
        kernel = np.zeros(width)
        kernel[self._moves - low] = self._root_mass
        codes, masses = [], []
        for block in np.unique(self._code // _BLOCK):
            rows = np.flatnonzero(self._code // _BLOCK == block)
            start, stop = int(self._code[rows[0]]), int(self._code[rows[-1]]) + 1
            dense = np.zeros((stop - start, self.mass.shape[1]))
            dense[self._code[rows] - start] = self.mass[rows]
            codes.append(np.arange(start + low, stop + low + width - 1, dtype=np.int64))
            if dense.shape[1] <= _NARROW:
                masses.append(np.stack([np.convolve(m, kernel) for m in dense.T], axis=1))
                continue
            # Row r of the band holds kernel[r - s] at source s. It is a view of overlapping rows,
            # which matrix products read quickly only once copied: a slab at a time.
            padded = np.pad(kernel[::-1], (stop - start - 1,))
            band = np.lib.stride_tricks.sliding_window_view(padded, stop - start)[::-1]
            slabs = range(0, len(band), _SLAB)
            masses += [np.ascontiguousarray(band[s : s + _SLAB]) @ dense for s in slabs]
        self._code, self.mass = np.concatenate(codes), np.concatenate(masses)

    def _rescale(self) -> None:
        if not self.mass.size:
            return
        peak = self.mass.max(axis=0)
        small = (peak < _SMALL) & (peak > 0)
        if small.any():
            self.mass[:, small] /= peak[small]
            self.log_scale = self.log_scale.copy()
            self.log_scale[small] += np.log(peak[small])

    def log_undecided(self, columns: IntArray | None = None) -> FloatArray:
        """Log probability of being still undecided, shape (2, C), given plus and given minus.

        Like the methods below it may be asked about some columns only, C then being their number.
        """
        return self._log(self._of(columns), columns)

    def log_where(self, rows: BoolArray, columns: IntArray | None = None) -> FloatArray:
        """Log mass of the chosen rows and columns, shape (2, C); ``rows`` has shape (R, C)."""
        return self._log(self._of(columns) * rows, columns)

    def cut(self, plus: BoolArray, minus: BoolArray, columns: IntArray | None = None) -> FloatArray:
        """Take out what commits to plus and to minus.

        Parameters
        ----------
        plus, minus : ndarray of bool, shape (R, C)
        columns : ndarray of int, shape (C,), optional
            The columns that the masks are about, if not all.

        Returns
        -------
        ndarray of float, shape (2, 2, C)
            Log weight of committing: axis 0 to plus, to minus; axis 1 given plus, given minus.
        """
        return self.divide(plus, minus, columns)[:2]

    def divide(
        self, plus: BoolArray, minus: BoolArray, columns: IntArray | None = None
    ) -> FloatArray:
        """As :meth:`cut`, with a third entry on axis 0: the log weight of what is left."""
        mass = self._of(columns)
        parts = np.empty((3, *mass.shape))
        for part, mask in zip(parts, (plus, minus, ~(plus | minus)), strict=True):
            np.multiply(mass, mask, out=part)  # much faster than copying where the mask holds
        divided = self._log(parts, columns)
        if columns is None:
            self.mass = parts[2]
            alive: BoolArray = np.asarray(self.mass.any(axis=1))
            if not alive.all():
                self._keep(alive)
        else:
            self.mass[:, columns] = parts[2]
        return divided

    @property
    def block(self) -> IntArray:
        """Which possibility each row belongs to, shape (R,)."""
        return np.asarray(self._code // _BLOCK)

    def carry(self, out: BoolArray, moved: Sequence[tuple[int, BoolArray]]) -> None:
        """Take out some mass, and carry other mass to the same own count of another possibility.

        Parameters
        ----------
        out : ndarray of bool, shape (R, C)
            What is taken out.
        moved : sequence of (int, ndarray of bool, shape (R, C))
            The possibility that mass goes to, and which; no mass is named twice.
        """
        codes, parts = [self._code], [np.where(out, 0.0, self.mass)]
        for block, mask in moved:
            rows = np.flatnonzero(mask.any(axis=1))
            parts[0][mask] = 0.0
            codes.append(self._code[rows] % _BLOCK + block * _BLOCK)
            parts.append(np.where(mask, self.mass, 0.0)[rows])
        self._code, row = np.unique(np.concatenate(codes), return_inverse=True)
        self.mass = np.zeros((len(self._code), self.mass.shape[1]))
        np.add.at(self.mass, row, np.concatenate(parts))
        alive = self.mass.any(axis=1)
        self._code, self.mass = self._code[alive], self.mass[alive]
        self._describe()

    def _keep(self, rows: BoolArray) -> None:
        self._code, self.mass = self._code[rows], self.mass[rows]
        self.count, self.tally = self.count[rows], self.tally[rows]
        self.bars, self._given = self.bars[:, rows], self._given[:, rows]

    def _of(self, columns: IntArray | None) -> FloatArray:
        return self.mass if columns is None else self.mass[:, columns]

    def grow(self, shape: tuple[int, ...], axis: int, extra: int) -> None:
        """Give ``extra`` new histories on one seen agent's axis a copy of its undecided slice.

        ``shape`` is the shape of the histories before; the product of it is C.
        """
        rows = len(self._code)
        self.log_scale = grown(self.log_scale.reshape(shape), axis, extra).ravel()
        mass = grown(self.mass.reshape(rows, *shape), axis + 1, extra)
        self.mass = mass.reshape(rows, len(self.log_scale))

    def _log(self, mass: FloatArray, columns: IntArray | None) -> FloatArray:
        scale = self.log_scale if columns is None else self.log_scale[columns]
        with np.errstate(divide="ignore"):
            return np.log(self._given @ mass) + scale


def grown(array: NDArray[Kind], axis: int, extra: int) -> NDArray[Kind]:
    """``array`` with ``extra`` copies of its slice 0 (undecided) appended along ``axis``."""
    if not extra:
        return array
    lengths, used = [*array.shape], array.shape[axis]
    lengths[axis] += extra
    longer = np.empty(lengths, dtype=array.dtype)
    # Seen with that axis first; this is much faster than joining the two for small arrays.
    new, old = longer.swapaxes(0, axis), array.swapaxes(0, axis)
    new[:used], new[used:] = old, old[:1]
    return longer


def _distinct(codes: IntArray) -> IntArray:
    """The different ones, ascending; for the few there are much faster than ``np.unique``."""
    codes.sort()
    fresh = np.ones(len(codes), dtype=bool)
    np.not_equal(codes[1:], codes[:-1], out=fresh[1:])
    return codes[fresh]
