"""Rules in several hands: who can use one, what it then costs, and tables right for all."""

from __future__ import annotations

import json
from pathlib import Path

import numpy as np
import pytest

from tests.distill.pricers import EVEN, coin_group, pricer_of_group
from tests.distill.test_crowds import CASE
from tests.exact.crowds import bars, kind, network
from thumbwright.distill.command import main
from thumbwright.distill.crowd_pricer import CrowdPricer
from thumbwright.distill.forms import Wanted, table, table_for_all
from thumbwright.distill.network_pricer import NetworkPricer
from thumbwright.distill.rules import Row, Rule
from thumbwright.distill.situations import values_of
from thumbwright.distill.tallies import PARTS, Tally
from thumbwright.distill.users import in_the_hands_of, users_of
from thumbwright.exact.adopters import adopt_together
from thumbwright.exact.crowd import Crowd, enumerate_shown
from thumbwright.exact.errors import ModelError
from thumbwright.exact.outcomes import outcome
from thumbwright.exact.play import Act, Situation

BY_STATE = (
    Row(shows={"a1": frozenset({"undecided"})}, minus_at=-3, plus_at=3),
    Row(shows={"a1": frozenset({"plus"})}, minus_at=-5, plus_at=1),
    Row(shows={"a1": frozenset({"minus"})}, minus_at=-1, plus_at=5),
)
CARD = Rule("by hand", "a0", ("a1",), BY_STATE)
COUNTED = Rule("by hand", "a0", ("a1",), (Row(ranges={"plus_shown": (0, None)}, value=0.0),))


def ring(
    size: int, horizon: int = 7, exchange: str = "once", own: tuple[int, int] = (-3, 3)
) -> NetworkPricer:
    sees = [((agent + 1) % size,) for agent in range(size)]
    group = coin_group([own] * size, sees, horizon, exchange)
    return pricer_of_group(group, "a0", EVEN)


def apart(one: Tally, other: Tally) -> float:
    return max(float(np.abs(getattr(one, n) - getattr(other, n)).max()) for n in PARTS)


def test_who_can_use_a_rule() -> None:
    ring_of_three = ring(3).group
    assert users_of(CARD, ring_of_three) == ("a0", "a1", "a2")
    uneven = coin_group([(-3, 3)] * 4, [(1,), (), (0, 1), (2,)], 4)
    assert users_of(CARD, uneven) == ("a0", "a3")
    assert users_of(COUNTED, uneven) == ("a0", "a2", "a3")
    knowing = Rule("by hand", "a0", ("a1",), (Row(thresholds={"a1": frozenset({"x"})}, value=0.0),))
    assert users_of(knowing, ring_of_three) == ("a0",)
    passed_on = in_the_hands_of(CARD, "a2", ring_of_three)
    assert (passed_on.agent, passed_on.seen) == ("a2", ("a0",))
    assert dict(passed_on.rows[1].shows) == {"a0": frozenset({"plus"})}


@pytest.mark.parametrize("exchange", ["once", "settle"])
def test_everybody_by_one_card_is_played_as_a_set(exchange: str) -> None:
    pricer = ring(3, exchange=exchange)

    def policy(situation: Situation) -> Act:
        (state,) = situation.states
        low, high = np.array([(-3, 3), (-5, 1), (-1, 5)]).T
        return Act(np.zeros(state.shape), low[state], high[state])

    users = pricer.users(CARD)
    played = adopt_together(pricer.settings[0].solution, dict.fromkeys(users, policy))
    found = pricer.together_tallies(CARD, users)
    for track, agent in zip(played.tracks, users, strict=True):
        for given, one in enumerate(outcome(track)):
            assert found[agent].plus[given] == pytest.approx(one.plus, abs=1e-14)
            assert found[agent].steps[given] == pytest.approx(one.mean_steps, abs=1e-12)
    assert apart(pricer.together_tally(CARD, ("a0",)), pricer.rule_tally(CARD)) < 1e-12
    among = pricer.together_tally(CARD, ("a0",), others=CARD)
    assert apart(among, found["a0"]) < 1e-14
    assert apart(found["a0"], pricer.rule_tally(CARD)) > 1e-4


def crowd_pricer(horizon: int = 5, exchange: str = "settle") -> CrowdPricer:
    crowd = Crowd((kind(4, bars(-2, 3)),))
    group = network(crowd, 0.1, horizon, exchange)
    shown = enumerate_shown(crowd, 0, 0.1, horizon, exchange)
    return CrowdPricer.build(group, group.agents[0].id, shown, EVEN, None, 0.0, 1)


def test_a_crowd_is_priced_for_one_for_all_and_for_one_among_others() -> None:
    pricer = crowd_pricer()
    seen = pricer.seen
    rule = Rule(
        "by hand",
        pricer.agent,
        seen,
        (
            Row(ranges={"plus_shown": (0, 0)}, value=-0.2),
            Row(ranges={"plus_shown": (1, None)}, value=0.9),
        ),
    )
    other = Rule("by hand", pricer.agent, seen, (Row(value=0.0),))
    users = pricer.users(rule)
    assert len(users) == 4
    alone = pricer.rule_tally(rule)
    assert apart(pricer.together_tally(rule, (pricer.agent,)), alone) == 0.0
    everybody = pricer.together_tally(rule, users)
    assert apart(everybody, alone) > 1e-4
    among = pricer.together_tally(rule, (pricer.agent,), others=rule)
    assert apart(among, everybody) == 0.0
    # Whoever looks at nobody fares the same whatever the others go by.
    assert (
        apart(pricer.together_tally(other, (pricer.agent,), others=rule), pricer.alone_tally)
        < 1e-13
    )
    half = pricer.together_tally(rule, users[:2])
    assert apart(half, everybody) > 1e-5
    assert apart(half, alone) > 1e-5
    # The exact ones take the users for exact, and are shown what they would not do.
    assert half.off_model > everybody.off_model == 0.0


def fixed(pricer: NetworkPricer | CrowdPricer, rows: int, inputs: tuple[str, ...]) -> Rule:
    made = table_for_all.distil(pricer, Wanted(rows, inputs))
    assert "until nothing changed" in made.notes[0] or "is also right" in made.notes[0]
    rule = made.in_rows
    assert rule.form == "table-for-all"
    situations = pricer.situations_among(rule)
    pooled = values_of(*situations.pooled(situations.rows_of(rule), len(rule.rows)))
    assert [row.value for row in rule.rows] == pytest.approx(list(pooled), abs=1e-8)
    return rule


def test_a_table_for_all_values_what_happens_where_all_use_it() -> None:
    pricer = ring(3, 9, own=(-2, 4))
    rule = fixed(pricer, 3, ("shown",))
    plain = table.distil(pricer, Wanted(3, ("shown",))).in_rows
    # In the group that goes by it, the table made among exact agents is off.
    situations = pricer.situations_among(plain)
    pooled = values_of(*situations.pooled(situations.rows_of(plain), 3))
    assert np.abs(pooled - [row.value for row in plain.rows]).max() > 1e-4
    assert rule.rows != plain.rows
    fixed(crowd_pricer(6, "once"), 3, ("minus_shown",))


def test_where_tables_come_round_the_best_of_them_is_taken() -> None:
    pricer = ring(3, 9, own=(-2, 3))
    made = table_for_all.distil(pricer, Wanted(3, ("shown",)))
    assert "came round again after 2" in made.notes[0]
    plain = table.distil(pricer, Wanted(3, ("shown",))).in_rows
    ours, theirs = (
        pricer.objective(pricer.together_tally(rule, pricer.users(rule)))
        for rule in (made.in_rows, plain)
    )
    assert ours <= theirs


def test_without_others_who_can_use_it_there_is_no_table_for_all() -> None:
    group = coin_group([(-2, 4), (-3, 3)], [(), (0,)], 8)
    with pytest.raises(ModelError, match="only a1"):
        table_for_all.distil(pricer_of_group(group, "a1"), Wanted(3, ("shown",)))


def test_the_command_line_prices_rules_in_several_hands(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    text = CASE.format(size=3, horizon=6, exchange="once", more='inputs = ["step", "plus_shown"]')
    file, rule = tmp_path / "trio.toml", tmp_path / "rule.csv"
    file.write_text(text, "utf-8")
    rule.write_text("plus_shown_from,plus_shown_to,nats\n,0,-0.1\n1,,0.8\n", "utf-8")
    given = ["price", str(file), str(rule), "--json"]
    found = {}
    for who in ("one", "a1,a2", "everybody"):
        assert main([*given, "--used-by", who]) == 0
        found[who] = json.loads(capsys.readouterr().out)
    assert found["everybody"]["used_by"] == ["a1", "a2", "a3"]
    assert set(found["a1,a2"]["agents"]) == {"a1", "a2", "a3"}
    assert "agents" not in found["one"]
    assert len({one["figures"]["accuracy"] for one in found.values()}) == 3
    assert 0.5 < found["one"]["agreement"]["same"] < 1.0
    assert main([*given, "--used-by", "60%"]) == 0
    assert json.loads(capsys.readouterr().out)["figures"] == found["a1,a2"]["figures"]
    assert main([*given, "--others-use", str(rule)]) == 0
    among = json.loads(capsys.readouterr().out)
    assert among["figures"] == found["everybody"]["figures"]
    for words, told in (
        (["--used-by", "a9"], "a9 cannot use this rule (allowed: one, everybody, a share such as"),
        (["--used-by", "0%"], "0% is no share (allowed: above 0% to 100%)"),
        (["--used-by", "half%"], "half% is no share"),
        (["--used-by", "a2"], "a1, whose figures are priced, is missing"),
    ):
        assert main([*given, *words]) == 2
        assert told in capsys.readouterr().err
    assert main(["price", str(file), "exact", "--used-by", "everybody"]) == 2
    assert "only a rule from a file" in capsys.readouterr().err
    assert main(["price", str(file), str(rule), "--used-by", "everybody"]) == 0
    told = capsys.readouterr().out
    assert "everybody uses the rule; the figures are those of a1" in told
    assert "on the same observations it ends as exact play does in" in told
