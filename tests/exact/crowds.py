"""What the tests of crowds share: crowds, distances to a network's solution, lumped situations."""

from __future__ import annotations

import math
from collections import Counter, defaultdict
from typing import Any

import numpy as np

from tests.exact.comparing import gap
from thumbwright.exact.arrays import FloatArray
from thumbwright.exact.crowd import (
    Crowd,
    CrowdPlay,
    CrowdSituations,
    Kind,
)
from thumbwright.exact.engine import Solution
from thumbwright.exact.evidence.base import Evidence
from thumbwright.exact.evidence.binary import bernoulli, coin
from thumbwright.exact.evidence.listed import listed
from thumbwright.exact.group import (
    MINUS,
    PLUS,
    Agent,
    Group,
    Thresholds,
    same_thresholds,
)
from thumbwright.exact.outcomes import outcomes
from thumbwright.exact.together import together

ALPHA = math.log(1.5)
OUTCOME = ("plus", "minus", "undecided", "mean_step_if_decided", "mean_steps")
TOGETHER = (
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
Bars = tuple[tuple[float, Thresholds], ...]

CERTAIN = listed([0.5, 0.2, 0.3], [0.4, 0.6, 0.0])
BIASED = bernoulli(0.3, 0.1)
assert isinstance(CERTAIN, Evidence)
UNKNOWN: Bars = ((0.3, Thresholds(-1.0, 0.7)), (0.7, Thresholds(-0.6, 1.3)))


def bars(low: float, high: float) -> Bars:
    """Thresholds in signs of the coin 0.6."""
    return same_thresholds(Thresholds(low * ALPHA, high * ALPHA))


def kind(size: int, levels: Bars, seen: Evidence | None = None, **more: Any) -> Kind:
    """Members whose ids tell kinds apart."""
    name = f"{levels[0][1].minus:.3f}{levels[0][1].plus:.3f}"
    members = tuple(f"{name}-{k}" for k in range(size))
    return Kind(seen or coin(0.6), levels, members, **more)


def even(size: int, low: float = -2, high: float = 2) -> Crowd:
    return Crowd((kind(size, bars(low, high)),))


def network(crowd: Crowd, prior: float, horizon: int, exchange: str) -> Group:
    """The same crowd as a network."""
    ids = [member for one in crowd.kinds for member in one.members]
    agents = [
        Agent(m, one.evidence, one.thresholds, tuple(i for i in ids if i != m), one.looks)
        for one in crowd.kinds
        for m in one.members
    ]
    return Group(tuple(agents), prior, horizon, exchange)


def play_apart(play: CrowdPlay, solution: Solution) -> float:
    """Largest difference in any outcome of any agent, in leanings and in what all do."""
    worst = abs(play.near_tie_mass - solution.near_tie_mass)
    ends = dict(zip(solution.group.index, outcomes(solution), strict=True))
    for one, found in zip(play.crowd.kinds, play.kinds, strict=True):
        for member in one.members:
            track = solution.tracks[solution.group.index[member]]
            worst = max(worst, float(np.abs(found.leaning - track.leaning).max()))
            for got, expected in zip(found.given, ends[member], strict=True):
                worst = max(worst, *(gap(getattr(got, n), getattr(expected, n)) for n in OUTCOME))
    return max(worst, together_apart(play, together(solution)))


def together_apart(play: CrowdPlay, expected: Any) -> float:
    return max(
        float(np.abs(getattr(play.together, n) - getattr(expected, n)).max()) for n in TOGETHER
    )


Lumps = dict[tuple[int, ...], FloatArray]


def lumps_of_crowd(found: CrowdSituations) -> Lumps:
    """Sums over the situations of one step, round and set of counts."""
    lumps: Lumps = defaultdict(lambda: np.zeros(8))
    keys = np.column_stack([found.step, found.round, found.plus, found.minus])
    for number, key in enumerate(keys):
        shown, still = found.shown[:, number], found.still[:, number]
        lumps[tuple(int(k) for k in key)] += _figures(shown, still, found.worth[number])
    return lumps


def lumps_of_network(solution: Solution, member: str, crowd: Crowd) -> Lumps:
    lumps: Lumps = defaultdict(lambda: np.zeros(8))
    group = solution.group
    track = solution.tracks[group.index[member]]
    sees = track.agent.sees
    which = [next(k for k, one in enumerate(crowd.kinds) if other in one.members) for other in sees]
    events = [solution.tracks[group.index[other]].events for other in sees]
    for moment in track.moments:
        for at in np.ndindex(*moment.value.shape):
            met = moment.log_shown[(slice(None), *at)] + moment.log_before[(slice(None), *at)]
            if not np.isfinite(met).any():
                continue
            shows = Counter((k, e.state[i]) for k, e, i in zip(which, events, at, strict=True))
            counts = [shows[k, s] for s in (PLUS, MINUS) for k in range(len(crowd.kinds))]
            shown = np.exp(moment.log_shown[(slice(None), *at)])
            still = np.exp(moment.log_before[(slice(None), *at)])
            value = float(moment.value[at])
            lumps[(moment.step, moment.round, *counts)] += _figures(shown, still, value)
    return lumps


def _figures(shown: FloatArray, still: FloatArray, worth: float) -> FloatArray:
    chance = shown * still
    worth = float(np.clip(worth, -1e3, 1e3))  # certain evidence
    return np.concatenate([shown, chance, chance * worth, chance * worth**2])


def lumps_apart(one: Lumps, other: Lumps) -> float:
    if one.keys() != other.keys():
        return math.inf
    return max(float(np.abs(one[key] - other[key]).max()) for key in one)
