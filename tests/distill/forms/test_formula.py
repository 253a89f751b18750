"""The form "formula": fits against plain alternatives, known limits, digits, symmetries."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest

from tests.distill.forms.test_table import starter
from tests.distill.pricers import ALPHA, coin_group, covering, one_way, pricer_of_group
from tests.distill.test_views import AGENTS, EVENTS, broadcast_view
from thumbwright.distill.costs import Pricer
from thumbwright.distill.forms import Distilled, Wanted, formula
from thumbwright.distill.forms.fitting import fitted, information_of, log_loss
from thumbwright.distill.formula import Formula, Term
from thumbwright.distill.situations import values_of
from thumbwright.exact.errors import ModelError
from thumbwright.exact.stopping import Losses

BOTH = ("step", "shown")


def distilled(
    pricer: Pricer, numbers: int, inputs: tuple[str, ...] = BOTH
) -> tuple[Formula, Distilled]:
    made = formula.distil(pricer, Wanted(numbers, inputs))
    assert isinstance(made.rule, Formula)
    assert made.rule.fitted <= numbers
    return made.rule, made


def test_terms_of_states_fit_their_pooled_worths() -> None:
    """One term per state of one agent is a table of three rows, whose best values are known."""
    pricer = one_way((-2, 5), (-3, 4), 20)
    s = pricer.situations
    terms = np.stack([s.states[:, 0] == k for k in range(3)], axis=1).astype(float)
    pooled = values_of(
        *(np.array([m[s.states[:, 0] == k].sum() for k in range(3)]) for m in (s.plus, s.minus))
    )
    assert fitted(terms, s.plus, s.minus) == pytest.approx(pooled, abs=1e-11)


def test_no_other_numbers_fit_better() -> None:
    generator = np.random.default_rng(5)
    terms = generator.normal(size=(60, 4)) * np.array([1.0, 50.0, 0.01, 1.0])
    plus, minus = generator.gamma(1.0, size=(2, 60))
    given = generator.normal(size=60)
    best = fitted(terms, plus, minus, given)
    least = log_loss(given + terms @ best, plus, minus)
    for _ in range(200):
        other = best + generator.normal(size=4) * 1e-3 / np.array([1.0, 50.0, 0.01, 1.0])
        assert log_loss(given + terms @ other, plus, minus) > least - 1e-12


def test_information_of_values_is_that_of_rows() -> None:
    pricer = one_way((-2, 5), (-3, 4), 20)
    s = pricer.situations
    assert information_of(pricer, s.worth) == pytest.approx(1.0, abs=1e-12)
    even = np.full(len(s.step), math.log(s.plus.sum() / s.minus.sum()))
    assert information_of(pricer, even) == pytest.approx(0.0, abs=1e-12)


def test_a_commitment_is_a_constant_and_silence_rises_to_its_known_limit() -> None:
    """One-way neighbour, thresholds −2 and 6 counts: calls are worth −2 and 6, silence tends to 2.

    Three numbers do what exact play does.
    """
    pricer = one_way((-2, 6), (-3, 3), 60, losses=Losses(1.0, 1.0, 0.0137))
    rule, made = distilled(pricer, 4)
    assert rule.unit == pytest.approx(ALPHA)
    by_name = rule.parameters
    assert by_name["plus_a0"] == 6.0
    assert by_name["minus_a0"] == -2.0
    silence = next(term for term in rule.terms if term.shows == "undecided")
    assert (silence.of, silence.number, silence.known) == ("saturating", 2.0, True)
    assert rule.fitted == 3
    assert pricer.price(rule).benefit_kept == pytest.approx(1.0, abs=2e-3)
    assert made.information_kept is not None
    assert made.information_kept > 0.95
    assert rule.sentences()[1:3] == ("A0 shows plus: 6.", "A0 shows minus: -2.")


@pytest.mark.parametrize(
    ("watched", "limit"), [((-2, 6), 2.0), ((-4, 2), -1.0), ((-3, 3), None), ((-2, 5), None)]
)
def test_the_limit_is_known_where_it_is_whole(
    watched: tuple[int, int], limit: float | None
) -> None:
    pricer = one_way(watched, (-3, 3), 20)
    search = formula.Search(pricer, Wanted(9, BOTH))
    known = {term.number for shape in search.shapes() for term in shape.terms if term.known}
    assert known == (set() if limit is None else {limit})


def first_of(history: list[tuple[int, int, int]]) -> list[tuple[int, int, int]]:
    """Answers of the earliest moment."""
    answers = [event for event in history if event[0]]
    return [e for e in answers if e[1:] == min(other[1:] for other in answers)]


def test_amounts_are_what_they_are_called() -> None:
    """Every joint history of three agents, agent by agent."""
    terms = [
        (Term("constant", "plus", ("a", "c")), lambda h, n: sum(e[0] == 1 for e in (h[0], h[2]))),
        (Term("step", "minus", ()), lambda h, n: n * sum(e[0] == 2 for e in h)),
        (
            Term("first_step", "plus", ()),
            lambda h, n: sum(e[0] == 1 for e in h) * min((e[1] for e in h if e[0]), default=0),
        ),
        (
            Term("saturating", "undecided", ("b",), half=3.0),
            lambda h, n: (h[1][0] == 0) * (n - 1) / (n + 2),
        ),
        (
            Term("first_answer", "plus"),
            lambda h, n: (
                {e[0] for e in h if e[0] and e[1:] == min(x[1:] for x in h if x[0])} == {1}
            ),
        ),
    ]
    step = 5
    view = broadcast_view(step)
    for term, literal in terms:
        found = np.broadcast_to(term.amount(view), (len(EVENTS),) * len(AGENTS))
        for cell in np.ndindex(found.shape):
            history = [EVENTS[k] for k in cell]
            assert found[cell] == pytest.approx(float(literal(history, step))), (term, history)


@pytest.mark.parametrize("numbers", [2, 3, 5])
def test_swapping_plus_and_minus_mirrors_it(numbers: int) -> None:
    one = one_way((-2, 5), (-3, 4), 14, losses=Losses(1.0, 1.4, 0.02))
    other = one_way((-5, 2), (-4, 3), 14, losses=Losses(1.4, 1.0, 0.02))
    rule, mirror = distilled(one, numbers)[0], distilled(other, numbers)[0]
    turned = {"plus": "minus", "minus": "plus", "undecided": "undecided"}
    here = sorted((turned[t.shows], t.of, -t.number) for t in rule.terms)
    there = sorted((t.shows, t.of, t.number) for t in mirror.terms)
    assert [x[:2] for x in here] == [x[:2] for x in there]
    assert [x[2] for x in here] == pytest.approx([x[2] for x in there], rel=1e-6)


def test_digits_that_matter_are_kept_and_others_go() -> None:
    for pricer in (one_way((-2, 6), (-3, 3), 30), starter("lot-inspection")[1]):
        search = formula.Search(pricer, Wanted(4, BOTH))
        for shape in search.shapes():
            search.take(shape)
        best, _ = search.chosen()
        rule, _ = search.rounded(best)
        allowed = formula.TOLERANCE * (
            pricer.objective(pricer.alone_tally) - pricer.objective(pricer.exact_tally)
        )
        ours, theirs = pricer.price(rule).risk, pricer.price(best).risk
        assert ours is not None
        assert theirs is not None
        assert ours <= theirs + allowed + 1e-12
        digits = [len(f"{t.number:.10g}".strip("-0.").replace(".", "")) for t in rule.terms]
        assert max(digits) <= formula.DIGITS
        assert sum(digits) < 10 * len(digits) / 2


def test_shorter_numbers_lie_on_either_side() -> None:
    found = list(formula.shorter(2.5424))
    assert found[:4] == [3.0, 2.0, 2.5, 2.6]
    assert list(formula.shorter(0.0)) == []
    assert list(formula.shorter(-0.00371))[:2] == [-0.004, -0.003]


def test_more_numbers_are_taken_only_where_they_are_worth_it() -> None:
    """Even neighbours: silence says nothing, so there is no number for it."""
    group = coin_group([(-3, 3)] * 3, [(), (), (0, 1)], 10)
    pricer = pricer_of_group(group, "a2")
    rule, made = distilled(pricer, 6)
    assert rule.parameters == {"plus_a0_a1": 3.0, "minus_a0_a1": -3.0}
    assert "2 with" in made.notes[0]


def test_counts_with_something_for_the_first_answer() -> None:
    group = coin_group([(-3, 3)] * 3, [(1, 2), (0, 2), (0, 1)], 10, "settle")
    pricer = pricer_of_group(group, "a2")
    counts = ("step", "plus_shown", "minus_shown", "undecided_shown")
    shapes = list(formula.Search(pricer, Wanted(9, (*counts, "first_answer"))).shapes())
    assert any(t.of == "first_answer" for shape in shapes for t in shape.terms)
    rule, _ = distilled(pricer, 4, (*counts, "first_answer"))
    assert all(term.agents == () for term in rule.terms)
    named, _ = distilled(pricer, 4)
    counted, _ = distilled(pricer, 4, counts)
    assert pricer.price(named).risk == pytest.approx(pricer.price(counted).risk, abs=1e-12)


def test_the_fewest_numbers_within_the_accuracy_that_may_be_lost() -> None:
    pricer = one_way((-2, 4), (-3, 3), 20)
    made = formula.distil(pricer, Wanted(6, BOTH, 0.01))
    assert isinstance(made.rule, Formula)
    assert pricer.price(made.rule).accuracy_lost <= 0.01
    assert "fewest numbers" in made.notes[0]
    none = formula.distil(pricer, Wanted(1, BOTH, 1e-9))
    assert "No formula of up to 1 numbers" in none.notes[0]


def test_no_numbers_is_playing_alone() -> None:
    pricer = one_way((-3, 3), (-3, 3), 12)
    rule, made = distilled(pricer, 1)
    assert rule.terms == ()
    assert pricer.price(rule).risk == pytest.approx(pricer.objective(pricer.alone_tally))
    assert made.information_kept == pytest.approx(0.0, abs=1e-12)
    assert rule.sentences() == ("What others show is worth nothing.",)


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
    rule, same = distilled(pricer, 4)[0], distilled(replace(pricer, situations=doubled), 4)[0]
    assert [t.name for t in same.terms] == [t.name for t in rule.terms]
    assert list(same.parameters.values()) == pytest.approx(list(rule.parameters.values()))


def test_what_it_cannot_look_at_is_refused() -> None:
    pricer = covering({"x": (-2, 4), "y": (-4, 2)}, (-3, 3), 8)
    with pytest.raises(ModelError, match=r"not at thresholds.*leave \"formula\" out"):
        formula.distil(pricer, Wanted(4, ("step", "shown", "thresholds")))
    with pytest.raises(ModelError, match="at what is shown in any case"):
        formula.distil(pricer, Wanted(4, ("step",)))
