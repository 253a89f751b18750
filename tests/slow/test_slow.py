"""The slow programs against hand calculation, against fixed values and against each other."""

from __future__ import annotations

import json
import math
from itertools import product
from pathlib import Path
from typing import Any

import pytest
from hypothesis import assume, given, settings, strategies as st

from tests.slow import pair_walk as walk
from tests.slow.enumerate import Enumeration, enumerate_group, play_rule
from tests.slow.group import Event, Group, Rule, Thresholds, from_reference

REFERENCE = Path(__file__).parents[1] / "reference"
NETWORKS: list[dict[str, Any]] = json.loads((REFERENCE / "small_networks.json").read_text())
ALPHA = math.log(1.5)
COIN = ((0.6, 0.4), (0.4, 0.6))
SIDES = ("plus", "minus")


def coin_group(
    sees: tuple[tuple[int, ...], ...],
    bars: tuple[tuple[float, float], ...],
    horizon: int,
    exchange: str = "once",
    prior_plus: float = 0.5,
) -> Group:
    """A group with the coin 0.6 and thresholds in coin steps."""
    thresholds = tuple((Thresholds(low * ALPHA, high * ALPHA),) for low, high in bars)
    return Group(sees, (COIN,) * len(sees), thresholds, horizon, exchange, prior_plus)


def coin_pair(
    watched: tuple[float, float],
    observer: tuple[float, float],
    horizon: int,
    exchange: str = "once",
    prior: float = 0.0,
) -> walk.Pair:
    """The same for a one-way pair."""
    bars = [(low * ALPHA, high * ALPHA) for low, high in (watched, observer)]
    return walk.Pair(walk.coin(0.6), bars[0], walk.coin(0.6), bars[1], horizon, exchange, prior)


def ends(model: Enumeration, side: str) -> Any:
    """Outcomes of all agents given one answer."""
    return model.given_plus if side == "plus" else model.given_minus


# --- by hand -------------------------------------------------------------------------------


def test_one_coin_step_decides_at_once() -> None:
    model = enumerate_group(coin_group(((),), ((-1, 1),), 1))
    plus = model.given_plus[0]
    assert (plus.plus, plus.minus, plus.undecided) == (0.6, 0.4, 0.0)
    assert plus.mean_step_if_decided == pytest.approx(1.0, abs=1e-15)
    assert model.given_minus[0].plus == 0.4
    assert len(model.branches) == 2


def test_two_coin_steps_by_hand() -> None:
    model = enumerate_group(coin_group(((),), ((-2, 2),), 2))
    plus = model.given_plus[0]
    assert plus.plus == pytest.approx(0.36, abs=1e-15)
    assert plus.minus == pytest.approx(0.16, abs=1e-15)
    assert plus.undecided == pytest.approx(0.48, abs=1e-15)
    assert plus.mean_step == 2.0


def test_follower_of_one_step_by_hand() -> None:
    """A calls at step 1; B needs two steps' worth and has A's step too from step 2 on."""
    model = enumerate_group(coin_group(((), (0,)), ((-1, 1), (-2, 2)), 2))
    call = (Event(1, 0, "plus"),)
    assert model.worth(1, 2, 0, call) == pytest.approx(ALPHA, abs=1e-14)
    assert model.worth(1, 2, 0, (None,)) is None  # A cannot be undecided there
    # Plus with both own signs and any call never (3 or 1 steps' worth: only A plus decides).
    plus = model.given_plus[1]
    assert plus.plus == pytest.approx(0.6 * 0.36, abs=1e-15)
    assert plus.minus == pytest.approx(0.4 * 0.16, abs=1e-15)


def test_settle_brings_the_call_into_the_same_step() -> None:
    once = enumerate_group(coin_group(((), (0,)), ((-1, 1), (-2, 2)), 1))
    settle = enumerate_group(coin_group(((), (0,)), ((-1, 1), (-2, 2)), 1, "settle"))
    assert once.given_plus[1].undecided == pytest.approx(1.0, abs=1e-15)
    assert once.rounds == (1,)
    assert settle.given_plus[1].plus == pytest.approx(0.36, abs=1e-15)
    assert settle.rounds == (3,)  # A calls, B answers, nobody can answer any more


def test_nothing_happens_before_the_first_observation() -> None:
    model = enumerate_group(coin_group(((),), ((-3, 3),), 1, prior_plus=0.9))
    # The prior alone is worth more than five steps: one sign either way still answers plus.
    assert model.given_minus[0].plus == pytest.approx(1.0, abs=1e-15)
    assert model.given_minus[0].mean_step_if_decided == pytest.approx(1.0, abs=1e-15)


def test_unknown_thresholds_mix_silence() -> None:
    """Half the time A needs one step, half the time two: silence after one step is the second."""
    mixed = (Thresholds(-ALPHA, ALPHA, 0.5), Thresholds(-2 * ALPHA, 3 * ALPHA, 0.5))
    group = Group(((), (0,)), (COIN, COIN), (mixed, (Thresholds(-9.0, 9.0),)), 3)
    model = enumerate_group(group)
    seen = model.worths[(1, 3, 0, (None,))]
    assert seen.shown_plus == pytest.approx(0.5 * (1 - 0.16), abs=1e-15)
    assert seen.shown_minus == pytest.approx(0.5 * (1 - 0.36), abs=1e-15)
    call = model.worths[(1, 2, 0, (Event(1, 0, "plus"),))]
    assert (call.shown_plus, call.shown_minus) == pytest.approx((0.3, 0.2), abs=1e-15)


def test_certain_evidence() -> None:
    """A value that only plus can bring settles the matter; the masses show no rounding."""
    group = Group(((),), (((0.5, 0.0), (0.5, 1.0)),), ((Thresholds(-2.0, 2.0),),), 3)
    model = enumerate_group(group)
    assert model.given_plus[0].plus == 0.875
    assert model.given_minus[0].minus == 1.0  # three silent draws are worth -3 ln 2
    assert model.given_minus[0].plus == 0.0


# --- against fixed values and known facts -----------------------------------------------------


@pytest.mark.parametrize("entry", NETWORKS, ids=lambda e: f"{e['name']} {e['exchange']}")
def test_enumeration_meets_the_reference(entry: dict[str, Any]) -> None:
    group = from_reference(entry)
    model = enumerate_group(group)
    last = {key[2] for key, w in model.worths.items() if w.reached_plus - w.left_plus > 1e-15}
    assert max(last) == entry["max_round"]
    for agent, expected in enumerate(entry["agents"]):
        for side in SIDES:
            got = ends(model, side)[agent]
            for name, value in expected[f"given_{side}"].items():
                assert getattr(got, name) == pytest.approx(value, abs=1e-10), (agent, side, name)
        silent = expected["social_when_nobody_has_committed"]
        for step, value in enumerate(silent, start=1):
            possible = any(
                all(event is None or event.step >= step for event in branch.shown)
                for branch in model.branches
            )
            assert possible == (value is not None)
            if value is not None:
                worth = model.worth(agent, step, 0, (None,) * len(group.sees[agent]))
                assert worth == pytest.approx(value, abs=2e-12)


def test_leaving_out_the_intervention_is_caught() -> None:
    """Given 'the observer is undecided' instead of 'made to show undecided': another number."""
    model = enumerate_group(coin_group(((), (0,)), ((-2, 4), (-2, 3)), 7))
    found = model.worths[(1, 7, 0, (None,))]
    assert found.worth == pytest.approx(0.3907, abs=5e-5)
    going = {
        side: sum(
            getattr(branch, side)
            for branch in model.branches
            if branch.shown[1] is None or branch.shown[1].step >= 7
        )
        for side in SIDES
    }
    conditioned = math.log(
        (found.reached_plus / going["plus"]) / (found.reached_minus / going["minus"])
    )
    assert conditioned == pytest.approx(0.0605, abs=5e-5)


def test_mutual_pair_facts() -> None:
    model = enumerate_group(coin_group(((1,), (0,)), ((-4, 8), (-4, 8)), 8, "settle"))
    for (_, _, _, seen), worth in model.worths.items():
        if seen[0] is not None:
            steps = 8 if seen[0].answer == "plus" else -4 if seen[0].step < 7 else -5
            assert worth.worth == pytest.approx(steps * ALPHA, abs=1e-12)


def test_silence_in_an_even_crowd_tells_nothing_until_someone_calls() -> None:
    model = enumerate_group(coin_group(((1, 2), (0, 2), (0, 1)), ((-2, 2),) * 3, 4))
    assert model.worth(0, 4, 0, (None, None)) == pytest.approx(0.0, abs=1e-14)
    after = model.worth(0, 4, 0, (Event(2, 0, "plus"), None))
    assert after is not None
    assert after < 2 * ALPHA - 0.1


def test_one_way_facts_over_long_horizons() -> None:
    worths = walk.Worths(coin_pair((-2, 4), (-3, 3), 60))
    for call, worth in worths.calls.items():
        expected = 4 * ALPHA if call.answer == "plus" else -2 * ALPHA
        assert worth == pytest.approx(expected, abs=1e-11)
    assert worths.silence[60] == pytest.approx(ALPHA, abs=1e-11)  # half of 4 - 2 steps
    pair = coin_pair((-2, 6), (-3, 3), 60)
    wrong = [
        (walk.play(pair, rule, "plus").minus, walk.play(pair, rule, "minus").plus)
        for rule in (walk.plain_count(pair), walk.exact(pair))
    ]
    assert wrong[0] == pytest.approx((0.2898, 0.1349), abs=5e-5)
    assert wrong[1] == pytest.approx((0.2028, 0.1810), abs=5e-5)


def test_published_silence_values() -> None:
    alpha = math.log(7 / 3)
    pair = walk.Pair(walk.coin(0.7), (-2 * alpha, 3 * alpha), walk.coin(0.7), (-9, 9), 60)
    silence = walk.Worths(pair).silence
    assert silence[2:5] == pytest.approx(
        [0.579033873793, 0.160342650075, 0.646627164925], abs=1e-11
    )
    assert (silence[60], silence[59]) == pytest.approx((0.657879149851, 0.189418710536), abs=1e-9)


def test_the_four_line_card_and_a_merged_one() -> None:
    pair = coin_pair((-2, 4), (-3, 3), 40)

    def card(early: bool) -> walk.LookRule:
        def rule(step: int, shown: walk.Call | None, count: int) -> str | None:
            low, high = (-3, 3) if early and step <= 2 else (-4, 3)
            if shown is not None:
                low, high = (-7, -1) if shown.answer == "plus" else (-1, 5)
            return "plus" if count >= high else "minus" if count <= low else None

        return walk.reading(rule)

    for side in SIDES:
        best = walk.play(pair, walk.exact(pair), side)
        four = walk.play(pair, card(True), side)
        for name in ("plus", "minus", "undecided", "mean_step"):
            assert abs(getattr(four, name) - getattr(best, name)) < 1e-5
        # Bars of three are out of reach in two checks, so the early line is never felt there.
        assert walk.play(pair, card(False), side) == four


# --- against each other ---------------------------------------------------------------------

SOURCES = st.one_of(
    st.floats(0.55, 0.8).map(walk.coin),
    st.tuples(st.floats(0.2, 0.4), st.floats(0.05, 0.15)).map(lambda p: walk.bernoulli(*p)),
)
BARS = st.tuples(st.floats(-1.6, -0.3), st.floats(0.3, 1.6))


@settings(max_examples=30, deadline=None)
@given(SOURCES, SOURCES, BARS, BARS, st.sampled_from(["once", "settle"]), st.floats(-0.25, 0.25))
def test_pair_walk_agrees_with_enumeration(
    watched: walk.Source,
    observer: walk.Source,
    watched_bars: tuple[float, float],
    observer_bars: tuple[float, float],
    exchange: str,
    prior: float,
) -> None:
    pair = walk.Pair(watched, watched_bars, observer, observer_bars, 5, exchange, prior)
    masses = [((s.p_plus, s.p_minus), (1 - s.p_plus, 1 - s.p_minus)) for s in (watched, observer)]
    bars = ((Thresholds(*watched_bars),), (Thresholds(*observer_bars),))
    prior_plus = 1 / (1 + math.exp(-prior))
    group = Group(((), (0,)), tuple(masses), bars, 5, exchange, prior_plus)
    model = enumerate_group(group)
    assume(model.narrowest > 1e-8)

    def counting(step: int, round_: int, seen: Any, tally: float, own: Any) -> str | None:
        event = seen[0]
        news = 0.0 if event is None else watched_bars[event.answer == "plus"] - prior
        belief = prior + tally + news
        return (
            "plus"
            if belief >= observer_bars[1]
            else ("minus" if belief <= observer_bars[0] else None)
        )

    adopted = play_rule(group, model, 1, counting)
    for side in SIDES:
        for slow, rule in ((model, walk.exact(pair)), (adopted, walk.plain_count(pair))):
            got = walk.play(pair, rule, side)
            expected = ends(slow, side)[1]
            for name in ("plus", "minus", "undecided", "mean_step"):
                assert getattr(got, name) == pytest.approx(getattr(expected, name), abs=1e-12)


def test_comparison_agrees_with_all_sequences() -> None:
    pair = coin_pair((-1, 2), (-2, 2), 5)
    rules = (walk.exact(pair), walk.alone(pair))
    joint: dict[tuple[str | None, str | None], float] = {}
    gap = 0.0
    for signs in product((1, -1), repeat=10):
        mass = math.prod(0.6 if sign == 1 else 0.4 for sign in signs)
        calls: list[walk.Call | None] = [None]
        for step in range(1, 6):
            total = sum(signs[:step])
            said = "plus" if total >= 2 else "minus" if total <= -1 else None
            calls.append(calls[-1] or (walk.Call(step, said) if said else None))
        results = []
        for rule in rules:
            answers = (
                (rule(step, step - 1, calls[step - 1], sum(signs[5 : 5 + step])), step)
                for step in range(1, 6)
            )
            results.append(next((a for a in answers if a[0] is not None), (None, 5)))
        key = (results[0][0], results[1][0])
        joint[key] = joint.get(key, 0.0) + mass
        gap += mass * abs(results[0][1] - results[1][1])
    got = walk.compare(pair, *rules, "plus")
    assert got.ends.keys() == joint.keys()
    for key, mass in joint.items():
        assert got.ends[key] == pytest.approx(mass, abs=1e-12)
    assert got.step_gap == pytest.approx(gap, abs=1e-12)
    assert gap > 0.1


def exact_rule(group: Group, model: Enumeration, agent: int) -> Rule:
    """The exact agent dressed as a rule."""
    (bars,) = group.thresholds[agent]

    def rule(step: int, round_: int, seen: Any, tally: float, own: Any) -> str | None:
        worth = model.worth(agent, step, round_, seen)
        assert worth is not None
        belief = group.prior + tally + worth
        if belief >= bars.plus - 1e-9:
            return "plus"
        return "minus" if belief <= bars.minus + 1e-9 else None

    return rule


@pytest.mark.parametrize("entry", NETWORKS[2:9:2] + NETWORKS[14:21:2], ids=lambda e: e["name"])
def test_a_rule_equal_to_the_exact_worths_changes_nothing(entry: dict[str, Any]) -> None:
    group = from_reference(entry)
    model = enumerate_group(group)
    for agent in range(len(group.sees)):
        played = play_rule(group, model, agent, exact_rule(group, model, agent))
        assert (played.given_plus, played.given_minus) == (model.given_plus, model.given_minus)
        assert played.odd_commitments == played.odd_silence == (0.0, 0.0)


@pytest.mark.parametrize(("call_at", "worth_in_steps"), [(1, 0.0), (2, 2.0), (3, 2.0), (5, 2.0)])
def test_calls_the_model_does_not_know(call_at: int, worth_in_steps: float) -> None:
    """A model neighbour with +-2 steps calls at 2, 4, 6; earlier or between is read as told."""
    group = coin_group(((), (0,)), ((-2, 2), (-3, 3)), 6)
    model = enumerate_group(group)
    played = play_rule(group, model, 0, lambda step, *_: "plus" if step == call_at else None)
    index = played.tables.moments.index((call_at + 1, 0))
    reading, worth, _ = played.tables.read(1, index, (Event(call_at, 0, "plus"),))
    assert worth == pytest.approx(worth_in_steps * ALPHA, abs=1e-12)
    known = call_at // 2 * 2
    assert reading == ((Event(known, 0, "plus"),) if known else (None,))
    watching = [
        branch.plus
        for branch in played.branches
        if branch.shown[1] is None or branch.shown[1].step > call_at
    ]
    odd = 0.0 if call_at == 2 else math.fsum(watching)
    assert played.odd_commitments[0] == pytest.approx(odd, abs=1e-15)


def test_silence_the_model_does_not_know_leaves_the_value() -> None:
    group = coin_group(((), (0,)), ((-1, 1), (-2, 2)), 3)
    played = play_rule(group, enumerate_group(group), 0, lambda *_: None)
    assert played.odd_silence[0] == pytest.approx(1.0, abs=1e-15)
    alone = enumerate_group(coin_group(((),), ((-2, 2),), 3))
    for name in ("plus", "minus", "undecided", "mean_step"):
        got, expected = (getattr(x, name) for x in (played.given_plus[1], alone.given_plus[0]))
        assert got == pytest.approx(expected, abs=1e-12)
