"""Sampled crowds against enumerated ones; what is dropped; what is refused."""

from __future__ import annotations

import math

import numpy as np
import pytest

from tests.exact.crowds import (
    BIASED,
    CERTAIN,
    OUTCOME,
    TOGETHER,
    UNKNOWN,
    bars,
    even,
    kind,
    lumps_of_crowd,
)
from thumbwright.exact.arrays import FloatArray
from thumbwright.exact.crowd import (
    Crowd,
    CrowdPlay,
    Kind,
    enumerate_crowd,
    enumerate_situations,
    sample_crowd,
    sample_situations,
)
from thumbwright.exact.errors import ModelError
from thumbwright.exact.evidence.binary import coin


def scalars(play: CrowdPlay) -> tuple[FloatArray, FloatArray]:
    """Every figure with a standard error, and these errors."""
    pairs = []
    for found in play.kinds:
        for got, error in zip(found.given, found.errors, strict=True):
            pairs += [(getattr(got, n), getattr(error, n)) for n in OUTCOME]
        pairs += list(zip(found.leaning.ravel(), found.leaning_errors.ravel(), strict=True))
    for name in TOGETHER:
        pairs += list(
            zip(
                getattr(play.together, name).ravel(),
                getattr(play.errors, name).ravel(),
                strict=True,
            )
        )
    for mean in (play.first, play.last, play.followers):
        pairs += list(zip(mean.value, mean.error, strict=True))
    value, error = zip(*pairs, strict=True)
    return np.array(value, dtype=float), np.array(error, dtype=float)


MIXED = Crowd((kind(3, bars(-2, 3)), kind(3, bars(-3, 2))))


@pytest.mark.parametrize("exchange", ["once", "settle"])
@pytest.mark.parametrize(
    ("crowd", "prior", "horizon"),
    [
        (even(5, -2, 4), 0.4, 12),
        (MIXED, 0.0, 8),
        (Crowd((kind(4, UNKNOWN),)), -0.3, 8),
        (Crowd((kind(3, bars(-3, 3), CERTAIN), kind(1, bars(-2, 3)))), 0.2, 6),
    ],
    ids=["alike", "mixed", "unknown", "certain"],
)
def test_sampled_agrees_with_enumerated(
    crowd: Crowd, prior: float, horizon: int, exchange: str
) -> None:
    exact, none = scalars(enumerate_crowd(crowd, prior, horizon, exchange))
    assert not none.any()
    sampled = sample_crowd(crowd, prior, horizon, exchange, 6000, 3)
    assert sampled.sampled
    value, error = scalars(sampled)
    # What is rarer than this may not have been met at all.
    common = exact > 0.005
    assert common.sum() > 40
    assert (np.abs(value - exact)[common] < 4.0 * error[common] + 1e-12).all()
    assert (error[common] < 0.1 * np.maximum(exact[common], 0.2)).all()


@pytest.mark.parametrize("exchange", ["once", "settle"])
def test_standard_errors_are_of_the_right_size(exchange: str) -> None:
    exact, _ = scalars(enumerate_crowd(MIXED, 0.0, 6, exchange))
    scores = []
    for seed in range(60):
        value, error = scalars(sample_crowd(MIXED, 0.0, 6, exchange, 400, seed))
        with np.errstate(invalid="ignore", divide="ignore"):
            scores.append((value - exact) / error)
    common = (exact > 0.05) & np.isfinite(scores).all(axis=0) & (np.abs(scores).max(axis=0) > 1e-6)
    spread = np.sqrt((np.array(scores)[:, common] ** 2).mean(axis=0))
    assert common.sum() > 30
    assert spread.min() > 0.7
    assert spread.max() < 1.4
    assert 0.9 < spread.mean() < 1.1


def test_the_same_seed_gives_the_same_figures() -> None:
    def once(seed: int) -> FloatArray:
        return scalars(sample_crowd(MIXED, 0.1, 6, "settle", 100, seed))[0]

    assert np.array_equal(once(5), once(5), equal_nan=True)
    assert not np.array_equal(once(5), once(6), equal_nan=True)


def test_what_is_wrong_and_rare_is_estimated_from_where_it_is_right() -> None:
    """No sampled crowd given plus need ever have been wrong."""
    crowd = Crowd((kind(40, bars(-10, 10)),))
    got = sample_crowd(crowd, 0.0, 60, "settle", 2000, 1)
    wrong, error = got.together.wrong_majority, got.errors.wrong_majority
    assert (wrong > 1e-6).all()
    assert (wrong < 1e-2).all()
    assert (error < 0.3 * wrong).all()
    assert abs(wrong[0] - wrong[1]) < 4.0 * float(np.hypot(*error))


@pytest.mark.parametrize("exchange", ["once", "settle"])
def test_sampled_situations_agree_with_enumerated(exchange: str) -> None:
    exact = enumerate_situations(MIXED, 1, 0.0, 6, exchange)
    sampled = sample_situations(MIXED, 1, 0.0, 6, exchange, 6000, 2)
    for found in (exact, sampled):
        ratio = np.log(found.shown[0]) - np.log(found.shown[1])
        assert ratio == pytest.approx(found.worth, abs=1e-10)
    # Rounds are held as long as any history needs, so only the first is sure to be common.
    one, other = (
        {key: row for key, row in lumps_of_crowd(found).items() if key[1] == 0}
        for found in (exact, sampled)
    )
    assert set(other) <= set(one)
    common = [key for key, row in one.items() if row[:2].min() > 0.02]
    assert len(common) > 8
    for key in common:
        off = np.abs(one[key][:4] - other[key][:4])
        assert (off < 5.0 * np.sqrt(one[key][:2].max() / 6000)).all()
    # At the first step every sampled history is there, once, and nothing has been shown.
    start = (sampled.step == 1) & (sampled.round == 0)
    assert sampled.label[start].tolist() == list(range(6000))
    assert sampled.shown[:, start].sum(axis=1) == pytest.approx([1.0, 1.0], abs=1e-12)


# --- dropping and refusing -----------------------------------------------------------------------


@pytest.mark.parametrize("exchange", ["once", "settle"])
def test_what_is_dropped_bounds_what_is_off(exchange: str) -> None:
    crowd = even(6, -2, 3)
    whole = enumerate_crowd(crowd, 0.3, 8, exchange)
    part = enumerate_crowd(crowd, 0.3, 8, exchange, drop=1e-4)
    assert part.histories < 0.75 * whole.histories
    assert 1e-4 < part.dropped_mass < 0.2
    for given_ in (0, 1):
        got, expected = part.kinds[0].given[given_], whole.kinds[0].given[given_]
        kept = got.plus + got.minus + got.undecided
        assert 1.0 - kept == pytest.approx(part.dropped[given_], abs=1e-12)
        for name in ("plus", "minus", "undecided"):
            short = getattr(expected, name) - getattr(got, name)
            assert -1e-12 < short < part.dropped[given_] + 1e-12
        for name in TOGETHER:
            short = getattr(whole.together, name) - getattr(part.together, name)
            assert short[given_].min() > -1e-12
            assert short[given_].sum() < part.dropped[given_] + 1e-12
    shares = 1.0 / (1.0 + np.exp(np.array([-0.3, 0.3])))
    assert part.dropped_mass == pytest.approx(float(shares @ part.dropped))


def test_too_many_histories_are_refused() -> None:
    for call in (enumerate_crowd, lambda crowd, *a, **k: enumerate_situations(crowd, 0, *a, **k)):
        with pytest.raises(ModelError, match=r"more than 500 .* drop the least likely"):
            call(even(12), 0.0, 10, "once", most=500)
        call(even(12), 0.0, 10, "once", drop=0.02, most=500)


def test_dropping_everything_is_refused() -> None:
    for crowd in (even(3), MIXED):
        for call in (enumerate_crowd, lambda c, *a, **k: enumerate_situations(c, 0, *a, **k)):
            with pytest.raises(ModelError, match="every public history"):
                call(crowd, 0.0, 4, "settle", drop=0.999)


def test_arguments_that_cannot_be() -> None:
    crowd = even(3)
    for arguments, says in (
        ((crowd, 0.0, 0, "once"), "at least 1 step"),
        ((crowd, math.inf, 3, "once"), "both answers possible"),
        ((crowd, 0.0, 3, "often"), "once, settle"),
        ((crowd, 0.0, 3, "once", 1.0), "probability from 0 to below 1"),
        ((Crowd((kind(2, bars(-2, 2), looks=(1, 1)),)), 0.0, 3, "once"), "2 entries in its time"),
    ):
        with pytest.raises(ModelError, match=says):
            enumerate_crowd(*arguments)  # type: ignore[arg-type]
    for number in (2, 7):
        with pytest.raises(ModelError, match="even and at least 4"):
            sample_crowd(crowd, 0.0, 3, "once", number, 1)
    with pytest.raises(ModelError, match="has 1 kinds"):
        enumerate_situations(crowd, 1, 0.0, 3, "once")
    with pytest.raises(ModelError, match="same id"):
        Crowd((kind(2, bars(-2, 2)), kind(2, bars(-2, 2), BIASED)))
    for empty in (lambda: Crowd(()), lambda: Kind(coin(0.6), bars(-2, 2), ())):
        with pytest.raises(ModelError, match="at least one member"):
            empty()
