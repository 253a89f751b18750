from __future__ import annotations

import json
import math
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

from thumbwright.distill.command import main

Run = Callable[..., tuple[int, str, str]]

ALPHA = math.log(1.5)

QUIET = "step,sign,upper_shows\n1,plus,undecided\n2,minus,\n3,plus,\n4,plus,\n5,minus,\n6,plus,\n"


@pytest.fixture
def run(tmp_path: Path, capsys: Any, monkeypatch: pytest.MonkeyPatch) -> Run:
    """Run the verb in an empty folder: status, output, errors; nothing may be written there."""
    monkeypatch.chdir(tmp_path)

    def go(case: str, record: str, *words: str) -> tuple[int, str, str]:
        (tmp_path / "seen.csv").write_text(record, "utf-8")
        before = sorted(tmp_path.iterdir())
        status = main(["replay", case, "seen.csv", *words])
        assert sorted(tmp_path.iterdir()) == before
        out, err = capsys.readouterr()
        return status, out, err

    return go


def steps(run: Run, case: str, record: str, *words: str) -> dict[str, Any]:
    status, out, err = run(case, record, "--json", *words)
    assert (status, err) == (0, "")
    found: dict[str, Any] = json.loads(out)
    return found


def test_frost_watch_by_hand(run: Run) -> None:
    """Upper stands down at -2 and lights at +4; by hand, its chances of showing nothing.

    After two checks it is undecided with 0.84 if frost, 0.64 if not; the third cannot end it;
    after the fourth 0.84 - 0.0768 - 0.1296 and 0.64 - 0.1728 - 0.0256.
    """
    found = steps(run, "frost-watch", QUIET)
    worths = [0, 0, math.log(0.84 / 0.64), math.log(0.84 / 0.64), math.log(0.6336 / 0.4416)]
    worths.append(worths[-1])
    own = [1, 0, 1, 2, 1, 2]
    for step, worth, count in zip(found["steps"], worths, own, strict=True):
        assert step["own_count"] == count
        assert step["exact"]["worth"] == pytest.approx(worth, abs=1e-12)
        belief = count * ALPHA + worth
        assert step["exact"]["belief"] == pytest.approx(belief, abs=1e-12)
        chance = 1 / (1 + math.exp(-belief))
        assert step["exact"]["probability_of_plus"] == pytest.approx(chance)
        assert step["exact"]["does"] == step["rule"]["does"] == "watch"
    assert [step["rule"]["row"] for step in found["steps"]] == [1, 1, 2, 2, 2, 2]
    assert (found["rule_answer"], found["exact_answer"]) == (None, None)
    assert found["impossible"] is None


def test_an_answer_seen_is_worth_the_neighbours_threshold(run: Run) -> None:
    found = steps(
        run,
        "frost-watch",
        "step,sign,upper_shows\n1,plus,\n2,plus,\n3,minus,minus\n4,minus,\n5,minus,\n",
    )
    third, fourth, fifth = found["steps"][2:]
    assert third["exact"]["worth"] == pytest.approx(-2 * ALPHA)
    assert third["exact"]["does"] == "watch"
    assert fourth["exact"]["belief"] == pytest.approx(-2 * ALPHA)
    # Row 4 of the card: stand down at -1 or less.
    assert (fifth["rule"]["row"], fifth["rule"]["does"]) == (4, "minus")
    assert fifth["exact"]["does"] == "minus"
    assert found["rule_answer"] == found["exact_answer"] == {"answer": "minus", "step": 5}


def test_once_answered_nothing_more_is_said(run: Run) -> None:
    record = "step,sign,upper_shows\n" + "".join(f"{k},plus,\n" for k in range(1, 6))
    found = steps(run, "frost-watch", record)
    assert found["rule_answer"] == {"answer": "plus", "step": 3}
    assert [one["rule"]["does"] for one in found["steps"]] == ["watch", "watch", "plus", None, None]
    assert found["steps"][4]["exact"] == dict.fromkeys(
        ("worth", "belief", "probability_of_plus", "does")
    )


def test_an_impossible_answer_is_named_and_the_rule_goes_on(run: Run) -> None:
    record = QUIET.replace("3,plus,", "3,minus,plus")
    found = steps(run, "frost-watch", record)
    assert found["no_belief_from"] == 3
    assert found["impossible"] == (
        "the model never lets upper answer plus at step 2; it can at steps 4, 6, 8, 10, 12 and more"
        " up to 40"
    )
    assert found["steps"][2]["exact"]["belief"] is None
    # Row 3: light at -1 or more; the own count is -1.
    assert (found["steps"][2]["rule"]["row"], found["rule_answer"]["step"]) == (3, 3)
    status, out, _ = run("frost-watch", record)
    assert status == 0
    assert "Impossible under the model at step 3: the model never lets upper" in out
    assert out.count("no belief") == 5
    assert "The rule answers plus at step 3." in out
    assert "Property or money can be lost" in out


def test_before_the_first_step_nobody_answers(run: Run) -> None:
    found = steps(run, "frost-watch", QUIET.replace("undecided", "minus"))
    assert found["no_belief_from"] == 1
    assert "upper answer minus before it has observed anything" in found["impossible"]


TWO = """
title = "Two"
question = {{ plus = "yes", minus = "no", stakes = "none" }}
evidence = {evidence}
time = {{ horizon = 6, exchange = "{exchange}" }}
[thresholds]
low = {{ plus = 0.9, minus = -0.9, unit = "nats" }}
high = {{ plus = 4.0, minus = -4.0, unit = "nats" }}
[agents]
first = {{ thresholds = "low", sees = [{sees}] }}
second = {{ thresholds = "high", sees = ["first"] }}
[rule]
agent = "second"
forms = {forms}
"""


def two(folder: Path, **changes: str) -> str:
    parts = {
        "evidence": '{ kind = "coin", p = 0.6 }',
        "exchange": "once",
        "sees": "",
        "forms": '["lines", "table"]',
    } | changes
    (folder / "two.toml").write_text(TWO.format(**parts), "utf-8")
    return "two.toml"


def test_silence_can_be_impossible(run: Run, tmp_path: Path) -> None:
    """With two signs in a row for one answer needed and p = 1, first cannot stay undecided."""
    case = two(tmp_path, evidence='{ kind = "bernoulli", p_plus = 0.5, p_minus = 0.0 }')
    record = "step,sign,first_shows\n1,0,\n2,0,\n3,0,\n4,0,\n"
    found = steps(run, case, record)
    # Without a sign the odds halve each step: after two, first says no, or has had its sign.
    assert found["no_belief_from"] == 3
    assert found["impossible"] == (
        "the model never leaves first undecided to the end of step 2 while the agent is undecided"
    )


def test_a_sign_that_settles_the_question_is_answered_at_once(run: Run, tmp_path: Path) -> None:
    case = two(tmp_path, evidence='{ kind = "bernoulli", p_plus = 0.5, p_minus = 0.0 }')
    found = steps(run, case, "step,sign,first_shows\n1,1,\n")
    assert found["steps"][0]["own_nats"] == "INF"
    assert found["rule_answer"] == found["exact_answer"] == {"answer": "plus", "step": 1}


def test_readings_on_a_scale_go_by_the_table(run: Run, tmp_path: Path) -> None:
    case = two(tmp_path, evidence='{ kind = "normal", d = 1.0, tolerance = 0.05 }')
    found = steps(run, case, "step,sign_nats,first_shows\n1,0.5,\n2,-0.2,plus\n")
    assert found["rule"] == "table"
    assert found["steps"][1]["own_nats"] == pytest.approx(0.3)
    assert found["steps"][1]["rule"]["nats"] > 0.5
    assert "split onto a ladder" in found["remarks"][0]
    status, _, err = run(
        two(tmp_path, evidence='{ kind = "normal", d = 1.0, tolerance = 0.05 }', forms='["lines"]'),
        "step,sign_nats,first_shows\n1,0.5,\n",
    )
    assert status == 2
    assert "needs an own count" in err


def test_within_a_step_rounds_are_followed(run: Run, tmp_path: Path) -> None:
    case = two(tmp_path, exchange="settle", sees='"second"')
    record = "step,sign,first_shows\n1,plus,\n2,minus,\n3,plus,plus\n4,plus,\n"
    found = steps(run, case, record)
    # First needs three signs for 0.9 nats, all alike: it has them at step 3, in its own round.
    assert found["steps"][2]["exact"]["worth"] == pytest.approx(3 * ALPHA)
    given = steps(
        run,
        case,
        record.replace("shows\n", "shows,first_round\n")
        .replace(",\n", ",,\n")
        .replace("plus,plus\n", "plus,plus,0\n"),
    )
    assert given["steps"] == found["steps"]
    wrong = record.replace("shows\n", "shows,first_round\n").replace(",\n", ",,\n")
    named = steps(run, case, wrong.replace("plus,plus\n", "plus,plus,1\n"))
    assert named["no_belief_from"] == 3
    assert "answer plus at step 3, round 1; there it can in round 0" in named["impossible"]


def test_a_rule_that_is_handed_in(run: Run, tmp_path: Path) -> None:
    rule = tmp_path / "mine.csv"
    rule.write_text("upper_shows,nats\nundecided|minus,-0.5\nplus,2\n", "utf-8")
    found = steps(run, "frost-watch", QUIET, "--rule", "mine.csv")
    assert found["rule"] == "mine.csv"
    assert [one["rule"]["nats"] for one in found["steps"]] == [-0.5] * 6
    rule.write_text("upper_shows,nats\nundecided,-0.5\nplus,2\n", "utf-8")
    status, out, err = run("frost-watch", QUIET, "--rule", "mine.csv")
    assert (status, out) == (2, "")
    assert "mine.csv: rows: no row holds" in err


def test_where_no_row_holds_nothing_is_said(run: Run, tmp_path: Path) -> None:
    """A rule may leave out what the model calls impossible; the record need not."""
    rule = tmp_path / "mine.csv"
    rule.write_text("step_from,upper_shows,nats\n,undecided|minus,-0.5\n5,plus,2\n", "utf-8")
    found = steps(run, "frost-watch", QUIET.replace("3,plus,", "3,plus,plus"), "--rule", "mine.csv")
    assert [one["rule"]["row"] for one in found["steps"]] == [1, 1, None, None, 2, None]
    assert found["steps"][2]["rule"]["does"] == "watch"


def test_files_with_faults_end_with_status_2(run: Run) -> None:
    status, out, err = run("frost-watch", "step,sign,upper_shows\n1,up,\n3,plus,lit\n")
    assert (status, out) == (2, "")
    assert err.splitlines() == [
        'seen.csv:2: sign: "up" is unknown (allowed frost sign, mild sign, minus, plus)',
        "seen.csv:3: step: 3 where 2 comes next (one line per step, from 1)",
        'seen.csv:3: upper_shows: "lit" is unknown (allowed undecided, plus, minus)',
    ]


def test_a_rule_that_counts_is_refused_in_plain_words(run: Run, tmp_path: Path) -> None:
    (tmp_path / "crowd.toml").write_text(
        'title = "Crowd"\nquestion = { plus = "yes", minus = "no", stakes = "none" }\n'
        'evidence = { kind = "coin", p = 0.6 }\ntime = { horizon = 5 }\n'
        'thresholds.low = { plus = 2, minus = -2, unit = "observations" }\n'
        'network = { shape = "crowd", size = 5, thresholds = "low" }\n'
        'rule = { agent = "any", inputs = ["step", "plus_shown", "minus_shown"] }\n',
        "utf-8",
    )
    status, out, err = run("crowd.toml", "step,sign,plus_shown,minus_shown\n1,plus,0,0\n")
    assert (status, out) == (2, "")
    assert "counts the others" in err
    assert 'inputs = ["step", "shown"]' in err


def test_the_table_on_the_terminal(run: Run) -> None:
    status, out, _ = run("frost-watch", QUIET)
    assert status == 0
    lines = out.splitlines()
    assert lines[0] == "Frost watch in two orchards: record of Mill field (mill), rule lines"
    assert lines[3].split("  ")[0] == "step"
    assert lines[6].split() == [
        *("3", "plus", "undecided", "1", "2", "watch", "0.2719", "0.6632", "watch")
    ]
    assert "The rule has no answer by step 6." in lines
