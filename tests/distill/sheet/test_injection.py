"""Labels of the case are data wherever they are printed: HTML, SVG, script, Markdown."""

from __future__ import annotations

import json
import re
from collections import Counter
from collections.abc import Iterator
from pathlib import Path

import pytest
from hypothesis import HealthCheck, given, settings
from markdown_it import MarkdownIt
from pydantic import ValidationError

from tests.browser import Browser, needs_browser
from tests.distill.sheet import nasty, sample_findings as samples
from tests.distill.sheet.markup import Page
from thumbwright.distill.exports import sheet_html, sheet_md
from thumbwright.distill.findings import Findings
from thumbwright.distill.sheet.view import sheet
from thumbwright.distill.sheet.words import clean

labels = pytest.mark.parametrize("label", nasty.LABELS)
few = settings(max_examples=60, deadline=None, suppress_health_check=[HealthCheck.too_slow])

PLAIN = samples.frost(**nasty.case_of("plain"))


def named(label: str) -> Findings:
    return samples.frost(**nasty.case_of(label))


def page_of(findings: Findings) -> str:
    return str(sheet_html.render(findings)["sheet.html"])


def markdown_of(findings: Findings) -> str:
    return str(sheet_md.render(findings)["sheet.md"])


def outline(text: str) -> tuple[set[str], set[tuple[str, str]]]:
    """Which elements a page has, and which attributes they have."""
    page = Page(text)
    return {tag for tag, _ in page.tags}, {(tag, n) for tag, attrs in page.tags for n in attrs}


def script_of(text: str) -> str:
    (found,) = re.findall(r"<script>(.*?)</script>", text, re.DOTALL)
    return str(found)


def data_of(text: str) -> dict[str, object]:
    (found,) = re.findall(r'<script type="application/json"[^>]*>(.*?)</script>', text, re.DOTALL)
    made: dict[str, object] = json.loads(found)
    assert not set(found) & set("<>&\u2028\u2029")
    return made


KNOWN, KNOWN_ATTRIBUTES = outline(page_of(PLAIN))


def check_page(label: str) -> None:
    findings = named(label)
    text = page_of(findings)
    tags, attributes = outline(text)
    assert tags == KNOWN
    # A line too long for a zone, or a card too long for a page, changes a class and no more.
    assert attributes <= KNOWN_ATTRIBUTES | {("section", "class")}
    assert script_of(text) == script_of(page_of(PLAIN))
    assert data_of(text) == json.loads(json.dumps(dict(sheet(findings).lookup.data)))
    assert clean(findings.case.title) in Page(text).text("card")


@labels
def test_html_holds_labels_as_text(label: str) -> None:
    check_page(label)


@few
@given(nasty.texts)
def test_html_holds_any_text(label: str) -> None:
    try:
        named(label)
    except ValidationError:
        return
    check_page(label)


def test_a_page_that_did_not_escape_would_be_noticed() -> None:
    broken = page_of(PLAIN).replace("plain title", nasty.LABELS[0])
    assert outline(broken)[0] != KNOWN


ALLOWED = {
    *("heading", "paragraph", "text", "inline", "strong", "softbreak", "blockquote"),
    *("ordered_list", "bullet_list", "list_item", "table", "thead", "tbody", "tr", "th", "td"),
}


def blocks(text: str) -> Counter[str]:
    """Count the kinds of part of which a Markdown text is made; entities and escapes are text."""
    found: Counter[str] = Counter()
    reader = MarkdownIt("commonmark", {"linkify": False}).enable(["table", "strikethrough"])
    for token in reader.parse(text):
        for part in [token, *(token.children or [])]:
            kind = part.type.removesuffix("_open").removesuffix("_close")
            found["text" if kind in ("text_special", "entity") else kind] += 1
    return found


def check_markdown(label: str) -> None:
    text = markdown_of(named(label))
    found, plain = blocks(text), blocks(markdown_of(PLAIN))
    assert set(found) <= ALLOWED, set(found) - ALLOWED
    for kind in ("heading", "table", "blockquote", "ordered_list", "list_item"):
        assert found[kind] == plain[kind]
    cells = [len(re.findall(r"(?<!\\)\|", line)) for line in text.splitlines() if line[:1] == "|"]
    like = [line.count("|") for line in markdown_of(PLAIN).splitlines() if line[:1] == "|"]
    assert cells == like
    # Readers that make links of bare addresses find none.
    assert not re.search(r"(?<=\w)://|\bwww(?<!\\)\.|(?<!\\)@", text, re.IGNORECASE)


@labels
def test_markdown_holds_labels_as_text(label: str) -> None:
    check_markdown(label)


@few
@given(nasty.texts)
def test_markdown_holds_any_text(label: str) -> None:
    try:
        named(label)
    except ValidationError:
        return
    check_markdown(label)


@pytest.mark.parametrize("label", nasty.REFUSED)
def test_what_no_case_may_hold_is_cleaned_all_the_same(label: str) -> None:
    with pytest.raises(ValidationError):
        named(label)
    assert clean(label).replace(" ", "") in ("ab", "a[31mb")


@pytest.fixture(scope="module")
def browser(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Browser]:
    with Browser(tmp_path_factory.mktemp("profile")) as made:
        yield made


_TAGS = "Array.from(new Set(Array.from(document.querySelectorAll('*'), e => e.tagName))).sort()"
_EVENTS = """Array.from(document.querySelectorAll('*')).filter(function (e) {
  return Array.from(e.attributes).some(a => /^on|^href$|^src/.test(a.name));
}).length"""


@needs_browser
@labels
def test_a_browser_takes_labels_for_text(label: str, browser: Browser, tmp_path: Path) -> None:
    browser.complaints.clear()
    browser.requests.clear()
    findings = named(label)
    place = tmp_path / "sheet.html"
    place.write_text(page_of(PLAIN), encoding="utf-8")
    browser.open(place)
    like = browser.ask(_TAGS)
    place.write_text(page_of(findings), encoding="utf-8")
    browser.open(place)
    assert browser.ask("window.hit === undefined")
    assert browser.ask(_TAGS) == like
    assert browser.ask(_EVENTS) == 0
    assert browser.ask("document.title") == sheet(findings).page_title
    browser.ask("document.getElementById('ask-2').value = '1'")
    browser.ask("document.getElementById('own').dispatchEvent(new Event('input'))")
    said = browser.ask("document.getElementById('act').textContent")
    words = findings.case.words
    assert said.lower() in (clean(words.do_plus).lower(), clean(words.do_minus).lower()) or (
        said == "Keep watching"
    )
    assert browser.complaints == []
    assert set(browser.requests) == {place.as_uri()}
