"""Facts about silence and commitments that must come out of the model."""

from __future__ import annotations

import math

import pytest

from thumbwright.exact.engine import Moment, Solution, solve
from thumbwright.exact.evidence.binary import coin
from thumbwright.exact.group import PLUS, Agent, Group, Thresholds, same_thresholds

ALPHA = math.log(1.5)


def played(
    bars: list[tuple[float, float]],
    sees: list[tuple[int, ...]],
    horizon: int,
    exchange: str = "once",
    prior: float = 0.0,
) -> Solution:
    """Agents with the coin 0.6 and thresholds (minus, plus) in its steps on the belief."""
    agents = [
        Agent(
            f"a{number}",
            coin(0.6),
            same_thresholds(Thresholds(low * ALPHA, high * ALPHA)),
            tuple(f"a{k}" for k in seen),
        )
        for number, ((low, high), seen) in enumerate(zip(bars, sees, strict=True))
    ]
    return solve(Group(tuple(agents), prior, horizon, exchange))


def calls(solution: Solution, agent: int, seen: int) -> list[tuple[int, int, list[float]]]:
    """(state, step, worths in coin steps at all later moments) of each call of one seen agent."""
    events = solution.tracks[seen].events
    found = []
    for entry in range(1, len(events)):
        worths = [
            float(moment.value[entry]) / ALPHA
            for moment in solution.tracks[agent].moments
            if moment.value.shape[0] > entry and reached(moment, entry)
        ]
        found.append((events.state[entry], events.step[entry], worths))
    return found


def reached(moment: Moment, entry: int) -> bool:
    """Whether the agent can still be undecided having seen this."""
    return bool((moment.log_shown + moment.log_before)[:, entry].max() > -math.inf)


@pytest.mark.parametrize("exchange", ["once", "settle"])
@pytest.mark.parametrize("m", [1, 2, 3])
def test_even_thresholds_make_silence_worth_nothing(exchange: str, m: int) -> None:
    networks: list[list[tuple[int, ...]]] = [[(), (0,)], [(1,), (0,)]]
    for sees in networks:
        for track in played([(-m, m), (-3, 3)], sees, 12, exchange).tracks:
            for moment in track.moments:
                if moment.value.shape and reached(moment, 0):
                    assert float(moment.value[0]) == pytest.approx(0.0, abs=1e-12)


def test_even_thresholds_at_another_prior() -> None:
    """Counted on the evidence silence is worth nothing; on the belief it is not."""
    prior = math.log(0.35 / 0.65)
    shift = prior / ALPHA
    even = played([(shift - 2, shift + 2), (-9, 9)], [(), (0,)], 8, prior=prior)
    assert [float(m.value[0]) for m in even.tracks[1].moments] == pytest.approx(
        [0.0] * 8, abs=1e-12
    )
    belief = played([(-2, 2), (-9, 9)], [(), (0,)], 2, prior=prior)
    assert float(belief.tracks[1].moments[1].value[0]) == pytest.approx(0.405, abs=5e-4)


def test_after_a_call_the_silence_of_another_counts_against_it() -> None:
    solution = played([(-2, 2)] * 3, [(1, 2), (0, 2), (0, 1)], 6)
    events = solution.tracks[1].events
    first = next(e for e in range(1, len(events)) if events.state[e] == PLUS)
    assert events.step[first] == 2
    worths = [float(m.value[first, 0]) / ALPHA for m in solution.tracks[0].moments if m.step > 2]
    assert worths[0] == pytest.approx(2.0, abs=1e-12)  # the other has not had time to answer it
    assert all(value < 2.0 - 0.1 for value in worths[1:])


@pytest.mark.parametrize(("low", "high"), [(-2, 4), (-3, 2), (-1, 6)])
@pytest.mark.parametrize("exchange", ["once", "settle"])
def test_a_call_in_a_one_way_pair_is_worth_its_threshold(
    low: int, high: int, exchange: str
) -> None:
    found = calls(played([(low, high), (-7, 7)], [(), (0,)], 20, exchange), 1, 0)
    assert found
    for state, _, worths in found:
        expected = high if state == PLUS else low
        assert worths == pytest.approx([expected] * len(worths), abs=1e-10)


@pytest.mark.parametrize(("low", "high"), [(-2, 4), (-1, 3), (-2, 6), (-1, 2), (-2, 3), (-1, 4)])
def test_long_silence_in_a_one_way_pair(low: int, high: int) -> None:
    """It tends to the middle of the thresholds, or to and fro around it where they are odd."""
    moments = played([(low, high), (-30, 30)], [(), (0,)], 200).tracks[1].moments
    last, before = (float(m.value[0]) / ALPHA for m in moments[-1:-3:-1])
    middle = (low + high) / 2
    if (high - low) % 2 == 0:
        assert [last, before] == pytest.approx([middle] * 2, abs=1e-6)
    else:
        assert (last + before) / 2 == pytest.approx(middle, abs=1e-6)
        assert abs(last - before) > 0.1


def test_holding_the_observer_undecided_is_not_conditioning_on_it() -> None:
    track = played([(-2, 4), (-2, 3)], [(), (0,)], 7).tracks[1]
    moment = track.moments[6]
    assert float(moment.value[0]) == pytest.approx(0.3907, abs=5e-5)
    joint = (moment.log_shown + moment.log_before)[:, 0]
    going = 1.0 - track.answers[:, :, :7].sum(axis=(0, 2))
    wrong = float(joint[0] - joint[1]) - math.log(going[0] / going[1])
    assert wrong == pytest.approx(0.0605, abs=5e-5)


def test_a_mutual_pair_that_settles() -> None:
    solution = played([(-4, 8), (-4, 8)], [(1,), (0,)], 120, "settle")
    steps = set()
    for state, step, worths in calls(solution, 0, 1):
        if not worths:
            continue  # whoever sees it has surely answered
        steps.add((state, step))
        late = step >= (15 if state == PLUS else 7)
        expected = (7 if late else 8) if state == PLUS else (-5 if late else -4)
        assert worths == pytest.approx([expected] * len(worths), abs=1e-9), (state, step)
    assert {(PLUS, 8), (PLUS, 14), (PLUS, 15), (2, 4), (2, 7)} <= steps
    assert float(solution.tracks[0].moments[-1].value[0]) / ALPHA == pytest.approx(1.0, abs=1e-3)
