"""The crowd engine: groups in which everybody sees everybody, of up to a thousand and more.

Small crowds are enumerated: all count histories, with multinomial weights, exact but for what is
dropped on request. Large crowds are sampled: public histories drawn with a seed, the beliefs along
each of them exact, figures with standard errors. See ``crowd_play`` for the mathematics and for
when a settle step ends, ``crowd_figures`` for the estimates.
"""

from __future__ import annotations

import math

import numpy as np

from thumbwright.exact.crowd_adopt import CrowdAdoption, adopt_crowd, exact_member
from thumbwright.exact.crowd_course import (
    MOST,
    Enumerated,
    Sampled,
    TooMany,
    balanced,
    blocks,
    half_of,
    play,
)
from thumbwright.exact.crowd_figures import (
    CrowdPlay,
    KindPlay,
    Mean,
    Weights,
    kind_play,
    whole_crowd,
)
from thumbwright.exact.crowd_held import (
    CrowdSituations,
    enumerate_situations,
    sample_situations,
)
from thumbwright.exact.crowd_kinds import Crowd, Kind, check_play, kinds_of
from thumbwright.exact.crowd_play import Histories
from thumbwright.exact.crowd_policy import CrowdPolicy, InPublic
from thumbwright.exact.crowd_record import Record
from thumbwright.exact.crowd_shown import Showing, Shown, enumerate_shown, sample_shown

__all__ = [
    "Crowd",
    "CrowdAdoption",
    "CrowdPlay",
    "CrowdPolicy",
    "CrowdSituations",
    "InPublic",
    "Kind",
    "KindPlay",
    "Mean",
    "Showing",
    "Shown",
    "TooMany",
    "Weights",
    "adopt_crowd",
    "enumerate_crowd",
    "enumerate_shown",
    "enumerate_situations",
    "exact_member",
    "kinds_of",
    "sample_crowd",
    "sample_shown",
    "sample_situations",
]


def enumerate_crowd(
    crowd: Crowd,
    prior: float,
    horizon: int,
    exchange: str,
    drop: float = 0.0,
    most: int = MOST,
) -> CrowdPlay:
    """Play a crowd through all its count histories.

    Parameters
    ----------
    crowd : Crowd
    prior : float
        Log-odds of plus (nats).
    horizon : int
        Number of steps.
    exchange : {"once", "settle"}
    drop : float
        Histories whose probability is below this under both answers are dropped.
    most : int
        Histories that may be held.

    Returns
    -------
    CrowdPlay
        Exact up to floating point but for what was dropped.

    Raises
    ------
    ModelError
        Where more histories would be held, or an argument is not allowed.
    """
    check_play(crowd, prior, horizon, exchange)
    course = Enumerated(crowd.size, drop, most)
    histories = Histories(crowd, prior, horizon, np.zeros(1, dtype=np.int64))
    record = play(histories, course, horizon, exchange == "settle")
    weights = Weights(np.exp(record.log_weight), None)
    dropped = float(course.dropped[0]), float(course.dropped[1])
    return _figures(crowd, prior, horizon, record, weights, dropped, sampled=False)


def sample_crowd(
    crowd: Crowd, prior: float, horizon: int, exchange: str, histories: int, seed: int
) -> CrowdPlay:
    """Play a crowd through sampled public histories, half of them given each answer.

    Parameters
    ----------
    crowd, prior, horizon, exchange
        As for :func:`enumerate_crowd`.
    histories : int
        How many, an even number of at least 4.
    seed : int
        The same seed gives the same figures.

    Raises
    ------
    ModelError
        Where an argument is not allowed.
    """
    check_play(crowd, prior, horizon, exchange)
    half = half_of(histories)
    course, records = Sampled(np.random.default_rng(seed), half), []
    for labels in blocks(histories):
        batch = Histories(crowd, prior, horizon, labels)
        records.append(play(batch, course, horizon, exchange == "settle"))
    record = Record.join(records)
    weights = Weights(balanced(record.ratio), record.label < half)
    return _figures(crowd, prior, horizon, record, weights, (0.0, 0.0), sampled=True)


def _figures(
    crowd: Crowd,
    prior: float,
    horizon: int,
    record: Record,
    weights: Weights,
    dropped: tuple[float, float],
    sampled: bool,
) -> CrowdPlay:
    prior_plus = 1.0 / (1.0 + math.exp(-prior))
    shares = np.array([prior_plus, 1.0 - prior_plus])
    value, error, (first, last, followers) = whole_crowd(record, weights, crowd.size, horizon)
    return CrowdPlay(
        crowd=crowd,
        kinds=tuple(
            kind_play(record, weights, k, kind.size, horizon) for k, kind in enumerate(crowd.kinds)
        ),
        together=value,
        errors=error,
        first=first,
        last=last,
        followers=followers,
        near_tie_mass=float(shares @ weights.mean(record.near)[0]),
        dropped=dropped,
        dropped_mass=float(shares @ dropped),
        histories=len(record.label),
        sampled=sampled,
    )
