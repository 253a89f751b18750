from __future__ import annotations

import json
import math
from collections.abc import Callable
from pathlib import Path
from random import Random
from typing import Any

import pytest

from thumbwright.distill.assemble import assemble
from thumbwright.distill.command import main
from thumbwright.distill.reading import read_case
from thumbwright.distill.record_reading import Line, Record
from thumbwright.distill.replay import follow
from thumbwright.distill.replay_crowd import follow_counts
from thumbwright.distill.rules import Row, Rule
from thumbwright.distill.signs import Sign
from thumbwright.exact.crowd import kinds_of
from thumbwright.exact.engine import solve

Run = Callable[..., tuple[int, str, str]]

HEAD = "step,sign,plus_shown,minus_shown\n"


@pytest.fixture
def run(tmp_path: Path, capsys: Any, monkeypatch: pytest.MonkeyPatch) -> Run:
    """Run the verb: status, output, errors."""
    monkeypatch.chdir(tmp_path)

    def go(case: str, record: str, *words: str) -> tuple[int, str, str]:
        (tmp_path / "seen.csv").write_text(record, "utf-8")
        status = main(["replay", case, "seen.csv", *words])
        out, err = capsys.readouterr()
        return status, out, err

    return go


def followed(run: Run, case: str, record: str, *words: str) -> dict[str, Any]:
    status, out, err = run(case, record, "--json", *words)
    assert (status, err) == (0, "")
    found: dict[str, Any] = json.loads(out)
    return found


@pytest.fixture(scope="module")
def flock(tmp_path_factory: pytest.TempPathFactory) -> str:
    """A rule to hand in, so that none need be distilled."""
    path = tmp_path_factory.mktemp("rules") / "flock.csv"
    path.write_text(
        "plus_shown_from,plus_shown_to,came_first_from,came_first_to,nats\n"
        ",0,,,-0.3\n1,3,,1,0.4\n1,3,2,,2\n4,,,,3\n",
        "utf-8",
    )
    return str(path)


def test_flock_alarm_by_hand(run: Run, flock: str) -> None:
    """A bird takes off at +0.536 nats; 3 in 7 there is a hawk, a cue comes with 0.3 and 0.1.

    So it takes two cues, and nobody can be in the air before second 2 (row 2). If then one is seen
    there first, with ln 9, and the other six heads up are worth ln(0.91 / 0.99) each, whoever had
    one cue follows (0 + 1.69), who had none does not (-1.35 + 1.69). If one follows, the last five
    had none: each ln(0.49 / 0.81), and 0.53 in all is not enough for them. Two at first would have
    taken all others along, so two in the air were one after the other.
    """
    record = HEAD + "1,quiet second,0,\n2,quiet second,2,\n"
    found = followed(run, "flock-alarm", record, "--rule", flock)
    first, second = found["steps"]
    assert first["exact"]["worth"] == 0.0
    worth = math.log(9) + math.log(0.42 / 0.18) + 5 * math.log(0.49 / 0.81)
    assert second["exact"]["worth"] == pytest.approx(worth, abs=1e-12)
    belief = math.log(3 / 7) + 2 * math.log(0.7 / 0.9) + worth
    assert second["exact"]["belief"] == pytest.approx(belief, abs=1e-12)
    assert (second["plus_shown"], second["minus_shown"]) == (2, 0)
    # One was first, so row 2 holds and not row 3.
    assert [one["rule"]["row"] for one in found["steps"]] == [1, 2]
    assert not any("first" in remark for remark in found["remarks"])


def test_what_cannot_be_is_named_with_what_could(run: Run, flock: str) -> None:
    """Three can be in the air after second 2 (1.88 - 1.35 is short of 0.536), four take all."""
    record = HEAD + "1,quiet second,0,0\n2,quiet second,4,0\n3,quiet second,,\n"
    found = followed(run, "flock-alarm", record, "--rule", flock)
    assert found["no_belief_from"] == 2
    assert found["impossible"] == (
        "the model never lets 4 of the others show plus and 0 minus at the end of step 2 after all "
        "that came before; it would have allowed 0 to 3 or 7 plus with 0 minus"
    )
    assert found["steps"][1]["exact"] == dict.fromkeys(
        ("worth", "belief", "probability_of_plus", "does")
    )
    assert [one["rule"]["row"] for one in found["steps"]] == [1, 4, None]
    assert found["rule_answer"] == {"answer": "plus", "step": 2}
    assert any("4 plus and 0 minus, all that came in that step" in one for one in found["remarks"])
    status, out, _ = run("flock-alarm", record, "--rule", flock)
    assert status == 0
    lines = out.splitlines()
    assert lines[3].split("  ")[0:3] == ["step", "sign", "plus shown"]
    assert lines[5].split() == [*("2", "0", "4", "0", "0", "4", "plus", "no", "belief")]
    assert "Impossible under the model at step 2: the model never lets 4 of the others" in out


CROWD = """
title = "Crowd"
question = {{ plus = "yes", minus = "no", stakes = "none", prior_plus = 0.45 }}
evidence = {{ kind = "coin", p = 0.6 }}
time = {{ horizon = 5, exchange = "{exchange}" }}
thresholds.low = {{ plus = 2, minus = -2, unit = "observations" }}
thresholds.quick = {{ plus = 1, minus = -2, unit = "observations" }}
thresholds.own = {{ plus = 40, minus = -40, unit = "observations" }}
rule = {{ agent = "a", inputs = ["step", "plus_shown", "minus_shown"], forms = ["table"] }}
[agents]
a = {{ thresholds = "{own}", sees = ["b", "c", "d"] }}
b = {{ thresholds = "low", sees = ["a", "c", "d"] }}
c = {{ thresholds = "low", sees = ["a", "b", "d"] }}
d = {{ thresholds = "{last}", sees = ["a", "b", "c"] }}
"""


def case(folder: Path, **parts: str) -> str:
    """A case, and a rule to hand in."""
    (folder / "crowd.toml").write_text(CROWD.format(**parts), "utf-8")
    (folder / "rule.csv").write_text("nats\n0\n", "utf-8")
    return "crowd.toml"


def records(exchange: str, number: int) -> list[list[tuple[int, ...]]]:
    """Random states of b, c, d at each of four steps."""
    rng, found = Random(11), []
    while len(found) < number:
        when = [rng.choice([1, 2, 2, 3, 9]) + (exchange == "once") for _ in range(3)]
        what = [rng.choice([1, 2]) for _ in range(3)]
        if rng.random() < 0.6:  # together, as the model has it more often
            when, what = [when[0]] * 3, [what[0]] * 2 + [what[1]]
        shown = list(zip(what, when, strict=True))
        found.append([tuple(w if step >= t else 0 for w, t in shown) for step in range(1, 5)])
    return found


@pytest.mark.parametrize("exchange", ["once", "settle"])
@pytest.mark.parametrize(("own", "last"), [("low", "low"), ("own", "low"), ("own", "quick")])
def test_counting_agrees_with_telling_apart(
    tmp_path: Path, exchange: str, own: str, last: str
) -> None:
    """Solved by displays, which know nothing of counts; where the others differ, who matters."""
    name = case(tmp_path, exchange=exchange, own=own, last=last)
    group = assemble(read_case(tmp_path / name))
    crowd = kinds_of(group)
    assert crowd is not None
    solution = solve(group)
    rule = Rule("table", "a", ("b", "c", "d"), (Row(value=0.0),))
    met, never = 0, 0
    for shown in records(exchange, 60):
        named, by_number = [], []
        for step, states in enumerate(shown, 1):
            # A sign that says nothing, so that the agent itself never answers by it.
            sign = Sign("none", 0.0, None)
            named.append(Line(step, sign, states, (None,) * 3))
            counts = (states.count(1), states.count(2))
            by_number.append(Line(step, sign, (), (), counts))
        model = follow(solution, "a", rule, {}, Record(tuple(named), {}))
        for lines in (named, by_number) if last == "low" else (named,):
            found, _ = follow_counts(group, crowd, "a", rule, Record(tuple(lines), {}))
            for here, there in zip(found, model, strict=True):
                assert (here.impossible is None) == (there.impossible is None)
                assert here.exact.does == there.exact.does
                never += here.impossible is not None
                if here.exact.worth is None or there.exact.worth is None:
                    assert here.exact.worth == there.exact.worth
                else:
                    assert here.exact.worth == pytest.approx(there.exact.worth, abs=1e-10)
                    met += here.exact.worth != 0.0
    assert met > 10
    assert never > 10


def test_who_was_first_is_taken_from_the_model(run: Run, tmp_path: Path) -> None:
    """The likeliest of the numbers that can be, and a note that says so."""
    counted = case(tmp_path, exchange="settle", own="own", last="low")
    (tmp_path / "first.csv").write_text(
        "came_first_from,came_first_to,nats\n,0,0\n1,1,1\n2,2,2\n3,,3\n", "utf-8"
    )
    record = HEAD + "1,plus,0,0\n2,minus,3,0\n"
    found = followed(run, counted, record, "--rule", "first.csv")
    # At step 2 one may come first and two follow, or two and one, or all three at once: with two
    # signs for plus, 0.36 and 0.16; a follower has one of each, 0.48. 3 * 0.36 * 0.48^2 = 0.2488,
    # 3 * 0.36^2 * 0.48 = 0.1866, 0.36^3 = 0.0467; given minus 0.1106, 0.0369, 0.0041.
    chances = [
        0.45 * a + 0.55 * b for a, b in ((0.2488, 0.1106), (0.1866, 0.0369), (0.0467, 0.0041))
    ]
    assert found["impossible"] is None
    assert found["steps"][1]["rule"]["nats"] == 1.0
    assert found["remarks"][0] == (
        "the record does not say who was first within the step; the rule is told 1 plus and 0 "
        f"minus, the most likely under the model ({chances[0] / sum(chances):.2f})"
    )


def test_proofs_that_contradict_each_other_are_named(run: Run, tmp_path: Path) -> None:
    """A value that has no chance under minus proves plus, one without a chance under plus minus."""
    name = case(tmp_path, exchange="once", own="own", last="low")
    text = (tmp_path / name).read_text("utf-8").replace('"observations"', '"nats"')
    proofs = (
        '{ kind = "listed", plus = [0.5, 0.5, 0.0], minus = [0.6, 0.0, 0.4], '
        'values = ["same", "for", "against"] }'
    )
    (tmp_path / name).write_text(text.replace('{ kind = "coin", p = 0.6 }', proofs), "utf-8")
    record = HEAD + "1,same,0,0\n2,same,0,2\n"
    found = followed(run, name, record, "--rule", "rule.csv")
    assert found["steps"][1]["exact"]["worth"] == "-INF"
    assert found["exact_answer"] == {"answer": "minus", "step": 2}
    found = followed(run, name, record.replace("2,same", "2,for"), "--rule", "rule.csv")
    assert "proves one answer and what it is shown the other" in found["impossible"]
    assert (found["rule_answer"], found["exact_answer"]) == ({"answer": "plus", "step": 2}, None)
    found = followed(run, name, record.replace("0,2", "1,2"), "--rule", "rule.csv")
    assert (
        "it would have allowed 0 to 3 plus with 0 minus; 0 plus with 1 minus"
        in (found["impossible"])
    )


def test_files_with_faults_end_with_status_2(run: Run, tmp_path: Path) -> None:
    counted = case(tmp_path, exchange="settle", own="low", last="low")
    record = HEAD + "1,plus,2,\n2,plus,1,1\n3,plus,2,2\n4,plus,-1,x\n5,plus,,2\n"
    status, out, err = run(counted, record)
    assert (status, out) == (2, "")
    assert err.splitlines() == [
        "seen.csv:3: plus_shown: 1 after 2: an answer is never taken back",
        "seen.csv:4: minus_shown: 2 showing plus and 2 showing minus, of 3 others",
        'seen.csv:5: plus_shown: "-1" is not a whole number from 0',
        'seen.csv:5: minus_shown: "x" is not a whole number from 0',
        "seen.csv:6: minus_shown: 2 showing plus and 2 showing minus, of 3 others",
    ]
    _, _, err = run(counted, "step,sign,plus_shown,b_shows,c_shows\n1,plus,0,,\n")
    assert "seen.csv:1: plus_shown: stands beside ID_shows" in err
    assert "seen.csv:1: d_shows: column is missing" in err
    _, _, err = run(counted, "step,sign,plus_shown,undecided_shown\n1,plus,0,3\n")
    assert "undecided_shown: leave it out" in err
    assert "minus_shown: column is missing" in err
    _, _, err = run(counted, "step,sign,plus_shown,minus_shown,b_round\n1,plus,0,0,0\n")
    assert "b_round: unknown column" in err


def test_members_that_differ_must_be_named(run: Run, tmp_path: Path) -> None:
    counted = case(tmp_path, exchange="once", own="own", last="quick")
    status, _, err = run(counted, HEAD + "1,plus,0,0\n")
    assert status == 2
    assert "plus_shown: the other members are of 2 kinds" in err
    record = "step,sign,b_shows,c_shows,d_shows\n1,plus,,,\n2,minus,plus,,\n"
    found = followed(run, counted, record, "--rule", "rule.csv")
    # d alone can answer plus after one sign.
    assert found["impossible"] == (
        "the model never lets 1 of the others show plus and 0 minus at the end of step 1 after all "
        "that came before; it would have allowed these numbers, but of other kinds of members"
    )
    early = "step,sign,b_shows,c_shows,d_shows\n1,plus,,,plus\n"
    found = followed(run, counted, early, "--rule", "rule.csv")
    assert "before anything has been observed" in found["impossible"]
