"""Records followed, against the beliefs of the enumeration: every history there can be, and not."""

from __future__ import annotations

import math
from collections import defaultdict
from collections.abc import Iterator
from functools import cache
from itertools import product

import pytest

from tests.exact.comparing import COIN, built
from tests.slow import group as slow
from tests.slow.enumerate import Enumeration, enumerate_group
from thumbwright.distill.record_reading import Line, Record
from thumbwright.distill.replay import WATCH, Step, follow
from thumbwright.distill.rules import SHOWN, Row, Rule
from thumbwright.distill.signs import Sign
from thumbwright.exact.engine import Solution, solve

ALPHA = math.log(1.5)
NOTHING = Sign("nothing", 0.0, None)
"""An observation that says nothing, so that the belief is prior and worth alone."""


def bars(low: float, high: float) -> tuple[slow.Thresholds, ...]:
    return (slow.Thresholds(low * ALPHA, high * ALPHA),)


GROUPS = {
    "frost watch": slow.Group(((), (0,)), (COIN,) * 2, (bars(-2, 4), bars(-3, 3)), 8),
    "two that see each other": slow.Group(
        ((1,), (0,)), (COIN,) * 2, (bars(-2, 3), bars(-3, 2)), 6, "settle", 0.4
    ),
    "two seen at once": slow.Group(
        ((), (0, 2), (0,)), (COIN,) * 3, (bars(-1, 2), bars(-4, 4), bars(-2, 2)), 4
    ),
    "in rounds": slow.Group(
        ((), (0, 2), (0,)), (COIN,) * 3, (bars(-1, 2), bars(-4, 4), bars(-2, 2)), 4, "settle"
    ),
    "through another": slow.Group(
        ((), (2,), (0,)), (COIN,) * 3, (bars(-1, 2), bars(-4, 4), bars(-2, 2)), 5, "settle"
    ),
    # An answer that follows another's overshoots its threshold, so rounds differ in worth.
    "beyond the threshold": slow.Group(
        ((), (2,), (0,)), (COIN,) * 3, (bars(-2, 3), bars(-9, 9), bars(-3, 3)), 5, "settle"
    ),
    "quick to answer": slow.Group(
        ((), (0, 2), (0,)), (COIN,) * 3, (bars(-1, 3), bars(-2, 2), bars(-1, 1)), 4, "settle"
    ),
}
OF = {name: 0 if name == "two that see each other" else 1 for name in GROUPS}


@cache
def prepared(name: str) -> tuple[slow.Group, Enumeration, Solution]:
    group = GROUPS[name]
    return group, enumerate_group(group), solve(built(group))


def shown_by(group: slow.Group, model: Enumeration, step: int, known: bool) -> Iterator[slow.Shown]:
    """Everything the seen agents could be said to have shown by the end of a step.

    Where rounds are not ``known``, an answer stands for all rounds of its step, as round -1.
    """
    agent_sees = group.sees[OF_GROUP[id(group)]]
    last = step if group.exchange == "settle" else step - 1
    one: list[slow.Event | None] = [None]
    # Under "once" a record can say that somebody had answered before the first step.
    for when in range(int(last == step), last + 1):
        rounds = range(model.rounds[when - 1] + 1) if when and known else [0 if known else -1]
        one += [
            slow.Event(when, round_, answer) for round_ in rounds for answer in ("plus", "minus")
        ]
    yield from product(one, repeat=len(agent_sees))


OF_GROUP = {id(group): OF[name] for name, group in GROUPS.items()}


def followed(
    group: slow.Group, solution: Solution, agent: int, shown: slow.Shown, until: int
) -> tuple[Step, ...]:
    """The steps of a record in which the seen agents show this."""
    late = 0 if group.exchange == "settle" else 1
    lines = []
    for step in range(1, until + 1):
        seen = [None if e is None or e.step + late > step else e for e in shown]
        lines.append(
            Line(
                step,
                NOTHING,
                tuple(0 if e is None else SHOWN.index(e.answer) for e in seen),
                tuple(None if e is None or e.round < 0 else e.round for e in seen),
            )
        )
    rule = Rule("none", f"a{agent}", solution.group.agents[agent].sees, (Row(value=0.0),))
    return follow(solution, f"a{agent}", rule, {}, Record(tuple(lines), {}))


def chances(
    model: Enumeration, agent: int, step: int, known: bool
) -> dict[slow.Shown, tuple[float, float]]:
    """Probabilities of all histories at the last round of a step, rounds lumped if not known."""
    found: dict[slow.Shown, list[float]] = defaultdict(lambda: [0.0, 0.0])
    for (who, when, round_, seen), worth in model.worths.items():
        if (who, when, round_) != (agent, step, model.rounds[step - 1] - 1):
            continue
        key = seen if known else tuple(e and e._replace(round=-1) for e in seen)
        found[key][0] += worth.shown_plus
        found[key][1] += worth.shown_minus
    return {key: (plus, minus) for key, (plus, minus) in found.items()}


@pytest.mark.slow
@pytest.mark.parametrize("known", [True, False], ids=["rounds known", "rounds not known"])
@pytest.mark.parametrize("name", GROUPS)
def test_every_belief_is_that_of_the_enumeration(name: str, known: bool) -> None:
    group, model, solution = prepared(name)
    agent = OF[name]
    compared = impossible = 0
    for step in range(1, group.horizon + 1):
        expected = chances(model, agent, step, known)
        for shown in shown_by(group, model, step, known):
            steps = followed(group, solution, agent, shown, step)
            plus, minus = expected.get(shown, (0.0, 0.0))
            before = [one for one in steps[:-1] if one.exact.does != WATCH]
            if before:
                # It had answered, or had lost its belief, on what was shown before.
                continue
            exact = steps[-1].exact
            if plus == minus == 0.0:
                assert steps[-1].impossible or exact.does in ("plus", "minus"), shown
                impossible += steps[-1].impossible is not None
            elif exact.does == WATCH or group.exchange == "once":
                assert steps[-1].impossible is None, shown
                assert exact.worth == pytest.approx(math.log(plus / minus), abs=1e-10), shown
                assert exact.belief == pytest.approx(group.prior + exact.worth, abs=1e-10)
                compared += 1
    assert compared >= 8
    # One seen agent that may answer both ways at every step leaves nothing impossible.
    assert impossible > 5 or (group.sees[1] == (2,) and not known)


def ending(
    group: slow.Group, model: Enumeration, agent: int, shown: slow.Shown
) -> tuple[int, str] | None:
    """Step and answer, or step at which the belief is lost, of an agent that observes nothing."""
    (bar,) = group.thresholds[agent]
    for step in range(1, group.horizon + 1):
        last = model.rounds[step - 1] - 1
        looks = [(round_, (step, round_)) for round_ in range(last + 1)]
        if group.exchange == "settle":
            # When a step ends, the record tells of all its rounds, even of one too many.
            looks = [*looks[: max(last, 1)], (last, (step, 99))]
        for round_, by in looks:
            seen = tuple(e if e and e.moment < by else None for e in shown)
            worth = model.worths.get((agent, step, round_, seen))
            if worth is None or worth.shown_plus == worth.shown_minus == 0.0:
                return step, "lost"
            belief = group.prior + worth.worth
            if belief >= bar.plus - 1e-9:
                return step, "plus"
            if belief <= bar.minus + 1e-9:
                return step, "minus"
    return None


@pytest.mark.slow
@pytest.mark.parametrize("name", GROUPS)
def test_the_exact_agent_does_what_the_enumeration_says(name: str) -> None:
    group, model, solution = prepared(name)
    agent = OF[name]
    endings: dict[str | None, int] = defaultdict(int)
    for shown in shown_by(group, model, group.horizon, known=True):
        if any(event is not None and event.step == 0 for event in shown):
            continue
        expected = ending(group, model, agent, shown)
        found = None
        for one in followed(group, solution, agent, shown, group.horizon):
            said = "lost" if one.impossible else one.exact.does
            if said in ("plus", "minus", "lost"):
                found = one.step, said
                break
        assert found == expected, shown
        endings[expected and expected[1]] += 1
    assert endings["lost"] > 5
    assert sum(endings.values()) > endings["lost"]


@pytest.mark.slow
@pytest.mark.parametrize("name", GROUPS)
def test_what_is_impossible_at_one_step_stays_so(name: str) -> None:
    group, model, solution = prepared(name)
    agent = OF[name]
    for shown in shown_by(group, model, group.horizon, known=False):
        steps = followed(group, solution, agent, shown, group.horizon)
        named = [number for number, one in enumerate(steps) if one.impossible]
        assert len(named) <= 1
        if named:
            assert all(one.exact.belief is None for one in steps[named[0] :])
