"""What the comparisons of engine and enumeration share: translation, distances, random groups."""

from __future__ import annotations

import math

import numpy as np
from hypothesis import assume, strategies as st

from tests.slow import group as slow
from tests.slow.enumerate import Enumeration
from thumbwright.exact.engine import Moment, Solution, Track
from thumbwright.exact.evidence.base import Evidence
from thumbwright.exact.evidence.listed import listed
from thumbwright.exact.group import MINUS, PLUS, UNDECIDED, Agent, Group, Thresholds
from thumbwright.exact.outcomes import outcome

NAMES = {PLUS: "plus", MINUS: "minus"}

COIN = ((0.6, 0.4), (0.4, 0.6))
UNSURE = (slow.Thresholds(-0.5, 1.0, 0.4), slow.Thresholds(-1.1, 0.6, 0.6))


def built(group: slow.Group) -> Group:
    """The same group in the engine's own terms."""
    agents = []
    for number, seen in enumerate(group.sees):
        evidence = listed(
            [plus for plus, _ in group.evidence[number]],
            [minus for _, minus in group.evidence[number]],
        )
        assert isinstance(evidence, Evidence)
        bars = tuple((t.share, Thresholds(t.minus, t.plus)) for t in group.thresholds[number])
        looks = None if group.looks is None else group.looks[number]
        agents.append(Agent(f"a{number}", evidence, bars, tuple(f"a{k}" for k in seen), looks))
    return Group(tuple(agents), group.prior, group.horizon, group.exchange)


def gap(first: float | None, second: float | None) -> float:
    """Absolute difference; none of two missing or equally infinite values."""
    if first is None or second is None:
        return 0.0 if first is second else math.inf
    return 0.0 if first == second else abs(first - second)


def outcomes_apart(model: Enumeration, solution: Solution) -> float:
    """Largest difference in any outcome of any agent."""
    worst = 0.0
    for agent, track in enumerate(solution.tracks):
        worst = max(worst, track_apart(model, agent, track))
    return worst


def track_apart(model: Enumeration, agent: int, track: Track) -> float:
    """Largest difference in any outcome of one agent."""
    worst = 0.0
    for got, expected in zip(
        outcome(track), (model.given_plus[agent], model.given_minus[agent]), strict=True
    ):
        for name in ("plus", "minus", "undecided", "mean_step_if_decided"):
            worst = max(worst, gap(getattr(got, name), getattr(expected, name)))
        worst = max(worst, gap(got.mean_steps, expected.mean_step))
    return worst


def histories(solution: Solution, agent: int, moment: Moment) -> dict[slow.Shown, tuple[int, ...]]:
    """Index of every seen history in the arrays of a moment."""
    seen = [solution.tracks[k].events for k in solution.group.sees[agent]]
    found = {}
    for index in np.ndindex(*moment.value.shape):
        shown: list[slow.Event | None] = []
        for events, entry in zip(seen, index, strict=True):
            state = events.state[entry]
            when = (events.step[entry], events.round[entry])
            shown.append(None if state == UNDECIDED else slow.Event(*when, NAMES[state]))
        found[tuple(shown)] = index
    return found


def worths_apart(model: Enumeration, solution: Solution) -> float:
    """Largest difference over all moments and all histories that can be met.

    Compared are the social value and the probabilities of the history (the agent made to show
    undecided), of being undecided there before the round and after it. A history that only one
    of the two knows is an infinite difference.
    """
    worst = 0.0
    for agent, track in enumerate(solution.tracks):
        moments = [(moment.step, moment.round) for moment in track.moments]
        if moments != model.tables.moments:
            return math.inf
        for moment in track.moments:
            place = histories(solution, agent, moment)
            known = {
                key[3]: worth
                for key, worth in model.worths.items()
                if key[:3] == (agent, moment.step, moment.round)
            }
            for shown, index in place.items():
                met = [
                    moment.log_shown[(g, *index)] + moment.log_before[(g, *index)] for g in (0, 1)
                ]
                if np.exp(met).any() and shown not in known:
                    return math.inf
            for shown, worth in known.items():
                if worth.reached_plus == worth.reached_minus == 0.0:
                    continue  # the agent has surely answered before
                if shown not in place:
                    return math.inf
                at = place[shown]
                pairs = [(float(moment.value[at]), worth.worth)]
                for side, w in enumerate(("plus", "minus")):
                    chance = float(np.exp(moment.log_shown[(side, *at)]))
                    before = chance * float(np.exp(moment.log_before[(side, *at)]))
                    after = chance * float(np.exp(moment.log_after[(side, *at)]))
                    pairs += [
                        (chance, getattr(worth, f"shown_{w}")),
                        (before, getattr(worth, f"reached_{w}")),
                        (after, getattr(worth, f"left_{w}")),
                    ]
                worst = max(worst, *(gap(a, b) for a, b in pairs))
    return worst


@st.composite
def evidence(draw: st.DrawFn, most: int) -> tuple[tuple[float, float], ...]:
    """Two or more values with small whole weights: ladders, lattices, now and then certainty."""
    size = draw(st.integers(2, most))
    lowest = draw(st.sampled_from([4, 4, 4, 1, 1, 0]))
    sides = []
    for _ in ("plus", "minus"):
        weights = draw(st.lists(st.integers(lowest, 9), min_size=size, max_size=size))
        assume(sum(weights) > 0)
        sides.append([weight / sum(weights) for weight in weights])
    return tuple(zip(*sides, strict=True))


@st.composite
def thresholds(
    draw: st.DrawFn, masses: tuple[tuple[float, float], ...], prior: float
) -> tuple[slow.Thresholds, ...]:
    """Anywhere, or counted from the prior in whole worths of the first value, to force ties."""
    up, down = masses[0]
    unit = abs(math.log(up / down)) if up > 0.0 < down else 0.0
    count = draw(st.sampled_from([1, 1, 2]))
    share = draw(st.sampled_from([0.25, 0.5])) if count == 2 else 1.0
    found = []
    for number in range(count):
        if unit > 0.01 and draw(st.booleans()):
            low, high = draw(st.integers(1, 3)) * unit, draw(st.integers(1, 3)) * unit
            pair = prior - low, prior + high
        else:
            pair = prior - draw(st.floats(0.2, 2.5)), prior + draw(st.floats(0.2, 2.5))
        found.append(slow.Thresholds(*pair, share if number == 0 else 1.0 - share))
    return tuple(found)


@st.composite
def groups(draw: st.DrawFn) -> slow.Group:
    """Any directed network of up to three agents, small enough to enumerate."""
    size = draw(st.sampled_from([3, 3, 2, 2, 1]))
    most = draw(st.sampled_from([2, 2, 3])) if size < 3 else 2
    longest = {1: 7, 2: 6 if most == 2 else 4, 3: 5}[size]
    horizon = draw(st.sampled_from([longest, longest - 1, longest - 2, 1]))
    prior_plus = draw(st.sampled_from([0.5, 0.5, 0.3, 0.6, 0.85]))
    prior = math.log(prior_plus / (1.0 - prior_plus))
    shared = draw(st.none() | evidence(most))
    sees, masses, bars = [], [], []
    for agent in range(size):
        sees.append(
            tuple(
                k for k in range(size) if k != agent and draw(st.sampled_from([True, True, False]))
            )
        )
        masses.append(shared if shared is not None else draw(evidence(most)))
        bars.append(draw(thresholds(masses[-1], prior)))
    return slow.Group(
        tuple(sees),
        tuple(masses),
        tuple(bars),
        horizon,
        draw(st.sampled_from(["once", "settle"])),
        prior_plus,
    )
