"""Some of a crowd go by rules, the rest take everybody for exact: against the network."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import pytest

from tests.exact.crowds import ALPHA, bars, even, kind
from tests.exact.test_crowd_adopt import CROWDS, Card, apart, solution_of
from thumbwright.exact.adopters import adopt_together
from thumbwright.exact.crowd import Crowd, Kind, adopt_crowd
from thumbwright.exact.crowd_adopt import CrowdAdoption
from thumbwright.exact.crowd_figures import Weights
from thumbwright.exact.crowd_policy import CrowdPolicy, InPublic
from thumbwright.exact.crowd_shown import Shown, enumerate_shown, sample_shown
from thumbwright.exact.play import Act, Play, Policy, Situation


def shown_to(
    crowd: Crowd,
    users: Sequence[str],
    policy: CrowdPolicy,
    prior: float,
    horizon: int,
    exchange: str,
    histories: int = 0,
) -> Shown:
    """What the first user is shown where all users go by a policy."""
    kinds, sorts = [], []
    for sort, one in enumerate(crowd.kinds):
        for use in (True, False):
            members = tuple(m for m in one.members if (m in users) == use)
            if members:
                kinds.append(Kind(one.evidence, one.thresholds, members, one.looks))
                sorts.append(sort)
    policies = [policy if one.members[0] in users else None for one in kinds]
    held = next(k for k, one in enumerate(kinds) if users[0] in one.members)
    given = (Crowd(tuple(kinds)), held, prior, horizon, exchange)
    if histories:
        return sample_shown(*given, histories, 4, policies=policies, sorts=sorts)
    return enumerate_shown(*given, policies=policies, sorts=sorts)


def counting(weight: float) -> tuple[CrowdPolicy, Policy]:
    """Every answer counts for so much, silence for nothing; for a crowd and for a network."""

    def of_crowd(seen: InPublic) -> Act:
        return Act(weight * (seen.plus.sum(axis=0) - seen.minus.sum(axis=0)))

    def of_network(situation: Situation) -> Act:
        worths = [np.array([0.0, weight, -weight])[states] for states in situation.states]
        return Act(sum(worths, np.zeros(())))

    return of_crowd, of_network


def compared(
    name: str, exchange: str, users: int, policies: tuple[CrowdPolicy, Policy], horizon: int = 5
) -> tuple[Shown, CrowdAdoption, float]:
    crowd, prior = CROWDS[name]
    ids = list(crowd.members)[:users]
    shown = shown_to(crowd, ids, policies[0], prior, horizon, exchange)
    found = adopt_crowd(shown, policies[0])
    solution = solution_of(crowd, prior, horizon, exchange)
    played = adopt_together(solution, dict.fromkeys(ids, policies[1]))
    track = played.tracks[solution.group.index[ids[0]]]
    return shown, found, apart(found, Play(track, 0.0, None), solution.group.prior_plus)


@pytest.mark.parametrize("exchange", ["once", "settle"])
@pytest.mark.parametrize("name", ["three alike", "two kinds", "far from even", "own evidence"])
def test_where_nothing_odd_is_shown_it_is_the_network(name: str, exchange: str) -> None:
    """Exact readers, actual weights and the model's weights of a crowd, as of display histories."""
    met = 0
    cards = [Card(seed, 5, 3, by_value=True) for seed in range(3)]
    for card in cards:
        card.value *= 0.1
    ways = [counting(weight * ALPHA) for weight in (0.4, 1.0, 2.0, 2.3)]
    for horizon in (2, 3, 5):
        for policies in [*ways, *((card.of_crowd, card.of_network) for card in cards)]:
            shown, _, gap = compared(name, exchange, 2, policies, horizon)
            if max(shown.odd) == 0.0:
                met += 1
                assert gap < 1e-12
    assert met > 0


def test_a_pair_reads_what_is_odd_as_the_network_does() -> None:
    """One who is exact between two rule users that it does not see through, and who see it."""
    crowd = Crowd((kind(1, bars(-2, 2)), kind(1, bars(-3, 3))))
    for seed in range(5):
        card = Card(seed, 6, 2, by_value=False)
        for users in (1, 2):
            ids = list(crowd.members)[:users]
            shown = shown_to(crowd, ids, card.of_crowd, 0.0, 6, "once")
            solution = solution_of(crowd, 0.0, 6, "once")
            played = adopt_together(solution, dict.fromkeys(ids, card.of_network))
            found = adopt_crowd(shown, card.of_crowd)
            assert apart(found, Play(played.tracks[0], 0.0, None), 0.5) < 1e-12
            if users == 1:
                assert found.off_model.mean() == pytest.approx(played.off_model, abs=1e-12)


def test_single_odd_answers_are_read_as_in_the_network() -> None:
    """Three agents of which one other answers too early, before anybody else could have."""
    crowd = even(3, -3, 3)
    prior, horizon = 0.0, 4

    def early(step: int, plus: np.ndarray, minus: np.ndarray) -> Act:
        """Answers at the first sign; later it waits."""
        low = np.where((plus + minus == 0) & (step == 1), -1, -9)
        return Act(np.zeros(plus.shape), low, -low)

    def of_crowd(seen: InPublic) -> Act:
        return early(seen.step, seen.plus.sum(axis=0), seen.minus.sum(axis=0))

    shown = shown_to(crowd, crowd.members[:2], of_crowd, prior, horizon, "once")
    assert min(shown.odd) > 0.5
    # The model allows nobody an answer at step 1, so it is no news: the third is alone till then.
    levels = [
        showing.plus.sum(axis=0) + showing.minus.sum(axis=0) for showing in shown.parts[0][:2]
    ]
    assert levels[0].max() == 0
    assert levels[1].max() == 1


def test_sampled_and_enumerated_shares_agree() -> None:
    crowd = even(6, -2, 3)
    policy = counting(1.3 * ALPHA)[0]
    users = crowd.members[:3]
    exact = adopt_crowd(shown_to(crowd, users, policy, 0.1, 6, "once"), policy)
    shown = shown_to(crowd, users, policy, 0.1, 6, "once", 6000)
    found = adopt_crowd(shown, policy)
    assert shown.weight is not None
    weights = Weights(shown.weight, shown.half)
    for name in ("plus", "minus", "steps"):
        value, error = weights.mean(getattr(found, name))
        assert (error > 0).all()
        assert (np.abs(value - getattr(exact, name)[:, 0]) < 4 * error).all(), name
    total = exact.plus + exact.minus + exact.undecided
    assert total == pytest.approx(1.0, abs=1e-12)
