"""rule.json keeps its schema, and whatever is changed in it for the worse does not."""

from __future__ import annotations

import copy
import json
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any

import jsonschema
import pytest

from tests.distill.exports import hand_built
from thumbwright.distill.exports import rule_schema
from thumbwright.distill.exports.rule_json import rule_json
from thumbwright.distill.reading import starter_names

OUTPUTS = Path(__file__).resolve().parents[3] / "outputs"
SCHEMA = json.loads(rule_schema.schema_text())
VALIDATOR = jsonschema.Draft202012Validator(SCHEMA)

MAY_BE_MISSING = {"ranges", "first_answer", "thresholds"}
"""Keys of a row that stand there only where the rule looks at such a thing."""

OPEN = {"shows", "ranges", "thresholds", "units", "forms", "worlds"}
"""Tables that have one entry for each of what there is."""

Place = tuple[str | int, ...]


def test_it_is_a_schema_of_the_standard_and_no_object_in_it_is_open() -> None:
    jsonschema.Draft202012Validator.check_schema(SCHEMA)
    for node in walk(SCHEMA):
        if isinstance(node, dict) and node.get("type") == "object":
            assert "additionalProperties" in node


def walk(node: Any) -> Iterator[Any]:
    yield node
    if isinstance(node, dict | list):
        for value in node.values() if isinstance(node, dict) else node:
            yield from walk(value)


@pytest.mark.parametrize("name", hand_built.FINDINGS)
def test_every_kind_of_rule_keeps_it(name: str) -> None:
    VALIDATOR.validate(json.loads(rule_json(hand_built.FINDINGS[name]())))


@pytest.mark.parametrize("name", starter_names())
def test_the_finished_examples_keep_the_schema_beside_them(name: str) -> None:
    folder = OUTPUTS / name
    schema = json.loads((folder / "rule.schema.json").read_text("utf-8"))
    assert schema == SCHEMA
    VALIDATOR.validate(json.loads((folder / "rule.json").read_text("utf-8")))


def spoilt(document: Any) -> Iterator[tuple[Place, str, Any]]:
    """Every single change: a key taken away or added, a value of another kind."""
    places: list[Place] = [()]
    while places:
        place = places.pop()
        node = at(document, place)
        if isinstance(node, dict):
            yield place, "added", changed(document, place, lambda d: d.update({"new key": 0}))
            for key in node:
                places.append((*place, key))
                if key not in MAY_BE_MISSING and place[-1:] and place[-1] not in OPEN:
                    taken = changed(document, place, lambda d, key=key: d.pop(key))
                    yield (*place, key), "taken away", taken
        elif isinstance(node, list):
            places += [(*place, number) for number in range(len(node))]
        if place:
            yield place, "of another kind", changed(document, place[:-1], put(place[-1]))


def put(key: str | int) -> Callable[[Any], None]:
    return lambda parent: parent.__setitem__(key, {"odd": [True]})


def at(document: Any, place: Place) -> Any:
    for key in place:
        document = document[key]
    return document


def changed(document: Any, place: Place, change: Callable[[Any], Any]) -> Any:
    made = copy.deepcopy(document)
    change(at(made, place))
    return made


@pytest.mark.parametrize("name", ["bars", "worths", "counts", "covers"])
def test_no_single_change_of_shape_goes_unnoticed(name: str) -> None:
    document = json.loads(rule_json(hand_built.FINDINGS[name]()))
    tried = 0
    for place, what, made in spoilt(document):
        tried += 1
        assert not VALIDATOR.is_valid(made), f"{place} {what}"
    assert tried > 300
    for key in document:
        assert not VALIDATOR.is_valid({k: v for k, v in document.items() if k != key})


@pytest.mark.parametrize(
    ("place", "value"),
    [
        (("forms",), {}),
        (("forms", "lines", "rows"), []),
        (("forms", "lines", "rows", 0, "step_from"), 0),
        (("forms", "lines", "rows", 0, "step_from"), 1.5),
        (("forms", "lines", "rows", 0, "shows", "upper"), []),
        (("forms", "lines", "rows", 0, "shows", "upper"), ["lit"]),
        (("forms", "lines", "rows", 0, "shows", "upper"), ["plus", "plus"]),
        (("forms", "lines", "rows", 0, "plus_at_or_above"), "3"),
        (("forms", "lines", "rows", 0, "calls"), 1.5),
        (("forms", "table", "rows", 0, "nats"), None),
        (("forms", "table", "rows", 0, "nats"), "inf"),
        (("case", "digest"), "0123456789AB"),
        (("question", "prior_plus"), 1),
        (("question", "stakes"), "money"),
        (("caution",), []),
        (("time", "exchange"), "never"),
        (("losses", "loss_ratio_range"), [1]),
        (("costs", "alone", "accuracy"), -0.1),
    ],
)
def test_values_that_cannot_be(place: Place, value: Any) -> None:
    document = json.loads(rule_json(hand_built.FINDINGS["both"]()))
    assert VALIDATOR.is_valid(document)
    parent = at(document, place[:-1])
    assert place[-1] in parent or isinstance(parent, list)
    parent[place[-1]] = value
    assert not VALIDATOR.is_valid(document)


def test_rows_of_one_form_are_of_one_kind() -> None:
    document = json.loads(rule_json(hand_built.FINDINGS["both"]()))
    forms = document["forms"]
    forms["lines"]["rows"].append(forms["table"]["rows"][0])
    assert not VALIDATOR.is_valid(document)
