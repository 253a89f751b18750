"""The exact worth of every public history of a crowd as one tidy table.

Members of a kind are alike, so one of them stands for all: the first, whose id the lines carry.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

import numpy as np

from thumbwright.exact.crowd_course import balanced
from thumbwright.exact.crowd_shown import Showing, Shown

if TYPE_CHECKING:
    import pandas as pd


def crowd_jumps(shown_to: Sequence[Shown]) -> pd.DataFrame:
    """One line per kind, step, round and public history in which a member may be undecided.

    Parameters
    ----------
    shown_to : sequence of Shown
        What a member of each kind may be shown.

    Returns
    -------
    pandas.DataFrame
        ``agent`` (the first member of the kind), ``step, round``; ``plus_shown`` and
        ``minus_shown``, how many others show which answer, and with several kinds the same of each,
        ``ID_kind_plus_shown`` and ``ID_kind_minus_shown``, ID being its first member;
        ``first_step`` and ``last_step`` of the others' answers, empty where there is none;
        ``worth`` and ``jump`` (nats); ``shown_plus``, ``shown_minus``: probability of the history,
        the member made to show undecided, or its weight where histories are sampled;
        ``still_plus``, ``still_minus``: probability that the member, shown that history, is still
        undecided when the round begins.
    """
    import pandas as pd

    frames = []
    for shown in shown_to:
        for part in shown.parts:
            before: Showing | None = None
            for showing in part:
                frames.append(_frame(shown, showing, before))
                before = showing
    return pd.concat(frames, ignore_index=True)


def _frame(shown: Shown, showing: Showing, before: Showing | None) -> pd.DataFrame:
    import pandas as pd

    here = np.flatnonzero(~np.isnan(showing.worth))
    worth = showing.worth[here]
    columns: dict[str, object] = {
        "agent": [shown.member.members[0]] * len(here),
        "step": np.full(len(here), showing.step),
        "round": np.full(len(here), showing.round),
    }
    counts = {"plus": showing.plus[:, here], "minus": showing.minus[:, here]}
    for name, count in counts.items():
        columns[f"{name}_shown"] = count.sum(axis=0)
    if len(shown.crowd.kinds) > 1:
        for number, kind in enumerate(shown.crowd.kinds):
            for name, count in counts.items():
                columns[f"{kind.members[0]}_kind_{name}_shown"] = count[number]
    for name, step in (("first_step", showing.first[here]), ("last_step", showing.last[here])):
        columns[name] = pd.array(step, dtype="Int64")
        columns[name][step == 0] = pd.NA  # type: ignore[index]
    old = np.zeros(len(here)) if before is None else before.worth[showing.parent[here]]
    columns["worth"], columns["jump"] = worth, worth - old
    weight = (
        np.exp(showing.log_shown[:, here])
        if shown.weight is None
        else balanced(worth) / shown.weight.shape[1]
    )
    for name, pair in (("shown", weight), ("still", np.exp(showing.log_still[:, here]))):
        for side, column in zip(("plus", "minus"), pair, strict=True):
            columns[f"{name}_{side}"] = column
    return pd.DataFrame(columns)
