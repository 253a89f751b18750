"""Rules without rows through the whole job, and pricing of any function."""

from __future__ import annotations

import json
from pathlib import Path

import numpy as np
import pytest

from tests.distill.pricers import ALPHA, coin_group, one_way, pricer_of_group
from thumbwright.distill import group_checks, texts
from thumbwright.distill.case import FORMS
from thumbwright.distill.exports import render_all
from thumbwright.distill.faults import Faults
from thumbwright.distill.findings import Findings
from thumbwright.distill.forms import MODULES
from thumbwright.distill.gather import gather
from thumbwright.distill.pricing import pricer_for, pricer_of
from thumbwright.distill.reading import case_from_text
from thumbwright.distill.rules import Row, Rule
from thumbwright.distill.starters import starter_text
from thumbwright.exact.play import Act


def findings_with(forms: list[str], starter: str = "frost-watch") -> Findings:
    text = starter_text(starter)
    line = next(one for one in text.splitlines() if one.startswith("forms"))
    return gather(
        case_from_text(text.replace(line, f"forms = {json.dumps(forms)}"), name="x", file="x")
    )


def test_every_form_is_known_everywhere() -> None:
    assert set(FORMS) == set(MODULES) == {*group_checks.RECKONED, *group_checks.WITH_ROWS}


def test_reckoned_forms_go_through_sheet_json_and_terminal() -> None:
    findings = findings_with(["table", "shifts", "formula"])
    assert list(findings.forms) == ["table"]
    assert list(findings.reckoned) == ["shifts", "formula"]
    files = render_all(findings)
    document = json.loads(files["rule.json"])
    assert list(document["reckoned"]) == ["shifts", "formula"]
    found = document["reckoned"]["formula"]
    assert found["numbers"] == {"plus_upper": 4.0, "minus_upper": -2.0, "undecided_upper": 0.5}
    assert found["nats_per_unit"] == pytest.approx(ALPHA)
    assert found["costs"]["risk"] == pytest.approx(findings.reckoned["formula"].figures.risk)
    text = files["sheet.md"]
    assert isinstance(text, str)
    assert "\n- Upper shows minus: −2.\n" in text
    assert "**The shifts: bars, and by how many boxes what is shown moves them**" in text
    page = files["sheet.html"]
    assert isinstance(page, str)
    assert "<li>Upper shows minus: −2.</li>" in page
    assert "formula, 3 numbers" in texts.sheet_text(findings, [])


def test_without_them_nothing_is_said_of_them() -> None:
    assert "reckoned" not in json.loads(render_all(findings_with(["table"]))["rule.json"])


def test_a_form_that_cannot_be_made_is_left_out_with_its_reason() -> None:
    findings = findings_with(["table", "shifts"], "lot-inspection")
    assert findings.reckoned == {}
    assert any('the form "shifts" needs an own count' in text for text in findings.caveats)


def test_alone_they_are_refused() -> None:
    with pytest.raises(Faults) as caught:
        findings_with(["shifts", "formula"])
    (message,) = caught.value.messages
    assert "rule.forms: formula and shifts have no rows" in message
    assert "add a form of rows" in message


def rows() -> Rule:
    return Rule(
        "mine",
        "a1",
        ("a0",),
        (
            Row(shows={"a0": frozenset({"plus"})}, value=4 * ALPHA),
            Row(shows={"a0": frozenset({"minus"})}, value=-2 * ALPHA),
            Row(shows={"a0": frozenset({"undecided"})}, value=0.2),
        ),
    )


def test_a_function_of_a_view_is_priced_as_the_rows_that_say_the_same() -> None:
    pricer = one_way((-2, 4), (-3, 3), 15)
    worths = np.array([0.2, 4 * ALPHA, -2 * ALPHA])
    assert pricer.price(lambda view: worths[view.state("a0")]) == pricer.price(rows())


def test_a_function_may_answer_with_bars() -> None:
    pricer = one_way((-2, 4), (-3, 3), 15)
    low, high = np.array([-4, -7, -1]), np.array([3, -1, 5])
    found = pricer.price(
        lambda view: Act(np.zeros(()), low[view.state("a0")], high[view.state("a0")])
    )
    states = ("undecided", "plus", "minus")
    bars = Rule(
        "mine",
        "a1",
        ("a0",),
        tuple(
            Row(shows={"a0": frozenset({state})}, minus_at=int(low[k]), plus_at=int(high[k]))
            for k, state in enumerate(states)
        ),
    )
    same = pricer.price(bars)
    assert found.given_plus == pytest.approx(same.given_plus, abs=1e-12)
    assert found.given_minus == pytest.approx(same.given_minus, abs=1e-12)


def test_a_function_may_look_at_counts_and_times() -> None:
    group = coin_group([(-2, 3), (-3, 2), (-3, 3)], [(), (), (0, 1)], 8)
    pricer = pricer_of_group(group, "a2")
    found = pricer.price(
        lambda view: 0.8 * (view.number("plus_shown") - view.number("minus_shown"))
    )
    by_state = pricer.price(
        lambda view: sum(np.array([0.0, 0.8, -0.8])[view.state(a)] for a in ("a0", "a1"))
    )
    assert found.risk == pytest.approx(by_state.risk, abs=1e-12)
    late = pricer.price(lambda view: 0.8 * (view.number("steps_since_first") > 2))
    assert late.risk != found.risk


def test_a_crowd_prices_functions_too() -> None:
    text = starter_text("frost-watch")
    start = text.index("[agents.upper]")
    crowd = text[:start] + (
        '[network]\nshape = "crowd"\nsize = 4\nthresholds = "even"\n\n'
        '[rule]\nagent = "any"\nforms = ["table"]\n\n' + text[text.index("[costs]") :]
    )
    crowd = crowd.replace("horizon = 40", "horizon = 8")
    pricer, _ = pricer_of(case_from_text(crowd, name="crowd", file="crowd"))
    nothing = pricer.price(lambda view: 0.0)
    assert nothing.risk == pytest.approx(pricer.objective(pricer.alone_tally), abs=1e-12)
    counted = pricer.price(
        lambda view: ALPHA * (view.number("plus_shown") - view.number("minus_shown"))
    )
    assert counted.risk != nothing.risk


def test_the_three_lines_of_the_readme(capsys: pytest.CaptureFixture[str]) -> None:
    readme = (Path(__file__).resolve().parents[2] / "README.md").read_text("utf-8")
    block = readme.split("<!-- price -->")[1].split("<!-- end of price -->")[0]
    lines = block.strip().removeprefix("```python").removesuffix("```").strip().splitlines()
    assert len(lines) == 3
    exec("\n".join(lines), {})  # noqa: S102 - the code of our own README
    printed = capsys.readouterr().out
    pricer = pricer_for("frost-watch")
    worths = np.array([0.0, 1.6, -0.8])
    same = pricer.price(lambda view: worths[view.state("upper")])
    assert same.benefit_kept is not None
    assert f"benefit_kept={same.benefit_kept!r}"[:24] in printed
