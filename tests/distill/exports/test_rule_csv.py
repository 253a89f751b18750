from __future__ import annotations

import csv
import hashlib
import io
import json
import re
from dataclasses import replace

import pytest

from tests.distill.exports import sample
from thumbwright.distill.cautions import cautions
from thumbwright.distill.exports import rule_csv as export
from thumbwright.distill.rules import Row, Rule

FOUND = sample.findings()


def test_bars_exactly() -> None:
    assert export.rule_csv(sample.rule_of_bars(), FOUND) == (
        "step_from,step_to,upper_shows,lower_shows,minus_at_or_below,plus_at_or_above\n"
        ",2,undecided,,-3,3\n"
        "3,,undecided,,-4,3\n"
        ",,plus,undecided|plus,,-1\n"
    )


def test_worths_exactly_with_thresholds_of_the_agent_that_needs_them() -> None:
    assert export.rule_csv(sample.rule_of_worths(), FOUND) == (
        "step_from,step_to,upper_shows,lower_shows,lower_thresholds,nats\n"
        ",,,,early,0.30000000000000004\n"
        "2,,,,even|early,-0.000000001\n"
        ",,,minus,,-INF\n"
    )


def test_rule_csv_holds_the_lines_and_else_the_table() -> None:
    assert export.chosen_form(FOUND).form == "lines"
    table = {"table": FOUND.forms["table"]}
    assert export.chosen_form(replace(FOUND, forms=table)).form == "table"
    with pytest.raises(ValueError, match="no rule"):
        export.chosen_form(replace(FOUND, forms={}))


@pytest.mark.parametrize("rule", [sample.rule_of_bars(), sample.rule_of_worths()])
def test_schema_describes_the_table(rule: Rule) -> None:
    content = export.rule_csv(rule, FOUND)
    package = json.loads(export.datapackage_json(rule, FOUND))
    (resource,) = package["resources"]
    assert resource["hash"] == "sha256:" + hashlib.sha256(content.encode()).hexdigest()
    assert resource["bytes"] == len(content.encode())
    fields = resource["schema"]["fields"]
    rows = list(csv.DictReader(io.StringIO(content)))
    assert [field["name"] for field in fields] == list(rows[0])
    for field in fields:
        assert field["description"]
        constraints = field.get("constraints", {})
        cells = [row[field["name"]] for row in rows]
        filled = [cell for cell in cells if cell not in resource["schema"]["missingValues"]]
        assert len(filled) == len(cells) or not constraints.get("required")
        for cell in filled:
            if field["type"] == "integer":
                assert int(cell) >= constraints.get("minimum", -99)
            elif field["type"] == "number":
                assert cell in {"INF", "-INF"} or re.fullmatch(r"-?\d+(\.\d+)?", cell)
            elif "pattern" in constraints:
                assert re.fullmatch(constraints["pattern"], cell)
    units = {field["name"]: field.get("unit") for field in fields}
    assert units["step_from"] == "steps of 10 minutes"
    assert units.get("nats", units.get("plus_at_or_above")) in {"nats", "observations"}


def test_package_carries_caution_cost_and_digest() -> None:
    package = json.loads(export.render(FOUND)["datapackage.json"])
    assert package["name"] == "thumbwright-rule-sample"
    assert package["caution"] == list(cautions("property"))
    about = package["thumbwright"]
    assert (about["case_digest"], about["version"]) == (FOUND.digest, "9.9")
    assert about["costs"]["rule"]["accuracy"] == 0.79
    assert about["costs"]["alone"]["wrong_given_plus"] == 0.1
    assert about["is_exact"] is False
    assert about["caveats"] == ["made up"]
    assert about["units"].keys() == about["costs"]["exact"].keys()


@pytest.mark.parametrize("start", ["=", "+", "-", "@", "\t", "\r"])
def test_what_a_spreadsheet_would_run_is_refused(start: str) -> None:
    row = Row(thresholds={"upper": frozenset({f"{start}cmd"})}, value=1.0)
    with pytest.raises(ValueError, match=r"formula|outer spaces"):
        export.rule_csv(Rule("table", "mill", ("upper",), (row,)), FOUND)
    agent = f"{start}up"
    agents = {**FOUND.case.agents, agent: FOUND.case.agents["upper"]}
    found = replace(FOUND, case=FOUND.case.model_copy(update={"agents": agents}))
    with pytest.raises(ValueError, match="formula"):
        export.rule_csv(Rule("table", "mill", (agent,), (Row(value=1.0),)), found)


@pytest.mark.parametrize(
    ("row", "message"),
    [
        (Row(value=1.0, plus_at=3), "not both"),
        (Row(value=1.0, shows={"upper": frozenset()}), "accepts"),
        (Row(value=1.0, shows={"upper": frozenset({"lit"})}), "accepts"),
        (Row(value=1.0, thresholds={"upper": frozenset({"a|b"})}), "cannot be joined"),
        (Row(value=float("nan")), "not a number"),
    ],
)
def test_what_the_format_cannot_say_is_refused(row: Row, message: str) -> None:
    with pytest.raises(ValueError, match=message):
        export.rule_csv(Rule("table", "mill", ("upper",), (row,)), FOUND)
