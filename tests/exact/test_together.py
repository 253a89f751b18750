"""Group outcomes against the enumeration, by hand, and against what must hold for any group."""

from __future__ import annotations

import math
from collections import Counter
from typing import Any

import numpy as np
import pytest
from hypothesis import assume, example, given, settings

from tests.exact.comparing import COIN, UNSURE, built, groups
from tests.slow import group as slow
from tests.slow.enumerate import Branch, Enumeration, enumerate_group
from thumbwright.exact import jointly
from thumbwright.exact.engine import solve
from thumbwright.exact.errors import ModelError
from thumbwright.exact.evidence.binary import coin
from thumbwright.exact.group import Agent, Group, Thresholds, same_thresholds
from thumbwright.exact.together import Together, first_answer, followers, together

ALPHA = math.log(1.5)
NAMES = (
    "first",
    "nobody",
    "last",
    "not_everybody",
    "followers",
    "right_majority",
    "wrong_majority",
    "tie",
    "split",
    "all_right",
    "all_wrong",
)


def counted(model: Enumeration, horizon: int) -> dict[str, np.ndarray[Any, Any]]:
    """Every figure from the final branches, one joint history at a time."""
    size = len(model.branches[0].shown)
    found = {name: np.zeros(2) for name in NAMES}
    found |= {name: np.zeros((2, horizon + 1)) for name in ("first", "last")}
    found["followers"] = np.zeros((2, size))
    for branch in model.branches:
        for given_, (right, mass) in enumerate((("plus", branch.plus), ("minus", branch.minus))):
            for name, place in facts(branch, right):
                found[name][(given_, *place)] += mass
    return found


def facts(branch: Branch, right: str) -> list[tuple[str, tuple[int, ...]]]:
    """What is true of one joint history, given which answer is right."""
    events = [event for event in branch.shown if event is not None]
    votes = Counter(event.answer == right for event in events)
    true: list[tuple[str, tuple[int, ...]]] = []
    if len(events) < len(branch.shown):
        true.append(("not_everybody", ()))
    else:
        true.append(("last", (max(event.step for event in events),)))
        true += [("all_right", ())] * (not votes[False]) + [("all_wrong", ())] * (not votes[True])
    if not events:
        return [*true, ("nobody", ())]
    step, round_ = min(event.moment for event in events)
    follow = sum(event.step == step and event.round > round_ for event in events)
    true += [("first", (step,)), ("followers", (follow,))]
    if votes[True] == votes[False]:
        true.append(("tie", ()))
    else:
        true.append(("right_majority" if votes[True] > votes[False] else "wrong_majority", ()))
    return [*true, ("split", ())] if votes[True] and votes[False] else true


def apart(got: Together, expected: dict[str, np.ndarray[Any, Any]]) -> float:
    return max(float(np.abs(getattr(got, name) - expected[name]).max()) for name in NAMES)


@settings(max_examples=60)
@given(groups())
@example(slow.Group(((1,), (0,)), (COIN, COIN), (UNSURE, UNSURE), 6, "settle", 0.6))
@example(slow.Group(((1, 2), (0, 2), (0, 1)), (COIN,) * 3, (UNSURE,) * 3, 4, "settle", 0.5))
@example(slow.Group(((2, 1), (2,), (0,)), (COIN,) * 3, (UNSURE,) * 3, 4, "once", 0.5))
def test_random_groups_agree_with_enumeration(group: slow.Group) -> None:
    model = enumerate_group(group)
    assume(model.narrowest > 1e-11)
    assert apart(together(solve(built(group))), counted(model, group.horizon)) < 1e-10


def test_the_comparison_can_fail() -> None:
    bars = ((slow.Thresholds(-0.5, 1.0),),) * 2
    one, other = (
        slow.Group(((1,), (0,)), (COIN, COIN), bars, 4, mode) for mode in ("once", "settle")
    )
    assert apart(together(solve(built(one))), counted(enumerate_group(one), 4)) < 1e-12
    assert apart(together(solve(built(one))), counted(enumerate_group(other), 4)) > 0.01


def crowd(size: int, horizon: int, exchange: str, minus: int = -2, plus: int = 2) -> Group:
    ids = [f"a{k}" for k in range(size)]
    bars = same_thresholds(Thresholds(minus * ALPHA, plus * ALPHA))
    agents = (Agent(i, coin(0.6), bars, tuple(j for j in ids if j != i)) for i in ids)
    return Group(tuple(agents), 0.0, horizon, exchange)


def test_two_by_hand() -> None:
    """One sign decides: at step 1 both answer, right with 0.6 each."""
    pair = crowd(2, 3, "settle", -1, 1)
    got = together(solve(pair))
    for given_ in (0, 1):
        assert got.first[given_] == pytest.approx([0, 1, 0, 0], abs=1e-14)
        assert got.last[given_] == pytest.approx([0, 1, 0, 0], abs=1e-14)
    assert got.right_majority == pytest.approx([0.36] * 2, abs=1e-14)
    assert got.all_wrong == pytest.approx([0.16] * 2, abs=1e-14)
    assert got.tie == pytest.approx([0.48] * 2, abs=1e-14)
    assert got.split == pytest.approx([0.48] * 2, abs=1e-14)
    assert got.followers[:, 0] == pytest.approx([1.0] * 2, abs=1e-14)
    assert got.mean_step("first") == pytest.approx((1.0, 1.0))


def test_one_that_follows_by_hand() -> None:
    """b needs two signs of its own; a's first answer is worth one and is followed at once."""
    bars = (
        same_thresholds(Thresholds(-ALPHA, ALPHA)),
        same_thresholds(Thresholds(-2 * ALPHA, 2 * ALPHA)),
    )
    agents = (Agent("a", coin(0.6), bars[0]), Agent("b", coin(0.6), bars[1], ("a",)))
    got = together(solve(Group(agents, 0.0, 1, "settle")))
    # b follows where its own first sign agrees with a's, and stands at 0 otherwise.
    assert got.followers[0] == pytest.approx([0.48, 0.52], abs=1e-14)
    assert got.mean_followers() == pytest.approx((0.52, 0.52))
    assert got.all_right == pytest.approx([0.36] * 2, abs=1e-14)
    assert got.not_everybody == pytest.approx([0.48] * 2, abs=1e-14)
    assert got.right_majority == pytest.approx([0.6] * 2, abs=1e-14)
    once = together(solve(Group(agents, 0.0, 1, "once")))
    assert once.followers[0] == pytest.approx([1.0, 0.0], abs=1e-14)
    assert once.not_everybody == pytest.approx([1.0] * 2, abs=1e-14)
    assert once.mean_step("last") == (None, None)


@pytest.mark.parametrize("exchange", ["once", "settle"])
def test_what_must_hold_for_any_group(exchange: str) -> None:
    solution = solve(crowd(3, 8, exchange))
    got = together(solution)
    whole = got.right_majority + got.wrong_majority + got.tie + got.nobody
    assert whole == pytest.approx([1.0] * 2, abs=1e-13)
    assert got.first.sum(axis=1) + got.nobody == pytest.approx([1.0] * 2, abs=1e-13)
    assert got.followers.sum(axis=1) + got.nobody == pytest.approx([1.0] * 2, abs=1e-13)
    assert got.last.sum(axis=1) + got.not_everybody == pytest.approx([1.0] * 2, abs=1e-13)
    # Even thresholds and an even prior: both answers are alike.
    for name in NAMES:
        assert getattr(got, name)[0] == pytest.approx(getattr(got, name)[1], abs=1e-13)
    assert (got.followers[0, 1:].sum() > 0.01) == (exchange == "settle")


def test_sums_in_portions_are_the_same_sums(monkeypatch: pytest.MonkeyPatch) -> None:
    solution = solve(crowd(3, 6, "settle", -2, 3))
    whole = together(solution)
    monkeypatch.setattr(jointly, "_AT_ONCE", 500)
    portions = together(solution)
    for name in NAMES:
        assert getattr(portions, name) == pytest.approx(getattr(whole, name), abs=1e-14)


def test_what_was_dropped_bounds_what_it_can_change() -> None:
    group = crowd(3, 10, "settle", -2, 3)
    whole, solution = together(solve(group)), solve(group, drop=1e-4)
    bound = np.array(solution.dropped) + np.array(solution.doubtful)
    assert bound.max() > 1e-5
    part = together(solution)
    for name in NAMES:
        got, expected = getattr(part, name), getattr(whole, name)
        for given_ in (0, 1):
            off = np.abs(got[given_] - expected[given_]).max()
            assert off <= bound[given_] + 1e-13, (name, given_)


def test_a_long_relay_is_summed_link_by_link() -> None:
    bars = same_thresholds(Thresholds(-2 * ALPHA, 3 * ALPHA))
    agents = tuple(Agent(f"a{k}", coin(0.6), bars, (f"a{k - 1}",) if k else ()) for k in range(40))
    solution = solve(Group(agents, 0.0, 6, "once"))
    got = together(solution)
    whole = got.right_majority + got.wrong_majority + got.tie + got.nobody
    assert whole == pytest.approx([1.0] * 2, abs=1e-12)
    # Nobody can answer at step 1, so all are on their own at step 2; two signs in a row for minus.
    assert got.first[0, 2] == pytest.approx(1.0 - 0.84**40, abs=1e-12)


def test_a_group_too_wide_is_refused_but_its_first_answer_is_not(
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    solution = solve(crowd(4, 4, "once"))
    monkeypatch.setattr(jointly, "MOST_PRODUCTS", 1000.0)
    with pytest.raises(ModelError, match=r"around agent a0 .* a horizon below 4 steps"):
        together(solution)
    law, nobody = first_answer(solution)
    assert law.sum(axis=1) + nobody == pytest.approx([1.0] * 2, abs=1e-13)
    assert followers(solution).sum(axis=1) + nobody == pytest.approx([1.0] * 2, abs=1e-13)
