"""The look-up in a browser: the answers of the rule itself, no complaint, nothing fetched."""

from __future__ import annotations

import itertools
import re
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from tests.browser import Browser, needs_browser
from tests.distill.sheet import more_findings as more, sample_findings as samples
from tests.distill.sheet.asking import ask
from thumbwright.distill.exports import sheet_html
from thumbwright.distill.findings import Findings
from thumbwright.distill.rules import FIRST_ANSWERS, SHOWN, Row, Rule
from thumbwright.distill.sheet.view import sheet
from thumbwright.distill.views import NO_ROW, Named, rows_in

pytestmark = needs_browser


@pytest.fixture(scope="module")
def browser(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Browser]:
    with Browser(tmp_path_factory.mktemp("profile")) as made:
        yield made


def page_of(findings: Findings) -> str:
    return str(sheet_html.render(findings)["sheet.html"])


def rule_of(findings: Findings) -> Rule:
    result = findings.forms.get("lines") or findings.forms["table"]
    return result.rule


def steps_of(findings: Findings) -> list[int]:
    """Steps on both sides of where rows begin and end, the first and the last."""
    horizon = findings.case.time.horizon
    cuts = {cut for row in rule_of(findings).rows for cut in (row.step_from, row.step_to) if cut}
    near = {cut + by for cut in cuts for by in (-1, 0, 1)} | {1, horizon}
    return sorted(step for step in near if 1 <= step <= horizon)


def told_apart(findings: Findings) -> list[tuple[dict[str, Any], Named]]:
    """Every joint state at those steps, as fields and as a view of the rule."""
    habits = sorted({n for r in rule_of(findings).rows for s in r.thresholds.values() for n in s})
    found = []
    for step, codes, names in itertools.product(
        steps_of(findings),
        itertools.product(range(3), repeat=len(findings.seen)),
        itertools.product(habits or [""], repeat=len(findings.seen)),
    ):
        states = dict(zip(findings.seen, map(np.array, codes), strict=True))
        zero = {agent: np.zeros((), dtype=np.int64) for agent in findings.seen}
        known = dict(zip(findings.seen, names, strict=True)) if habits else {}
        given: dict[str, Any] = {"step": step}
        given |= {f"{a}_shows": SHOWN[c] for a, c in zip(findings.seen, codes, strict=True)}
        given |= {f"{agent}_thresholds": name for agent, name in known.items()}
        found.append((given, Named(np.array(step), states, zero, zero, known)))
    return found


class Counted:
    """A view of a group of which only numbers are known."""

    def __init__(self, given: dict[str, Any]) -> None:
        self.step, self.names, self._given = np.array(given["step"]), {}, given

    def state(self, agent: str) -> Any:
        raise AssertionError(f"nobody may ask for {agent}")

    def number(self, name: str) -> Any:
        return np.array(self._given[name])

    def first_answer(self) -> Any:
        return np.array(FIRST_ANSWERS.index(self._given["first_answer"]))


def counted(findings: Findings) -> list[tuple[dict[str, Any], Counted]]:
    found = []
    for step, plus, minus, since, first in itertools.product(
        steps_of(findings), (0, 1, 2, 3, 7), (0, 1, 4), (0, 1, 6, 7, 40), FIRST_ANSWERS
    ):
        given = {"step": step, "plus_shown": plus, "minus_shown": minus}
        given |= {"steps_since_first": since, "first_answer": first}
        found.append((given, Counted(given)))
    return found


def answer(row: Row | None, count: float) -> str:
    if row is None:
        return "none"
    if row.plus_at is not None and count >= row.plus_at:
        return "plus"
    return "minus" if row.minus_at is not None and count <= row.minus_at else "watch"


WITH_BARS = ["frost", "lots", "three", "long-scale", "counts", "habits", "good-items"]


def asked_of(name: str) -> tuple[Findings, list[tuple[int, dict[str, Any]]], list[str]]:
    """Situations with counts about the bars, and what the rule answers there."""
    findings = more.EVERY[name]()
    look, rule = sheet(findings).lookup, rule_of(findings)
    views = counted(findings) if name == "counts" else told_apart(findings)
    asked, expected = [], []
    for given, view in views:
        held = int(rows_in(rule, view)[0])
        row = None if held == NO_ROW else rule.rows[held]
        bars = [] if row is None else [b for b in (row.minus_at, row.plus_at) if b is not None]
        turned = -1 if look.data["flipped"] else 1
        for count in sorted({0, *(bar + by for bar in bars for by in (-1, 0, 1))}):
            if look.least <= turned * count <= look.most:
                asked.append((turned * count, given))
                expected.append(answer(row, count))
    return findings, asked, expected


@pytest.mark.parametrize("name", WITH_BARS)
def test_the_look_up_says_what_the_rule_says(name: str, browser: Browser, tmp_path: Path) -> None:
    findings, asked, expected = asked_of(name)
    found = ask(browser, page_of(findings), tmp_path, asked)
    assert [one["stood"] for one in found] == [str(count) for count, _ in asked]
    assert [one["act"] for one in found] == expected
    assert {"plus", "minus", "watch"} <= set(expected)
    assert browser.complaints == []


SPOILS = {
    "a bar": (r'"minus": -4', '"minus": -5'),
    "a step": (r'"fits": \[\[1, 2\]', '"fits": [[1, 3]'),
    "a state": (r"\[\[3, null\], \[0\]", "[[3, null], [1]"),
}


@pytest.mark.parametrize("what", SPOILS)
def test_a_spoilt_look_up_is_noticed(what: str, browser: Browser, tmp_path: Path) -> None:
    findings, asked, expected = asked_of("frost")
    page, times = re.subn(*SPOILS[what], page_of(findings), count=1)
    assert times == 1
    found = ask(browser, page, tmp_path, asked)
    assert [one["act"] for one in found] != expected


def test_a_spoilt_script_does_not_run(browser: Browser, tmp_path: Path) -> None:
    page = page_of(samples.frost()).replace("count >= row.plus", "count > row.plus")
    (tmp_path / "spoilt.html").write_text(page)
    browser.open(tmp_path / "spoilt.html")
    assert browser.ask("document.getElementById('lookup').hidden") is True
    assert any("Content Security Policy" in said for said in browser.complaints)
    browser.complaints.clear()


@pytest.mark.parametrize("name", ["readings", "table-alone"])
def test_worths_and_own_evidence(name: str, browser: Browser, tmp_path: Path) -> None:
    findings = more.EVERY[name]()
    rule, look = rule_of(findings), sheet(findings).lookup
    asked, expected = [], []
    for given, view in told_apart(findings):
        held = int(rows_in(rule, view)[0])
        row = None if held == NO_ROW else rule.rows[held]
        for tally in range(look.least, look.most + 1) if look.kind == "peg" else (-2, 0.8, 1.2, ""):
            asked.append((tally, given))
            if row is None or row.value is None:
                expected.append(("none", ""))
                continue
            if tally == "":
                expected.append(("open", repr(row.value)))
                continue
            count = findings.alpha if look.kind == "peg" else 1.0
            assert count is not None
            belief = count * float(tally) + row.value
            low, high = (
                (-1.2, 1.2) if name == "readings" else (-3 * samples.ALPHA, 3 * samples.ALPHA)
            )
            act = "plus" if belief >= high - 1e-9 else "minus" if belief <= low + 1e-9 else "watch"
            expected.append((act, repr(row.value)))
    found = ask(browser, page_of(findings), tmp_path, asked)
    said = [(one["act"], repr(float(one["worth"])) if one["worth"] else "") for one in found]
    assert said == expected
    assert {act for act, _ in expected} >= {"plus", "minus", "watch"}
    assert browser.complaints == []


def test_what_cannot_be_is_refused(browser: Browser, tmp_path: Path) -> None:
    given = {"upper_shows": "plus"}
    steps = ["0", "41", "", "2.5", "1e1", "40"]
    found = ask(
        browser, page_of(samples.frost()), tmp_path, [(0, given | {"step": s}) for s in steps]
    )
    assert [one["act"] for one in found] == ["none"] * 5 + ["plus"]
    assert found[0]["said"] == "No answer here"


@pytest.mark.parametrize(("name", "line"), [("frost", "Line A"), ("lots", "D")])
def test_nobody_on_watch_takes_the_line_for_it(
    name: str, line: str, browser: Browser, tmp_path: Path
) -> None:
    findings = samples.SAMPLES[name]()
    shows = f"{findings.seen[0]}_shows"
    asked = [
        (count, {"step": step, shows: state, "sure": "no"})
        for step in steps_of(findings)
        for state in SHOWN
        for count in range(7)
    ]
    found = ask(browser, page_of(findings), tmp_path, asked)
    for (count, given), one in zip(asked, found, strict=True):
        row = next(
            row
            for row in findings.alone_rows
            if (row.step_from or 1) <= given["step"] <= (row.step_to or 999)
        )
        assert one["act"] == answer(row, min(count, int(one["stood"])))
        assert one["line"].startswith(line)
    unknown = ask(browser, page_of(more.good_items()), tmp_path, [(0, {"step": 1, "sure": "no"})])
    assert unknown[0]["said"] == "Put this card aside"


def test_it_is_hidden_without_its_script() -> None:
    page = page_of(samples.frost())
    assert re.search(r'<section id="lookup"[^>]* hidden>', page)
    assert ".hidden = false" in page


def test_keys_move_the_peg(browser: Browser, tmp_path: Path) -> None:
    ask(browser, page_of(samples.frost()), tmp_path, [(0, {"step": 1, "upper_shows": "plus"})])
    stops = []
    browser.ask("document.activeElement.blur()")
    for _ in range(12):
        for kind in ("keyDown", "keyUp"):
            browser.send("Input.dispatchKeyEvent", type=kind, key="Tab", windowsVirtualKeyCode=9)
        stops.append(browser.ask("document.activeElement.id"))
        style = "getComputedStyle(document.activeElement)"
        assert browser.ask(f"{style}.outlineStyle + {style}.outlineWidth") == "solid3px"
        if stops[-1] == "again":
            break
    assert stops == ["ask-1", "ask-2", "ask-3", "own", "fewer", "more", "again"]
    browser.ask("document.getElementById('own').focus()")
    for kind in ("keyDown", "keyUp"):
        browser.send("Input.dispatchKeyEvent", type=kind, key="ArrowLeft", windowsVirtualKeyCode=37)
    assert browser.ask("document.getElementById('own-said').textContent") == "mild 1"
    assert browser.ask("document.getElementById('own').getAttribute('aria-valuetext')") == "mild 1"
    browser.ask("document.getElementById('more').click()")
    browser.ask("document.getElementById('more').click()")
    assert browser.ask("document.getElementById('own-said').textContent") == "frost 1"


def test_nothing_is_fetched(browser: Browser, tmp_path: Path) -> None:
    browser.requests.clear()
    ask(browser, page_of(more.counts()), tmp_path, [])
    assert browser.requests == [(tmp_path / "asked.html").as_uri()]
