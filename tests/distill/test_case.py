from __future__ import annotations

import json
import tomllib
from typing import Any

import jsonschema
import pytest
from pydantic import ValidationError

from thumbwright.distill.case import FORMS, INPUTS, Case, CaseFile
from thumbwright.distill.evidence_keys import EVIDENCE_KINDS
from thumbwright.distill.faults import Faults
from thumbwright.distill.network import SMALLEST, who_sees_whom
from thumbwright.distill.reading import case_from_text, read_case, starter_names, starter_text
from thumbwright.distill.rules import FIRST_ANSWER, NUMBERS

SCHEMA = jsonschema.Draft202012Validator(Case.json_schema())

PLAIN = """title = "t"
[question]
plus = "yes"
minus = "no"
stakes = "none"
[evidence]
kind = "coin"
p = 0.6
[time]
horizon = 10
[thresholds.even]
plus = 2
minus = -2
unit = "nats"
[thresholds.leaning]
plus = 3
minus = -1
unit = "nats"
[rule]
agent = "any"
"""
PAIR = """
[agents.lead]
thresholds = "even"
[agents.follower]
thresholds = "even"
sees = ["lead"]
"""


def read(text: str) -> Case:
    return case_from_text(text, name="t", file="t.toml")


def with_evidence(keys: str) -> Case:
    return read(PLAIN.replace('kind = "coin"\np = 0.6\n', keys) + PAIR)


def test_frost_watch_is_the_pair_it_describes() -> None:
    case = read_case("frost-watch")
    assert (case.name, case.source, case.title) == (
        "frost-watch",
        "frost-watch",
        "Frost watch in two orchards",
    )
    assert (case.question.plus, case.question.minus) == ("frost tonight", "no frost tonight")
    assert (case.question.prior_plus, case.question.stakes) == (0.5, "property")
    assert case.words.shows_nothing == "lamp dark"
    assert (case.evidence.kind, case.evidence.p, case.evidence.tolerance) == ("coin", 0.6, 1e-3)
    assert (case.time.horizon, case.time.step_label, case.time.exchange) == (
        40,
        "10 minutes",
        "once",
    )
    even, quick = case.thresholds["even"], case.thresholds["quick-to-stand-down"]
    assert (even.plus, even.minus, even.unit, even.from_costs) == (3, -3, "observations", False)
    assert (quick.plus, quick.minus) == (4, -2)
    assert list(case.agents) == ["upper", "mill"]
    assert case.agents["mill"].sees == ["upper"]
    assert case.agents["upper"].thresholds == "quick-to-stand-down"
    assert case.agents["upper"].evidence is None
    assert case.rule_agent == case.rule.agent == "mill"
    assert (case.rule.forms, case.rule.rows) == (["lines", "table"], 6)
    assert case.costs is not None
    assert (case.costs.false_plus, case.costs.false_minus) == (1, 1)
    assert (case.costs.per_step, case.costs.undecided) == (0.015, None)


def test_lot_inspection_is_the_published_plan() -> None:
    # NIST/SEMATECH e-Handbook of Statistical Methods, section 6.2.6.
    case = read_case("lot-inspection")
    assert (case.evidence.kind, case.evidence.p_plus, case.evidence.p_minus) == (
        "bernoulli",
        0.10,
        0.01,
    )
    plan = case.thresholds["plan"]
    assert (plan.false_plus, plan.false_minus, plan.plus) == (0.05, 0.10, None)
    assert (case.time.horizon, case.time.exchange, case.costs) == (120, "once", None)
    assert case.agents["second"].sees == ["first"]
    assert (case.rule_agent, case.rule.rows) == ("second", 24)


def test_what_is_left_out_is_filled_in() -> None:
    case = read(PLAIN + PAIR)
    assert all(case.words.model_dump().values())
    assert case.words.shows_plus == "says “yes”"
    assert case.question.prior_plus == 0.5
    assert case.time.exchange == "once"
    assert case.rule.inputs == ["step", "shown"]
    assert case.rule.forms == ["lines", "table"]
    assert set(case.rule.forms) < set(FORMS)
    assert ("step", "shown", "thresholds", *NUMBERS, FIRST_ANSWER) == INPUTS
    assert (case.rule.rows, case.rule.covers, case.rule.max_accuracy_lost) == (6, [], None)
    assert case.agents["lead"].name == "lead"
    assert case.rule_agent == "follower"


def test_any_means_the_first_agent_when_nobody_sees_anybody() -> None:
    text = PLAIN.replace('agent = "any"', 'agent = "any"\ninputs = ["step"]')
    assert read(text + '[agents.a]\nthresholds = "even"\n').rule_agent == "a"


@pytest.mark.parametrize(
    "written",
    [
        "unknown = { even = 0.7, leaning = 0.3 }",
        "thresholds = { unknown = { even = 0.7, leaning = 0.3 } }",
        "thresholds = { even = 0.7, leaning = 0.3 }",
    ],
)
def test_unknown_thresholds_become_names_with_shares(written: str) -> None:
    case = read(PLAIN + PAIR.replace('thresholds = "even"', written, 1))
    assert case.agents["lead"].thresholds == {"even": 0.7, "leaning": 0.3}
    assert case.agents["follower"].thresholds == "even"


@pytest.mark.parametrize(
    ("keys", "expected"),
    [
        ('kind = "bernoulli"\np_plus = 0.2\np_minus = 0.1\n', {"p_plus": 0.2, "p_minus": 0.1}),
        (
            'kind = "calibration"\nhits = 231\nmisses = 27\nfalse_alarms = 32\n'
            "correct_rejections = 54\n",
            {"hits": 231, "misses": 27, "false_alarms": 32, "correct_rejections": 54},
        ),
        ('kind = "binomial"\nm = 3\np_plus = 1\np_minus = 0.1\n', {"m": 3, "p_plus": 1.0}),
        ('kind = "poisson"\nrate_plus = 2\nrate_minus = 1\n', {"rate_plus": 2.0}),
        (
            'kind = "listed"\nplus = [0.6, 0.4]\nminus = [0.4, 0.6]\nvalues = ["up", "down"]\n',
            {"plus": [0.6, 0.4], "minus": [0.4, 0.6], "values": ["up", "down"]},
        ),
        ('kind = "listed"\nplus = [0.6, 0.4]\nminus = [0.4, 0.6]\n', {"values": None}),
        ('kind = "normal"\nd = 0.5\ntolerance = 0.01\n', {"d": 0.5, "tail": 1e-12}),
    ],
)
def test_every_kind_of_evidence_can_be_stated(keys: str, expected: dict[str, Any]) -> None:
    case = with_evidence(keys)
    assert {name: getattr(case.evidence, name) for name in expected} == expected
    own = read(PLAIN + PAIR + "[agents.follower.evidence]\n" + keys)
    assert own.agents["follower"].evidence == case.evidence
    assert own.evidence.kind == "coin"


def test_thresholds_can_be_stated_in_three_ways() -> None:
    text = PLAIN + PAIR + "[costs]\nfalse_plus = 1\nfalse_minus = 2\nper_step = 0.01\n"
    text += "[thresholds.plan]\nfalse_plus = 0.05\nfalse_minus = 0.1\n"
    text += '[thresholds.best]\nfrom = "costs"\n'
    case = read(text)
    assert case.thresholds["best"].from_costs
    assert case.thresholds["best"].plus is None
    assert case.thresholds["plan"].false_minus == 0.1
    assert not case.thresholds["plan"].from_costs


@pytest.mark.parametrize(
    ("shape", "sees"),
    [
        ("one-way", {"a1": [], "a2": ["a1"]}),
        ("mutual", {"a1": ["a2"], "a2": ["a1"]}),
        ("relay", {"a1": [], "a2": ["a1"], "a3": ["a2"], "a4": ["a3"]}),
        ("ring", {"a1": ["a2", "a4"], "a2": ["a1", "a3"], "a3": ["a2", "a4"], "a4": ["a1", "a3"]}),
        ("star", {"a1": ["a2", "a3", "a4"], "a2": ["a1"], "a3": ["a1"], "a4": ["a1"]}),
        (
            "crowd",
            {
                "a1": ["a2", "a3", "a4"],
                "a2": ["a1", "a3", "a4"],
                "a3": ["a1", "a2", "a4"],
                "a4": ["a1", "a2", "a3"],
            },
        ),
    ],
)
def test_shapes_are_written_out_as_agents(shape: str, sees: dict[str, list[str]]) -> None:
    size = "" if shape in ("one-way", "mutual") else f"size = {len(sees)}\n"
    case = read(PLAIN + f'[network]\nshape = "{shape}"\nthresholds = "leaning"\n{size}')
    assert {key: agent.sees for key, agent in case.agents.items()} == sees
    assert [agent.name for agent in case.agents.values()] == [
        f"Agent {number}" for number in range(1, len(sees) + 1)
    ]
    assert {agent.thresholds for agent in case.agents.values()} == {"leaning"}
    assert list(case.agents) == list(sees)


def test_names_of_a_shape_are_taken_in_order() -> None:
    text = PLAIN + '[network]\nshape = "mutual"\nthresholds = "even"\nnames = ["North", "South"]\n'
    assert [agent.name for agent in read(text).agents.values()] == ["North", "South"]


@pytest.mark.parametrize(("shape", "size"), [("ring", 2), ("mutual", 3), ("knot", 3), ("star", 0)])
def test_impossible_shapes_are_refused(shape: str, size: int) -> None:
    with pytest.raises(ValueError, match=shape):
        who_sees_whom(shape, size)


def test_the_smallest_group_of_each_shape_has_different_neighbours() -> None:
    for shape, size in SMALLEST.items():
        for agent, seen in who_sees_whom(shape, size).items():
            assert agent not in seen
            assert len(set(seen)) == len(seen)


def test_a_case_and_its_parts_are_frozen() -> None:
    case = read_case("frost-watch")
    for part in (case, case.question, case.evidence, case.agents["mill"], case.rule):
        with pytest.raises(ValidationError):
            setattr(part, next(iter(type(part).model_fields)), "else")


def test_a_case_survives_its_own_dump() -> None:
    for name in starter_names():
        case = read_case(name)
        again = Case.model_validate(json.loads(case.model_dump_json(by_alias=True)))
        assert again == case
        assert again.digest == case.digest


def test_a_case_that_contradicts_itself_cannot_be_built() -> None:
    dump = read_case("frost-watch").model_dump(by_alias=True)
    dump["agents"]["mill"]["sees"] = ["mill", "nobody"]
    with pytest.raises(ValidationError, match=r"cannot see itself.*no agent \"nobody\""):
        Case.model_validate(dump)


def test_the_digest_depends_on_what_is_said_and_on_nothing_else() -> None:
    case = read(PLAIN + PAIR)
    spelt = PLAIN.replace('minus = "no"', 'minus = "no"\nprior_plus = 0.5').replace(
        "= 2\n", "= 2.0\n"
    )
    same = case_from_text("# comment\n" + spelt + PAIR, name="other", file="elsewhere.toml")
    assert case.digest == same.digest
    assert len(case.digest) == 12
    assert set(case.digest) <= set("0123456789abcdef")
    shape = read(PLAIN + '[network]\nshape = "one-way"\nthresholds = "even"\n')
    tables = PAIR.replace("lead", "a1").replace("follower]", 'a2]\nname = "Agent 2"')
    tables = tables.replace("[agents.a1]", '[agents.a1]\nname = "Agent 1"')
    assert shape.digest == read(PLAIN + tables).digest
    others = {
        read(text).digest
        for text in (
            PLAIN.replace("0.6", "0.61") + PAIR,
            PLAIN.replace('"yes"', '"aye"') + PAIR,
            PLAIN.replace("horizon = 10", "horizon = 11") + PAIR,
            # The order of agents is the order of columns.
            PLAIN + '[agents.follower]\nthresholds = "even"\nsees = ["lead"]\n'
            '[agents.lead]\nthresholds = "even"\n',
        )
    }
    assert len(others | {case.digest}) == 5


def test_an_agent_may_start_late_skip_steps_and_look_several_times() -> None:
    keys = "first_step = 2\nlooks_every = 3\nlooks_per_step = 2\n"
    case = read(PLAIN + PAIR + keys)
    lead, follower = case.agents.values()
    assert lead.looks(7) is None
    assert follower.looks(7) == (0, 2, 0, 0, 2, 0, 0)
    assert (follower.first_step, follower.looks_every, follower.looks_per_step) == (2, 3, 2)
    assert read(PLAIN + PAIR + "first_step = 10\n").agents["follower"].looks(10) == (0,) * 9 + (1,)
    plain = read(PLAIN + PAIR)
    digests = {
        read(PLAIN + PAIR + keys[:end]).digest for end in (len("first_step = 2\n"), len(keys))
    }
    assert len({plain.digest, *digests}) == 3
    assert read(PLAIN + PAIR + "first_step = 1\nlooks_every = 1\n").digest == plain.digest
    again = Case.model_validate(json.loads(case.model_dump_json(by_alias=True)))
    assert (again, again.digest) == (case, case.digest)


def test_digests_stay_what_they_were() -> None:
    # Results in the field carry these; a change of the models must not change them unnoticed.
    assert {name: read_case(name).digest for name in starter_names()} == {
        "flock-alarm": "adbf2c693957",
        "frost-watch": "56c9f779be1f",
        "lot-inspection": "97f28eaf3a9e",
    }


def test_the_schema_is_valid_and_describes_every_key() -> None:
    schema = Case.json_schema()
    jsonschema.Draft202012Validator.check_schema(schema)
    assert schema["$schema"] == "https://json-schema.org/draft/2020-12/schema"
    assert json.loads(json.dumps(schema)) == schema
    text = json.dumps(schema)
    assert '"null"' not in text
    assert '"discriminator"' not in text
    for name, part in schema["$defs"].items():
        assert part["description"], name
        for key, keyword in part["properties"].items():
            assert "description" in keyword or key == "kind" or "$ref" in keyword, (name, key)
    for shape in SMALLEST:
        assert f"{shape}" in schema["$defs"]["Network"]["properties"]["shape"]["description"]
    assert len(EVIDENCE_KINDS) == len(schema["properties"]["evidence"]["oneOf"])


@pytest.mark.parametrize("name", starter_names())
def test_starters_satisfy_the_schema(name: str) -> None:
    assert list(SCHEMA.iter_errors(tomllib.loads(starter_text(name)))) == []


@pytest.mark.parametrize(
    ("old", "new"),
    [
        ('stakes = "none"', ""),
        ("p = 0.6", "p = 1.1"),
        ("p = 0.6", "p = 0.6\nq = 1"),
        ("horizon = 10", "horizon = 10.5"),
        ("horizon = 10", "horizon = 0"),
        ('unit = "nats"\n[thresholds.leaning]', "[thresholds.leaning]"),
        ("[thresholds.leaning]", '[thresholds."1 2"]'),
        ('thresholds = "even"\n[agents.f', "[agents.f"),
        (PAIR, ""),
        (PAIR, PAIR + '[network]\nshape = "mutual"\nthresholds = "even"\n'),
        (PAIR, '[network]\nthresholds = "even"\n'),
        (PAIR, '[network]\nshape = "mutual"\nfile = "e.csv"\nthresholds = "even"\n'),
        (PAIR, PAIR + "first_step = 0\n"),
    ],
)
def test_what_the_schema_refuses_reading_refuses_too(old: str, new: str) -> None:
    text = (PLAIN + PAIR).replace(old, new, 1)
    SCHEMA.validate(tomllib.loads(PLAIN + PAIR))
    assert not SCHEMA.is_valid(tomllib.loads(text))
    with pytest.raises(Faults):
        read(text)


def test_the_file_model_knows_nothing_of_name_and_source() -> None:
    assert not {"name", "source"} & set(CaseFile.model_fields)
