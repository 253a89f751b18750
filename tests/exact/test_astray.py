"""Groups in a world that is not what they believe, against an enumeration of every sequence."""

from __future__ import annotations

import dataclasses
import math

import numpy as np
import pytest
from hypothesis import assume, event, given, settings, strategies as st

from tests.exact.comparing import built, groups, track_apart
from tests.slow import group as slow
from tests.slow.astray import ALONE, SILENT, Mind, model_of, play_astray
from thumbwright.exact.astray import (
    Habit,
    World,
    as_believed_by,
    fates,
    with_habit,
    with_laws,
    with_links,
    with_thresholds,
)
from thumbwright.exact.engine import solve
from thumbwright.exact.errors import ModelError
from thumbwright.exact.evidence.base import Evidence
from thumbwright.exact.evidence.binary import bernoulli, calibration, coin
from thumbwright.exact.evidence.counts import binomial, poisson
from thumbwright.exact.evidence.law import Law, as_believed, real_law, stretched, useless
from thumbwright.exact.evidence.listed import listed
from thumbwright.exact.group import Agent, Group, Thresholds, same_thresholds
from thumbwright.exact.outcomes import outcome
from thumbwright.exact.play import Act, Situation, adopt, silence_is_possible

ALPHA = math.log(1.5)


def worths(masses: tuple[tuple[float, float], ...]) -> tuple[float, ...]:
    """What each value is taken for (nats)."""
    found = []
    for plus, minus in masses:
        if plus and minus:
            found.append(math.log(plus / minus))
        else:
            found.append(math.inf if plus else -math.inf)
    return tuple(found)


def real_masses(
    masses: tuple[tuple[float, float], ...], law: Law, evidence: Evidence
) -> tuple[tuple[float, float], ...]:
    """The law's probabilities of the slow program's values, which the engine may have merged."""
    found = []
    for plus, minus in masses:
        if not (plus and minus):
            assert plus == minus == 0.0
            found.append((0.0, 0.0))
            continue
        worth = math.log(plus / minus)
        place = int(np.argmin(np.abs(evidence.worths() - worth)))
        # Values of equal worth are one value to the engine; any division among them will do.
        share = plus / evidence.plus[place]
        found.append((law.plus[place] * share, law.minus[place] * share))
    return tuple(found)


@st.composite
def astray(draw: st.DrawFn) -> tuple[slow.Group, list[tuple[str, int, float]]]:
    """A random group, and a list of what is otherwise: what, of whom, how much."""
    group = draw(groups())
    size = len(group.sees)
    kinds = st.sampled_from(["law", "law", "thresholds", "silent", "alone", "useless", "links"])
    agents = st.integers(0, size - 1)
    changes = draw(
        st.lists(
            st.tuples(kinds, agents, st.sampled_from([0.3, 0.7, 1.4, -0.5])),
            min_size=1,
            max_size=2,
            unique_by=lambda change: change[1],
        )
    )
    return group, changes


@settings(max_examples=80)
@given(astray())
def test_random_worlds_agree_with_enumeration(
    case: tuple[slow.Group, list[tuple[str, int, float]]],
) -> None:
    group, changes = case
    here, size = built(group), len(group.sees)
    solution = solve(here)
    tables, narrowest = model_of(group)
    world = as_believed_by(solution)
    minds: list[Mind] = [Mind(tables, worths(masses)) for masses in group.evidence]
    sees, masses, bars = [*group.sees], [*group.evidence], [*group.thresholds]
    for kind, who, much in changes:
        name, evidence = f"a{who}", here.agents[who].evidence
        if kind in ("law", "useless"):
            assume(evidence.certain_plus + evidence.certain_minus == 0)
            law = stretched(evidence, much) if kind == "law" else useless(evidence)
            world = with_laws(world, {name: law})
            masses[who] = real_masses(group.evidence[who], law, evidence)
        elif kind == "thresholds":
            moved = [(b.minus - much / 2, b.plus + much, b.share) for b in bars[who]]
            assume(all(low < high for low, high, _ in moved))
            bars[who] = tuple(slow.Thresholds(*one) for one in moved)
            real = tuple((share, Thresholds(low, high)) for low, high, share in moved)
            world = with_thresholds(world, name, real)
        elif kind in ("silent", "alone"):
            world = with_habit(world, name, Habit.SILENT if kind == "silent" else Habit.ALONE)
            minds[who] = dataclasses.replace(
                minds[who], tables=SILENT if kind == "silent" else ALONE
            )
            sees[who] = ()
        else:
            other = tuple(k for k in range(size) if k != who and (k in sees[who]) != (much > 1))
            changed = dataclasses.replace(
                group, sees=tuple(other if k == who else s for k, s in enumerate(group.sees))
            )
            linked, narrow = model_of(changed)
            narrowest = min(narrowest, narrow)
            world = with_links(world, name, solve(built(changed)))
            minds[who] = dataclasses.replace(minds[who], tables=linked)
            sees[who] = other
    real_group = dataclasses.replace(
        group, sees=tuple(sees), evidence=tuple(masses), thresholds=tuple(bars)
    )
    played = play_astray(real_group, minds)
    assume(min(narrowest, played.narrowest) > 1e-11)
    odd = max(played.odd_commitments) > 0.0
    event(f"{size} agents, {'+'.join(sorted(c[0] for c in changes))}, odd {odd}")
    # What the engine does not hold after a silence that never is, the enumeration does; and how
    # several odd commitments of one moment are read together is settled for pairs only.
    assume(all(silence_is_possible(solution, i) for i in range(size)))
    assume(size < 3 or not odd)
    for who in range(size):
        (fate,) = fates(world, f"a{who}", [None])
        assert track_apart(played, who, fate.track) < 1e-12
        expected = group.prior_plus * played.odd_commitments[0]
        expected += (1.0 - group.prior_plus) * played.odd_commitments[1]
        assert fate.off_model == pytest.approx(expected, abs=1e-12)


def pair(horizon: int = 12, low: float = -2, high: float = 4, mutual: bool = False) -> Group:
    """A watcher at three signs either way, and a neighbour."""
    first = same_thresholds(Thresholds(low * ALPHA, high * ALPHA))
    second = same_thresholds(Thresholds(-3 * ALPHA, 3 * ALPHA))
    return Group(
        (
            Agent("first", coin(0.6), first, ("second",) if mutual else ()),
            Agent("second", coin(0.6), second, ("first",)),
        ),
        0.0,
        horizon,
    )


def follow(situation: Situation) -> Act:
    """A rule: an answer seen counts two signs."""
    return Act(ALPHA * np.array([0.0, 2.0, -2.0])[situation.states[0]])


@pytest.mark.parametrize("mutual", [False, True])
def test_where_everybody_is_right_nothing_changes(mutual: bool) -> None:
    solution = solve(pair(mutual=mutual))
    exact, rule = fates(as_believed_by(solution), "second", [None, follow])
    assert outcome(exact.track)[0].plus == pytest.approx(
        outcome(solution.tracks[1])[0].plus, abs=1e-13
    )
    played = adopt(solution, "second", follow)
    assert np.abs(rule.track.answers - played.track.answers).max() < 1e-13
    assert exact.off_model == 0.0


def test_a_law_that_is_believed_changes_nothing() -> None:
    solution = solve(pair())
    world = with_laws(as_believed_by(solution), {"first": as_believed(coin(0.6))})
    (fate,) = fates(world, "second", [None])
    assert np.abs(fate.track.answers - solution.tracks[1].answers).max() < 1e-13


def test_a_weaker_coin_is_a_coin_with_stretched_log_odds() -> None:
    weaker = stretched(coin(0.6), 0.5)
    p = 1.0 / (1.0 + math.exp(-ALPHA / 2))
    assert weaker.plus == pytest.approx([1 - p, p], abs=1e-15)
    assert real_law(coin(0.6), coin(p)).alpha == pytest.approx(weaker.alpha, abs=1e-14)


def test_stretched_counts_keep_their_geometric_mean() -> None:
    """Rates 4 and 1 at half the worth are rates 2 sqrt(2) and sqrt(2)."""
    law = stretched(poisson(4.0, 1.0), 0.5)
    real = poisson(2.0 * math.sqrt(2.0), math.sqrt(2.0))
    size = min(len(law.plus), len(real.plus))
    assert law.plus[:size] == pytest.approx(real.plus[:size], abs=1e-12)
    assert law.beta == pytest.approx(real.beta, abs=1e-9)


@pytest.mark.parametrize(
    "evidence",
    [
        coin(0.7),
        bernoulli(0.9, 0.2),
        bernoulli(0.5, 0.0),
        calibration(9, 1, 0, 5),
        binomial(4, 0.6, 0.3),
        poisson(2.0, 1.0),
        listed([0.5, 0.3, 0.2], [0.1, 0.3, 0.6]),
    ],
)
def test_one_agent_astray_agrees_with_every_sequence(evidence: Evidence) -> None:
    """Useless observations: what is answered does not depend on the truth."""
    group = Group((Agent("a", evidence, same_thresholds(Thresholds(-1.2, 0.9))),), 0.2, 6, "once")
    world = with_laws(as_believed_by(solve(group)), {"a": useless(evidence)})
    (fate,) = fates(world, "a", [None])
    plus, minus = outcome(fate.track)
    assert plus == minus
    assert plus.plus + plus.minus + plus.undecided == pytest.approx(1.0, abs=1e-12)
    assert plus.plus > 0.0 < plus.minus


def test_what_is_taken_for_proof_may_not_be() -> None:
    """No false alarm in five trials is no proof: one step of a sign with p 0.9 and really 0.3."""
    believed = calibration(9, 1, 0, 5)
    group = Group((Agent("a", believed, same_thresholds(Thresholds(-9.0, 9.0))),), 0.0, 1)
    world = with_laws(as_believed_by(solve(group)), {"a": real_law(believed, bernoulli(0.9, 0.3))})
    (fate,) = fates(world, "a", [None])
    plus, minus = outcome(fate.track)
    assert (plus.plus, minus.plus) == pytest.approx((0.9, 0.3), abs=1e-14)


def test_an_absent_neighbour_never_answers() -> None:
    world = with_habit(as_believed_by(solve(pair())), "first", Habit.SILENT)
    (fate,) = fates(world, "first", [None])
    assert fate.track.answers.sum() == 0.0
    assert fate.track.undecided == pytest.approx([1.0, 1.0])


def test_an_absent_neighbour_with_proof_at_hand_never_answers() -> None:
    sure = bernoulli(0.5, 0.0)
    agents = (
        Agent("first", sure, same_thresholds(Thresholds(-1.0, 1.0))),
        Agent("second", coin(0.6), same_thresholds(Thresholds(-1.0, 1.0)), ("first",)),
    )
    world = with_habit(as_believed_by(solve(Group(agents, 0.0, 4))), "first", Habit.SILENT)
    assert fates(world, "first", [None])[0].track.answers.sum() == 0.0


def test_only_other_laws_are_read_by_the_model() -> None:
    """Laws alone never lead to histories that the believed solution calls impossible."""
    solution = solve(pair(mutual=True))
    world = with_laws(as_believed_by(solution), {"first": stretched(coin(0.6), 0.4)})
    exact, rule = fates(world, "second", [None, follow])
    assert exact.off_model == 0.0
    # The rule's own answers come at odd times.
    assert rule.off_model > 0.0


@pytest.mark.parametrize(
    ("evidence", "real", "says"),
    [
        (coin(0.6), bernoulli(0.6, 0.4), "cannot really be"),
        (binomial(3, 0.6, 0.4), binomial(4, 0.6, 0.4), "values that it does not have"),
        (
            listed([0.2, 0.3, 0.5], [0.5, 0.3, 0.2]),
            listed([0.2, 0.3, 0.5], [0.6, 0.25, 0.15]),
            "linear",
        ),
    ],
)
def test_other_laws_are_refused(evidence: Evidence, real: Evidence, says: str) -> None:
    with pytest.raises(ModelError, match=says):
        real_law(evidence, real)


def test_a_mind_must_see_whom_the_agent_really_sees() -> None:
    solution = solve(pair())
    with pytest.raises(ModelError, match="agent first must reason by a group"):
        World(pair(mutual=True), (solution, solution), (None, None))
