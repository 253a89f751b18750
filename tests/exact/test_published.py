"""Published values: every entry of the reference file that the engine can be asked for.

Each test names the entries it meets; the file says where each value comes from and how far it is
confirmed. The last test makes sure that no entry is forgotten.
"""

from __future__ import annotations

import json
import math
import re
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from thumbwright.exact.alone import Alone, alone
from thumbwright.exact.engine import solve
from thumbwright.exact.evidence.base import Evidence
from thumbwright.exact.evidence.binary import bernoulli, calibration, coin
from thumbwright.exact.evidence.listed import listed
from thumbwright.exact.group import MINUS, PLUS, Agent, Group, Thresholds, same_thresholds
from thumbwright.exact.jointly import displays, elimination, total
from thumbwright.exact.stopping import Losses, best_alone
from thumbwright.exact.thresholds import from_error_rates
from thumbwright.exact.together import together

FILE = Path(__file__).parents[1] / "reference" / "published.json"
ENTRIES: dict[str, dict[str, Any]] = {e["id"]: e for e in json.loads(FILE.read_text())}

NOT_ASKED: dict[str, str] = {}
"""Entries outside the model, each with the reason."""

FAIR = 0.5 + 1e-7
"""A fair coin carries no evidence, so no belief moves; this one is fair to seven digits."""


def value(name: str) -> Any:
    """The value of an entry."""
    return ENTRIES[name]["value"]


def steps_apart(p: float, minus: int, plus: int, **more: Any) -> Alone:
    """One agent with coin evidence and thresholds in whole signs, prior even."""
    evidence = coin(p)
    worth = float(evidence.alpha[0])
    return alone(evidence, Thresholds(minus * worth, plus * worth), 0.0, **more)


# --- sequential sampling plan, 1 % against 10 % ------------------------------------------------


@pytest.fixture
def plan() -> tuple[Evidence, Thresholds]:
    """Plus is the bad lot: rejecting a good one is tolerated at 5 %, passing a bad one at 10 %."""
    return bernoulli(0.10, 0.01), from_error_rates(0.05, 0.10, 0.0)


def test_sampling_plan_lines(plan: tuple[Evidence, Thresholds]) -> None:
    """Meets nist-k and nist-lines."""
    evidence, bars = plan
    worth = float(evidence.alpha[0])
    assert worth == pytest.approx(value("nist-k"), rel=1e-10)
    lines = [-bars.minus / worth, bars.plus / worth, -evidence.beta / worth]
    # The entry's second number is off in its tenth digit: ln(18)/ln(11) is 1.20537864630.
    assert lines == pytest.approx(value("nist-lines"), rel=1e-9)
    assert lines[1] == pytest.approx(math.log(18.0) / math.log(11.0), rel=1e-13)


def acceptance_and_rejection(
    plan: tuple[Evidence, Thresholds], items: int
) -> tuple[int | None, int | None]:
    """Most defectives that accept after so many items, and fewest that reject."""
    evidence, bars = plan
    tally = [float(evidence.alpha[0]) * x + evidence.beta * items for x in range(items + 1)]
    accept = [x for x, belief in enumerate(tally) if belief <= bars.minus]
    reject = [x for x, belief in enumerate(tally) if belief >= bars.plus]
    return max(accept, default=None), min(reject, default=None)


def test_sampling_plan_numbers(plan: tuple[Evidence, Thresholds]) -> None:
    """Meets nist-n24, nist-accept and nist-reject."""
    assert list(acceptance_and_rejection(plan, 24)) == value("nist-n24")
    by_items = {items: acceptance_and_rejection(plan, items) for items in range(1, 121)}

    def first(place: int, number: int) -> int:
        return next(items for items, pair in by_items.items() if pair[place] == number)

    assert [first(0, number) for number in (0, 2, 3)] == value("nist-accept")
    assert [first(1, number) for number in (2, 3, 6)] == value("nist-reject")


def test_sampling_plan_as_played(plan: tuple[Evidence, Thresholds]) -> None:
    """Meets nist-accept and nist-reject once more, by when the engine's inspector can answer."""
    law = alone(*plan, 0.0, horizon=120).answers
    accepts, rejects = (np.flatnonzero(law[answer, 0]).tolist() for answer in (1, 0))
    assert accepts[0] == value("nist-accept")[0]
    assert set(value("nist-accept")) <= set(accepts)
    assert rejects[0] == value("nist-reject")[0]
    # Where the rejection number rises, the lower number would have rejected one item earlier.
    rises = [
        n
        for n in range(3, 121)
        if acceptance_and_rejection(plan, n - 1)[1] != (acceptance_and_rejection(plan, n)[1])
    ]
    assert set(value("nist-reject")[1:]) <= set(rises)
    assert rejects == [n for n in range(2, 121) if n not in rises]


def test_sampling_plan_exact_rates(plan: tuple[Evidence, Thresholds]) -> None:
    """Meets nist-exact-oc and nist-exact-asn; the nominal rates are not the exact ones."""
    played = alone(*plan, 0.0)
    accepted = [float(played.answers[1, side].sum()) for side in (1, 0)]
    assert accepted == pytest.approx(value("nist-exact-oc"), rel=1e-10)
    assert played.steps[::-1].tolist() == pytest.approx(value("nist-exact-asn"), rel=1e-10)
    assert abs(accepted[0] - 0.95) > 0.01


def test_sampling_plan_walds_approximation(plan: tuple[Evidence, Thresholds]) -> None:
    """Meets wald-asn: expected evidence at the bars over expected evidence of an item."""
    evidence, bars = plan
    worths = evidence.worths()
    good = (0.95 * bars.minus + 0.05 * bars.plus) / float(worths @ evidence.minus)
    bad = (0.10 * bars.minus + 0.90 * bars.plus) / float(worths @ evidence.plus)
    assert [good, bad] == pytest.approx(value("wald-asn"), rel=1e-10)


# --- gambler's ruin --------------------------------------------------------------------------


@pytest.mark.parametrize("name", [name for name in ENTRIES if re.match(r"feller-0", name)])
def test_ruin_probability_and_duration(name: str) -> None:
    """Meets the feller-P-z-a entries: ruin is an answer of minus z steps down, a - z steps up."""
    found = re.fullmatch(r"feller-([\d.]+)-(\d+)-(\d+)", name)
    assert found is not None
    p, start, goal = float(found[1]), int(found[2]), int(found[3])
    fair = p == 0.5
    # A walk that tends downwards is the coin given minus.
    played = steps_apart(
        FAIR if fair else 1.0 - p, -start, goal - start, leftover=1e-6 if fair else 1e-11
    )
    ruin, duration = float(played.answers[1, 1].sum()), float(played.steps[1])
    within = 1e-4 if fair else 1e-8
    assert [ruin, duration] == pytest.approx(value(name), rel=within)


def test_ruin_at_an_exact_step() -> None:
    """Meets feller-u-1 and feller-u-2."""
    down = steps_apart(0.55, -3, 2, horizon=7).answers[1, 1, 7]
    up = steps_apart(0.7, -2, 2, horizon=6).answers[1, 0, 6]
    assert down == pytest.approx(value("feller-u-1"), rel=1e-10)
    assert up == pytest.approx(value("feller-u-2"), rel=1e-10)


def test_ruin_with_one_barrier() -> None:
    """Meets oeis-ruin: the other barrier is out of reach."""
    for capital, flip, chance in value("oeis-ruin"):
        law = steps_apart(FAIR, -capital, 100, horizon=flip).answers[1]
        assert law[:, flip].tolist() == pytest.approx([chance, chance], rel=1e-5)


def test_even_thresholds_without_horizon() -> None:
    """Meets lattice-even, and the two formulas behind it over a range of cases."""
    played = steps_apart(0.6, -5, 5)
    assert [played.wrong()[0], played.steps[0]] == pytest.approx(value("lattice-even"), rel=1e-10)
    for p, m in ((0.55, 4), (0.6, 7), (0.8, 2), (0.99, 3)):
        worth = math.log(p / (1.0 - p))
        played = steps_apart(p, -m, m)
        expected = 1.0 / (1.0 + math.exp(m * worth))
        assert played.wrong().tolist() == pytest.approx([expected] * 2, rel=1e-10)
        mean = m * math.tanh(m * worth / 2.0) / (2.0 * p - 1.0)
        assert played.steps.tolist() == pytest.approx([mean] * 2, rel=1e-10)


def test_uneven_thresholds_without_horizon() -> None:
    """Meets decider-3-2."""
    played = steps_apart(0.7, -2, 3)
    got = [float(played.answers[0, 0].sum()), float(played.steps[0])]
    assert got == pytest.approx(value("decider-3-2"), rel=1e-10)


def test_fine_steps_tend_to_brownian_evidence() -> None:
    """Meets brownian: wrong at once, time as steps shrink, with an error of second order.

    A step of worth w has variance about w squared, so it lasts w squared over two.
    """
    wrong, time = value("brownian")
    off = []
    for m in (5, 10, 20):
        worth = 2.0 / m
        played = steps_apart(1.0 / (1.0 + math.exp(-worth)), -m, m, leftover=1e-12)
        assert played.wrong()[0] == pytest.approx(wrong, rel=1e-9)
        off.append(float(played.steps[0]) * worth**2 / 2.0 - time)
    assert abs(off[2]) < 2e-3 * time
    assert off[0] / off[1] == pytest.approx(4.0, rel=0.02)
    assert off[1] / off[2] == pytest.approx(4.0, rel=0.02)


# --- information -----------------------------------------------------------------------------


def test_mutual_information() -> None:
    """Meets info-bsc and js-merge."""
    got = [coin(p).information() for p in (0.6, 0.7, 0.9)]
    assert got == pytest.approx(value("info-bsc"), rel=1e-10)
    four = listed([0.1, 0.2, 0.3, 0.4], [0.4, 0.3, 0.2, 0.1])
    two = listed([0.3, 0.7], [0.7, 0.3])
    assert isinstance(four, Evidence)
    assert isinstance(two, Evidence)
    kept = [four.information(), two.information()]
    assert [*kept, kept[0] - kept[1]] == pytest.approx(value("js-merge"), rel=1e-10)


def test_calibration_counts() -> None:
    """Meets pathology-counts: the worths and rates that its note gives."""
    hits, false_alarms, misses, correct_rejections = value("pathology-counts")
    evidence = calibration(hits, misses, false_alarms, correct_rejections)
    rates = {
        float(w): (float(p), float(q))
        for w, p, q in zip(evidence.worths(), evidence.plus, evidence.minus, strict=True)
    }
    normal, abnormal = sorted(rates)
    assert abnormal == pytest.approx(0.878069519054, rel=1e-11)
    assert normal == pytest.approx(-math.log(6.0), rel=1e-12)
    assert rates[abnormal][0] == pytest.approx(0.895348837209, rel=1e-11)
    assert rates[normal][1] == pytest.approx(0.627906976744, rel=1e-11)


# --- silence -----------------------------------------------------------------------------------


def silence(minus: int, plus: int, horizon: int) -> list[float]:
    """Worth of a neighbour's silence after its steps 0, 1, 2, ... (nats), coin 0.7."""
    evidence = coin(0.7)
    worth = float(evidence.alpha[0])
    bars = same_thresholds(Thresholds(minus * worth, plus * worth))
    agents = (Agent("watched", evidence, bars), Agent("observer", evidence, bars, ("watched",)))
    track = solve(Group(agents, 0.0, horizon)).tracks[1]
    # Under "once" the observer's step s is the first to know of the neighbour's step s - 1.
    return [float(moment.value[0]) for moment in track.moments]


def test_silence() -> None:
    """Meets silence-3-2, silence-3-2-limits and silence-3-1."""
    values = silence(-2, 3, 61)
    assert values[2:5] == pytest.approx(value("silence-3-2"), rel=1e-10)
    even, odd = value("silence-3-2-limits")
    assert [values[60], values[59]] == pytest.approx([even, odd], rel=1e-9)
    assert silence(-1, 3, 30)[1:] == pytest.approx([value("silence-3-1")] * 29, rel=1e-9)


# --- when to stop --------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("name", "p", "price"), [("optimal-stop-1", 0.7, 0.01), ("optimal-stop-2", 0.6, 0.001)]
)
def test_best_symmetric_thresholds(name: str, p: float, price: float) -> None:
    """Meets optimal-stop-1 and optimal-stop-2, and no neighbouring thresholds do better."""
    best, least = value(name)
    worth = float(coin(p).alpha[0])
    bars = best_alone(coin(p), Losses(1.0, 1.0, price))
    assert math.ceil(bars.plus / worth) == best
    assert math.floor(bars.minus / worth) == -best

    def risk(m: int) -> float:
        played = steps_apart(p, -m, m)
        return float(played.wrong()[0] + price * played.steps[0])

    assert risk(best) == pytest.approx(least, rel=1e-10)
    assert min(risk(best - 1), risk(best + 1)) > least


def test_best_thresholds_tend_to_the_diffusion() -> None:
    """Meets optimal-diffusion.

    With evidence x of drift 1 and variance 2 per unit time, wrong is 1/(1 + e^x) and the time is
    x tanh(x/2); the best x for a loss of 1 and a price c of time solves sinh x + x = 1/(2 c), so
    the ratio 10 is a price of 1/20.
    """
    threshold, wrong = value("optimal-diffusion")
    off = []
    for worth in (0.4, 0.2, 0.1):
        price = worth**2 / 2.0 / 20.0
        bars = best_alone(coin(1.0 / (1.0 + math.exp(-worth))), Losses(1.0, 1.0, price))
        assert bars.minus == pytest.approx(-bars.plus, abs=1e-6)
        off.append(bars.plus - threshold)
    # A walk in steps of w stops about w/2 earlier; what is left after that is of second order.
    assert [gap / worth for gap, worth in zip(off, (0.4, 0.2, 0.1), strict=True)] == pytest.approx(
        [-0.5] * 3, abs=0.03
    )
    assert 2.0 * off[2] - off[1] == pytest.approx(0.0, abs=1e-3)
    assert 1.0 / (1.0 + math.exp(threshold)) == pytest.approx(wrong, rel=1e-10)


# --- groups --------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("name", "p", "sizes"), [("jury-.6", 0.6, (3, 5, 7, 11)), ("jury-.7", 0.7, (3, 5, 7))]
)
def test_a_jury_of_one_observation_each(name: str, p: float, sizes: tuple[int, ...]) -> None:
    """Meets jury-.6 and jury-.7: agents who see nobody and answer by their only sign."""
    evidence = coin(p)
    worth = float(evidence.alpha[0])
    bars = same_thresholds(Thresholds(-worth, worth))
    for size, expected in zip(sizes, value(name), strict=True):
        jury = Group(tuple(Agent(f"a{k}", evidence, bars) for k in range(size)), 0.0, 1)
        got = together(solve(jury))
        assert got.right_majority.tolist() == pytest.approx([expected] * 2, rel=1e-12)
        assert got.tie.tolist() == pytest.approx([0.0] * 2, abs=1e-14)


def in_turn(p: float, size: int) -> Group:
    """Agents who answer in turn after one observation each, having seen everybody before them.

    No belief lies strictly between the thresholds, so each answers at its first observation. At a
    belief of 0 it says plus or minus by which of two thresholds it has, and nobody else knows
    which: a coin flip.
    """
    evidence, short = coin(p), 1e-6
    flip = ((0.5, Thresholds(-short, 0.0)), (0.5, Thresholds(0.0, short)))
    agents = []
    for place in range(size):
        before = tuple(f"a{k}" for k in range(place))
        looks = tuple(int(step == place) for step in range(size))
        agents.append(Agent(f"a{place}", evidence, flip, before, looks))
    return Group(tuple(agents), 0.0, size)


def test_cascades() -> None:
    """Meets cascade-none and cascade-correct, and their sequence: nobody thinks once two agree.

    A cascade is in force once the two of a pair (first and second, third and fourth) agree.
    """
    solution = solve(in_turn(0.7, 4))
    order = elimination(solution.group)

    def answered(*signs: int) -> Any:
        """Probability, given plus and given minus, that the first agents say these."""
        picks = []
        for place, track in enumerate(solution.tracks):
            state = np.array(track.events.state)
            assert track.undecided.tolist() == [0.0, 0.0]
            picks.append(
                np.flatnonzero(state == signs[place] if place < len(signs) else state >= 0)
            )
        ones = [np.ones((1, len(pick))) for pick in picks]
        return total(displays(solution, 4, picks), ones, order)[0]

    mixed = ((PLUS, MINUS), (MINUS, PLUS))
    up, down = (answered(s, s) + sum(answered(*m, s, s) for m in mixed) for s in (PLUS, MINUS))
    none = sum(answered(*m, *n) for m in mixed for n in mixed)
    assert [float(up.mean()), float(none.mean())] == pytest.approx(value("cascade-none"), rel=1e-12)
    assert float(down.mean()) == pytest.approx(value("cascade-none")[0], rel=1e-12)
    assert [float(up[0]), float(down[0])] == pytest.approx(value("cascade-correct"), rel=1e-12)
    assert answered(PLUS, PLUS, PLUS, PLUS) == pytest.approx(answered(PLUS, PLUS), rel=1e-12)


def test_no_entry_is_forgotten() -> None:
    """Every entry is named by a test above, or listed with the reason why it is not asked."""
    docs = " ".join(
        member.__doc__ or "" for name, member in globals().items() if name.startswith("test_")
    )
    met = {name for name in ENTRIES if re.search(rf"(?<![\w-]){re.escape(name)}(?![\w-])", docs)}
    met |= {name for name in ENTRIES if name.startswith("feller-0")}
    assert met.isdisjoint(NOT_ASKED)
    assert met | set(NOT_ASKED) == set(ENTRIES)
