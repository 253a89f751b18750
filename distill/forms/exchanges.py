"""Valued boxes that lie one step from others: two boxes joined, or one box cut in two."""

from __future__ import annotations

from collections.abc import Callable, Iterator

from thumbwright.distill.forms.boxes import Box
from thumbwright.distill.forms.valued import Valued

WorthOf = Callable[[Box], float]
"""Best value of a box (nats)."""


def joined(one: Box, other: Box) -> Box | None:
    """The two boxes as one, where they differ on a single axis and touch there."""
    apart = [k for k, (a, b) in enumerate(zip(one, other, strict=True)) if a != b]
    if len(apart) != 1:
        return None
    (axis,) = apart
    first, second = sorted((one[axis], other[axis]))
    if first[1] != second[0]:
        return None
    return (*one[:axis], (first[0], second[1]), *one[axis + 1 :])


def merges(valued: Valued, worth_of: WorthOf) -> Iterator[Valued]:
    """Two boxes joined, with the value of either or the best common one."""
    boxes, values = valued.boxes, valued.values
    for first in range(len(boxes)):
        for second in range(first + 1, len(boxes)):
            union = joined(boxes[first], boxes[second])
            if union is None:
                continue
            kept = [k for k in range(len(boxes)) if k not in (first, second)]
            for value in dict.fromkeys((values[first], values[second], worth_of(union))):
                yield Valued(
                    (union, *(boxes[k] for k in kept)), (value, *(values[k] for k in kept))
                )


def cuts(boxes: tuple[Box, ...]) -> Iterator[tuple[int, Box, Box]]:
    """Every way of cutting a box in two: its number, and the parts."""
    for number, box in enumerate(boxes):
        for axis, (start, stop) in enumerate(box):
            for cut in range(start + 1, stop):
                below = (*box[:axis], (start, cut), *box[axis + 1 :])
                above = (*box[:axis], (cut, stop), *box[axis + 1 :])
                yield number, below, above


def cut_in_two(
    valued: Valued,
    number: int,
    parts: tuple[Box, Box],
    worth_of: WorthOf,
    tried: Callable[[Box, float], list[float]],
) -> Iterator[Valued]:
    """A box cut, both parts at their best values, or one of them as before and the other near.

    ``tried(box, value)`` is the values to try for a part besides the value of the whole.
    """
    value = valued.values[number]
    pairs = [(worth_of(parts[0]), worth_of(parts[1]))]
    pairs += [(near, value) for near in tried(parts[0], value)]
    pairs += [(value, near) for near in tried(parts[1], value)]
    boxes = (*valued.boxes[:number], *parts, *valued.boxes[number + 1 :])
    for pair in dict.fromkeys(pairs):
        yield Valued(boxes, (*valued.values[:number], *pair, *valued.values[number + 1 :]))
