"""Facts about crowds that must come out of the model."""

from __future__ import annotations

import json
import math
from pathlib import Path

import numpy as np
import pytest

from tests.bench import crowd as bench
from tests.exact.crowds import (
    ALPHA,
    BIASED,
    TOGETHER,
    UNKNOWN,
    Bars,
    bars,
    even,
    kind,
)
from thumbwright.exact import crowd_course
from thumbwright.exact.arrays import FloatArray, IntArray
from thumbwright.exact.crowd import (
    Crowd,
    enumerate_crowd,
    sample_crowd,
)
from thumbwright.exact.crowd_course import Course
from thumbwright.exact.crowd_play import Choice, Histories
from thumbwright.exact.evidence.binary import bernoulli, coin
from thumbwright.exact.group import (
    Thresholds,
    same_thresholds,
)


class Scripted(Course):
    """Shows what it is told to, whatever its probability, and otherwise nothing."""

    def __init__(self, commits: dict[tuple[int, int], tuple[int, int]]) -> None:
        self._commits = commits
        self.may_follow: dict[tuple[int, int], bool] = {}

    def go_on(self, histories: Histories, choice: Choice, step: int, round_: int) -> IntArray:
        at = np.flatnonzero(choice.open)
        columns = choice.columns[at]
        plus, minus = np.zeros((2, len(histories.free), len(at)), dtype=np.int64)
        plus[0], minus[0] = self._commits.get((step, round_), (0, 0))
        self.may_follow[step, round_] = bool(np.isfinite(choice.log_share[:, 0]).any())
        if len(at):
            histories.show(choice, at, columns, (plus, minus), step, round_)
        return columns


def worths(
    crowd: Crowd,
    commits: dict[tuple[int, int], tuple[int, int]],
    horizon: int,
    exchange: str = "once",
    prior: float = 0.0,
) -> tuple[dict[tuple[int, int], FloatArray], Scripted]:
    """Worth per kind (coin steps) at each round of one public history."""
    histories = Histories(crowd, prior, horizon, np.zeros(1, dtype=np.int64))
    found, course = {}, Scripted(commits)

    def watch(step: int, round_: int, here: Histories) -> None:
        found[step, round_] = np.array(
            [here.worth(k, np.array([0]))[0] / ALPHA for k in range(len(crowd.kinds))]
        )

    crowd_course.play(histories, course, horizon, exchange == "settle", watch)
    return found, course


@pytest.mark.parametrize("exchange", ["once", "settle"])
@pytest.mark.parametrize("size", [3, 4, 10, 50, 1000])
def test_even_silence_is_worth_nothing(size: int, exchange: str) -> None:
    found, _ = worths(even(size, -3, 3), {}, 20, exchange)
    assert max(step for step, _ in found) == 20
    for value in found.values():
        assert value == pytest.approx([0.0], abs=1e-9)


def test_uneven_silence_is_worth_something() -> None:
    found, _ = worths(even(50, -3, 4), {}, 20)
    assert max(abs(float(value[0])) for value in found.values()) > 1.0
    belief, _ = worths(even(3), {}, 6, prior=math.log(0.35 / 0.65))
    assert max(abs(float(value[0])) for value in belief.values()) > 0.1


@pytest.mark.parametrize("size", [3, 10, 50])
def test_a_mixture_and_its_mirror_image_make_silence_worth_nothing(size: int) -> None:
    low, high = Thresholds(-2 * ALPHA, 4 * ALPHA), Thresholds(-4 * ALPHA, 2 * ALPHA)
    odd = Thresholds(-0.7, 1.9), Thresholds(-1.9, 0.7)
    mixture: Bars = ((0.2, low), (0.2, high), (0.3, odd[0]), (0.3, odd[1]))
    for exchange in ("once", "settle"):
        found, _ = worths(Crowd((kind(size, mixture),)), {}, 15, exchange)
        for value in found.values():
            assert value == pytest.approx([0.0], abs=1e-9)
        lopsided: Bars = ((0.3, low), (0.1, high), (0.3, odd[0]), (0.3, odd[1]))
        found, _ = worths(Crowd((kind(size, lopsided),)), {}, 15, exchange)
        assert max(abs(float(value[0])) for value in found.values()) > 0.05


def test_after_a_call_the_silence_of_another_counts_against_it() -> None:
    found, _ = worths(even(3), {(2, 0): (1, 0)}, 8)
    assert float(found[2, 0][0]) == pytest.approx(0.0, abs=1e-12)
    assert float(found[3, 0][0]) == pytest.approx(2.0, abs=1e-12)
    assert all(float(found[step, 0][0]) < 2.0 - 0.1 for step in range(4, 9))


@pytest.mark.parametrize("size", [50, 1000])
def test_the_first_call_in_a_large_crowd_is_followed_at_once(size: int) -> None:
    """By those it pushes over; those who hold back count against it, in the same step."""
    crowd = even(size, -4, 4)
    found, course = worths(crowd, {(4, 0): (1, 0)}, 5, "settle")
    assert float(found[4, 1][0]) == pytest.approx(4.0, abs=1e-9)
    assert course.may_follow[4, 1]
    assert float(found[4, 2][0]) < -4.0  # nobody followed, of so many
    for exchange in ("settle", "once"):
        play = sample_crowd(crowd, 0.0, 12, exchange, 200, 1)
        follow = [float(f) for f in play.followers.value if f is not None]
        if exchange == "settle":
            assert min(follow) > 0.5 * size
        else:
            assert follow == [0.0, 0.0]


def test_mirror_symmetry() -> None:
    one = Crowd((kind(3, bars(-2, 4), bernoulli(0.3, 0.1)), kind(1, UNKNOWN, BIASED)))
    turned: Bars = tuple((share, Thresholds(-t.plus, -t.minus)) for share, t in UNKNOWN)
    other = Crowd(
        (
            kind(3, bars(-4, 2), bernoulli(0.1, 0.3)),
            kind(1, turned, bernoulli(0.1, 0.3)),
        )
    )
    for exchange in ("once", "settle"):
        a = enumerate_crowd(one, 0.3, 6, exchange)
        b = enumerate_crowd(other, -0.3, 6, exchange)
        for first, second in zip(a.kinds, b.kinds, strict=True):
            for given_ in (0, 1):
                here, there = first.given[given_], second.given[1 - given_]
                got = [here.plus, here.minus, here.undecided, here.mean_steps]
                expected = [there.minus, there.plus, there.undecided, there.mean_steps]
                assert got == pytest.approx(expected, abs=1e-12)
        for name in TOGETHER:
            got_, expected_ = getattr(a.together, name), getattr(b.together, name)
            assert got_ == pytest.approx(expected_[::-1], abs=1e-12)


def test_a_jury_of_one_observation_each() -> None:
    """Everybody answers at its first sign, so nobody sees anything in time."""
    file = Path(__file__).parents[1] / "reference" / "published.json"
    values = {e["id"]: e["value"] for e in json.loads(file.read_text())}
    for name, p, sizes in (("jury-.6", 0.6, (3, 5, 7, 11)), ("jury-.7", 0.7, (3, 5, 7))):
        worth = float(coin(p).alpha[0])
        levels = same_thresholds(Thresholds(-worth, worth))
        for size, expected in zip(sizes, values[name], strict=True):
            crowd = Crowd((kind(size, levels, coin(p)),))
            for exchange in ("once", "settle"):
                got = enumerate_crowd(crowd, 0.0, 3, exchange).together
                assert got.right_majority == pytest.approx([expected] * 2, rel=1e-12)
                assert got.first[:, 1] == pytest.approx([1.0] * 2, abs=1e-14)


def test_a_thousand() -> None:
    crowd = Crowd((kind(700, bars(-4, 8)), kind(300, UNKNOWN)))
    play = sample_crowd(crowd, 0.2, 40, "settle", 400, 9)
    for found in play.kinds:
        for got in found.given:
            assert got.plus + got.minus + got.undecided == pytest.approx(1.0, abs=1e-12)
    for law, rest in (("first", "nobody"), ("last", "not_everybody"), ("followers", "nobody")):
        total = getattr(play.together, law).sum(axis=1) + getattr(play.together, rest)
        assert total == pytest.approx([1.0, 1.0], abs=1e-12)
    assert play.near_tie_mass == 0.0


@pytest.mark.parametrize("name", bench.BENCHMARKS)
def test_a_benchmark_runs_and_prints(name: str, capsys: pytest.CaptureFixture[str]) -> None:
    bench.main([name], tiny=True)
    printed = capsys.readouterr().out
    assert len([line for line in printed.splitlines() if " s  " in line]) >= 3
