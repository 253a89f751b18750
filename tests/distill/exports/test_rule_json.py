from __future__ import annotations

import json
from dataclasses import replace
from typing import Any

from tests.distill.exports import sample
from thumbwright.distill.cautions import cautions
from thumbwright.distill.exports.rule_json import render, rule_json

FOUND = sample.findings()
DOCUMENT: dict[str, Any] = json.loads(rule_json(FOUND))


def test_forms_rows_and_costs() -> None:
    assert list(DOCUMENT["forms"]) == ["lines", "table"]
    lines = DOCUMENT["forms"]["lines"]
    assert lines["rows"][2] == {
        "step_from": None,
        "step_to": None,
        "shows": {"upper": ["plus"], "lower": ["undecided", "plus"]},
        "minus_at_or_below": None,
        "plus_at_or_above": -1,
        "base": False,
        "steps_in_force": 2.5,
        "calls": 0.25,
    }
    assert lines["rows"][0]["shows"]["lower"] == ["undecided", "plus", "minus"]
    assert lines["costs"]["accuracy"] == 0.79
    assert (lines["information_kept"], lines["information_ceiling"]) == (0.9, 0.95)
    table = DOCUMENT["forms"]["table"]["rows"]
    assert table[0]["nats"] == 0.1 + 0.2
    assert table[2]["nats"] == "-INF"
    assert table[1]["thresholds"] == {"lower": ["even", "early"]}
    assert "thresholds" not in lines["rows"][0]


def test_ways_of_playing_and_losses() -> None:
    assert {name: costs["accuracy"] for name, costs in DOCUMENT["costs"].items()} == {
        "exact": 0.8,
        "plain_count": 0.7,
        "alone": 0.6,
    }
    assert DOCUMENT["costs"]["alone"]["benefit_kept"] == 0
    assert DOCUMENT["losses"]["inferred_from_thresholds"] is True
    assert DOCUMENT["losses"]["loss_ratio_range"] == [1, "INF"]
    assert DOCUMENT["losses"]["undecided"] is None


def test_caution_comes_first_and_origin_is_told() -> None:
    assert next(iter(DOCUMENT)) == "caution"
    assert DOCUMENT["caution"] == list(cautions("property"))
    assert DOCUMENT["case"]["digest"] == FOUND.case.digest
    assert DOCUMENT["thumbwright"] == "9.9"
    assert DOCUMENT["is_exact"] is False
    assert DOCUMENT["caveats"] == ["made up"]


def test_every_figure_has_a_unit() -> None:
    figures = DOCUMENT["costs"]["exact"].keys() | DOCUMENT["forms"]["lines"]["rows"][0].keys()
    own_words = {"shows", "base"}
    assert figures - own_words <= DOCUMENT["units"].keys()


def test_full_precision_and_same_text_every_time() -> None:
    text = render(FOUND)["rule.json"]
    assert isinstance(text, str)
    assert "0.30000000000000004" in text
    assert "NaN" not in text
    assert "Infinity" not in text
    assert text == render(sample.findings())["rule.json"]
    assert text.endswith("}\n")


def test_figures_that_are_not_known_are_null() -> None:
    found = replace(FOUND, alone=sample.figures(risk=None, benefit_kept=None))
    alone = json.loads(rule_json(found))["costs"]["alone"]
    assert (alone["risk"], alone["benefit_kept"]) == (None, None)
