"""The field model of the README: it runs, and its flocks do what the finished example says."""

from __future__ import annotations

import importlib.util
import json
import re
import sys
from collections.abc import Callable
from pathlib import Path
from types import ModuleType
from typing import Any

import numpy as np
import pytest

HERE = Path(__file__).resolve().parent.parent
EXAMPLE = HERE / "outputs" / "flock-alarm"
FLOCKS = 6000

Flocks = Callable[..., tuple[Any, Any]]


@pytest.fixture
def watch_rule(monkeypatch: pytest.MonkeyPatch) -> ModuleType:
    """The exported rule, under the name by which the model imports it."""
    spec = importlib.util.spec_from_file_location("watch_rule", EXAMPLE / "watch_rule.py")
    assert spec is not None
    assert spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    monkeypatch.setitem(sys.modules, "watch_rule", module)
    return module


@pytest.fixture
def flocks(watch_rule: ModuleType) -> Flocks:
    """The function of the README, as it stands there."""
    assert watch_rule
    text = (HERE / "README.md").read_text("utf-8")
    found = re.search(
        r"<!-- field model -->\n```python\n(.*?)```\n<!-- end of field model -->", text, re.DOTALL
    )
    assert found is not None
    names: dict[str, Any] = {}
    exec(found[1], names)  # noqa: S102 - our own page
    model: Flocks = names["flocks"]
    return model


def distances(flocks: Flocks) -> list[float]:
    """How far its figures are from those of the sheet, in standard errors of both."""
    rule = json.loads((EXAMPLE / "rule.json").read_text("utf-8"))
    figures = rule["forms"]["table"]["costs_if_everybody_uses_it"]
    errors = figures["errors"]
    far = []
    used = []
    for hawk, wrong, key in ((True, 2, "plus"), (False, 1, "minus")):
        shows, when = flocks(hawk, FLOCKS, np.random.default_rng(20 + hawk))
        # Birds of a flock depend on each other; flocks do not.
        share = (shows == wrong).mean(axis=1)
        error = np.hypot(share.std(ddof=1) / np.sqrt(FLOCKS), errors[f"wrong_given_{key}"])
        far.append(abs(share.mean() - figures[f"wrong_given_{key}"]) / error)
        used.append(when.mean(axis=1))
    prior = 0.3
    step = prior * used[0].mean() + (1 - prior) * used[1].mean()
    spread = [prior * used[0].std(ddof=1), (1 - prior) * used[1].std(ddof=1)]
    error = np.hypot(np.hypot(*spread) / np.sqrt(FLOCKS), errors["mean_step"])
    far.append(abs(step - figures["mean_step"]) / error)
    return [float(one) for one in far]


def test_flocks_that_go_by_the_rule_do_what_the_sheet_says(flocks: Flocks) -> None:
    assert max(distances(flocks)) < 4.0


def test_a_rule_that_is_off_would_be_noticed(
    flocks: Flocks, watch_rule: ModuleType, monkeypatch: pytest.MonkeyPatch
) -> None:
    """With what is shown taken for nothing, the same comparison fails."""
    decide = watch_rule.decide

    def deaf(tally: Any, step: int, plus_shown: Any, minus_shown: Any) -> Any:
        return decide(tally, step, 0 * plus_shown, 0 * minus_shown)

    monkeypatch.setattr(watch_rule, "decide", deaf)
    assert max(distances(flocks)) > 4.0
