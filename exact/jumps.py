"""The exact worth of every seen history as one tidy table.

The worth of a history is the log ratio of its probabilities with the agent held to showing
undecided: a level, to be added to prior and own tally. The jump is its change at the newest round.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from thumbwright.exact.arrays import FloatArray, IntArray
from thumbwright.exact.engine import Moment, Solution, Track

if TYPE_CHECKING:
    import pandas as pd

STATES = ("undecided", "plus", "minus")


def jumps(solution: Solution) -> pd.DataFrame:
    """One line per agent, step, round and history that is possible under either answer.

    Returns
    -------
    pandas.DataFrame
        ``agent, step, round``; for every agent that anybody sees ``ID_shows`` (undecided, plus,
        minus; empty where the agent of the line does not see it), ``ID_step`` and ``ID_round`` of
        its commitment; ``worth`` and ``jump`` (nats); ``shown_plus``, ``shown_minus``: probability
        of the history, the agent made to show undecided; ``still_plus``, ``still_minus``:
        probability that the agent, shown that history, is still undecided when the round begins.
    """
    import pandas as pd

    group = solution.group
    seen_ids = [a.id for a in group.agents if any(a.id in other.sees for other in group.agents)]
    frames = [frame for track in solution.tracks for frame in _frames(solution, track, seen_ids)]
    table = pd.concat(frames, ignore_index=True)
    for other in seen_ids:
        table[f"{other}_shows"] = table[f"{other}_shows"].astype("category")
        table[f"{other}_shows"] = table[f"{other}_shows"].cat.set_categories(list(STATES))
        for column in (f"{other}_step", f"{other}_round"):
            table[column] = table[column].astype("Int64")
    return table


def jump(moment: Moment, before: Moment | None) -> FloatArray:
    """Change of the worth of every history since the round before, same shape as the worth."""
    if before is None:
        return moment.value.copy()
    shapes = zip(moment.value.shape, before.value.shape, strict=True)
    where = np.ix_(*(_prefix(now, then) for now, then in shapes))
    with np.errstate(invalid="ignore"):
        change: FloatArray = moment.value - (before.value[where] if where else before.value)
    return change


def _prefix(now: int, before: int) -> IntArray:
    """Index of every history now among those before: what is new was undecided then."""
    index = np.arange(now)
    index[before:] = 0
    return index


def _frames(solution: Solution, track: Track, seen_ids: list[str]) -> list[pd.DataFrame]:
    import pandas as pd

    group, agent = solution.group, track.agent
    frames, before = [], None
    for moment in track.moments:
        possible = np.isfinite(moment.log_shown).any(axis=0)
        where = np.nonzero(possible) if agent.sees else ()
        rows = len(where[0]) if where else 1
        columns: dict[str, object] = {
            "agent": [agent.id] * rows,
            "step": np.full(rows, moment.step),
            "round": np.full(rows, moment.round),
        }
        for other in seen_ids:
            if other in agent.sees:
                events = solution.tracks[group.index[other]].events
                picked = where[agent.sees.index(other)]
                state = np.array(events.state)[picked]
                columns[f"{other}_shows"] = np.array(STATES, dtype=object)[state]
                for name, numbers in (("step", events.step), ("round", events.round)):
                    column = np.array(numbers, dtype=object)[picked]
                    column[state == 0] = pd.NA
                    columns[f"{other}_{name}"] = column
            else:
                for name in ("shows", "step", "round"):
                    columns[f"{other}_{name}"] = np.full(rows, pd.NA, dtype=object)
        columns["worth"] = moment.value[where].ravel()
        columns["jump"] = jump(moment, before)[where].ravel()
        for name, array in (("shown", moment.log_shown), ("still", moment.log_before)):
            for given, side in enumerate(("plus", "minus")):
                columns[f"{name}_{side}"] = np.exp(array[given][where]).ravel()
        frames.append(pd.DataFrame(columns))
        before = moment
    return frames
