"""Every number a rule may read, against a literal reading of one history at a time."""

from __future__ import annotations

import itertools

import numpy as np
import pytest

from thumbwright.distill.rules import FIRST_ANSWERS, NUMBERS, SHOWN, Row, Rule
from thumbwright.distill.views import NO_ROW, Named, holds, rows_in

AGENTS = ("a", "b", "c")
EVENTS = [(0, 0, 0), *itertools.product((1, 2), (1, 2, 4), (0, 2))]
"""State, step and round: undecided, or an answer at one of six moments."""


def broadcast_view(step: int = 5) -> Named:
    """All joint histories of three agents, one axis each."""
    columns = np.array(EVENTS).T
    turned = [
        {a: c.reshape([-1 if k == i else 1 for k in range(3)]) for i, a in enumerate(AGENTS)}
        for c in columns
    ]
    return Named(np.array(step), *turned)


def literal(name: str, history: tuple[tuple[int, int, int], ...], step: int) -> int:
    """A number read off one history as its definition says."""
    answers = [event for event in history if event[0]]
    if name.endswith("_shown"):
        wanted = SHOWN.index(name.removesuffix("_shown"))
        return sum(event[0] == wanted for event in history)
    if not answers:
        return 0
    if name == "came_first":
        first = min(event[1:] for event in answers)
        return sum(event[1:] == first for event in answers)
    steps = [event[1] for event in answers]
    return step - (min(steps) if name == "steps_since_first" else max(steps)) + 1


@pytest.mark.parametrize("name", NUMBERS)
def test_each_number_is_what_it_is_called(name: str) -> None:
    found = np.broadcast_to(broadcast_view().number(name), (len(EVENTS),) * 3)
    for cell in itertools.product(range(len(EVENTS)), repeat=3):
        assert found[cell] == literal(name, tuple(EVENTS[k] for k in cell), 5), (name, cell)


def test_the_first_answer_is_that_of_the_earliest_moment() -> None:
    found = np.broadcast_to(broadcast_view().first_answer(), (len(EVENTS),) * 3)
    for cell in itertools.product(range(len(EVENTS)), repeat=3):
        answers = [EVENTS[k] for k in cell if EVENTS[k][0]]
        first = min((event[1:] for event in answers), default=None)
        said = {SHOWN[event[0]] for event in answers if event[1:] == first}
        name = "nobody" if not said else "both" if len(said) == 2 else said.pop()
        assert FIRST_ANSWERS[found[cell]] == name, cell


def test_nobody_to_see_is_nobody_who_answered() -> None:
    view = Named(np.array([1, 2, 3]), {}, {}, {})
    assert all(int(np.max(view.number(name))) == 0 for name in NUMBERS)
    assert FIRST_ANSWERS[int(view.first_answer())] == "nobody"


def test_rows_are_met_as_they_are_written() -> None:
    rule = Rule(
        "by hand",
        "me",
        AGENTS,
        (
            Row(step_to=4),
            Row(step_from=5, ranges={"plus_shown": (None, 1)}, shows={"a": frozenset({"minus"})}),
            Row(step_from=5, ranges={"plus_shown": (2, 2), "minus_shown": (0, 0)}),
            Row(step_from=5, first_answer=frozenset({"plus"}), ranges={"plus_shown": (2, None)}),
        ),
    )
    row, count = rows_in(rule, broadcast_view())
    for cell in itertools.product(range(len(EVENTS)), repeat=3):
        history = tuple(EVENTS[k] for k in cell)
        plus, minus = (sum(e[0] == code for e in history) for code in (1, 2))
        answers = [e for e in history if e[0]]
        first = min((e[1:] for e in answers), default=None)
        held = [
            False,
            plus <= 1 and history[0][0] == 2,
            plus == 2 and minus == 0,
            plus >= 2 and {e[0] for e in answers if e[1:] == first} == {1},
        ]
        assert count[cell] == sum(held), history
        assert row[cell] == (held.index(True) if any(held) else NO_ROW), history


def test_thresholds_narrow_only_where_their_names_are_known() -> None:
    row = Row(thresholds={"a": frozenset({"quick"})})
    told = {"a": np.array([0])}
    assert holds(row, Named(np.array([1]), told, told, told)).all()
    assert holds(row, Named(np.array([1]), told, told, told, {"a": "quick"})).all()
    assert not holds(row, Named(np.array([1]), told, told, told, {"a": "slow"})).any()
