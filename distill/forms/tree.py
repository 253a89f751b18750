"""The form "tree": rows grown by one cut at a time, each where it saves the most log loss.

Scikit-learn's decision tree, grown best first on the weighted situations with the inputs as
ordered cells. A leaf is a box of the grid, so a tree is a table of rows, valued like one at the
log ratio of their pooled masses. It looks no cut ahead and so keeps at most what the most
informative table of as many rows keeps, but it needs no grid and serves where that search takes
too long.
"""

from __future__ import annotations

import numpy as np

from thumbwright.distill.costs import Pricer
from thumbwright.distill.forms import Distilled, Wanted
from thumbwright.distill.forms.axes import Axis, grid_axes
from thumbwright.distill.forms.boxes import Box, Partition, gain
from thumbwright.distill.forms.choosing import (
    box_masses,
    chosen,
    of_every_size,
    valued_row,
)
from thumbwright.distill.forms.grouping import best_groupings
from thumbwright.distill.rules import Rule
from thumbwright.distill.situations import values_of
from thumbwright.exact.arrays import FloatArray, IntArray
from thumbwright.exact.engine import Progress

NAME = "tree"


def distil(pricer: Pricer, wanted: Wanted, progress: Progress | None = None) -> Distilled:
    """The tree of at most ``wanted.rows`` leaves."""
    axes = grid_axes(pricer, wanted.inputs)
    several = wanted.limited or wanted.every_size
    sizes = range(1, wanted.rows + 1) if several else [wanted.rows]
    partitions = []
    for done, leaves in enumerate(sizes):
        if progress:
            progress(NAME, done, len(sizes))
        partitions.append(_partition(pricer, axes, leaves))
    picked, notes = chosen(pricer, wanted, partitions, lambda p: as_rule(pricer, axes, p), NAME)
    situations = pricer.situations
    ceiling = best_groupings(situations.plus, situations.minus, len(picked.boxes))
    if progress:
        progress(NAME, len(sizes), len(sizes))
    return Distilled(
        as_rule(pricer, axes, picked),
        situations.information_kept(picked.gain),
        situations.information_kept(float(ceiling[-1])),
        notes,
        tuple(
            (as_rule(pricer, axes, one), situations.information_kept(one.gain))
            for one in (of_every_size(partitions) if wanted.every_size else ())
        ),
    )


def grown(
    where: IntArray, plus: FloatArray, minus: FloatArray, cells: tuple[int, ...], leaves: int
) -> tuple[Box, ...]:
    """The leaves of a tree grown best first, lower side before upper side of every cut.

    Parameters
    ----------
    where : ndarray of int, shape (R, D)
        Cell of each entry on each input.
    plus, minus : ndarray of float, shape (R,)
        Masses.
    cells : tuple of int, length D
        Number of cells on each input.
    leaves : int
        At most so many; at least 1.

    Returns
    -------
    tuple of Box
    """
    whole = tuple((0, n) for n in cells)
    if leaves == 1:
        return (whole,)
    from sklearn.tree import DecisionTreeClassifier

    # Entries of one cell are put together, so that how finely they are listed changes nothing.
    cell, entry = np.unique(where, axis=0, return_inverse=True)
    weights = [np.bincount(entry.ravel(), side, len(cell)) for side in (plus, minus)]
    tree = DecisionTreeClassifier(criterion="log_loss", max_leaf_nodes=leaves, random_state=0)
    answers = np.repeat([1, 0], len(cell))
    tree.fit(np.concatenate([cell, cell]), answers, sample_weight=np.concatenate(weights))
    nodes = tree.tree_

    def boxes(node: int, box: Box) -> tuple[Box, ...]:
        lower, upper = int(nodes.children_left[node]), int(nodes.children_right[node])
        if lower < 0:
            return (box,)
        axis, cut = int(nodes.feature[node]), int(np.floor(nodes.threshold[node])) + 1
        start, stop = box[axis]
        below = (*box[:axis], (start, cut), *box[axis + 1 :])
        above = (*box[:axis], (cut, stop), *box[axis + 1 :])
        return boxes(lower, below) + boxes(upper, above)

    return boxes(0, whole)


def _partition(pricer: Pricer, axes: list[Axis], leaves: int) -> Partition:
    situations = pricer.situations
    where = np.stack([axis.where for axis in axes], axis=1)
    cells = tuple(axis.cells for axis in axes)
    boxes = grown(where, situations.plus, situations.minus, cells, leaves)
    return Partition(boxes, float(gain(*box_masses(pricer, axes, boxes)).sum()))


def as_rule(pricer: Pricer, axes: list[Axis], partition: Partition) -> Rule:
    """The leaves as rows with their best values, in the order of the tree."""
    values = values_of(*box_masses(pricer, axes, partition.boxes))
    rows = [
        valued_row(axes, box, float(value))
        for box, value in zip(partition.boxes, values, strict=True)
    ]
    return Rule(NAME, pricer.agent, pricer.seen, tuple(rows))
