"""Kinds of evidence at their extremes: none, certain, lopsided, and what is refused."""

from __future__ import annotations

import math

import numpy as np
import pytest

from thumbwright.exact.engine import solve
from thumbwright.exact.errors import ModelError
from thumbwright.exact.evidence import KINDS, build
from thumbwright.exact.evidence.base import Evidence, Loose
from thumbwright.exact.group import Agent, Group, Thresholds, same_thresholds
from thumbwright.exact.outcomes import outcomes
from thumbwright.exact.thresholds import from_error_rates, from_observations, from_probability

EXAMPLES = {
    "coin": {"p": 0.6},
    "bernoulli": {"p_plus": 0.3, "p_minus": 0.1},
    "calibration": {"hits": 8, "misses": 2, "false_alarms": 1, "correct_rejections": 9},
    "binomial": {"m": 4, "p_plus": 0.4, "p_minus": 0.2},
    "poisson": {"rate_plus": 3.0, "rate_minus": 2.0},
    "listed": {"plus": [0.5, 0.3, 0.2], "minus": [0.2, 0.3, 0.5]},
    "normal": {"d": 0.5},
}


def built(kind: str, **keys: object) -> Evidence:
    evidence = build(kind, **keys)
    assert isinstance(evidence, Evidence)
    return evidence


def pair(evidence: Evidence, bars: Thresholds, prior: float = 0.0, horizon: int = 6) -> Group:
    agents = (
        Agent("a", evidence, same_thresholds(bars)),
        Agent("b", evidence, same_thresholds(bars), ("a",)),
    )
    return Group(agents, prior, horizon)


def test_every_kind_has_an_example() -> None:
    assert EXAMPLES.keys() == KINDS.keys()


@pytest.mark.parametrize("kind", [k for k in EXAMPLES if k != "normal"])
def test_worths_are_the_log_ratios(kind: str) -> None:
    evidence = built(kind, **EXAMPLES[kind])
    # Poisson tails are cut and the rest renormalised, which moves worths by about 1e-15.
    assert evidence.worths() == pytest.approx(np.log(evidence.plus / evidence.minus), abs=1e-12)
    assert evidence.informative
    assert evidence.information() > 0


def test_normal_is_loose_until_it_is_split() -> None:
    assert isinstance(build("normal", d=0.5), Loose)


@pytest.mark.parametrize(
    "evidence",
    [
        built("coin", p=0.5),
        built("bernoulli", p_plus=0.3, p_minus=0.3),
        built("binomial", m=3, p_plus=0.2, p_minus=0.2),
        built("poisson", rate_plus=2.0, rate_minus=2.0),
        built("listed", plus=[0.2, 0.8], minus=[0.2, 0.8]),
    ],
    ids=lambda e: e.kind,
)
def test_evidence_without_information_is_handled_exactly(evidence: Evidence) -> None:
    """Belief stays at the prior: nobody answers between the thresholds, all at once beyond."""
    assert not evidence.informative
    assert evidence.information() == pytest.approx(0.0, abs=1e-15)
    for given in outcomes(solve(pair(evidence, Thresholds(-1.0, 1.0)))):
        for one in given:
            assert (one.plus, one.minus) == (0.0, 0.0)
            assert one.undecided == pytest.approx(1.0, abs=1e-12)
            assert one.mean_step_if_decided is None
    for given in outcomes(solve(pair(evidence, Thresholds(-1.0, 1.0), prior=1.5))):
        for one in given:
            assert one.plus == pytest.approx(1.0, abs=1e-12)
            assert one.mean_step_if_decided == pytest.approx(1.0, abs=1e-12)


def test_certain_evidence_answers_at_once_and_is_worth_infinity() -> None:
    """A detector that never raised a false alarm: whoever meets it says plus, and is believed."""
    evidence = built("calibration", hits=3, misses=7, false_alarms=0, correct_rejections=10)
    assert evidence.certain_plus == pytest.approx(0.3)
    solution = solve(pair(evidence, Thresholds(-50.0, 50.0), horizon=3))
    first, second = outcomes(solution)
    assert first[0].plus == pytest.approx(1 - 0.7**3, abs=1e-12)
    assert first[1].plus == 0.0
    # The second meets its own certain evidence or believes the first, one step later.
    by_own, by_other = 1 - 0.7**3, 1 - 0.7**2
    assert second[0].plus == pytest.approx(1 - (1 - by_own) * (1 - by_other), abs=1e-12)
    shown = solution.tracks[1].moments[-1].value
    assert math.isinf(shown.max())


def test_a_coin_that_is_always_right() -> None:
    first, second = outcomes(solve(pair(built("coin", p=1.0), Thresholds(-1.0, 1.0))))
    assert (first[0].plus, first[1].minus) == (1.0, 1.0)
    assert (second[0].plus, second[1].minus) == (1.0, 1.0)


@pytest.mark.parametrize(
    ("kind", "keys", "said"),
    [
        ("coin", {"p": 0.4}, "swap the signs"),
        ("bernoulli", {"p_plus": 1.2, "p_minus": 0.1}, "must be a probability"),
        ("calibration", {**EXAMPLES["calibration"], "hits": -1}, "must be a count"),
        ("binomial", {"m": 0, "p_plus": 0.4, "p_minus": 0.2}, "whole number"),
        ("binomial", {"m": 9000, "p_plus": 0.9, "p_minus": 0.1}, "fewer tries"),
        ("binomial", {"m": 3, "p_plus": 1.0, "p_minus": 0.1}, "strictly between"),
        ("poisson", {"rate_plus": 900.0, "rate_minus": 1.0}, "shorten the step"),
        ("poisson", {"rate_plus": 0.0, "rate_minus": 1.0}, "positive rate"),
        ("listed", {"plus": [0.5, 0.5], "minus": [0.5, 0.4]}, "sum to 1"),
        ("listed", {"plus": [0.5, 0.5], "minus": [1.0]}, "one length"),
        ("normal", {"d": 0.0}, "above 0"),
        ("guess", {}, "allowed: coin, bernoulli"),
    ],
)
def test_what_is_refused_is_said(kind: str, keys: dict[str, object], said: str) -> None:
    with pytest.raises(ModelError, match=said):
        build(kind, **keys)


def test_thresholds_that_are_refused() -> None:
    with pytest.raises(ModelError, match="below the upper"):
        Thresholds(1.0, 1.0)
    with pytest.raises(ModelError, match="finite"):
        Thresholds(-math.inf, 1.0)
    with pytest.raises(ModelError, match="one finite worth"):
        from_observations(-2, 2, built("coin", p=0.5), 0.0)
    with pytest.raises(ModelError, match="one finite worth"):
        from_observations(-2, 2, built("bernoulli", p_plus=0.3, p_minus=0.1), 0.0)
    with pytest.raises(ModelError, match="strictly between"):
        from_probability(0.0, 0.9)
    with pytest.raises(ModelError, match="no better than guessing"):
        from_error_rates(0.6, 0.4, 0.0)
