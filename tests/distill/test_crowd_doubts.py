"""Doubted worlds of a crowd: against the same worlds of the same group told apart."""

from __future__ import annotations

from dataclasses import replace

import pytest

from tests.distill.test_crowds import CASE, case
from thumbwright.distill.assemble import NO_LIMITS
from thumbwright.distill.case import Case
from thumbwright.distill.crowd_doubts import doubted_crowd
from thumbwright.distill.crowd_pricer import CrowdPricer
from thumbwright.distill.doubts import doubted
from thumbwright.distill.findings import Figures
from thumbwright.distill.network_pricer import NetworkPricer
from thumbwright.distill.pricing import pricer_of
from thumbwright.distill.reading import case_from_text
from thumbwright.distill.rules import Row, Rule
from thumbwright.exact.errors import ModelError

COUNTED = 'inputs = ["step", "plus_shown", "minus_shown"]'
NAMED = 'inputs = ["step", "shown"]'


def pricers(exchange: str, horizon: int) -> tuple[CrowdPricer, NetworkPricer]:
    counted, named = (
        pricer_of(case(size=4, horizon=horizon, exchange=exchange, more=more))[0]
        for more in (COUNTED, NAMED)
    )
    assert isinstance(counted, CrowdPricer)
    assert isinstance(named, NetworkPricer)
    return counted, named


def rule(seen: tuple[str, ...]) -> Rule:
    rows = (
        Row(ranges={"plus_shown": (0, 0)}, value=-0.1),
        Row(ranges={"plus_shown": (1, None)}, value=0.9),
    )
    return Rule("by hand", "a1", seen, rows)


def apart(one: Figures, other: Figures) -> float:
    names = ("wrong_given_plus", "wrong_given_minus", "mean_step", "risk", "benefit_kept")
    pairs = [(getattr(one, name), getattr(other, name)) for name in names]
    assert all((a is None) == (b is None) for a, b in pairs)
    return max(abs(a - b) for a, b in pairs if a is not None)


@pytest.mark.parametrize("exchange", ["once", "settle"])
def test_worlds_are_those_of_the_network(exchange: str) -> None:
    counted, named = pricers(exchange, 4)
    plain = case(size=4, horizon=4, exchange=exchange, more=NAMED)
    here, said = doubted_crowd(counted, plain, rule(counted.seen))
    there = {one.name: one for one in doubted(named, plain, rule(named.seen), NO_LIMITS)[0]}
    assert [one.name for one in here] == [
        "evidence-weaker",
        "evidence-stronger",
        "all-nearer",
        "all-further",
        "all-readier-for-plus",
        "all-readier-for-minus",
        "all-absent",
        "all-random",
    ]
    assert "when the others answer: sooner, later" in said[-1]
    for one in here:
        other = there[one.name]
        assert (one.says, one.how) == (other.says, other.how)
        assert apart(one.alone, other.alone) < 1e-10, one.name
        if one.name.startswith("evidence"):
            # Nobody is shown anything odd, so nothing rests on how that is read.
            assert apart(one.exact, other.exact) < 1e-10, one.name
            assert apart(one.rule, other.rule) < 1e-10, one.name
        if one.name == "all-absent":
            assert apart(one.rule, other.rule) < 1e-10
        if other.exact.off_model == 0.0:
            assert apart(one.exact, other.exact) < 1e-10, one.name
    weaker, stronger = here[:2]
    assert weaker.exact.accuracy < counted.figures(counted.exact_tally).accuracy
    assert stronger.exact.accuracy > counted.figures(counted.exact_tally).accuracy
    random = next(one for one in here if one.name == "all-random")
    assert random.rule.risk is not None
    assert random.alone.risk is not None
    assert random.rule.risk > random.alone.risk


def test_a_crowd_states_no_worlds_of_its_own() -> None:
    stated = case(size=4, horizon=4).model_copy(
        update={"doubts": {"fog": None}},
    )
    counted, _ = pricers("once", 4)
    with pytest.raises(ModelError, match=r"doubts.fog: the worlds of a crowd"):
        doubted_crowd(counted, stated, rule(counted.seen))


def test_large_crowds_are_doubted_along_sampled_histories() -> None:
    from thumbwright.distill.assemble import Limits

    big = case(size=12, horizon=5)
    pricer = pricer_of(big, limits=Limits(histories=800))[0]
    assert isinstance(pricer, CrowdPricer)
    found, _ = doubted_crowd(pricer, big, replace(rule(pricer.seen), agent="a1"))
    assert all(one.rule.errors for one in found)


def test_moved_thresholds_are_read_by_those_of_the_case() -> None:
    """With two steps nothing can be read as something earlier, so all worlds are the network's."""
    counted, named = pricers("once", 2)
    plain = case(size=4, horizon=2, more=NAMED)
    here, _ = doubted_crowd(counted, plain, rule(counted.seen))
    there = {one.name: one for one in doubted(named, plain, rule(named.seen), NO_LIMITS)[0]}
    assert any(one.exact.off_model > 0.0 for one in here)
    for one in here:
        assert apart(one.exact, there[one.name].exact) < 1e-10, one.name
        assert apart(one.rule, there[one.name].rule) < 1e-10, one.name


def test_others_of_another_kind_are_taken_for_what_the_case_says() -> None:
    """Two kinds of members, the last one slower to say plus."""

    def of(more: str) -> Case:
        plain = CASE.format(size=4, horizon=2, exchange="once", more=more)
        start, stop = plain.index("[network]"), plain.index("[rule]")
        ids = [f"a{number}" for number in range(1, 5)]
        agents = "".join(
            f'[agents.{one}]\nname = "{one}"\nthresholds = "{"slow" if one == "a4" else "even"}"\n'
            f"sees = {[other for other in ids if other != one]}\n"
            for one in ids
        )
        slow = '[thresholds.slow]\nplus = 3\nminus = -2\nunit = "observations"\n'
        text = plain[:start] + slow + agents + plain[stop:].replace('"any"', '"a1"')
        return case_from_text(text, "kinds.toml", "kinds")

    counted, named = pricer_of(of(COUNTED))[0], pricer_of(of(NAMED))[0]
    assert isinstance(counted, CrowdPricer)
    assert isinstance(named, NetworkPricer)
    assert len(counted.shown.crowd.kinds) == 2
    here, _ = doubted_crowd(counted, of(COUNTED), rule(counted.seen))
    there = {one.name: one for one in doubted(named, of(NAMED), rule(named.seen), NO_LIMITS)[0]}
    for one in here:
        assert apart(one.exact, there[one.name].exact) < 1e-10, one.name
        assert apart(one.rule, there[one.name].rule) < 1e-10, one.name
