from __future__ import annotations

from collections import defaultdict

import numpy as np
import pytest

from tests.exact.crowds import ALPHA, BIASED, CERTAIN, UNKNOWN, bars, even, kind
from thumbwright.exact.arrays import FloatArray
from thumbwright.exact.crowd import Crowd, Shown, TooMany, enumerate_shown
from thumbwright.exact.crowd_followed import Followed
from thumbwright.exact.errors import ModelError

Counts = tuple[tuple[int, ...], tuple[int, ...]]
"""How many others of each kind show plus, and minus."""

PRIOR = -0.2
CROWDS = {
    "five alike": (even(5), 0, 4),
    "sooner for minus": (even(4, -2, 3), 0, 5),
    "unknown thresholds": (Crowd((kind(4, UNKNOWN, BIASED),)), 0, 4),
    "certain evidence": (Crowd((kind(4, bars(-2, 2), CERTAIN),)), 0, 3),
    "one among others": (Crowd((kind(1, bars(-9, 9)), kind(3, bars(-1, 2)))), 0, 4),
    "two kinds": (Crowd((kind(2, bars(-2, 2)), kind(3, bars(-1, 3)))), 1, 4),
}


def paths(shown: Shown) -> list[dict[tuple[Counts, ...], FloatArray]]:
    """Per step: log probability of all that may be shown before it, by the counts after each step.

    Found by going back from every entry of the tree, which has one for each way of the rounds.
    """
    found, past = [], [()]
    for showing in shown.parts[0]:
        past = [past[k] for k in showing.parent]
        if showing.round:
            continue
        counts = zip(showing.plus.T.tolist(), showing.minus.T.tolist(), strict=True)
        now = [(tuple(plus), tuple(minus)) for plus, minus in counts]
        past = [(*before, here) for before, here in zip(past, now, strict=True)]
        total: dict[tuple[Counts, ...], FloatArray] = defaultdict(lambda: np.full(2, -np.inf))
        for path, weight in zip(past, showing.log_shown.T, strict=True):
            total[path[1:]] = np.logaddexp(total[path[1:]], weight)
        found.append(total)
    return found


def follow(crowd: Crowd, member: int, exchange: str, path: tuple[Counts, ...]) -> Followed:
    followed = Followed(crowd, member, PRIOR, len(path) + 1, exchange)
    for plus, minus in path:
        followed.go_on(np.array(plus), np.array(minus))
    return followed


@pytest.mark.parametrize("exchange", ["once", "settle"])
@pytest.mark.parametrize("name", CROWDS)
def test_every_record_is_as_likely_as_its_part_of_the_tree(name: str, exchange: str) -> None:
    crowd, member, horizon = CROWDS[name]
    shown = enumerate_shown(crowd, member, PRIOR, horizon, exchange)
    most = 0
    for totals in paths(shown)[1:]:
        after: dict[tuple[Counts, ...], set[Counts]] = defaultdict(set)
        for path, weight in totals.items():
            followed = follow(crowd, member, exchange, path)
            assert np.allclose(np.exp(followed.log_shown()), np.exp(weight), rtol=0, atol=1e-13)
            plus, minus = weight
            assert followed.worth() == pytest.approx(plus - minus, abs=1e-10)
            assert sum(followed.first_answers().values()) == pytest.approx(1.0)
            most = max(most, followed.ways)
            after[path[:-1]].add(path[-1])
        for past, allowed in after.items():
            # What is allowed is what the tree has, whatever the record then says.
            nothing = past[-1] if past else ((0,) * len(crowd.kinds),) * 2
            assert follow(crowd, member, exchange, (*past, nothing)).allowed() == allowed
    assert (most > 1) == (exchange == "settle")


def test_an_answer_that_cannot_be_leaves_nothing() -> None:
    crowd = even(4)
    followed = Followed(crowd, 0, 0.0, 4, "settle")
    followed.go_on(np.array([1]), np.array([0]))
    assert followed.ways == 0
    assert followed.allowed() == {((0,), (0,))}
    assert not np.isfinite(followed.log_shown()).any()
    with pytest.raises(ModelError, match="impossible"):
        followed.worth()
    with pytest.raises(ModelError, match="no further step"):
        followed.go_on(np.array([1]), np.array([0]))


def test_several_at_once_or_one_after_another_by_hand() -> None:
    """Three show plus after step 2: two signs each, or one sign each for those who follow.

    Whoever leads has two signs: 0.36 given plus, 0.16 given minus. One leader and two followers
    (one sign each, 0.48) have 3 such orders; two leaders and one follower 3; all at once 1.
    """
    followed = Followed(even(4), 0, 0.0, 3, "settle")
    followed.go_on(np.array([0]), np.array([0]))
    followed.go_on(np.array([3]), np.array([0]))
    lead, follower = np.array([0.36, 0.16]), 0.48
    ways = np.array([3 * lead * follower**2, 3 * lead**2 * follower, lead**3])
    assert followed.ways == 3
    assert np.exp(followed.log_shown()) == pytest.approx(ways.sum(axis=0))
    assert followed.worth() == pytest.approx(np.log(ways.sum(axis=0)[0] / ways.sum(axis=0)[1]))
    shares = ways.sum(axis=1) / ways.sum()
    expected = dict(zip([(1, 0), (2, 0), (3, 0)], shares, strict=True))
    assert followed.first_answers() == pytest.approx(expected)


def test_a_large_crowd_that_answers_from_step_to_step() -> None:
    """Under once there is one way only, and what it is worth can be counted up by hand.

    After two steps all with two signs alike have answered; 300 plus and 150 minus among 999.
    """
    followed = Followed(even(1000), 0, 0.0, 4, "once")
    followed.go_on(np.array([0]), np.array([0]))
    followed.go_on(np.array([300]), np.array([150]))
    assert followed.ways == 1
    assert followed.worth() == pytest.approx(150 * 2 * ALPHA)


def test_too_many_ways_are_refused() -> None:
    followed = Followed(even(40), 0, 0.0, 4, "settle", most=10)
    followed.go_on(np.array([0]), np.array([0]))
    with pytest.raises(TooMany, match="more than 10 ways"):
        followed.go_on(np.array([20]), np.array([0]))


@pytest.mark.parametrize(("plus", "minus"), [(0, 1), (3, 2), (5, 0)])
def test_counts_that_cannot_be_counts_are_refused(plus: int, minus: int) -> None:
    followed = Followed(even(5), 0, 0.0, 4, "once")
    followed.go_on(np.array([0]), np.array([0]))
    followed.go_on(np.array([1]), np.array([0]))
    with pytest.raises(ModelError, match="never fall"):
        followed.go_on(np.array([plus]), np.array([minus]))
