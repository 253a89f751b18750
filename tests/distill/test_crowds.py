"""Crowds as cases: against the same groups played through display histories, and sampled."""

from __future__ import annotations

import json
from pathlib import Path

import numpy as np
import pandas as pd
import pytest

from tests.exact.crowds import bars, kind, network
from thumbwright.distill import crowds, job
from thumbwright.distill.assemble import Limits, Setting
from thumbwright.distill.case import Case
from thumbwright.distill.command import main
from thumbwright.distill.crowd_pricer import CrowdPricer
from thumbwright.distill.forms import Wanted, table
from thumbwright.distill.network_pricer import NetworkPricer
from thumbwright.distill.pricing import pricer_of
from thumbwright.distill.reading import case_from_text
from thumbwright.distill.rules import Row, Rule
from thumbwright.distill.tallies import PARTS, Tally
from thumbwright.exact.crowd import Crowd, enumerate_shown, sample_shown
from thumbwright.exact.engine import solve
from thumbwright.exact.group import Group
from thumbwright.exact.stopping import Losses

LOSSES = Losses(1.0, 2.0, 0.02)
MIXED = Crowd((kind(2, bars(-2, 3)), kind(2, bars(-3, 2))))
COUNTS = ("step", "plus_shown", "minus_shown")


def of_crowd(crowd: Crowd, group: Group, histories: int | None = None) -> CrowdPricer:
    """The pricer of its first member."""
    given = (crowd, 0, group.prior, group.horizon, group.exchange)
    shown = sample_shown(*given, histories, 7) if histories else enumerate_shown(*given)
    return CrowdPricer.build(group, crowd.kinds[0].members[0], shown, LOSSES, None, 0.0, 7)


def of_network(group: Group, agent: str) -> NetworkPricer:
    return NetworkPricer.build(agent, (Setting(1.0, {}, solve(group)),), LOSSES)


def card(seen: tuple[str, ...], agent: str) -> Rule:
    """Bars by how many show what and since when."""
    rows = (
        Row(ranges={"plus_shown": (0, 0), "minus_shown": (0, 0)}, minus_at=-3, plus_at=3),
        Row(ranges={"plus_shown": (1, None), "minus_shown": (0, 0)}, minus_at=-4, plus_at=1),
        Row(ranges={"minus_shown": (1, None), "steps_since_last": (1, 2)}, minus_at=-2, plus_at=3),
        Row(ranges={"minus_shown": (1, None), "steps_since_last": (3, None)}, minus_at=-1),
    )
    return Rule("by hand", agent, seen, rows)


def apart(one: Tally, other: Tally) -> float:
    return max(float(np.abs(getattr(one, n) - getattr(other, n)).max()) for n in PARTS)


@pytest.mark.parametrize("exchange", ["once", "settle"])
def test_a_crowd_costs_what_the_network_costs(exchange: str) -> None:
    group = network(MIXED, 0.2, 5, exchange)
    one = of_crowd(MIXED, group)
    other = of_network(group, one.agent)
    assert one.seen == other.seen
    assert apart(one.exact_tally, other.exact_tally) < 1e-12
    assert apart(one.alone_tally, other.alone_tally) < 1e-12
    assert apart(one.plain_count_tally(), other.plain_count_tally()) < 1e-12
    rule = card(one.seen, one.agent)
    (found, uses), (expected, wanted) = one.rule_uses(rule), other.rule_uses(rule)
    assert apart(found, expected) < 1e-12
    for got, right in zip(uses, wanted, strict=True):
        assert got.steps_in_force == pytest.approx(right.steps_in_force, abs=1e-12)
        assert got.calls == pytest.approx(right.calls, abs=1e-12)
    assert one.figures(found).errors is None
    assert one.figures(found).benefit_kept == pytest.approx(other.figures(expected).benefit_kept)


def test_the_same_table_comes_out_of_both() -> None:
    """Histories that differ only in who showed what weigh together what a count weighs."""
    group = network(MIXED, 0.2, 6, "once")
    one, other = of_crowd(MIXED, group), of_network(group, MIXED.kinds[0].members[0])
    assert one.situations.everything == pytest.approx(other.situations.everything, abs=1e-13)
    for inputs in (COUNTS, ("step", "first_answer", "came_first"), ("steps_since_last",)):
        found, expected = (table.distil(p, Wanted(5, inputs)) for p in (one, other))
        assert found.information_kept == pytest.approx(expected.information_kept, abs=1e-10)
        assert found.information_ceiling == pytest.approx(expected.information_ceiling, abs=1e-10)
        for got, right in zip(found.rule.rows, expected.rule.rows, strict=True):
            assert got.ranges == right.ranges
            assert (got.step_from, got.step_to) == (right.step_from, right.step_to)
            assert got.first_answer == right.first_answer
            assert got.value == pytest.approx(right.value, abs=1e-9)


@pytest.mark.parametrize("exchange", ["once", "settle"])
def test_sampled_figures_are_within_their_errors(exchange: str) -> None:
    group = network(MIXED, 0.2, 6, exchange)
    exact, sampled = of_crowd(MIXED, group), of_crowd(MIXED, group, 8000)
    rule = card(exact.seen, exact.agent)
    for one, other in (
        (exact.rule_tally(rule), sampled.rule_tally(rule)),
        (exact.plain_count_tally(), sampled.plain_count_tally()),
        (exact.exact_tally, sampled.exact_tally),
    ):
        right, found = exact.figures(one), sampled.figures(other)
        assert found.errors is not None
        for name, error in found.errors.items():
            gap = abs(getattr(found, name) - getattr(right, name))
            assert gap <= 4 * error + 1e-9, (name, gap, error)
    own = sampled.figures(sampled.exact_tally)
    assert own.errors is not None
    assert own.errors["accuracy"] > 1e-4
    assert own.errors["accuracy_lost"] == 0.0
    told = sampled.figures(sampled.rule_tally(rule)).errors
    assert told is not None
    # The same histories serve for both, so the difference is surer than of two independent ones.
    assert 0.0 < told["accuracy_lost"] < np.hypot(told["accuracy"], own.errors["accuracy"])
    assert sampled.inexact().sampled == (8000, 7)
    assert not sampled.inexact().nothing
    assert exact.inexact().nothing


def test_errors_say_how_far_figures_scatter() -> None:
    """Over many seeds the standard deviation of a figure is what its errors say."""
    group = network(MIXED, 0.2, 5, "once")
    rule = card(tuple(group.agents[0].sees), group.agents[0].id)
    found: dict[str, list[float]] = {}
    told: dict[str, list[float]] = {}
    for seed in range(60):
        shown = sample_shown(MIXED, 0, 0.2, 5, "once", 400, seed)
        pricer = CrowdPricer.build(group, group.agents[0].id, shown, LOSSES, None, 0.0, seed)
        figures = pricer.figures(pricer.rule_tally(rule))
        for name, error in (figures.errors or {}).items():
            found.setdefault(name, []).append(float(getattr(figures, name)))
            told.setdefault(name, []).append(error)
    assert set(found) >= {"accuracy", "risk", "benefit_kept", "delay_added", "accuracy_lost"}
    for name, numbers in found.items():
        # The deviation of 60 is itself known to about a tenth.
        assert np.std(numbers, ddof=1) == pytest.approx(np.mean(told[name]), rel=0.35), name


CASE = """title = "a flock"
[question]
plus = "go"
minus = "stay"
stakes = "none"
[evidence]
kind = "coin"
p = 0.6
[time]
horizon = {horizon}
exchange = "{exchange}"
[thresholds.even]
plus = 2
minus = -3
unit = "observations"
[network]
shape = "crowd"
size = {size}
thresholds = "even"
[rule]
agent = "any"
{more}
[costs]
false_plus = 1.0
false_minus = 1.0
per_step = 0.02
"""


def case(size: int = 5, horizon: int = 8, exchange: str = "once", more: str = "") -> Case:
    text = CASE.format(size=size, horizon=horizon, exchange=exchange, more=more)
    return case_from_text(text, "flock.toml", "flock")


def test_a_crowd_is_counted_unless_its_rule_says_otherwise() -> None:
    assert case().rule.inputs == list(COUNTS)
    assert case().rule.forms == ["table"]
    assert case(size=3).rule.inputs == ["step", "shown"]
    assert case(more='inputs = ["step"]').rule.inputs == ["step"]
    assert isinstance(pricer_of(case())[0], CrowdPricer)
    assert isinstance(pricer_of(case(horizon=4, more='inputs = ["shown"]'))[0], NetworkPricer)


def test_check_names_the_engine_and_where_sampling_begins(
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    told = job.check(case())
    assert "public histories of a crowd of 5, all alike" in told
    assert "nothing is sampled" in told
    assert "a1 and 4 like it  4 others" in told
    entries = [
        sum(len(showing.parent) for showing in enumerate_shown(crowd, 0, 0.0, 8, "once").parts[0])
        for crowd in (Crowd((kind(size, bars(-3, 2)),)) for size in (3, 4))
    ]
    assert entries[0] < entries[1]
    monkeypatch.setattr(crowds, "ENUMERATED", entries[0])
    told = job.check(case())
    assert "4,000 are sampled with seed 1" in told
    assert "a crowd of at most 3 members" in told
    assert "standard errors" in told


def test_outcomes_of_a_crowd() -> None:
    exact = job.outcomes(case())
    assert exact["exact"]
    assert [agent["id"] for agent in exact["agents"]] == ["a1", "a2", "a3", "a4", "a5"]
    text = job.outcomes_text(exact)
    assert "a1, one of 5 alike" in text
    assert text.endswith("\nexact")
    sampled = job.outcomes(case(), Limits(histories=3000))
    assert not sampled["exact"]
    assert sampled["sampled_with_seed"] == 1
    for key in ("given_plus", "given_minus"):
        error = sampled["agents"][0]["errors"][key]["plus"]
        gap = sampled["agents"][0][key]["plus"] - exact["agents"][0][key]["plus"]
        assert 0 < error < 0.02
        assert abs(gap) <= 4 * error
        share, off = exact["group"][key]["split"], sampled["group_errors"][key]["split"]
        assert abs(sampled["group"][key]["split"] - share) <= 4 * off
    told = job.outcomes_text(sampled)
    assert " ± " in told
    assert "3,000 public histories sampled with seed 1" in told
    assert told.endswith("not exact: evidence split, or histories dropped or sampled")
    dropped = job.outcomes(case(), Limits(drop=1e-4))
    assert dropped["dropped_mass"] > 0
    assert not dropped["exact"]


def test_jumps_of_a_crowd_are_those_of_the_network() -> None:
    """Lines of one count sum up the lines of the network that show as many."""
    counted = job.jumps(case(size=4, horizon=5))
    named = job.jumps(case(size=4, horizon=5, more='inputs = ["step", "shown"]'))
    # The network also lists what the agent cannot be shown while it is undecided.
    named = named[(named.agent == "a1") & (named.still_plus + named.still_minus > 0)]
    others = ["a2_shows", "a3_shows", "a4_shows"]
    named = named.assign(
        plus_shown=sum((named[c] == "plus").astype(int) for c in others),
        minus_shown=sum((named[c] == "minus").astype(int) for c in others),
    )
    keys = ["step", "plus_shown", "minus_shown"]
    assert list(counted.columns[:5]) == ["agent", "step", "round", "plus_shown", "minus_shown"]
    for table_ in (counted, named):
        table_["weighed"] = table_.worth * table_.shown_plus * table_.still_plus
        table_["moved"] = table_.jump * table_.shown_minus
    columns = ["shown_plus", "shown_minus", "weighed", "moved"]
    one, other = (t.groupby(keys)[columns].sum() for t in (counted, named))
    pd.testing.assert_frame_equal(one, other, atol=1e-12, check_dtype=False)


def test_the_main_job_on_a_sampled_crowd(
    monkeypatch: pytest.MonkeyPatch, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.chdir(tmp_path)
    text = CASE.format(size=30, horizon=8, exchange="settle", more="rows = 5")
    Path("flock.toml").write_text(text, "utf-8")
    words = ["sheet", "flock.toml", "--histories", "600", "--seed", "3"]
    assert main([*words, "--into", "one"]) == 0
    told = capsys.readouterr().out
    assert "600 public histories with seed 3" in told
    assert "± is one standard error" in told
    assert main([*words, "--into", "two"]) == 0
    capsys.readouterr()
    for file in Path("one").iterdir():
        assert file.read_bytes() == (Path("two") / file.name).read_bytes(), file.name
    found = json.loads(Path("one/rule.json").read_text("utf-8"))
    assert found["is_exact"] is False
    assert found["costs"]["exact"]["errors"]["accuracy"] > 0
    header = Path("one/rule.csv").read_text("utf-8").splitlines()[0]
    assert "plus_shown_from,plus_shown_to" in header
    assert "_shows" not in header
    assert main(["price", "flock.toml", "one/rule.csv", *words[2:], "--json"]) == 0
    price = json.loads(capsys.readouterr().out)
    rule = found["forms"]["table"]["costs"]
    assert price["figures"]["accuracy"] == pytest.approx(rule["accuracy"], abs=1e-9)
    assert price["exact"] is False
    assert main(["price", "flock.toml", "one/rule.csv", "--histories", "7"]) == 2
    assert "must be even" in capsys.readouterr().err


def test_a_rule_of_a_crowd_is_read_with_its_faults(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    file = tmp_path / "flock.toml"
    file.write_text(CASE.format(size=5, horizon=6, exchange="once", more=""), "utf-8")
    rule = tmp_path / "rule.csv"
    rule.write_text("plus_shown_from,plus_shown_to,nats\n,0,0\n2,,1\n", "utf-8")
    assert main(["price", str(file), str(rule)]) == 2
    assert (
        "no row holds at step 3 with 1 showing plus and 0 showing minus" in capsys.readouterr().err
    )
    rule.write_text("a2_shows,nats\nplus,1\n,0\n", "utf-8")
    assert main(["price", str(file), str(rule)]) == 2
    assert "a rule cannot look at what a2 shows" in capsys.readouterr().err
    rule.write_text("plus_shown_from,plus_shown_to,nats\n,0,0\n1,,0.7\n", "utf-8")
    assert main(["price", str(file), str(rule)]) == 0
    assert "exact" in capsys.readouterr().out
