"""The private walk: long silence, many values, mixtures of thresholds; the forecast before it."""

from __future__ import annotations

import math

import numpy as np
import pytest

from thumbwright.exact import walk as walk_module
from thumbwright.exact.alone import alone
from thumbwright.exact.arrays import FloatArray
from thumbwright.exact.engine import solve
from thumbwright.exact.evidence.base import Evidence
from thumbwright.exact.evidence.binary import bernoulli, coin
from thumbwright.exact.evidence.counts import binomial, poisson
from thumbwright.exact.evidence.listed import listed
from thumbwright.exact.group import Agent, Group, Thresholds, same_thresholds
from thumbwright.exact.outcomes import outcomes
from thumbwright.exact.walk import TIE, Walk, grown

SURE = coin(0.9)
STEP = math.log(9.0)


def bars(m: float) -> Thresholds:
    return Thresholds(-m * STEP, m * STEP)


def one_step(walk: Walk) -> FloatArray:
    """Observe and cut what has reached a threshold; log weights, shape (2, 2, C)."""
    walk.observe()
    plus = walk.tally >= walk.high - TIE
    minus = walk.tally <= walk.low + TIE
    return walk.cut(plus[:, None], minus[:, None])


def test_silence_far_below_the_smallest_number_keeps_its_logarithm() -> None:
    """Thresholds of two signs: every second step survives with probability 2pq, for ever."""
    walk = Walk(SURE, same_thresholds(bars(2)), 1000)
    laws = []
    for step in range(1, 1001):
        laws.append(one_step(walk))
        expected = (step // 2) * math.log(2 * 0.9 * 0.1)
        assert walk.log_undecided()[:, 0] == pytest.approx([expected] * 2, abs=1e-9)
    assert expected < math.log(1e-323)
    # At every even step the answer comes with odds of 81 to 1, however late.
    for late in (laws[1], laws[999]):
        assert late[0, 0, 0] - late[1, 0, 0] == pytest.approx(2 * STEP, abs=1e-9)
    assert not np.isfinite(laws[998]).any()


@pytest.mark.parametrize(("p", "m"), [(0.9, 3), (0.6, 5), (0.99, 4)])
def test_the_law_of_the_decision_time_sums_to_one(p: float, m: int) -> None:
    evidence = coin(p)
    worth = float(evidence.alpha[0])
    played = alone(evidence, Thresholds(-m * worth, m * worth), 0.0, 1000)
    total = played.answers.sum(axis=(0, 2)) + played.undecided
    assert total == pytest.approx([1.0, 1.0], abs=1e-12)
    late = played.answers[:, :, 900:]
    assert (late >= 0).all()
    assert np.isfinite(late).all()
    steps = np.arange(1001)
    mean = (played.answers.sum(axis=0) @ steps) + 1000 * played.undecided
    assert played.steps == pytest.approx(mean, rel=1e-12)


def test_a_one_way_pair_over_a_thousand_steps() -> None:
    """Every worth is finite and what it should be, though most histories have no double left."""
    watched = Agent("a", SURE, same_thresholds(Thresholds(-STEP, 3 * STEP)))
    observer = Agent("b", SURE, same_thresholds(bars(40)), ("a",))
    solution = solve(Group((watched, observer), 0.0, 1000))
    track, events = solution.tracks[1], solution.tracks[0].events
    states = np.array(events.state)
    for moment in track.moments:
        assert np.isfinite(moment.log_shown).all()
        assert np.isfinite(moment.value).all()
        length = len(moment.value)
        calls = np.where(states[:length] == 1, 3 * STEP, -STEP)
        assert moment.value[1:] == pytest.approx(calls[1:], abs=1e-8)
    # Long silence tends to half the sum of the thresholds; its chance is beyond any double.
    last = track.moments[-1]
    assert last.value[0] == pytest.approx(STEP, abs=1e-8)
    assert last.log_shown[0, 0] < -745.0
    # What may have been shown is everything that may have been shown.
    for moment in track.moments[::100]:
        assert np.exp(moment.log_shown).sum(axis=1) == pytest.approx([1.0, 1.0], abs=1e-12)
    for given in outcomes(solution)[1]:
        assert given.plus + given.minus + given.undecided == pytest.approx(1.0, abs=1e-12)


MANY = [binomial(12, 0.6, 0.4), binomial(9, 0.5, 0.35), poisson(1.5, 0.8)]


@pytest.mark.parametrize("evidence", MANY, ids=lambda e: f"{e.kind} {len(e.plus)}")
@pytest.mark.parametrize(
    "thresholds",
    [
        ((1.0, Thresholds(-4.0, 3.0)),),
        ((0.3, Thresholds(-2.0, 3.0)), (0.7, Thresholds(-5.0, 2.0))),
    ],
    ids=["known", "mixture"],
)
def test_one_product_per_block_is_one_addition_per_value(
    evidence: Evidence,
    thresholds: tuple[tuple[float, Thresholds], ...],
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    """Both ways of moving give the same law, with several histories side by side."""
    laws = []
    for few in (0, 1000):
        monkeypatch.setattr(walk_module, "_FEW", few)
        walk = Walk(evidence, thresholds, 12)
        walk.grow((1,), 0, 2)
        moved = []
        for step in range(12):
            walk.observe()
            # Histories differ by what they are worth.
            belief = walk.tally[:, None] + np.array([0.0, 0.8, -0.5]) * (step > 2)
            plus = belief >= walk.high[:, None] - TIE
            minus = belief <= walk.low[:, None] + TIE
            moved.append([walk.cut(plus, minus).ravel(), walk.log_undecided().ravel()])
        laws.append(moved)
    for (gone, left), (gone_too, left_too) in zip(*laws, strict=True):
        assert np.exp(gone) == pytest.approx(np.exp(gone_too), abs=1e-13)
        assert np.exp(left) == pytest.approx(np.exp(left_too), rel=1e-9, abs=1e-13)
        finite = gone > -600
        assert gone[finite] == pytest.approx(gone_too[finite], abs=1e-9)


def test_the_way_of_moving_is_chosen_by_the_number_of_values(
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    used: list[str] = []
    for name in ("_move_each", "_move_many"):
        original = getattr(Walk, name)

        def move(self: Walk, name: str = name, original: object = original) -> None:
            used.append(name)
            assert callable(original)
            original(self)

        monkeypatch.setattr(Walk, name, move)
    for evidence in (coin(0.6), MANY[0]):
        Walk(evidence, same_thresholds(Thresholds(-1.0, 1.0)), 3).observe()
    assert used == ["_move_each", "_move_many"]


def test_a_mixture_of_thresholds_is_the_average_of_its_parts() -> None:
    parts = [(0.25, Thresholds(-1.0, 1.4)), (0.75, Thresholds(-2.2, 0.8))]
    mixed = Walk(bernoulli(0.4, 0.2), tuple(parts), 15)
    alones = [Walk(bernoulli(0.4, 0.2), same_thresholds(pair), 15) for _, pair in parts]
    for _ in range(15):
        got = np.exp(one_step(mixed))
        expected = sum(
            share * np.exp(one_step(walk)) for (share, _), walk in zip(parts, alones, strict=True)
        )
        assert got == pytest.approx(expected, abs=1e-14)
        left = sum(
            share * np.exp(walk.log_undecided())
            for (share, _), walk in zip(parts, alones, strict=True)
        )
        assert np.exp(mixed.log_undecided()) == pytest.approx(left, abs=1e-14)


def test_new_histories_start_as_a_copy_of_silence() -> None:
    walk = Walk(coin(0.7), same_thresholds(Thresholds(-3.0, 3.0)), 10)
    walk.observe()
    walk.grow((1,), 0, 2)
    walk.grow((3,), 0, 1)
    assert walk.mass.shape[1] == walk.log_scale.shape[0] == 4
    assert (walk.mass == walk.mass[:, :1]).all()
    table = np.arange(6.0).reshape(2, 3)
    assert grown(table, 0, 1).tolist() == [[0, 1, 2], [3, 4, 5], [0, 1, 2]]
    assert grown(table, 1, 2).tolist() == [[0, 1, 2, 0, 0], [3, 4, 5, 3, 3]]


def test_the_lattice_of_counts_never_mixes_axes() -> None:
    """Three free counts over twelve steps: the law of the tally is the multinomial one."""
    masses = np.array([[0.2, 0.1], [0.21, 0.18], [0.26, 0.35], [0.33, 0.37]])
    evidence = listed(masses[:, 0], masses[:, 1])
    assert isinstance(evidence, Evidence)
    walk = Walk(evidence, same_thresholds(Thresholds(-99.0, 99.0)), 12)
    for _ in range(12):
        walk.observe()
    assert len(walk.tally) == math.comb(15, 3)
    worth = np.log(masses[:, 0] / masses[:, 1])
    law: dict[float, float] = {}
    for a in range(13):
        for b in range(13 - a):
            for c in range(13 - a - b):
                counts = np.array([a, b, c, 12 - a - b - c])
                ways = math.factorial(12) / math.prod(math.factorial(int(k)) for k in counts)
                chance = ways * float(np.prod(masses[:, 0] ** counts))
                law[round(float(counts @ worth), 9)] = chance
    for row, tally in enumerate(walk.tally):
        rows = np.zeros((len(walk.tally), 1), dtype=bool)
        rows[row] = True
        expected = law[min(law, key=lambda key: abs(key - tally))]
        assert float(np.exp(walk.log_where(rows)[0, 0])) == pytest.approx(expected, rel=1e-9)


def test_nobody_answers_before_the_first_observation() -> None:
    """Even where the prior lies beyond a threshold already."""
    played = alone(coin(0.6), Thresholds(-1.0, 1.0), 5.0, 3)
    assert played.answers[0, :, 1] == pytest.approx([1.0, 1.0], abs=1e-12)
    assert not played.answers[:, :, 0].any()
