"""What rules cost: against simulation, by hand, and in cases where the answer is known."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest

from tests.distill.pricers import (
    ALPHA,
    EVEN,
    coin_group,
    covering,
    one_way,
    pair,
    pricer_of_group,
)
from tests.exact.comparing import COIN
from tests.slow import group as slow, pair_walk as walk, simulate as sim
from tests.slow.enumerate import enumerate_group, play_rule
from thumbwright.distill.forms import Wanted, table
from thumbwright.distill.network_pricer import NetworkPricer
from thumbwright.distill.rules import SHOWN, Row, Rule
from thumbwright.distill.tallies import Tally, average
from thumbwright.exact.engine import solve
from thumbwright.exact.evidence.binary import coin
from thumbwright.exact.group import Agent, Group, Thresholds, same_thresholds
from thumbwright.exact.play import Act, Situation
from thumbwright.exact.stopping import Losses, costs_behind

SIDES = ("plus", "minus")
RUNS = 40_000


def shows(*states: str) -> dict[str, frozenset[str]]:
    return {"a0": frozenset(states)}


CARD = Rule(
    "card",
    "a1",
    ("a0",),
    (
        Row(shows=shows("undecided"), step_to=3, minus_at=-3, plus_at=2),
        Row(shows=shows("undecided"), step_from=4, minus_at=-4, plus_at=3),
        Row(shows=shows("plus"), minus_at=-6, plus_at=-1),
        Row(shows=shows("minus"), minus_at=-1, plus_at=None),
    ),
)


def card_bars(step: int, shown: tuple[str, ...]) -> tuple[float, float]:
    """The same card, for the simulation."""
    if shown[0] == "":
        return (-3, 2) if step <= 3 else (-4, 3)
    return (-6, -1) if shown[0] == "plus" else (-1, math.inf)


def within(got: sim.Estimates, tally: Tally, side: int) -> None:
    for name, value in (
        ("plus", tally.plus),
        ("minus", tally.minus),
        ("undecided", tally.undecided),
        ("mean_step", tally.steps),
    ):
        assert getattr(got, name).off(float(value[side])) < 4.0, (side, name)


def test_one_way_price_agrees_with_simulation() -> None:
    pricer = one_way((-2, 4), (-3, 3), 30)
    tally = pricer.rule_tally(CARD)
    evidence = [sim.values(COIN, sim.COIN_COUNTS)] * 2
    players = [sim.alone(0.0, (-2 * ALPHA, 4 * ALPHA)), sim.by_count(card_bars)]
    for side, answer in enumerate(SIDES):
        runs = sim.simulate(((), (0,)), evidence, players, 30, answer, RUNS, 100 + side)
        within(runs.of(1), tally, side)
        # The same runs refuse the figures of another way of playing.
        assert runs.of(1).mean_step.off(float(pricer.alone_tally.steps[side])) > 4.0


@pytest.mark.parametrize("exchange", ["once", "settle"])
def test_price_in_a_mutual_pair_agrees_with_simulation(exchange: str) -> None:
    """The other plays on exactly, and takes the adopter for exact."""
    bars = tuple((slow.Thresholds(m * ALPHA, p * ALPHA),) for m, p in ((-2, 4), (-3, 3)))
    case = slow.Group(((1,), (0,)), (COIN, COIN), bars, 7, exchange)
    model = enumerate_group(case)
    pricer = pricer_of_group(coin_group([(-2, 4), (-3, 3)], [(1,), (0,)], 7, exchange), "a1")
    tally = pricer.rule_tally(CARD)

    def rule(step: int, _round: int, seen: slow.Shown, _tally: float, own: object) -> str | None:
        assert isinstance(own, tuple)
        low, high = card_bars(step, ("" if seen[0] is None else seen[0].answer,))
        count = len(own) - 2 * sum(own)
        return "plus" if count >= high else "minus" if count <= low else None

    played = play_rule(case, model, 1, rule, rounds="actual")
    off_model = sum(played.odd_commitments) / 2
    assert off_model > 0.01
    assert tally.off_model == pytest.approx(off_model, abs=1e-12)
    evidence = [sim.values(COIN, sim.COIN_COUNTS)] * 2
    players = [sim.exact(case, model, 0), sim.by_count(card_bars)]
    for side, answer in enumerate(SIDES):
        runs = sim.simulate(
            case.sees, evidence, players, 7, answer, RUNS, 200 + side, played.rounds
        )
        within(runs.of(1), tally, side)
    assert [tally.plus[0], tally.steps[0]] == pytest.approx(
        [played.given_plus[1].plus, played.given_plus[1].mean_step], abs=1e-12
    )


def exact_table(pricer: NetworkPricer) -> Rule:
    """One row per step and shown state, with the exact worth there."""
    s = pricer.situations
    rows = {}
    for i in range(len(s.step)):
        cell = (int(s.step[i]), int(s.states[i, 0]))
        if cell in rows:
            assert rows[cell].value == pytest.approx(float(s.worth[i]), abs=1e-9)
        else:
            step, state = cell
            rows[cell] = Row(step, step, shows(SHOWN[state]), value=float(s.worth[i]))
    return Rule("table", "a1", ("a0",), tuple(rows.values()))


@pytest.mark.parametrize(("watched", "observer"), [((-2, 4), (-3, 3)), ((-3, 2), (-2, 5))])
def test_a_rule_equal_to_the_exact_worths_costs_nothing(
    watched: tuple[int, int], observer: tuple[int, int]
) -> None:
    pricer = one_way(watched, observer, 40)
    rule = exact_table(pricer)
    figures = pricer.figures(pricer.rule_tally(rule))
    assert figures.accuracy_lost == pytest.approx(0.0, abs=1e-15)
    assert figures.delay_added == pytest.approx(0.0, abs=1e-15)
    assert figures.benefit_kept == pytest.approx(1.0, abs=1e-14)
    # A corrupted row is noticed.
    wrong = replace(rule.rows[4], value=rule.rows[4].value - 2 * ALPHA)  # type: ignore[operator]
    spoiled = replace(rule, rows=(*rule.rows[:4], wrong, *rule.rows[5:]))
    assert abs(pricer.figures(pricer.rule_tally(spoiled)).accuracy_lost) > 1e-4


LOSSES = Losses(1.0, 1.0, 0.0137)


def test_information_is_not_benefit() -> None:
    """Neighbour -2/+6, observer -3/+3, coin 0.6, horizon 60.

    The plain count has both kinds of wrong answer on the other side of exact play, and decides
    earlier; a table that keeps less information than the most informative one keeps more of the
    benefit, unless its silence is rounded.
    """
    pricer = one_way((-2, 6), (-3, 3), 60, losses=LOSSES)
    exact = pricer.figures(pricer.exact_tally)
    plain = pricer.figures(pricer.plain_count_tally())
    assert [plain.wrong_given_plus, plain.wrong_given_minus] == pytest.approx(
        [0.2898, 0.1349], abs=5e-5
    )
    assert [exact.wrong_given_plus, exact.wrong_given_minus] == pytest.approx(
        [0.2028, 0.1810], abs=5e-5
    )
    assert plain.delay_added < 0.0
    slow_case = pair((-2, 6), (-3, 3), 60)
    slow_plain = walk.play(slow_case, walk.plain_count(slow_case), "plus")
    assert plain.wrong_given_plus == pytest.approx(slow_plain.minus, abs=1e-12)

    def kept(silence: float) -> tuple[float | None, float | None]:
        values = zip(("minus", "undecided", "plus"), (-2.0, silence, 6.0), strict=True)
        rows = tuple(Row(shows=shows(state), value=v * ALPHA) for state, v in values)
        rule = Rule("table", "a1", ("a0",), rows)
        s = pricer.situations
        row = s.rows_of(rule)
        plus, minus = s.pooled(row, 3)
        both = plus + minus
        saved = sum(float(m @ np.log(2 * m / both)) for m in (plus, minus))
        figures = pricer.figures(pricer.rule_tally(rule))
        return s.information_kept(saved), figures.benefit_kept

    information, benefit = kept(0.789)
    assert information == pytest.approx(0.8268, abs=5e-5)
    assert benefit == pytest.approx(0.94, abs=5e-3)
    assert kept(1.0)[1] == pytest.approx(0.56, abs=5e-3)
    informative = table.distil(pricer, Wanted(3, ("step", "shown")))
    assert informative.information_kept == pytest.approx(0.8845, abs=5e-5)
    figures = pricer.figures(pricer.rule_tally(informative.rule))
    assert figures.benefit_kept == pytest.approx(0.81, abs=5e-3)


# --- risk -----------------------------------------------------------------------------------

TALLY = Tally(
    plus=np.array([0.6, 0.1]),
    minus=np.array([0.2, 0.7]),
    undecided=np.array([0.2, 0.2]),
    steps=np.array([5.0, 4.0]),
    lean_plus=np.array([0.15, 0.04]),
    lean_minus=np.array([0.05, 0.16]),
)


def test_risk_by_hand() -> None:
    """Prior 0.3; loss 2 for a wrong plus, 3 for a wrong minus, 0.1 a step."""
    steps = 0.1 * (0.3 * 5.0 + 0.7 * 4.0)
    stated = Losses(2.0, 3.0, 0.1, undecided=0.5)
    by_hand = 2.0 * 0.7 * 0.1 + 3.0 * 0.3 * 0.2 + steps + 0.5 * 0.2
    assert TALLY.risk(stated, 0.3) == pytest.approx(by_hand, rel=1e-14)
    # Left out: at the horizon the belief answers.
    forced = 2.0 * 0.7 * (0.1 + 0.04) + 3.0 * 0.3 * (0.2 + 0.05) + steps
    assert TALLY.risk(Losses(2.0, 3.0, 0.1), 0.3) == pytest.approx(forced, rel=1e-14)
    free = replace(stated, undecided=0.0)
    assert TALLY.risk(stated, 0.3) - TALLY.risk(free, 0.3) == pytest.approx(0.1, rel=1e-12)


def test_risk_of_a_tiny_case() -> None:
    """One look, thresholds out of reach: the only sign decides, or nothing does."""
    price = Losses(1.0, 4.0, 0.01)
    pricer = pricer_of_group(coin_group([(-9, 9), (-9, 9)], [(), (0,)], 1), "a1", price)
    assert pricer.exact_tally.undecided == pytest.approx([1.0, 1.0], abs=1e-12)
    # Wrong with 0.4 either way; plus when minus costs 1, minus when plus costs 4.
    risk = pricer.exact_tally.risk(price, 0.5)
    assert risk == pytest.approx(0.5 * 0.4 * 1.0 + 0.5 * 0.4 * 4.0 + 0.01, rel=1e-12)
    # After two looks, one sign each way (0.48) leaves the belief even: half for each answer.
    pricer = pricer_of_group(coin_group([(-9, 9), (-9, 9)], [(), (0,)], 2), "a1", price)
    risk = pricer.exact_tally.risk(price, 0.5)
    assert risk == pytest.approx(2.5 * (0.16 + 0.24) + 0.02, rel=1e-12)
    stated = replace(price, undecided=0.25)
    assert pricer.exact_tally.risk(stated, 0.5) == pytest.approx(0.25 + 0.02, rel=1e-12)


def test_at_the_horizon_the_value_of_the_row_tips_the_belief() -> None:
    price = Losses(1.0, 1.0, 0.01)
    pricer = pricer_of_group(coin_group([(-9, 9), (-9, 9)], [(), (0,)], 1), "a1", price)

    def risk(value: float) -> float:
        rule = Rule("table", "a1", ("a0",), (Row(value=value),))
        return pricer.rule_tally(rule).risk(price, 0.5)

    assert risk(0.9 * ALPHA) == pytest.approx(0.41, rel=1e-12)
    assert risk(1.1 * ALPHA) == pytest.approx(0.51, rel=1e-12)  # plus whatever was seen
    assert risk(-ALPHA) == pytest.approx(0.5 * (0.6 / 2 + 0.4) + 0.5 * 0.4 / 2 + 0.01, rel=1e-12)


def test_settings_are_averaged() -> None:
    named = {"x": (-2.0, 4.0), "y": (-4.0, 2.0)}
    both = covering(named, (-3, 3), 20)
    parts = [one_way(bars, (-3, 3), 20) for bars in named.values()]
    rule = Rule(
        "table",
        "a1",
        ("a0",),
        (
            Row(thresholds={"a0": frozenset(["x"])}, value=0.4),
            Row(thresholds={"a0": frozenset(["y"])}, value=-0.4),
        ),
    )
    own = [
        part.rule_tally(Rule("table", "a1", ("a0",), (Row(value=value),)))
        for part, value in zip(parts, (0.4, -0.4), strict=True)
    ]
    for got, expected in (
        (both.rule_tally(rule), average([(0.5, tally) for tally in own])),
        (both.exact_tally, average([(0.5, part.exact_tally) for part in parts])),
    ):
        for name in ("plus", "minus", "undecided", "steps", "lean_plus", "lean_minus"):
            assert getattr(got, name) == pytest.approx(getattr(expected, name), abs=1e-14)


# --- benefit -------------------------------------------------------------------------------


def useless(losses: Losses | None) -> NetworkPricer:
    """The neighbour's evidence says nothing, so it never answers."""
    bars = same_thresholds(Thresholds(-3 * ALPHA, 3 * ALPHA))
    agents = (Agent("a0", coin(0.5), bars), Agent("a1", coin(0.6), bars, ("a0",)))
    return pricer_of_group(Group(agents, 0.0, 20), "a1", losses)


def test_watching_a_useless_neighbour_is_worth_nothing() -> None:
    pricer = useless(EVEN)
    assert not pricer.watching_is_worth
    assert pricer.figures(pricer.exact_tally).benefit_kept is None
    assert pricer.figures(pricer.rule_tally(CARD)).benefit_kept is None
    assert pricer.figures(pricer.exact_tally).accuracy_lost == 0.0
    assert useless(None).watching_is_worth  # without costs nothing can be said


def test_benefit_by_its_definition() -> None:
    pricer = one_way((-2, 4), (-3, 3), 30)
    alone, exact, rule = (
        tally.risk(EVEN, 0.5)
        for tally in (pricer.alone_tally, pricer.exact_tally, pricer.rule_tally(CARD))
    )
    assert pricer.watching_is_worth
    assert alone - exact > 0.01 * alone
    figures = pricer.figures(pricer.rule_tally(CARD))
    assert figures.benefit_kept == pytest.approx((alone - rule) / (alone - exact), rel=1e-12)
    assert figures.risk == pytest.approx(rule, rel=1e-14)
    kept = [pricer.figures(t).benefit_kept for t in (pricer.alone_tally, pricer.exact_tally)]
    assert kept == [0.0, 1.0]
    # Alone is what the walk of one agent says.
    lone = walk.play(pair((-2, 4), (-3, 3), 30), walk.alone(pair((-2, 4), (-3, 3), 30)), "plus")
    assert pricer.alone_tally.minus[0] == pytest.approx(lone.minus, abs=1e-12)


def test_inferred_costs_come_with_the_benefit_at_the_ends() -> None:
    group = coin_group([(-2, 4), (-3, 3)], [(), (0,)], 40)
    own = group.agents[1]
    cone = costs_behind(own.evidence, own.thresholds[0][1], 0.0, 40)
    assert cone is not None
    built = pricer_of_group(group, "a1")
    pricer = NetworkPricer.build("a1", built.settings, cone.middle, cone)
    tally = pricer.rule_tally(CARD)
    basis = pricer.basis(tally)
    assert basis is not None
    assert basis.inferred
    assert basis.benefit_kept_range is not None
    ends = [pricer.benefit_kept(tally, corner) for corner in cone.corners]
    assert None not in ends
    assert basis.benefit_kept_range == (min(ends), max(ends))  # type: ignore[type-var]
    middle = pricer.figures(tally).benefit_kept
    assert middle is not None
    assert basis.benefit_kept_range[0] <= middle <= basis.benefit_kept_range[1]
    stated = built.basis(tally)
    assert stated is not None
    assert (stated.inferred, stated.per_step_range) == (False, None)


def test_without_costs_there_is_no_risk_but_everything_else() -> None:
    pricer = one_way((-2, 4), (-3, 3), 20, losses=None)
    figures = pricer.figures(pricer.rule_tally(CARD))
    assert (figures.risk, figures.benefit_kept, pricer.basis(pricer.exact_tally)) == (
        None,
        None,
        None,
    )
    assert pricer.objective(pricer.exact_tally) == pytest.approx(
        1.0 - figures.accuracy - figures.accuracy_lost, abs=1e-12
    )
    assert solve(pricer.group).near_tie_mass == 0.0


@pytest.mark.parametrize("exchange", ["once", "settle"])
def test_a_rule_on_counts_costs_what_the_same_rule_on_states_costs(exchange: str) -> None:
    """Written once by how many show what, and once by who shows what."""
    bars = [(-2, 3), (-3, 2), (-3, 3)]
    group = coin_group(bars, [(1,), (0,), (0, 1)], 9, exchange)
    pricer = pricer_of_group(group, "a2")
    values = {(0, 0): 0.1, (1, 0): 0.7, (0, 1): -0.8, (2, 0): 1.4, (0, 2): -1.5, (1, 1): -0.05}
    by_count, by_state = [], []
    for (plus, minus), value in values.items():
        ranges = {"plus_shown": (plus, plus), "minus_shown": (minus, minus)}
        by_count.append(Row(ranges=ranges, value=value))
        by_state += [
            Row(shows={"a0": frozenset({one}), "a1": frozenset({two})}, value=value)
            for one in SHOWN
            for two in SHOWN
            if ((one, two).count("plus"), (one, two).count("minus")) == (plus, minus)
        ]
    one, two = (
        pricer.rule_tally(Rule("by hand", "a2", ("a0", "a1"), tuple(rows)))
        for rows in (by_count, by_state)
    )
    for name in ("plus", "minus", "undecided", "steps", "lean_plus", "lean_minus"):
        assert getattr(one, name) == pytest.approx(getattr(two, name), abs=1e-15)
    assert one.undecided.max() > 1e-3


def test_a_rule_on_times_costs_what_it_says() -> None:
    """A commitment of step s is met at t as t - s + 1 steps since: forgotten after three of them.

    The same rule as a policy that reads the steps of the answers itself.
    """
    pricer = one_way((-2, 3), (-3, 3), 12)
    fresh = {"steps_since_last": (1, 3)}
    rows = (
        Row(ranges=fresh, shows=shows("plus"), value=1.0),
        Row(ranges=fresh, shows=shows("minus"), value=-1.0),
        Row(ranges={"steps_since_last": (0, 0)}, value=0.0),
        Row(ranges={"steps_since_last": (4, None)}, value=0.0),
    )

    def forgetful(situation: Situation) -> Act:
        (state,), (step,) = situation.states, situation.shown_steps
        recent = (state > 0) & (situation.step - step < 3)
        return Act(np.where(recent, np.array([0.0, 1.0, -1.0])[state], 0.0))

    one = pricer.rule_tally(Rule("by hand", "a1", ("a0",), rows))
    two = pricer.play(lambda _: forgetful)[0]
    for name in ("plus", "minus", "undecided", "steps", "lean_plus", "lean_minus"):
        assert getattr(one, name) == pytest.approx(getattr(two, name), abs=1e-15)
    assert abs(one.plus - pricer.alone_tally.plus).max() > 1e-2
