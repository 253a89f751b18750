"""Contrast of at least 4.5 : 1 by day, by night and in print, and nothing told by colour alone."""

from __future__ import annotations

import re
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest

from tests.browser import Browser, needs_browser
from tests.distill.sheet import more_findings as more
from tests.distill.sheet.markup import Page
from thumbwright.distill.exports import sheet_html
from thumbwright.distill.sheet.view import sheet

names = pytest.mark.parametrize("name", list(more.EVERY))


def html(name: str) -> str:
    return str(sheet_html.render(more.EVERY[name]())["sheet.html"])


def contrast(one: str, other: str) -> float:
    """Return the contrast of two colours by the formula of WCAG 2 (relative luminance)."""

    def luminance(colour: str) -> float:
        parts = [int(colour[at : at + 2], 16) / 255 for at in (1, 3, 5)]
        line = [p / 12.92 if p <= 0.04045 else ((p + 0.055) / 1.055) ** 2.4 for p in parts]
        return 0.2126 * line[0] + 0.7152 * line[1] + 0.0722 * line[2]

    low, high = sorted((luminance(one), luminance(other)))
    return (high + 0.05) / (low + 0.05)


def palettes() -> dict[str, dict[str, str]]:
    """The colours by day and by night; paper is white where a printer leaves the ground out."""
    style = Page(html("frost")).style
    day, night = (
        dict(re.findall(r"--(\w+): (#\w{6})", part))
        for part in re.findall(r":root \{(.*?--paper.*?)\}", style, re.DOTALL)
    )
    return {"day": day, "night": night, "print": day | {"paper": "#ffffff"}}


def test_the_formula() -> None:
    assert contrast("#ffffff", "#767676") == pytest.approx(4.54, abs=0.01)
    assert contrast("#000000", "#ffffff") == pytest.approx(21.0)


@pytest.mark.parametrize("when", ["day", "night", "print"])
def test_colours_of_text_and_ground(when: str) -> None:
    colours = palettes()[when]
    assert set(colours) == {"paper", "ink", "soft", "sand", "hatch", "line"}
    for text in ("ink", "soft"):
        for ground in ("paper", "sand"):
            assert contrast(colours[text], colours[ground]) >= 4.5
    # Lines of charts and tables, WCAG 2 for what is not text; the hatching comes with words.
    assert contrast(colours["line"], colours["paper"]) >= 3.0


def test_no_colour_is_named_elsewhere() -> None:
    style = Page(html("frost")).style
    outside = re.sub(r":root \{.*?\}", "", style, flags=re.DOTALL)
    assert len(outside) < len(style)
    assert not re.findall(r"#[0-9a-f]{3,8}\b(?![^{}]*\{)|rgba?\(|hsl", outside)


_PAIRS = """
(function () {
  var walk = document.createTreeWalker(document.body, NodeFilter.SHOW_TEXT), found = {}, node;
  while ((node = walk.nextNode())) {
    var at = node.parentElement, style = getComputedStyle(at);
    if (!node.textContent.trim() || !at.getClientRects().length || at.closest("script")) continue;
    var colour = at.closest("svg") ? style.fill : style.color, ground = null;
    for (var over = at; over; over = over.parentElement) {
      var back = getComputedStyle(over);
      if (back.backgroundImage !== "none") { ground = back.backgroundImage; break; }
      if (back.backgroundColor !== "rgba(0, 0, 0, 0)") { ground = back.backgroundColor; break; }
    }
    found[colour + " on " + (ground || "rgb(255, 255, 255)")] = node.textContent.trim();
  }
  return found;
}())
"""


@pytest.fixture(scope="module")
def browser(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Browser]:
    with Browser(tmp_path_factory.mktemp("profile")) as made:
        yield made


def as_hex(colour: str) -> list[str]:
    """Every colour named in a computed style, as #rrggbb; none may be seen through."""
    assert "rgba" not in colour
    found = re.findall(r"rgb\((\d+), (\d+), (\d+)\)", colour)
    assert found, colour
    return [f"#{int(r):02x}{int(g):02x}{int(b):02x}" for r, g, b in found]


@needs_browser
@pytest.mark.parametrize("when", ["day", "night", "print"])
@names
def test_all_text_as_it_is_shown(name: str, when: str, browser: Browser, tmp_path: Path) -> None:
    (tmp_path / "sheet.html").write_text(html(name), encoding="utf-8")
    features: list[Any] = [
        {"name": "prefers-color-scheme", "value": "light" if when == "day" else "dark"}
    ]
    media = "print" if when == "print" else "screen"
    browser.send("Emulation.setEmulatedMedia", media=media, features=features)
    browser.open(tmp_path / "sheet.html")
    pairs: dict[str, str] = {}
    for act in ("watch", "minus", "plus"):  # the three looks of the answer
        browser.ask(f"document.getElementById('lookup-said').className = '{act}'")
        pairs |= browser.ask(_PAIRS)
    assert len(pairs) >= 3
    for pair, text in pairs.items():
        front, ground = pair.split(" on ", 1)
        for behind in as_hex(ground):
            assert contrast(as_hex(front)[0], behind) >= 4.5, (pair, text)


@names
def test_zones_are_told_by_words(name: str) -> None:
    for line in sheet(more.EVERY[name]()).card.lines:
        for zone in line.zones:
            assert zone.spoken
            assert zone.label or zone.spoken in line.below
