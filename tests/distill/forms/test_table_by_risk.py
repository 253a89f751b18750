"""The table of least risk: a worked example, all alternatives on small inputs, and symmetries."""

from __future__ import annotations

import itertools
from dataclasses import replace

import numpy as np
import pytest

from tests.distill.forms.test_table import COVERS, SHOWN, starter
from tests.distill.pricers import (
    ALPHA,
    coin_group,
    covering,
    faults_of_cover,
    one_way,
    pricer_of_group,
)
from thumbwright.distill.findings import Figures
from thumbwright.distill.forms import Distilled, Wanted, form, table, table_by_risk
from thumbwright.distill.forms.boxes import Box
from thumbwright.distill.forms.exchanges import cuts, joined
from thumbwright.distill.forms.valued import Bench, Valued
from thumbwright.distill.network_pricer import NetworkPricer
from thumbwright.distill.pricing import pricer_of
from thumbwright.distill.reading import case_from_text
from thumbwright.exact.errors import ModelError
from thumbwright.exact.stopping import Losses


def distilled(pricer: NetworkPricer, rows: int, inputs: tuple[str, ...] = SHOWN) -> Distilled:
    made = table_by_risk.distil(pricer, Wanted(rows, inputs))
    assert faults_of_cover(pricer, made.rule) == 0
    assert len(made.rule.rows) <= rows
    return made


def figures(pricer: NetworkPricer, made: Distilled) -> Figures:
    return pricer.figures(pricer.rule_tally(made.rule))


def risk(pricer: NetworkPricer, made: Distilled) -> float:
    found = figures(pricer, made).risk
    assert found is not None
    return found


def test_the_name_leads_to_the_module() -> None:
    assert form("table-by-risk") is table_by_risk


def test_information_ranks_but_does_not_decide() -> None:
    """A neighbour that is quick to minus and slow to plus; three rows, wrong answers equal.

    By hand, minus at −2, silence at 0.789 and plus at 6 counts keep 94 % of the benefit, the most
    informative three rows 81 %, and plain count 68 %.
    """
    pricer = one_way((-2, 6), (-3, 3), 60, losses=Losses(1.0, 1.0, 0.0137))
    made = distilled(pricer, 3)
    ours = figures(pricer, made)
    theirs = figures(pricer, table.distil(pricer, Wanted(3, SHOWN)))
    assert len(made.rule.rows) == 3
    assert ours.benefit_kept is not None
    assert ours.benefit_kept >= 0.9399
    assert theirs.benefit_kept == pytest.approx(0.81, abs=0.005)
    by_state = {state: row.value for row in made.rule.rows for state in row.shows["a0"]}
    assert by_state["minus"] == pytest.approx(-2 * ALPHA, abs=1e-8)
    assert by_state["plus"] == pytest.approx(6 * ALPHA, abs=1e-8)
    plain = pricer.figures(pricer.plain_count_tally())
    assert (plain.wrong_given_plus, plain.wrong_given_minus) == pytest.approx(
        (0.2898, 0.1349), abs=5e-5
    )
    exact = pricer.figures(pricer.exact_tally)
    assert (exact.wrong_given_plus, exact.wrong_given_minus) == pytest.approx(
        (0.2028, 0.1810), abs=5e-5
    )
    assert f"benefit kept {ours.benefit_kept:.4f} against {theirs.benefit_kept:.4f}" in " ".join(
        made.notes
    )


def partitions(boxes: tuple[Box, ...], rows: int) -> set[frozenset[Box]]:
    """Everything that cuts one after another can make of these boxes."""
    found = {frozenset(boxes)}
    if len(boxes) < rows:
        for number, below, above in cuts(boxes):
            found |= partitions((*boxes[:number], below, above, *boxes[number + 1 :]), rows)
    return found


@pytest.mark.parametrize(
    ("watched", "observer", "horizon", "rows", "inputs"),
    [
        ((-1, 2), (-2, 2), 6, 2, SHOWN),
        ((-2, 3), (-2, 3), 8, 2, SHOWN),
        ((-2, 4), (-3, 3), 12, 2, SHOWN),
        ((-1, 3), (-2, 3), 8, 3, ("shown",)),
        ((-2, 2), (-3, 2), 8, 3, ("shown",)),
    ],
)
def test_against_all_alternatives(
    watched: tuple[int, int],
    observer: tuple[int, int],
    horizon: int,
    rows: int,
    inputs: tuple[str, ...],
) -> None:
    pricer = one_way(watched, observer, horizon, losses=Losses(1.0, 1.3, 0.02))
    bench = Bench(pricer, inputs, "any")
    whole = tuple((0, axis.cells) for axis in bench.axes)
    every = [
        Valued(tuple(boxes), values)
        for boxes in partitions((whole,), rows)
        for values in itertools.product(*(map(float, bench.classes(box)) for box in boxes))
    ]
    least = min(bench.risks(every))
    assert risk(pricer, distilled(pricer, rows, inputs)) == pytest.approx(least, abs=1e-12)


@pytest.mark.parametrize("observer", [(-2.3, 3.6), (-2.4, 3.7)])
def test_no_value_between_two_classes_acts_in_another_way(observer: tuple[float, float]) -> None:
    # Thresholds beside the ladder, so that the two bars move at different values.
    pricer = one_way((-2, 4), observer, 15, losses=Losses(1.0, 1.0, 0.02))
    bench = Bench(pricer, ("shown",), "any")
    boxes = (((0, 1),), ((1, 2),), ((2, 3),))
    classes = bench.classes(boxes[1])
    allowed = {round(r, 12) for r in _risks(bench, boxes, classes)}
    between = np.linspace(classes[0], classes[-1], 401)
    assert {round(r, 12) for r in _risks(bench, boxes, between)} <= allowed


def _risks(bench: Bench, boxes: tuple[Box, ...], values: np.ndarray) -> list[float]:  # type: ignore[type-arg]
    return bench.risks([Valued(boxes, (-0.8, float(v), 1.6)) for v in values])


@pytest.mark.parametrize("rows", [1, 2, 3, pytest.param(5, marks=pytest.mark.slow)])
@pytest.mark.parametrize("name", ["frost-watch", "lot-inspection", "named"])
def test_never_worse_than_the_most_informative_table(name: str, rows: int) -> None:
    inputs: tuple[str, ...] = SHOWN
    if name == "named":
        pricer = covering({"x": (-2, 4), "y": (-4, 2)}, (-3, 3), 16)
        inputs = ("step", "shown", "thresholds")
    else:
        _, pricer = starter(name)
    made = distilled(pricer, rows, inputs)
    most = table.distil(pricer, Wanted(rows, inputs))
    assert risk(pricer, made) <= risk(pricer, most) + 1e-12
    assert made.information_kept is not None
    assert most.information_kept is not None
    assert made.information_kept <= most.information_kept + 1e-12
    if rows == 1:
        assert made.information_kept == pytest.approx(0.0, abs=1e-12)


@pytest.mark.slow
def test_more_rows_are_never_worse_here() -> None:
    pricer = one_way((-2, 6), (-3, 3), 30, losses=Losses(1.0, 1.0, 0.0137))
    risks = [risk(pricer, distilled(pricer, rows)) for rows in (1, 2, 3, 4, 6, 9)]
    assert risks == sorted(risks, reverse=True)


def test_prices_are_those_of_the_rule_itself() -> None:
    """Both ways of pricing, and evidence whose steps have a worth of their own."""
    pricer = starter("lot-inspection")[1]
    for one in (pricer, covering({"x": (-2, 4), "y": (-4, 2)}, (-3, 3), 12)):
        inputs = SHOWN if one is pricer else ("step", "shown", "thresholds")
        bench = Bench(one, inputs, "any")
        assert bench.together
        shape = tuple((0, axis.cells) for axis in bench.axes)
        low, high = shape[0]
        parts = (((low, 3), *shape[1:]), ((3, high), *shape[1:]))
        valued = Valued(parts, (0.3, -0.45))
        (found,) = bench.risks([valued])
        assert found == pytest.approx(one.objective(one.rule_tally(bench.rule(valued))), abs=1e-12)


@pytest.mark.parametrize("rows", [2, 3, 4])
def test_swapping_plus_and_minus_mirrors_it(rows: int) -> None:
    pricer = one_way((-2, 5), (-3, 4), 14, losses=Losses(1.0, 1.4, 0.02))
    other = one_way((-5, 2), (-4, 3), 14, losses=Losses(1.4, 1.0, 0.02))
    made, mirror = distilled(pricer, rows), distilled(other, rows)
    here, there = figures(pricer, made), figures(other, mirror)
    assert there.risk == pytest.approx(here.risk, abs=1e-12)
    assert there.wrong_given_plus == pytest.approx(here.wrong_given_minus, abs=1e-9)
    assert there.wrong_given_minus == pytest.approx(here.wrong_given_plus, abs=1e-9)


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
    made, same = distilled(pricer, 3), distilled(replace(pricer, situations=doubled), 3)
    for one, two in zip(made.rule.rows, same.rule.rows, strict=True):
        assert replace(one, value=None) == replace(two, value=None)
        assert one.value == pytest.approx(two.value, abs=1e-9)


def test_two_neighbours_are_played_one_rule_at_a_time() -> None:
    group = coin_group([(-2, 3), (-3, 2), (-3, 3)], [(), (), (0, 1)], 8)
    pricer = pricer_of_group(group, "a2", Losses(1.0, 1.0, 0.03))
    made = distilled(pricer, 3, ("shown",))
    most = table.distil(pricer, Wanted(3, ("shown",)))
    assert risk(pricer, made) < risk(pricer, most)


@pytest.mark.parametrize("lost", [0.02, 0.001])
def test_the_fewest_rows_within_the_accuracy_that_may_be_lost(lost: float) -> None:
    pricer = one_way((-2, 4), (-3, 3), 16)
    made = table_by_risk.distil(pricer, Wanted(6, SHOWN, lost))
    assert figures(pricer, made).accuracy_lost <= lost
    assert "fewest rows" in made.notes[0]


def test_without_costs_it_is_refused() -> None:
    pricer = one_way((-2, 4), (-3, 3), 10, losses=None)
    with pytest.raises(ModelError, match=r"needs costs.*\[costs\]"):
        table_by_risk.distil(pricer, Wanted(3, SHOWN))


def test_boxes_are_joined_only_where_a_box_results() -> None:
    assert joined(((0, 2), (0, 3)), ((2, 5), (0, 3))) == ((0, 5), (0, 3))
    assert joined(((2, 5), (0, 3)), ((0, 2), (0, 3))) == ((0, 5), (0, 3))
    assert joined(((0, 2), (0, 3)), ((3, 5), (0, 3))) is None
    assert joined(((0, 2), (0, 3)), ((2, 5), (1, 3))) is None
    assert joined(((0, 2), (0, 3)), ((0, 2), (0, 3))) is None


def test_a_case_asks_for_it_by_name() -> None:
    text = COVERS.read_text().replace('forms = ["table"]', 'forms = ["table-by-risk"]')
    case = case_from_text(text.replace("horizon = 40", "horizon = 10"), name="c", file="c.toml")
    assert case.rule.forms == ["table-by-risk"]
    made = table_by_risk.distil(pricer_of(case)[0], Wanted(3, tuple(case.rule.inputs)))
    assert made.rule.form == "table-by-risk"
