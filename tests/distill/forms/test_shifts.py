"""The form "shifts": all alternatives on small inputs, bars as they are said, symmetries."""

from __future__ import annotations

import itertools
from dataclasses import replace

import numpy as np
import pytest

from tests.distill.pricers import ALPHA, coin_group, covering, one_way, pricer_of_group
from tests.distill.test_views import broadcast_view
from thumbwright.distill.costs import Pricer
from thumbwright.distill.forms import Distilled, Wanted, shifts
from thumbwright.distill.forms.cells import Cells
from thumbwright.distill.network_pricer import NetworkPricer
from thumbwright.distill.pricing import pricer_of
from thumbwright.distill.reading import read_case
from thumbwright.distill.rules import SHOWN
from thumbwright.distill.shifts import Base, Move, Shifts
from thumbwright.exact.errors import ModelError
from thumbwright.exact.stopping import Losses

BOTH = ("step", "shown")


def built(pricer: Pricer, rows: int, inputs: tuple[str, ...] = BOTH) -> tuple[Shifts, Distilled]:
    made = shifts.distil(pricer, Wanted(rows, inputs))
    assert isinstance(made.rule, Shifts)
    assert made.rule.rows <= rows
    return made.rule, made


def risk(pricer: Pricer, rule: Shifts) -> float:
    found = pricer.price(rule).risk
    assert found is not None
    return found


@pytest.mark.parametrize(
    ("watched", "observer"), [((-2, 4), (-2, 2)), ((-1, 3), (-2, 3)), ((-3, 2), (-2, 2))]
)
def test_against_all_alternatives(watched: tuple[int, int], observer: tuple[int, int]) -> None:
    pricer = one_way(watched, observer, 9, losses=Losses(1.0, 1.2, 0.03))
    cells = Cells.of(pricer, BOTH)
    assert cells is not None
    ranges = {"plus": range(6), "minus": range(-5, 1), "undecided": range(-3, 4)}
    every = [
        Shifts(
            "a1",
            ("a0",),
            (Base(None, low, high),),
            (Move(one, ("a0",), first), Move(other, ("a0",), second)),
            ALPHA,
        )
        for one, other in itertools.combinations(ranges, 2)
        for low, high, first, second in itertools.product(
            range(-5, 0), range(1, 6), ranges[one], ranges[other]
        )
    ]
    prices = [pricer.objective(t) for t in cells.tallies([cells.of_way(one) for one in every])]
    rule, _ = built(pricer, 3, ("shown",))
    assert risk(pricer, rule) == pytest.approx(min(prices), abs=1e-12)
    best = every[prices.index(min(prices))]
    # No single number moved makes it better, whatever the search went through.
    for near in neighbours(rule):
        assert risk(pricer, near) >= risk(pricer, rule) - 1e-12
    assert risk(pricer, best) == pytest.approx(min(prices), abs=1e-12)


def neighbours(rule: Shifts) -> list[Shifts]:
    (base,) = rule.base
    found = [
        replace(rule, base=(replace(base, **{name: getattr(base, name) + by}),))
        for name in ("minus_at", "plus_at")
        for by in (-1, 1)
    ]
    for n, move in enumerate(rule.moves):
        for by in (-1, 1):
            moves = (*rule.moves[:n], replace(move, down=move.down + by), *rule.moves[n + 1 :])
            found.append(replace(rule, moves=moves))
    return found


def test_both_ways_of_pricing_agree() -> None:
    for pricer in (
        one_way((-2, 4), (-3, 3), 12),
        covering({"x": (-2, 4), "y": (-4, 2)}, (-3, 3), 9),
    ):
        cells = Cells.of(pricer, BOTH)
        assert cells is not None
        rule = Shifts(
            "a1",
            ("a0",),
            (Base(4, -3, 3), Base(None, -4, 3)),
            (Move("plus", ("a0",), 3), Move("undecided", ("a0",), 1, 6)),
            ALPHA,
        )
        (found,) = cells.tallies([cells.of_way(rule)])
        assert pricer.objective(found) == pytest.approx(risk(pricer, rule), abs=1e-12)
        values = cells.of_way(lambda view: 0.5 * view.state("a0") - 0.1 * (view.step > 4))
        (found,) = cells.tallies([values])
        priced = pricer.price(lambda view: 0.5 * view.state("a0") - 0.1 * (view.step > 4))
        assert pricer.objective(found) == pytest.approx(priced.risk, abs=1e-12)


def test_bars_are_those_that_the_sentences_say() -> None:
    """Every joint history of three agents at two steps, agent by agent."""
    rule = Shifts(
        "me",
        ("a", "b", "c"),
        (Base(4, -3, 3), Base(None, -2, 4)),
        (Move("plus", ("a", "b"), 2), Move("minus", ("c",), -5), Move("undecided", (), 1, 5)),
        0.4,
    )
    for step, (low, high) in ((4, (-3, 3)), (5, (-2, 4))):
        view = broadcast_view(step)
        act = rule(view)
        states = np.broadcast_arrays(*(view.state(agent) for agent in "abc"))
        lows, highs = np.broadcast_arrays(act.minus_at, act.plus_at, states[0])[:2]
        for cell in np.ndindex(states[0].shape):
            shown = [SHOWN[int(state[cell])] for state in states]
            down = 2 * shown[:2].count("plus") - 5 * (shown[2] == "minus")
            down += shown.count("undecided") if step >= 5 else 0
            assert (lows[cell], highs[cell]) == (low - down, high - down)
    assert rule.sentences() == (
        "Bars at steps 1 to 4: minus at -3 or below, plus at 3 or above.",
        "Bars from step 5 on: minus at -2 or below, plus at 4 or above.",
        "For each of a, b that shows plus: both bars 2 boxes down.",
        "C shows minus: both bars 5 boxes up.",
        "For each agent that shows undecided from step 5 on: both bars 1 box down.",
    )
    assert list(rule.parameters) == [
        "minus_at_1",
        "plus_at_1",
        "step_to_1",
        "minus_at_2",
        "plus_at_2",
        "down_plus_a_b",
        "down_minus_c",
        "down_undecided",
        "down_undecided_step_from",
    ]


def test_counting_is_the_same_as_naming_agents_of_one_kind() -> None:
    group = coin_group([(-2, 3), (-2, 3), (-3, 3)], [(), (), (0, 1)], 8)
    pricer = pricer_of_group(group, "a2")
    named, _ = built(pricer, 4)
    counted, _ = built(pricer, 4, ("step", "plus_shown", "minus_shown", "undecided_shown"))
    assert {move.agents for move in named.moves} == {("a0", "a1")}
    assert {move.agents for move in counted.moves} == {()}
    assert [m.down for m in named.moves] == [m.down for m in counted.moves]
    assert risk(pricer, named) == pytest.approx(risk(pricer, counted), abs=1e-12)


def test_agents_that_differ_get_shifts_of_their_own() -> None:
    group = coin_group([(-1, 4), (-4, 1), (-3, 3)], [(), (), (0, 1)], 9)
    pricer = pricer_of_group(group, "a2")
    rule, made = built(pricer, 5)
    assert {move.agents for move in rule.moves} == {("a0",), ("a1",)}
    assert "plus of a0" in made.notes[-1]


@pytest.mark.parametrize("rows", [1, 2, 3, 5])
def test_swapping_plus_and_minus_mirrors_it(rows: int) -> None:
    one = one_way((-2, 5), (-3, 4), 14, losses=Losses(1.0, 1.4, 0.02))
    other = one_way((-5, 2), (-4, 3), 14, losses=Losses(1.4, 1.0, 0.02))
    rule, mirror = built(one, rows)[0], built(other, rows)[0]
    assert risk(other, mirror) == pytest.approx(risk(one, rule), abs=1e-12)
    assert mirror.base == tuple(
        Base(base.step_to, -base.plus_at, -base.minus_at) for base in rule.base
    )
    turned = {"plus": "minus", "minus": "plus", "undecided": "undecided"}
    assert {(turned[m.shows], -m.down, m.step_from) for m in rule.moves} == {
        (m.shows, m.down, m.step_from) for m in mirror.moves
    }


def test_more_lines_are_never_worse_and_one_line_keeps_nothing() -> None:
    pricer = one_way((-2, 6), (-3, 3), 30, losses=Losses(1.0, 1.0, 0.0137))
    risks = [risk(pricer, built(pricer, rows)[0]) for rows in (1, 2, 3, 4, 6)]
    # A line goes that saves less than this share of what watching saves.
    saved = pricer.objective(pricer.alone_tally) - pricer.objective(pricer.exact_tally)
    for fewer, more in itertools.pairwise(risks):
        assert more <= fewer + shifts.WORTH_A_LINE * saved
    even = one_way((-3, 3), (-3, 3), 12)
    assert built(even, 1)[1].information_kept == pytest.approx(0.0, abs=1e-12)


def test_what_rounding_costs_is_said() -> None:
    """Fitted worths of −2, silence and 6 counts keep 94 % here; the note prices them unrounded."""
    pricer = one_way((-2, 6), (-3, 3), 60, losses=Losses(1.0, 1.0, 0.0137))
    rule, made = built(pricer, 3)
    note = made.notes[-1]
    assert "plus of a0 6; minus of a0 -2; undecided of a0" in note
    s = pricer.situations
    worths = [
        np.log(s.plus[s.states[:, 0] == k].sum() / s.minus[s.states[:, 0] == k].sum())
        for k in range(3)
    ]
    unrounded = pricer.price(lambda view: np.array(worths)[view.state("a0")])
    assert unrounded.risk is not None
    assert f"{unrounded.risk:.6f}" in note
    lost = risk(pricer, rule) - unrounded.risk
    assert f"{'loses' if lost > 0 else 'saves'} {abs(lost):.6f}" in note


@pytest.mark.parametrize("lost", [0.03, 0.01])
def test_the_fewest_lines_within_the_accuracy_that_may_be_lost(lost: float) -> None:
    pricer = one_way((-2, 4), (-3, 3), 20)
    made = shifts.distil(pricer, Wanted(6, BOTH, lost))
    assert isinstance(made.rule, Shifts)
    assert pricer.price(made.rule).accuracy_lost <= lost
    assert "fewest lines" in made.notes[0]


def test_duplicated_situations_change_nothing() -> None:
    pricer = one_way((-2, 4), (-3, 3), 14)
    s = pricer.situations
    names = ("setting", "step", "round", "states", "worth", "shown_steps", "shown_rounds")
    doubled = replace(
        s,
        **{name: np.concatenate([getattr(s, name)] * 2) for name in names},
        plus=np.concatenate([0.3 * s.plus, 0.7 * s.plus]),
        minus=np.concatenate([0.3 * s.minus, 0.7 * s.minus]),
    )
    assert built(replace(pricer, situations=doubled), 4)[0] == built(pricer, 4)[0]


def test_what_it_cannot_be_made_for_is_refused_with_ways_out() -> None:
    lots: NetworkPricer = pricer_of(read_case("lot-inspection"))[0]  # type: ignore[assignment]
    with pytest.raises(ModelError, match=r"do not drift.*leave \"shifts\" out"):
        shifts.distil(lots, Wanted(4, BOTH))
    pricer = one_way((-2, 4), (-3, 3), 8)
    with pytest.raises(ModelError, match="not at steps_since_first"):
        shifts.distil(pricer, Wanted(4, ("shown", "steps_since_first")))
    with pytest.raises(ModelError, match="looks at step, and at shown"):
        shifts.distil(pricer, Wanted(4, ("step",)))
