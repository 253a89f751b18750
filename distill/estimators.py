"""The value forms as scikit-learn estimators: inputs in, worth in nats out.

``X`` has one situation per line and one whole number per input (a step, a code of a shown state, a
count); ``y`` says which answer is true there, the greater of two labels being plus; and
``sample_weight`` is the mass of that situation under that answer. So every situation of an agent is
listed twice, with y = 1 and its mass given plus, and with y = 0 and its mass given minus. What is
predicted is the worth of a situation: log odds, and neither a class nor a probability.

>>> import numpy as np
>>> from thumbwright.distill.estimators import WorthTable
>>> X, y = np.array([[0], [0], [1], [1]]), np.array([1, 0, 1, 0])
>>> WorthTable(rows=2).fit(X, y, sample_weight=[3, 1, 1, 1]).predict([[0], [1]]).round(4).tolist()
[1.0986, 0.0]

Importing this module imports scikit-learn.
"""

from __future__ import annotations

from abc import ABC, abstractmethod
from typing import Any, Self

import numpy as np
from numpy.typing import ArrayLike
from sklearn.base import BaseEstimator
from sklearn.utils import ClassifierTags, Tags
from sklearn.utils.multiclass import check_classification_targets
from sklearn.utils.validation import _check_sample_weight, check_is_fitted, validate_data

from thumbwright.distill.forms.boxes import Box, best_partitions
from thumbwright.distill.forms.fitting import fitted, log_loss
from thumbwright.distill.forms.table import MOST_BOXES
from thumbwright.distill.forms.tree import grown
from thumbwright.distill.situations import values_of
from thumbwright.exact.arrays import BoolArray, FloatArray, IntArray, sums


class _Worths(ABC, BaseEstimator):  # type: ignore[misc]
    """What the estimators share: checks of what comes in, and the score."""

    def fit(self, X: ArrayLike, y: ArrayLike, sample_weight: ArrayLike | None = None) -> Self:
        """Fit to weighted situations.

        Parameters
        ----------
        X : array-like, shape (n, d)
        y : array-like, shape (n,)
            Two labels; the greater is plus.
        sample_weight : array-like, shape (n,), optional
            Masses, not negative; those of 0 count for nothing.

        Raises
        ------
        ValueError
            Where there are not two labels with mass, or an input is not a finite number.
        """
        checked = validate_data(self, X, y, dtype=np.float64)
        inputs, label = np.asarray(checked[0], dtype=float), np.asarray(checked[1])
        check_classification_targets(label)
        weight = _check_sample_weight(sample_weight, inputs, ensure_non_negative=True)
        self.classes_ = np.unique(label)
        used = weight > 0
        if len(self.classes_) != 2 or len(np.unique(label[used])) != 2:
            raise ValueError(
                f"y has {len(np.unique(label[used]))} class label(s) with weight; a worth compares "
                "two answers, so two classes are needed"
            )
        is_plus = label[used] == self.classes_[1]
        plus, minus = np.where(is_plus, weight[used], 0.0), np.where(is_plus, 0.0, weight[used])
        self._learn(inputs[used], plus, minus)
        return self

    def predict(self, X: ArrayLike) -> FloatArray:
        """Worth of situations (nats), shape (n,); infinite where one answer was never met."""
        check_is_fitted(self)
        return self._worth(validate_data(self, X, dtype=np.float64, reset=False))

    def score(self, X: ArrayLike, y: ArrayLike, sample_weight: ArrayLike | None = None) -> float:
        """Mean log loss (nats) of the worths, negative: the greater the better."""
        worth, label = self.predict(X), np.asarray(y)
        weight = np.ones(len(label)) if sample_weight is None else np.asarray(sample_weight)
        is_plus = label == self.classes_[1]
        plus, minus = np.where(is_plus, weight, 0.0), np.where(is_plus, 0.0, weight)
        return -log_loss(worth, plus, minus) / float(weight.sum())

    def __sklearn_tags__(self) -> Tags:
        """Needs a target of two classes, and is nevertheless no classifier."""
        tags = super().__sklearn_tags__()
        tags.target_tags.required = True
        tags.classifier_tags = ClassifierTags(multi_class=False)
        return tags

    @abstractmethod
    def _learn(self, X: FloatArray, plus: FloatArray, minus: FloatArray) -> None:
        """Fit to masses given plus and given minus, shape (R,)."""

    @abstractmethod
    def _worth(self, X: FloatArray) -> FloatArray:
        """Worths (nats) of these inputs, shape (R,)."""


class _Boxed(_Worths):
    """Boxes of ordered cells: between neighbouring values of an input lies a possible cut."""

    cuts_: list[FloatArray]
    boxes_: tuple[Box, ...]
    values_: FloatArray

    def _cells(self, X: FloatArray) -> IntArray:
        pairs = zip(self.cuts_, X.T, strict=True)
        columns = [np.searchsorted(cuts, column, side="left") for cuts, column in pairs]
        return np.stack(columns, axis=1).astype(np.int64)

    def _valued(self, boxes: tuple[Box, ...], X: FloatArray, *sides: FloatArray) -> None:
        cell = self._cells(X)
        inside = [_in_box(cell, box) for box in boxes]
        self.boxes_ = boxes
        self.values_ = values_of(*(np.array([s[here].sum() for here in inside]) for s in sides))

    def _worth(self, X: FloatArray) -> FloatArray:
        cell, worth = self._cells(X), np.zeros(len(X))
        for box, value in zip(self.boxes_, self.values_, strict=True):
            worth[_in_box(cell, box)] = value
        return worth


def _in_box(cell: IntArray, box: Box) -> BoolArray:
    low, high = np.array(box).T
    return np.asarray(((cell >= low) & (cell < high)).all(axis=1))


def _cuts(column: FloatArray, most: int | None = None) -> FloatArray:
    """Midpoints of neighbouring values; of too many, evenly spread ones."""
    values = np.unique(column)
    middle: FloatArray = values[:-1] + (values[1:] - values[:-1]) / 2.0
    if most is None or len(middle) < most:
        return middle
    spread: FloatArray = middle[np.linspace(0, len(middle) - 1, most + 1).round().astype(int)[1:-1]]
    return spread


class WorthTable(_Boxed):
    """The most informative table: boxes by dynamic programming, values pooled.

    Parameters
    ----------
    rows : int
        Most rows.
    cells : int
        Inputs with more values than this are put into so many cells of about equally many values.
    """

    def __init__(self, rows: int = 6, cells: int = 40) -> None:
        self.rows = rows
        self.cells = cells

    def _learn(self, X: FloatArray, plus: FloatArray, minus: FloatArray) -> None:
        self.cuts_ = [_cuts(column, self.cells) for column in X.T]
        shape = tuple(len(cuts) + 1 for cuts in self.cuts_)
        boxes = float(np.prod([n * (n + 1) // 2 for n in shape], dtype=float))
        if boxes * self.rows > MOST_BOXES:
            raise ValueError(
                f"the table would be searched over {boxes:,.0f} boxes, which takes too long; give "
                "fewer inputs, fewer cells, or use WorthTree"
            )
        flat = np.ravel_multi_index(tuple(self._cells(X).T), shape)
        size = int(np.prod(shape))
        grids = [sums(flat, side, size).reshape(shape) for side in (plus, minus)]
        self._valued(best_partitions(grids[0], grids[1], self.rows)[-1].boxes, X, plus, minus)


class WorthTree(_Boxed):
    """A tree grown best first by log loss, values pooled.

    Parameters
    ----------
    rows : int
        Most leaves.
    """

    def __init__(self, rows: int = 6) -> None:
        self.rows = rows

    def _learn(self, X: FloatArray, plus: FloatArray, minus: FloatArray) -> None:
        self.cuts_ = [_cuts(column) for column in X.T]
        shape = tuple(len(cuts) + 1 for cuts in self.cuts_)
        self._valued(grown(self._cells(X), plus, minus, shape, self.rows), X, plus, minus)


class WorthFormula(_Worths):
    """A sum of terms: one number for each input, and one besides; fitted by log loss.

    Parameters
    ----------
    saturating : sequence of int
        Columns x that come in as x / (x + half), half being fitted; their values are 0 or more.
    constant : bool
        Whether there is a number besides those of the inputs.
    """

    def __init__(self, saturating: Any = (), constant: bool = True) -> None:
        self.saturating = saturating
        self.constant = constant

    def _learn(self, X: FloatArray, plus: FloatArray, minus: FloatArray) -> None:
        from scipy.optimize import minimize_scalar

        columns = list(self.saturating)
        self.half_: float | None = None
        if columns:
            if X[:, columns].min() < 0:
                raise ValueError(f"saturating: columns {columns} must not be negative")
            found = minimize_scalar(
                lambda size: self._fitted(X, plus, minus, float(np.exp(size)))[0],
                bounds=(np.log(0.01), np.log(2.0 * max(float(X[:, columns].max()), 1.0))),
                method="bounded",
            )
            self.half_ = float(np.exp(found.x))
        numbers = self._fitted(X, plus, minus, self.half_)[1]
        self.constant_ = float(numbers[-1]) if self.constant else 0.0
        self.numbers_ = numbers[: X.shape[1]]

    def _fitted(
        self, X: FloatArray, plus: FloatArray, minus: FloatArray, half: float | None
    ) -> tuple[float, FloatArray]:
        terms = self._terms(X, half)
        if self.constant:
            terms = np.column_stack([terms, np.ones(len(X))])
        numbers = fitted(terms, plus, minus)
        return log_loss(terms @ numbers, plus, minus), numbers

    def _terms(self, X: FloatArray, half: float | None) -> FloatArray:
        if half is None:
            return X
        columns, terms = list(self.saturating), X.copy()
        terms[:, columns] = X[:, columns] / (X[:, columns] + half)
        return terms

    def _worth(self, X: FloatArray) -> FloatArray:
        return self._terms(X, self.half_) @ self.numbers_ + self.constant_
