"""A member of a crowd that plays by a rule: against the same play through display histories."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import replace
from functools import reduce

import numpy as np
import pytest

from tests.exact.comparing import COIN
from tests.exact.crowds import BIASED, CERTAIN, UNKNOWN, bars, even, kind, network
from tests.slow import simulate as sim
from thumbwright.exact.adopters import adopt_together
from thumbwright.exact.arrays import FloatArray, IntArray
from thumbwright.exact.crowd import Crowd, enumerate_crowd, enumerate_situations
from thumbwright.exact.crowd_adopt import CrowdAdoption, adopt_crowd, exact_member
from thumbwright.exact.crowd_figures import Weights
from thumbwright.exact.crowd_policy import InPublic
from thumbwright.exact.crowd_shown import enumerate_shown, sample_shown
from thumbwright.exact.engine import Solution, solve
from thumbwright.exact.errors import ModelError
from thumbwright.exact.play import Act, Play, Situation, adopt

FIGURES = ("plus", "minus", "undecided", "steps")
CROWDS = {
    "three alike": (even(3), 0.0),
    "two kinds": (Crowd((kind(2, bars(-2, 2)), kind(1, bars(-3, 4)))), 0.0),
    "far from even": (Crowd((kind(2, bars(-1, 3)), kind(1, bars(-2, 2)))), 0.4),
    "own evidence": (Crowd((kind(2, bars(-2, 2)), kind(1, bars(-2, 3), BIASED))), -0.3),
    "certain evidence": (Crowd((kind(2, bars(-2, 2)), kind(1, bars(-2, 2.5), CERTAIN))), 0.0),
    "unknown thresholds": (Crowd((kind(2, UNKNOWN), kind(1, bars(-2, 3)))), 0.1),
}


class Card:
    """Random bars and values by step and by how many show plus and minus."""

    def __init__(self, seed: int, horizon: int, size: int, by_value: bool) -> None:
        rng = np.random.default_rng(seed)
        shape = (horizon + 1, size, size)
        self.value: FloatArray = rng.normal(0.0, 1.2, shape)
        self.low: IntArray = rng.integers(-4, 0, shape)
        self.high: IntArray = rng.integers(1, 5, shape)
        self.row: IntArray = rng.integers(-1, 4, shape)
        self._by_value = by_value

    def at(self, step: int, plus: IntArray, minus: IntArray) -> Act:
        where = (step, plus, minus)
        if self._by_value:
            return Act(self.value[where], row=self.row[where])
        return Act(self.value[where], self.low[where], self.high[where], self.row[where])

    def of_network(self, situation: Situation) -> Act:
        plus, minus = (
            reduce(np.add, [(states == code).astype(int) for states in situation.states])
            for code in (1, 2)
        )
        return self.at(situation.step, plus, minus)

    def of_crowd(self, showing: InPublic) -> Act:
        return self.at(showing.step, showing.plus.sum(axis=0), showing.minus.sum(axis=0))


def apart(found: CrowdAdoption, played: Play, prior_plus: float) -> float:
    """Largest difference in any figure."""
    track = played.track
    horizon = track.answers.shape[2] - 1
    undecided = np.asarray(track.undecided)
    expected = {
        "plus": track.answers[0].sum(axis=1),
        "minus": track.answers[1].sum(axis=1),
        "undecided": undecided,
        "steps": track.answers.sum(axis=0) @ np.arange(horizon + 1) + horizon * undecided,
        "leaning": track.leaning,
    }
    worst = max(float(np.abs(getattr(found, n)[..., 0] - one).max()) for n, one in expected.items())
    if played.usage is not None:
        assert found.usage is not None
        mean = prior_plus * found.usage[:, :, 0, 0] + (1 - prior_plus) * found.usage[:, :, 1, 0]
        worst = max(worst, float(np.abs(mean - played.usage).max()))
    return worst


def solution_of(crowd: Crowd, prior: float, horizon: int, exchange: str) -> Solution:
    return solve(network(crowd, prior, horizon, exchange))


@pytest.mark.parametrize("exchange", ["once", "settle"])
@pytest.mark.parametrize("name", CROWDS)
def test_any_rule_costs_what_it_costs_in_the_network(name: str, exchange: str) -> None:
    """Also where the member keeps a silence that the others' model calls impossible."""
    crowd, prior = CROWDS[name]
    horizon = 5
    solution = solution_of(crowd, prior, horizon, exchange)
    seen_impossible = False
    for number, one in enumerate(crowd.kinds):
        shown = enumerate_shown(crowd, number, prior, horizon, exchange)
        seen_impossible |= any(np.isnan(s.worth).any() for s in shown.parts[0])
        for seed in range(3):
            card = Card(seed, horizon, crowd.size, by_value=seed == 2)
            found = adopt_crowd(shown, card.of_crowd, rows=4)
            played = adopt(solution, one.members[0], card.of_network, rows=4)
            assert apart(found, played, solution.group.prior_plus) < 1e-12, (name, seed)
    assert seen_impossible or exchange == "once"


def test_a_play_that_ends_with_the_silence_of_the_model_is_noticed() -> None:
    """The check above can fail."""
    crowd, prior = CROWDS["far from even"]
    solution = solution_of(crowd, prior, 5, "settle")
    shown = enumerate_shown(crowd, 1, prior, 5, "settle")
    ended = [
        replace(s, log_shown=np.where(np.isnan(s.worth), -np.inf, s.log_shown))
        for s in shown.parts[0]
    ]
    broken = replace(shown, parts=(tuple(ended),))
    worst = 0.0
    for seed in range(4):
        card = Card(seed, 5, 3, by_value=False)
        played = adopt(solution, crowd.kinds[1].members[0], card.of_network)
        worst = max(worst, apart(adopt_crowd(broken, card.of_crowd), played, 0.5))
    assert worst > 1e-3


@pytest.mark.parametrize("exchange", ["once", "settle"])
def test_exact_play_is_a_policy_like_any_other(exchange: str) -> None:
    crowd = Crowd((kind(3, bars(-2, 3)), kind(2, bars(-3, 2))))
    play = enumerate_crowd(crowd, 0.2, 7, exchange)
    for number in (0, 1):
        shown = enumerate_shown(crowd, number, 0.2, 7, exchange)
        found = adopt_crowd(shown, exact_member)
        for given, expected in enumerate(play.kinds[number].given):
            for name, one in (("plus", "plus"), ("minus", "minus"), ("steps", "mean_steps")):
                got = getattr(found, name)[given, 0]
                assert got == pytest.approx(getattr(expected, one), abs=1e-12)
        assert found.leaning[..., 0] == pytest.approx(play.kinds[number].leaning, abs=1e-12)
        assert found.off_model.max() == 0.0


@pytest.mark.parametrize("exchange", ["once", "settle"])
def test_odd_answers_are_counted_as_in_the_network(exchange: str) -> None:
    """A pair that watches each other: the other one is shown what its model calls impossible."""
    crowd = Crowd((kind(1, bars(-2, 2)), kind(1, bars(-3, 3))))
    solution = solution_of(crowd, 0.0, 6, exchange)
    most = 0.0
    for seed in range(6):
        card = Card(seed, 6, 2, by_value=False)
        found = adopt_crowd(enumerate_shown(crowd, 1, 0.0, 6, exchange), card.of_crowd)
        played = adopt(solution, crowd.kinds[1].members[0], card.of_network)
        assert found.off_model.mean() == pytest.approx(played.off_model, abs=1e-12)
        most = max(most, played.off_model)
    assert most > 1e-2


@pytest.mark.parametrize("exchange", ["once", "settle"])
def test_sampled_histories_agree_within_their_errors(exchange: str) -> None:
    crowd = Crowd((kind(3, bars(-2, 3)), kind(2, bars(-3, 2))))
    card = Card(5, 6, 5, by_value=False)
    exact = adopt_crowd(enumerate_shown(crowd, 0, 0.1, 6, exchange), card.of_crowd, rows=4)
    shown = sample_shown(crowd, 0, 0.1, 6, exchange, 6000, 3)
    found = adopt_crowd(shown, card.of_crowd, rows=4)
    assert shown.weight is not None
    weights, one = Weights(shown.weight, shown.half), np.ones(6000)
    for name in FIGURES:
        value, error = weights.ratio(getattr(found, name), one)
        off = np.abs(value - getattr(exact, name)[:, 0])
        assert (error > 0).all()
        assert (off <= 4 * error).all(), (name, off / error)
    assert found.usage is not None
    assert exact.usage is not None
    for got, expected in zip(found.usage, exact.usage, strict=True):
        for of_one, wanted in zip(got, expected[..., 0], strict=True):
            value, error = weights.ratio(of_one, one)
            assert (np.abs(value - wanted) <= 4 * error + 1e-12).all()
    again = adopt_crowd(sample_shown(crowd, 0, 0.1, 6, exchange, 6000, 3), card.of_crowd)
    assert np.array_equal(again.plus, found.plus)


def test_the_tree_holds_the_situations_of_the_member() -> None:
    """Under "once", where no round is idle, entry by entry; sums over what shows the same."""
    crowd = Crowd((kind(2, bars(-2, 3)), kind(2, bars(-3, 2))))
    shown = enumerate_shown(crowd, 1, 0.3, 6, "once")
    expected = enumerate_situations(crowd, 1, 0.3, 6, "once")
    for given in (0, 1):
        for showing in shown.parts[0]:
            told = ~np.isnan(showing.worth)
            mass = np.exp(showing.log_shown + showing.log_still)[given, told]
            here = expected.step == showing.step
            wanted = (expected.shown * expected.still)[given, here]
            assert mass.sum() == pytest.approx(wanted.sum(), abs=1e-13)
            assert mass @ showing.worth[told] == pytest.approx(
                wanted @ expected.worth[here], abs=1e-12
            )
    total = [np.exp(s.log_shown).sum(axis=1) for s in shown.parts[0]]
    assert np.array(total) == pytest.approx(1.0, abs=1e-12)


def test_first_and_latest_answers_are_written_down() -> None:
    crowd = even(4, -2, 2)
    shown = enumerate_shown(crowd, 0, 0.0, 6, "settle")
    before = None
    for showing in shown.parts[0]:
        number = (showing.plus + showing.minus).sum(axis=0)
        came = showing.first_plus + showing.first_minus
        assert ((came > 0) == (number > 0)).all()
        assert (came <= number).all()
        assert ((showing.first > 0) == (number > 0)).all()
        assert (showing.first <= showing.last).all()
        if before is not None:
            old = (before.plus + before.minus).sum(axis=0)[showing.parent]
            new = number > old
            assert (showing.last[new] == before.step).all()
            assert (
                came[old > 0] == (before.first_plus + before.first_minus)[showing.parent][old > 0]
            ).all()
            first = new & (old == 0)
            assert (came[first] == number[first]).all()
        before = showing


def test_what_is_too_much_is_refused() -> None:
    with pytest.raises(ModelError, match="situations would be held"):
        enumerate_shown(even(5), 0, 0.0, 12, "once", most=2000)
    with pytest.raises(ModelError, match="1 kinds"):
        enumerate_shown(even(3), 1, 0.0, 4, "once")
    with pytest.raises(ModelError, match="even"):
        sample_shown(even(3), 0, 0.0, 4, "once", 5, 1)
    assert math.isclose(enumerate_shown(even(3), 0, 0.5, 2, "once").prior_plus, 0.6224593312)


@pytest.mark.parametrize("exchange", ["once", "settle"])
@pytest.mark.parametrize("name", CROWDS)
def test_everybody_by_a_rule_is_the_network_in_which_everybody_is(name: str, exchange: str) -> None:
    crowd, prior = CROWDS[name]
    if name == "unknown thresholds":
        crowd = Crowd((kind(2, UNKNOWN), kind(2, bars(-2, 3))))
    horizon = 4
    solution = solution_of(crowd, prior, horizon, exchange)
    by_kind = [Card(k, horizon, crowd.size, by_value=k == 1) for k in range(len(crowd.kinds))]
    policies = [card.of_crowd for card in by_kind]
    played = adopt_together(
        solution,
        {
            member: card.of_network
            for one, card in zip(crowd.kinds, by_kind, strict=True)
            for member in one.members
        },
    )
    for number, one in enumerate(crowd.kinds):
        shown = enumerate_shown(crowd, number, prior, horizon, exchange, policies=policies)
        found = adopt_crowd(shown, policies[number])
        track = played.tracks[solution.group.index[one.members[0]]]
        expected = Play(track, 0.0, None)
        assert apart(found, expected, solution.group.prior_plus) < 1e-12, number
        assert found.off_model.max() == 0.0


def test_worths_among_rule_users_are_those_of_what_they_really_do() -> None:
    """The log ratio of the probabilities of each history, the member held to undecided."""
    crowd = Crowd((kind(4, bars(-2, 3)),))
    card = Card(3, 5, 4, by_value=False)
    shown = enumerate_shown(crowd, 0, 0.2, 5, "settle", policies=[card.of_crowd])
    for showing in shown.parts[0]:
        told = ~np.isnan(showing.worth)
        ratio = showing.log_shown[0] - showing.log_shown[1]
        assert showing.worth[told] == pytest.approx(ratio[told], abs=1e-10)
    plain = enumerate_shown(crowd, 0, 0.2, 5, "settle")
    assert len(plain.parts[0][-1]) != len(shown.parts[0][-1])


def test_a_crowd_of_eight_by_one_card_agrees_with_simulation() -> None:
    """Drawn bird by bird and observation by observation."""
    size, horizon, runs = 8, 8, 20_000
    crowd = even(size, -3, 3)

    def bars_at(plus: int, minus: int) -> tuple[int, int]:
        return (-3, 3) if plus == minus else (-5, 1) if plus > minus else (-1, 5)

    table = np.array([[bars_at(p, m) for m in range(size)] for p in range(size)])

    def card(seen: InPublic) -> Act:
        low, high = table[seen.plus.sum(axis=0), seen.minus.sum(axis=0)].T
        return Act(np.zeros(len(seen)), low, high)

    shown = enumerate_shown(crowd, 0, 0.0, horizon, "once", policies=[card])
    found = adopt_crowd(shown, card)
    sees = [tuple(k for k in range(size) if k != agent) for agent in range(size)]

    def player(
        _step: int, _round: int, seen: Sequence[sim.Seen], _tally: FloatArray, count: IntArray
    ) -> IntArray:
        plus, minus = (sum((one.state == code).astype(int) for one in seen) for code in (1, 2))
        low, high = np.moveaxis(table[plus, minus], -1, 0)
        return np.where(count >= high, sim.PLUS, np.where(count <= low, sim.MINUS, sim.UNDECIDED))

    evidence = [sim.values(COIN, sim.COIN_COUNTS)] * size
    for given, answer in enumerate(("plus", "minus")):
        drawn = sim.simulate(sees, evidence, [player] * size, horizon, answer, runs, 5 + given)
        # All are alike: the mean over them, its error from the spread between runs.
        for name, state in (("plus", sim.PLUS), ("minus", sim.MINUS), ("undecided", 0)):
            share = (drawn.state == state).mean(axis=1)
            error = share.std(ddof=1) / np.sqrt(runs)
            assert abs(share.mean() - getattr(found, name)[given, 0]) < 4 * error, name
        used = np.where(drawn.state == 0, horizon, drawn.step).mean(axis=1)
        error = used.std(ddof=1) / np.sqrt(runs)
        assert abs(used.mean() - found.steps[given, 0]) < 4 * error
