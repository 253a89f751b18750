"""The value forms as estimators: scikit-learn's own checks, and the forms themselves."""

from __future__ import annotations

import math
import subprocess
import sys

import numpy as np
import pytest
from sklearn.base import clone
from sklearn.model_selection import GridSearchCV, KFold
from sklearn.pipeline import make_pipeline
from sklearn.preprocessing import FunctionTransformer
from sklearn.utils.estimator_checks import check_estimator

from tests.distill.pricers import one_way
from thumbwright.distill.estimators import WorthFormula, WorthTable, WorthTree
from thumbwright.distill.forms import Wanted, table, tree
from thumbwright.distill.forms.axes import grid_axes
from thumbwright.distill.network_pricer import NetworkPricer
from thumbwright.distill.situations import values_of

EXCEPTIONS = {
    "WorthTable": {
        "check_sample_weight_equivalence_on_dense_data": (
            "30 continuous inputs have more boxes than can be searched; the same is tested below "
            "with few"
        )
    }
}
"""Checks of scikit-learn that do not make sense for an estimator, each with its reason."""

NOT_ASKED = {"check_array_api_input"}
"""Left out by scikit-learn itself where its switch for other array libraries is not set."""


@pytest.mark.parametrize("estimator", [WorthTable(cells=2), WorthTree(), WorthFormula()])
def test_manners(estimator: WorthTable | WorthTree | WorthFormula) -> None:
    exceptions = EXCEPTIONS.get(type(estimator).__name__, {})
    found = check_estimator(
        estimator, expected_failed_checks=exceptions, on_skip=None, on_fail=None
    )
    by_status: dict[str, set[str]] = {}
    for one in found:
        by_status.setdefault(one["status"], set()).add(one["check_name"])
    assert by_status.get("failed", set()) == set()
    assert by_status.get("xfail", set()) == set(exceptions)
    assert by_status.get("skipped", set()) <= NOT_ASKED
    assert len(by_status["passed"]) > 30


@pytest.mark.parametrize("estimator", [WorthTable(rows=3), WorthTree(rows=3), WorthFormula()])
def test_weights_stand_for_repetition(estimator: WorthTable | WorthTree | WorthFormula) -> None:
    generator = np.random.default_rng(3)
    X, y = generator.integers(0, 5, size=(40, 2)), generator.integers(0, 2, size=40)
    weight = generator.integers(0, 4, size=40)
    weighted = clone(estimator).fit(X, y, sample_weight=weight).predict(X)
    repeated = clone(estimator).fit(np.repeat(X, weight, axis=0), np.repeat(y, weight)).predict(X)
    assert weighted == pytest.approx(repeated, abs=1e-9)


def situations(pricer: NetworkPricer) -> tuple[np.ndarray, np.ndarray, np.ndarray]:  # type: ignore[type-arg]
    s = pricer.situations
    axes = grid_axes(pricer, ("step", "shown"))
    X = np.stack([axis.where for axis in axes], axis=1)
    y = np.repeat([1, 0], len(X))
    return np.concatenate([X, X]), y, np.concatenate([s.plus, s.minus])


@pytest.mark.parametrize("rows", [1, 2, 4, 7])
def test_table_and_tree_say_what_the_forms_say(rows: int) -> None:
    pricer = one_way((-2, 5), (-3, 4), 20)
    X, y, weight = situations(pricer)
    s = pricer.situations
    for estimator, form in ((WorthTable(rows=rows), table), (WorthTree(rows=rows), tree)):
        said = estimator.fit(X, y, sample_weight=weight).predict(X[: len(s.step)])
        made = form.distil(pricer, Wanted(rows, ("step", "shown")))
        values = np.array([row.value for row in made.rule.rows])
        assert said == pytest.approx(values[s.rows_of(made.rule)], abs=1e-8)


def test_a_formula_of_states_says_their_pooled_worths() -> None:
    pricer = one_way((-2, 5), (-3, 4), 20)
    s = pricer.situations
    shown = np.stack([s.states[:, 0] == k for k in range(3)], axis=1).astype(int)
    X, y = np.concatenate([shown, shown]), np.repeat(["plus", "minus"], len(shown))
    made = WorthFormula(constant=False).fit(X, y, sample_weight=np.concatenate([s.plus, s.minus]))
    pooled = values_of(
        *(np.array([m[s.states[:, 0] == k].sum() for k in range(3)]) for m in (s.plus, s.minus))
    )
    assert made.numbers_ == pytest.approx(pooled, abs=1e-10)
    assert list(made.classes_) == ["minus", "plus"]


def test_a_saturating_column_finds_its_curve() -> None:
    step = np.arange(0, 60)
    worth = 1.5 * step / (step + 4.0)
    X, y = np.tile(step[:, None], (2, 1)), np.repeat([1, 0], len(step))
    share = 1.0 / (1.0 + np.exp(-worth))
    made = WorthFormula(saturating=(0,), constant=False)
    made.fit(X, y, sample_weight=np.concatenate([share, 1.0 - share]))
    assert made.half_ == pytest.approx(4.0, rel=1e-3)
    assert made.numbers_ == pytest.approx([1.5], rel=1e-3)
    with pytest.raises(ValueError, match="must not be negative"):
        made.fit(-X, y)


def test_pipelines_clones_and_searches() -> None:
    pricer = one_way((-2, 5), (-3, 4), 12)
    X, y, weight = situations(pricer)
    chain = make_pipeline(FunctionTransformer(lambda x: x[:, :1]), WorthTree(rows=3))
    assert chain.fit(X, y, worthtree__sample_weight=weight).predict(X).shape == (len(X),)
    copy = clone(WorthTable(rows=9, cells=5))
    assert copy.get_params() == {"rows": 9, "cells": 5}
    generator = np.random.default_rng(1)
    step = generator.integers(0, 10, size=(400, 1))
    label = (generator.random(400) < np.where(step[:, 0] < 5, 0.3, 0.8)).astype(int)
    folds = KFold(2, shuffle=True, random_state=0)
    search = GridSearchCV(WorthTree(), {"rows": [1, 2]}, cv=folds)
    assert search.fit(step, label).best_params_ == {"rows": 2}


def test_what_it_cannot_fit_is_said() -> None:
    with pytest.raises(ValueError, match="two classes are needed"):
        WorthTree().fit([[0], [1]], [1, 1])
    with pytest.raises(ValueError, match="two classes are needed"):
        WorthTree().fit([[0], [1]], [1, 0], sample_weight=[1.0, 0.0])
    with pytest.raises(ValueError, match="fewer inputs, fewer cells, or use WorthTree"):
        WorthTable().fit(np.random.default_rng(0).normal(size=(90, 4)), np.arange(90) % 2)


def test_an_answer_that_was_never_met_is_certain() -> None:
    made = WorthTable(rows=2).fit([[0], [0], [1]], [0, 1, 1])
    assert made.predict([[0], [1]]).tolist() == [0.0, math.inf]


def test_the_command_line_does_not_import_them() -> None:
    code = "import sys, thumbwright.distill.command; print('sklearn' in sys.modules)"
    found = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert found.stdout.strip() == "False"
