"""What a rule costs where the case is not right, and what a case may say about that."""

from __future__ import annotations

import tomllib
from functools import cache
from typing import Any

import pytest
from scipy.stats import beta

from thumbwright.distill.assemble import NO_LIMITS, Limits
from thumbwright.distill.case import CaseFile
from thumbwright.distill.crosschecks import contradictions
from thumbwright.distill.doubts import doubted, posterior
from thumbwright.distill.findings import Doubted
from thumbwright.distill.forms import Wanted, form
from thumbwright.distill.network_pricer import NetworkPricer
from thumbwright.distill.pricing import pricer_of
from thumbwright.exact.errors import ModelError

PAIR = """
title = "A pair"
[question]
plus = "yes"
minus = "no"
stakes = "none"
[evidence]
kind = "coin"
p = 0.6
[time]
horizon = 16
[thresholds.even]
plus = 3
minus = -3
unit = "observations"
[thresholds.eager]
plus = 4
minus = -2
unit = "observations"
[agents.a]
thresholds = "eager"
[agents.b]
thresholds = "even"
sees = ["a"]
[rule]
agent = "b"
forms = ["table"]
[costs]
false_plus = 1.0
false_minus = 1.0
per_step = 0.015
"""


def priced(
    text: str, limits: Limits = NO_LIMITS
) -> tuple[NetworkPricer, dict[str, Doubted], tuple[str, ...]]:
    """The pricer of a case, its doubted worlds by name, and what was left out."""
    case = CaseFile.model_validate(tomllib.loads(text)).complete("case", "case.toml")
    pricer, _ = pricer_of(case, limits=limits)
    assert isinstance(pricer, NetworkPricer)
    rule = form("table").distil(pricer, Wanted(6, ("step", "shown"), None), None).rule
    found, left_out = doubted(pricer, case, rule, limits)
    return pricer, {one.name: one for one in found}, left_out


@cache
def pair() -> tuple[NetworkPricer, dict[str, Doubted], tuple[str, ...]]:
    return priced(PAIR)


def test_what_is_doubted_of_a_pair() -> None:
    _, found, left_out = pair()
    assert list(found) == [
        "evidence-weaker",
        "evidence-stronger",
        "a-nearer",
        "a-further",
        "a-readier-for-plus",
        "a-readier-for-minus",
        "a-absent",
        "a-random",
        "a-sees-b",
    ]
    assert left_out == ()


def test_laws_alone_and_absence_are_exact() -> None:
    _, found, _ = pair()
    exact = {name for name, one in found.items() if one.is_exact}
    assert exact == {"evidence-weaker", "evidence-stronger", "a-absent", "a-random"}


def test_a_neighbour_that_is_not_there_does_not_bear_on_who_looks_at_nobody() -> None:
    pricer, found, _ = pair()
    for name in ("a-absent", "a-random", "a-nearer"):
        assert found[name].alone.accuracy == pytest.approx(
            pricer.accuracy(pricer.alone_tally), abs=1e-12
        )
        assert found[name].alone.benefit_kept == pytest.approx(0.0, abs=1e-12)


def test_following_what_is_random_is_worse_than_looking_at_nobody() -> None:
    _, found, _ = pair()
    one = found["a-random"]
    assert one.harms
    assert one.rule.risk is not None
    assert one.alone.risk is not None
    assert one.rule.risk > one.alone.risk


def test_weaker_evidence_is_wrong_more_often_and_stronger_less() -> None:
    pricer, found, _ = pair()
    right = pricer.accuracy(pricer.exact_tally)
    assert (
        found["evidence-weaker"].exact.accuracy < right < found["evidence-stronger"].exact.accuracy
    )


def test_losses_are_against_the_full_calculation_in_the_same_world() -> None:
    _, found, _ = pair()
    for one in found.values():
        assert one.exact.accuracy_lost == 0.0
        assert one.rule.accuracy_lost == pytest.approx(
            one.exact.accuracy - one.rule.accuracy, abs=1e-12
        )


def test_benefit_is_a_share_of_what_exact_play_was_to_save() -> None:
    pricer, found, _ = pair()
    assert pricer.losses is not None
    alone = pricer.alone_tally.risk(pricer.losses, 0.5)
    exact = pricer.exact_tally.risk(pricer.losses, 0.5)
    one = found["a-further"]
    assert one.alone.risk is not None
    assert one.rule.risk is not None
    expected = (one.alone.risk - one.rule.risk) / (alone - exact)
    assert one.rule.benefit_kept == pytest.approx(expected, abs=1e-12)


def test_swapping_the_answers_swaps_every_doubt() -> None:
    mirrored = PAIR.replace("plus = 4\nminus = -2", "plus = 2\nminus = -4")
    found, mirror = pair()[1], priced(mirrored)[1]
    swapped = {"a-readier-for-plus": "a-readier-for-minus"}
    swapped |= {one: other for other, one in swapped.items()}
    for name, one in found.items():
        other = mirror[swapped.get(name, name)].exact
        assert one.exact.wrong_given_plus == pytest.approx(other.wrong_given_minus, abs=1e-12)
        assert one.exact.mean_step == pytest.approx(other.mean_step, abs=1e-12)


def test_thresholds_of_one_sign_have_no_nearer_ones() -> None:
    _, found, left_out = priced(PAIR.replace("plus = 4\nminus = -2", "plus = 4\nminus = -1"))
    assert "a-nearer" not in found
    assert "a-further" in found
    assert any("a-nearer" in text and "reach the prior" in text for text in left_out)


def test_calibration_counts_leave_chances_open() -> None:
    counts = "hits = 18\nmisses = 2\nfalse_alarms = 0\ncorrect_rejections = 30"
    text = PAIR.replace('kind = "coin"\np = 0.6', f'kind = "calibration"\n{counts}')
    text = text.replace('"observations"', '"nats"')
    _, found, _ = priced(text)
    named = ["signs-worse", "signs-better", "signs-rarer", "signs-commoner"]
    assert [name for name in found if name.startswith("signs")] == named
    # Believed: no false alarm in 30, so a sign is proof of plus; really it may not be.
    assert found["signs-worse"].exact.wrong_given_minus > 0.02
    assert found["signs-better"].exact.wrong_given_minus < 0.001
    assert "evidence-weaker" not in found


@pytest.mark.parametrize(("seen", "not_seen"), [(18, 2), (0, 30), (1, 1)])
def test_the_posterior_of_a_chance(seen: int, not_seen: int) -> None:
    """Beta with the counts plus a half: Jeffreys' prior."""
    law = beta(seen + 0.5, not_seen + 0.5)
    assert law.cdf(posterior(seen, not_seen)) == pytest.approx([0.05, 0.95], abs=1e-7)


def test_three_neighbours_are_doubted_together() -> None:
    more = '[agents.c]\nthresholds = "eager"\n[agents.d]\nthresholds = "even"\n[agents.b]'
    text = PAIR.replace("[agents.b]", more).replace('sees = ["a"]', 'sees = ["a", "c", "d"]')
    text = text.replace("horizon = 16", "horizon = 8")
    _, found, _ = priced(text)
    assert "all-absent" in found
    assert not any(name.startswith(("a-", "c-", "d-")) for name in found)


def test_two_neighbours_may_see_each_other() -> None:
    more = '[agents.c]\nthresholds = "eager"\n[agents.b]'
    text = PAIR.replace("[agents.b]", more).replace('sees = ["a"]', 'sees = ["a", "c"]')
    _, found, _ = priced(text.replace("horizon = 16", "horizon = 8"))
    # What was thought to be two opinions is in part one.
    assert found["a-sees-others"].exact.accuracy != pytest.approx(
        found["c-absent"].exact.accuracy, abs=1e-6
    )
    assert not found["a-sees-others"].is_exact


def test_dropped_events_leave_nothing_to_price() -> None:
    _, found, left_out = priced(PAIR, Limits(drop=0.03))
    assert found == {}
    assert left_out == ("Wrong assumptions were not priced, since rare events were dropped.",)


STATED = """
[doubts.fog]
says = "fog makes signs less sure"
evidence = { kind = "coin", p = 0.55 }
[doubts.a-absent.agents.a]
answers = "never"
[doubts.dice.agents.a]
answers = "at random"
[doubts.new-hand.agents.a]
thresholds = "even"
[doubts.peek.agents.a]
sees = ["b"]
"""


def test_stated_doubts_come_first_and_stand_in_for_ours() -> None:
    _, found, _ = priced(PAIR + STATED)
    ours = pair()[1]
    assert list(found)[:5] == ["fog", "a-absent", "dice", "new-hand", "peek"]
    assert found["fog"].says == "fog makes signs less sure"
    assert found["dice"].says == "dice"
    # What is stated in other words is the same world.
    for mine, yours in (
        ("a-absent", "a-absent"),
        ("dice", "a-random"),
        ("peek", "a-sees-b"),
        ("new-hand", "a-readier-for-plus"),
    ):
        assert found[mine].rule.risk == pytest.approx(ours[yours].rule.risk, abs=1e-12)
    assert len(found) == 5 + len(ours) - 1


def test_stated_evidence_that_cannot_be_is_refused() -> None:
    listed = 'kind = "listed"\nplus = [0.2, 0.3, 0.5]\nminus = [0.5, 0.3, 0.2]'
    text = PAIR.replace('kind = "coin"\np = 0.6', listed).replace('"observations"', '"nats"')
    text += '\n[doubts.odd]\nevidence = { kind = "listed", plus = [0.2, 0.3, 0.5],'
    text += " minus = [0.6, 0.25, 0.15] }\n"
    with pytest.raises(ModelError, match=r"doubts\.odd: .*linear"):
        priced(text)


def faults(more: str) -> list[str]:
    document: dict[str, Any] = tomllib.loads(PAIR + more)
    return [f"{'.'.join(map(str, key))}: {text}" for key, text in contradictions(document)]


@pytest.mark.parametrize(
    ("more", "says"),
    [
        ("[doubts.x]\n", "doubts.x: doubts nothing; write evidence"),
        ("[doubts.x.agents.a]\n", "doubts.x.agents.a: doubts nothing (allowed thresholds"),
        ("[doubts.x.agents.aa]\nanswers='never'\n", 'there is no agent "aa"'),
        ("[doubts.x.agents.b]\nanswers='never'\n", "the rule is for this agent"),
        ("[doubts.x.agents.a]\nthresholds='evn'\n", 'no thresholds "evn"'),
        ("[doubts.x.agents.a]\nsees=['a']\n", "cannot see itself"),
        ("[doubts.x.agents.a]\nsees=['z']\n", 'there is no agent "z"'),
        ("[doubts.x.agents.a]\nsees=['b','b']\n", "listed twice"),
        ("[doubts.x.agents.a]\nanswers='never'\nsees=['b']\n", "makes nothing of sees"),
        ("[doubts.x]\nevidence={kind='poisson',rate_plus=2,rate_minus=1}\n", "another kind"),
        ("[doubts.x]\nevidence={kind='coin',p=0.4}\n", "below 0.5"),
    ],
)
def test_faulty_doubts_are_said(more: str, says: str) -> None:
    assert any(says in text for text in faults(more)), faults(more)


def test_doubts_count_in_the_digest_only_where_there_are_any() -> None:
    plain, more = (
        CaseFile.model_validate(tomllib.loads(text)).complete("case", "case.toml")
        for text in (PAIR, PAIR + STATED)
    )
    assert plain.digest != more.digest
    assert plain.digest == "2b1de7220f7a"  # as before there were doubts
