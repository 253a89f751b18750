from __future__ import annotations

import math
from pathlib import Path
from typing import Any

import pytest

from thumbwright.distill.assemble import assemble
from thumbwright.distill.case import Case
from thumbwright.distill.faults import Faults
from thumbwright.distill.record_reading import Record, read_record
from thumbwright.distill.signs import Own, Sign, signs_of

THRESHOLDS = {
    "even": {"plus": 1.0, "minus": -1.0, "unit": "nats"},
    "early": {"plus": 2.0, "minus": -0.5, "unit": "nats"},
}


def case(**changes: Any) -> Case:
    parts: dict[str, Any] = {
        "title": "A record",
        "question": {"plus": "frost", "minus": "no frost", "stakes": "none"},
        "words": {
            "plus_sign": "frost sign",
            "minus_sign": "mild sign",
            "shows_plus": "lamp lit",
            "shows_minus": "lamp blinking",
            "shows_nothing": "lamp dark",
        },
        "evidence": {"kind": "coin", "p": 0.6},
        "time": {"horizon": 4},
        "thresholds": THRESHOLDS,
        "agents": {
            "upper": {"name": "Upper", "thresholds": "even", "sees": []},
            "lower": {"name": "Lower", "thresholds": "even", "sees": []},
            "mill": {"name": "Mill", "thresholds": "even", "sees": ["upper", "lower"]},
        },
        "rule": {"agent": "mill"},
    }
    return Case.model_validate(parts | changes)


def read(folder: Path, content: str | bytes, **changes: Any) -> Record:
    path = folder / "seen.csv"
    path.write_bytes(content.encode() if isinstance(content, str) else content)
    made = case(**changes)
    mill = assemble(made).agents[2]
    return read_record(path, made, mill.sees, signs_of(made, "mill", mill.evidence))


def faults(folder: Path, content: str | bytes, **changes: Any) -> list[str]:
    with pytest.raises(Faults) as caught:
        read(folder, content, **changes)
    return [message.replace(str(folder) + "/", "") for message in caught.value.messages]


HEAD = "step,sign,upper_shows,lower_shows\n"


def test_a_record_in_codes_and_in_the_words_of_the_case(tmp_path: Path) -> None:
    plain = read(tmp_path, HEAD + "1,plus,undecided,undecided\n2,minus,minus,\n3,plus,,plus\n")
    words = (
        "\ufefflower_shows , sign,step,upper_shows\r\n\r\n"
        "lamp dark, frost sign,1,\r\n,mild sign,2,lamp blinking\r\nlamp lit,plus,3,minus\r\n"
    )
    assert read(tmp_path, words) == plain
    assert [line.step for line in plain.lines] == [1, 2, 3]
    assert [line.states for line in plain.lines] == [(0, 0), (2, 0), (2, 1)]
    assert [line.sign.name for line in plain.lines] == ["plus", "minus", "plus"]
    assert [line.sign.moves for line in plain.lines] == [(1,), (-1,), (1,)]


def test_every_fault_at_once_with_its_line(tmp_path: Path) -> None:
    content = HEAD + (
        "1,up,lit,undecided\n3,plus,minus,\n4,,plus,\n5,plus,,\n5\nx,minus,,\n0,minus,,minus\n"
    )
    assert faults(tmp_path, content) == [
        'seen.csv:2: upper_shows: "lit" is unknown (allowed undecided, plus, minus)',
        'seen.csv:2: sign: "up" is unknown (allowed frost sign, mild sign, minus, plus)',
        "seen.csv:3: step: 3 where 2 comes next (one line per step, from 1)",
        "seen.csv:4: upper_shows: plus after minus: an answer is never taken back",
        "seen.csv:4: sign: is blank (allowed frost sign, mild sign, minus, plus)",
        "seen.csv:5: step: 5 is after the last step of the case, 4",
        "seen.csv:6: 1 cells where the header has 4",
        'seen.csv:7: step: "x" is not a whole number from 1',
        'seen.csv:8: step: "0" is not a whole number from 1',
    ]


@pytest.mark.parametrize(
    ("content", "expected"),
    [
        ("", "seen.csv:1: empty file (the first line names the columns)"),
        (HEAD, "seen.csv:1: a header but no steps (one line per step follows it)"),
        (HEAD.replace(",", ";"), "seen.csv:1: columns are separated by commas, not ; or tabs"),
        (HEAD + '1,"plus,,\n', "seen.csv:2: not CSV: unexpected end of data"),
        (b"step,sign\xff\n", "seen.csv:1: byte 0xff is not UTF-8 (save the file as UTF-8)"),
        (
            "step,sign,upper_shows,lower_show\n",
            "seen.csv:1: lower_show: unknown column (allowed step, sign, upper_shows, lower_shows;"
            " did you mean lower_shows)\nseen.csv:1: lower_shows: column is missing",
        ),
        (
            HEAD.replace("sign", "step"),
            "seen.csv:1: step: column stands 2 times\nseen.csv:1: sign: column is missing",
        ),
        (
            HEAD.replace("sign", "sign,plus_shown"),
            "seen.csv:1: plus_shown: this case tells agents apart (give ID_shows for each)",
        ),
        (
            HEAD.replace("sign", "sign,upper_round"),
            "seen.csv:1: upper_round: unknown column (allowed step, sign, upper_shows,"
            " lower_shows; did you mean upper_shows)",
        ),
    ],
)
def test_files_that_are_no_record(tmp_path: Path, content: str | bytes, expected: str) -> None:
    assert "\n".join(faults(tmp_path, content)) == expected


def test_a_file_that_is_not_there(tmp_path: Path) -> None:
    with pytest.raises(Faults, match="No such file"):
        read_record(tmp_path / "none.csv", case(), ("upper",), {})


def test_rounds_where_answers_run_round_within_a_step(tmp_path: Path) -> None:
    settle = {"time": {"horizon": 4, "exchange": "settle"}}
    head = HEAD.replace("\n", ",upper_round\n")
    record = read(tmp_path, head + "1,plus,plus,,1\n2,plus,,minus,\n3,plus,,,1\n", **settle)
    assert [line.rounds for line in record.lines] == [(1, None)] * 3
    content = head + "1,plus,,,0\n2,plus,plus,,\n3,plus,,,2\n4,plus,,,one\n"
    assert faults(tmp_path, content, **settle) == [
        "seen.csv:2: upper_round: upper has not answered yet (leave it blank)",
        "seen.csv:4: upper_round: belongs into the line in which the answer is first shown",
        'seen.csv:5: upper_round: "one" is not a whole number from 0',
    ]


def test_thresholds_where_the_rule_tells_them_apart(tmp_path: Path) -> None:
    rule = {"agent": "mill", "inputs": ["step", "shown", "thresholds"], "covers": ["even", "early"]}
    head = HEAD.replace("\n", ",upper_thresholds,lower_thresholds\n")
    record = read(tmp_path, head + "1,plus,,,even,early\n2,plus,,,,early\n", rule=rule)
    assert record.names == {"upper": "even", "lower": "early"}
    content = head + "1,plus,,,late,\n2,plus,,,even,early\n3,plus,,,early,early\n"
    assert faults(tmp_path, content, rule=rule) == [
        'seen.csv:2: upper_thresholds: "late" is unknown (allowed even, early)',
        "seen.csv:2: lower_thresholds: is blank (allowed even, early)",
        "seen.csv:4: upper_thresholds: early after even: thresholds do not change",
    ]


def signs(**evidence: Any) -> dict[str, Sign]:
    made = case(evidence=evidence)
    return signs_of(made, "mill", assemble(made).agents[2].evidence)


def test_signs_and_what_they_are_worth() -> None:
    coin = signs(kind="coin", p=0.6)
    assert coin["plus"].worth == pytest.approx(math.log(1.5))
    assert coin["mild sign"] == coin["minus"]
    noticed = signs(kind="bernoulli", p_plus=0.1, p_minus=0.01)
    assert noticed["frost sign"] == noticed["1"]
    assert noticed["1"].worth == pytest.approx(math.log(10))
    assert noticed["0"].worth == pytest.approx(math.log(0.9 / 0.99))
    counted = signs(kind="binomial", m=3, p_plus=0.5, p_minus=0.25)
    assert list(counted) == ["0", "1", "2", "3"]
    assert counted["2"].moves == (2,)
    assert counted["3"].worth == pytest.approx(3 * math.log(2))


def test_signs_that_settle_the_question_and_signs_of_one_worth() -> None:
    sure = signs(kind="bernoulli", p_plus=0.4, p_minus=0.0)
    assert sure["1"].worth == math.inf
    assert sure["0"].worth == pytest.approx(math.log(0.6))
    listed = signs(
        kind="listed",
        plus=[0.3, 0.3, 0.2, 0.2, 0.0],
        minus=[0.2, 0.2, 0.3, 0.2, 0.1],
        values=["warm", "mild", "cold", "none", "ice"],
    )
    assert listed["warm"].worth == listed["mild"].worth == pytest.approx(math.log(1.5))
    assert listed["warm"].moves == listed["mild"].moves
    assert listed["none"].worth == pytest.approx(0.0)
    assert listed["ice"].worth == -math.inf


def test_readings_on_a_scale_are_given_in_nats(tmp_path: Path) -> None:
    normal = {"evidence": {"kind": "normal", "d": 1.0, "tolerance": 0.1}}
    head = HEAD.replace("sign", "sign_nats")
    record = read(tmp_path, head + "1,0.5,,\n2,\N{MINUS SIGN}1e-1,,\n", **normal)
    assert [line.sign.worth for line in record.lines] == [0.5, -0.1]
    assert faults(tmp_path, head + "1,,,\n2,inf,,\n3,1_0,,\n", **normal) == [
        "seen.csv:2: sign_nats: is blank",
        'seen.csv:3: sign_nats: "inf" is not a finite number (nats)',
        'seen.csv:4: sign_nats: "1_0" is not a finite number (nats)',
    ]
    assert "sign: unknown column" in faults(tmp_path, HEAD + "1,plus,,\n", **normal)[0]


def test_own_observations_add_up_without_rounding() -> None:
    evidence = assemble(case()).agents[2].evidence
    made, own = signs(kind="coin", p=0.6), Own(evidence)
    for name in ["plus"] * 7 + ["minus"] * 4:
        own.observe(made[name])
    assert own.count == 3
    assert own.tally == 3 * evidence.alpha[0]
    own.observe(Sign("sure", math.inf, None))
    assert (own.count, own.tally) == (None, math.inf)


def test_own_observations_of_uneven_worth_add_up() -> None:
    keys = {"kind": "bernoulli", "p_plus": 0.1, "p_minus": 0.01}
    made, own = signs(**keys), Own(assemble(case(evidence=keys)).agents[2].evidence)
    for name in ("0", "1", "0", "0"):
        own.observe(made[name])
    assert own.count == 1
    assert own.tally == pytest.approx(math.log(10) + 3 * math.log(0.9 / 0.99), abs=1e-12)
