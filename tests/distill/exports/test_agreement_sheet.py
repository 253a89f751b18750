"""The sheet's look-up, asked in a browser, answers as the rule does; see ``agreement``.

A person sets a check within the case and numbers that a group of this size can show; what lies
outside must be refused, and is not compared.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace
from pathlib import Path
from typing import Any

import pytest

from tests.browser import Browser, needs_browser
from tests.distill.exports import agreement, hand_built
from tests.distill.exports.agreement import Answers, Asked, Engine, Situation, Spoil
from tests.distill.sheet.asking import ask
from thumbwright.distill.exports import sheet_html
from thumbwright.distill.findings import Findings
from thumbwright.distill.sheet.parts import Lookup
from thumbwright.distill.sheet.view import sheet

pytestmark = needs_browser

ACTS = {"plus": "plus", "minus": "minus", "watch": "undecided", "none": None}


def not_run(*_: Any) -> Answers:
    raise AssertionError("the look-up is asked through a browser of its own")


ENGINE = Engine(
    "look-up in Chromium",
    "sheet.html",
    not_run,
    (
        Spoil("a number", r'"minus": -4', '"minus": -5'),
        Spoil("a state", r"\[\[null, 2\], \[0\]", "[[null, 2], [2]"),
    ),
)


@pytest.fixture(scope="module")
def browser(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Browser]:
    with Browser(tmp_path_factory.mktemp("profile")) as made:
        yield made


def prepared(name: str) -> tuple[Findings, Asked]:
    """Findings and their situations; worths alone are asked in nats, as the others are."""
    findings = hand_built.FINDINGS[name]()
    asked = agreement.asked_of(findings)
    if asked.parts.decide.valued:
        findings = replace(findings, count_is_whole=False)
    return findings, asked


def can_be_set(look: Lookup, situation: Situation) -> bool:
    turned = -situation.tally if look.data["flipped"] else situation.tally
    if look.kind == "number" and turned < 0:
        return False  # a number that signs only add to
    for one in look.data["asks"]:
        given = situation.given.get(one["key"])
        if one["kind"] == "number" and given is not None:
            assert isinstance(given, int)
            if not one["least"] <= given <= one["most"]:
                return False
    return True


def through_the_page(
    browser: Browser, page: str, folder: Path, asked: Asked, look: Lookup
) -> Answers:
    situations = [(s.tally, s.given) for s in asked.situations]
    found = ask(browser, page, folder, situations)
    if look.kind in ("peg", "number"):
        # The peg stops where nothing changes any more.
        for (tally, _), one in zip(situations, found, strict=True):
            turned = -tally if look.data["flipped"] else tally
            assert int(one["stood"]) == max(look.least, min(look.most, turned))
    worths = None
    if not look.data["bars"]:
        worths = [float(one["worth"]) if one["worth"] else None for one in found]
    return Answers(worths, [ACTS[one["act"]] for one in found])


@pytest.mark.parametrize("name", hand_built.FINDINGS)
def test_the_look_up_answers_as_the_rule_does(name: str, browser: Browser, tmp_path: Path) -> None:
    findings, asked = prepared(name)
    look, page = sheet(findings).lookup, str(sheet_html.render(findings)["sheet.html"])
    inside = tuple(s for s in asked.situations if can_be_set(look, s))
    outside = [(0, s.given) for s in asked.situations if not can_be_set(look, replace(s, tally=0))]
    assert len(inside) > 100
    assert {one["act"] for one in ask(browser, page, tmp_path, outside)} <= {"none"}
    asked = replace(asked, situations=inside)
    expected = agreement.in_memory(tmp_path, findings, asked)
    got = through_the_page(browser, page, tmp_path, asked, look)
    found = agreement.disagreements(expected, got, asked, ENGINE)
    assert not found, "\n".join([f"{len(found)} differ", *found[:5]])
    assert browser.complaints == []


@pytest.mark.parametrize("spoil", ENGINE.spoils, ids=lambda spoil: spoil.what)
def test_a_spoilt_look_up_is_noticed(spoil: Spoil, browser: Browser, tmp_path: Path) -> None:
    findings, asked = prepared("frost-watch")
    look, page = sheet(findings).lookup, str(sheet_html.render(findings)["sheet.html"])
    asked = replace(asked, situations=tuple(s for s in asked.situations if can_be_set(look, s)))
    expected = agreement.in_memory(tmp_path, findings, asked)
    got = through_the_page(browser, spoil.applied(page), tmp_path, asked, look)
    assert agreement.disagreements(expected, got, asked, ENGINE)
