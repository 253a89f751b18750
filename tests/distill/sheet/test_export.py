"""The finished files: structure, safety, forbidden words on the card, and repeatable bytes."""

from __future__ import annotations

import re
from typing import Any

import pytest

from tests.distill.sheet import sample_findings as samples
from tests.distill.sheet.markup import Page
from thumbwright.distill.exports import sheet_html, sheet_md
from thumbwright.distill.sheet.parts import Grid

NASTY = '"><script>alert(1)</script><img src=x onerror=alert(2)>{{ 7*7 }}{% raw %}&amp;|`*_'
BANNED = r"\b(points?|steps?|silen\w+|commit\w*|log-odds|nats?)\b"


def html(name: str) -> str:
    made = sheet_html.render(samples.SAMPLES[name]())
    assert list(made) == ["sheet.html"]
    return str(made["sheet.html"])


def markdown(name: str) -> str:
    made = sheet_md.render(samples.SAMPLES[name]())
    assert list(made) == ["sheet.md"]
    return str(made["sheet.md"])


names = pytest.mark.parametrize("name", list(samples.SAMPLES))


@names
def test_page_is_well_formed_and_in_order(name: str) -> None:
    page = Page(html(name))
    tags = [tag for tag, _ in page.tags]
    assert tags.count("h1") == 1
    assert tags.count("title") >= 1
    assert page.headings[0] == 1
    for before, after in zip(page.headings, page.headings[1:], strict=False):
        assert after <= before + 1
    assert ("html", {"lang": "en"}) in page.tags
    assert page.ids.count("card") == page.ids.count("modeller") == 1
    assert tags.count("table") == tags.count("caption")
    for tag, attrs in page.tags:
        if tag == "th":
            assert attrs.get("scope") in ("row", "col")
        for pointer in ("aria-labelledby", "aria-describedby"):
            for target in (attrs.get(pointer) or "").split():
                assert target in page.ids


@names
def test_rows_of_strips_fill_the_scale(name: str) -> None:
    found = re.findall(r'<tr role="row">\n<th scope="row".*?</tr>', html(name), re.DOTALL)
    spans = [sum(map(int, re.findall(r'colspan="(\d+)"', row))) for row in found]
    pegs = len(
        re.findall(r'<th scope="col" role="columnheader"(?: class="zero")?>(?:<span|0)', html(name))
    )
    spans = [span for span in spans if span]
    assert spans == [pegs] * len(spans)


@names
def test_nothing_is_fetched_or_run(name: str) -> None:
    text = html(name)
    policy = next(
        attrs["content"]
        for tag, attrs in Page(text).tags
        if attrs.get("http-equiv") == "Content-Security-Policy"
    )
    assert policy == (
        "default-src 'none'; style-src 'unsafe-inline'; base-uri 'none'; form-action 'none'"
    )
    lower = text.lower()
    for word in ("<script", "http:", "https:", "url(", "@import", "<link", "<img", "src="):
        assert word not in lower
    assert not re.search(r"\son\w+=", lower)


@names
def test_card_speaks_plainly(name: str) -> None:
    text = Page(html(name)).text("card")
    assert not re.search(f"{BANNED}|\\bminus\\b", text, re.I)
    assert not re.search(r"[−–\u0370-\u03ff½⅓¼¾]|(?<!\w)-\s?\d|\d\s?/\s?\d|\d\.\d|%", text)


@names
def test_markdown_card_speaks_plainly(name: str) -> None:
    text = markdown(name).split("## For the modeller")[0]
    text = re.sub(r"^thumbwright .*$", "", text, flags=re.M)
    assert not re.search(BANNED, text, re.I)
    assert not re.search(r"[−\u0370-\u03ff½⅓¼¾]|(?<![\w-])-\d|\d\s?/\s?\d|\d\.\d|%", text)


@names
def test_same_findings_same_bytes(name: str) -> None:
    for module in (sheet_html, sheet_md):
        first = module.render(samples.SAMPLES[name]())
        assert first == module.render(samples.SAMPLES[name]())
        for content in first.values():
            assert not re.search(r"20\d\d-\d\d-\d\d", str(content))
            assert str(content).endswith("\n")
            assert not re.search(r"[ \t]+\n\n\n", str(content))


def contrast(one: str, other: str) -> float:
    """Return the contrast of two colours by the formula of WCAG 2 (relative luminance)."""

    def luminance(colour: str) -> float:
        parts = [int(colour[at : at + 2], 16) / 255 for at in (1, 3, 5)]
        line = [p / 12.92 if p <= 0.04045 else ((p + 0.055) / 1.055) ** 2.4 for p in parts]
        return 0.2126 * line[0] + 0.7152 * line[1] + 0.0722 * line[2]

    low, high = sorted((luminance(one), luminance(other)))
    return (high + 0.05) / (low + 0.05)


def test_contrast_by_day_and_night() -> None:
    style = Page(html("frost")).style
    day, night = (
        dict(re.findall(r"--(\w+): (#\w{6})", part))
        for part in re.findall(r":root \{(.*?--paper.*?)\}", style, re.DOTALL)
    )
    assert contrast("#ffffff", "#767676") == pytest.approx(4.54, abs=0.01)
    for colours in (day, night):
        for text, ground in (
            ("ink", "paper"),
            ("ink", "sand"),
            ("soft", "paper"),
            ("soft", "sand"),
        ):
            assert contrast(colours[text], colours[ground]) >= 4.5


def nasty_case() -> dict[str, Any]:
    words = {key: f"{NASTY} {key}" for key in samples.FROST["words"]}
    agents = {
        "upper": {"name": f"{NASTY} upper", "thresholds": "even", "sees": []},
        "mill": {"name": f"{NASTY} mill", "thresholds": "even", "sees": ["upper"]},
    }
    question = samples.FROST["question"] | {"plus": f"{NASTY} yes", "minus": f"{NASTY} no"}
    time = {"horizon": 40, "step_label": NASTY}
    return {"title": NASTY, "words": words, "agents": agents, "question": question, "time": time}


def test_labels_are_data_in_html() -> None:
    plain = Page(html("frost"))
    text = str(sheet_html.render(samples.frost(**nasty_case()))["sheet.html"])
    page = Page(text)
    assert "<script" not in text
    assert "<img" not in text
    assert "{{ 7*7 }}" in text
    assert {tag for tag, _ in page.tags} == {tag for tag, _ in plain.tags}
    known = {name for _, attrs in plain.tags for name in attrs}
    assert {name for _, attrs in page.tags for name in attrs} <= known
    assert NASTY in page.text("card")


def test_labels_are_data_in_markdown() -> None:
    text = str(sheet_md.render(samples.frost(**nasty_case()))["sheet.md"])
    assert "<" not in text
    assert not re.search(r"(?<!\\)`", text)
    tables = [line for line in text.splitlines() if line.startswith("|")]
    rows = [len(re.findall(r"(?<!\\)\|", line)) for line in tables]
    plain = [line.count("|") for line in markdown("frost").splitlines() if line.startswith("|")]
    assert rows == plain


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        ("a|b", r"a\|b"),
        ("`code` *x* _y_", r"\`code\` \*x\* \_y\_"),
        ("<b>&lt; & co", "&lt;b&gt;&amp;lt; & co"),
        ("[x](javascript:y)", r"\[x\](javascript:y)"),
        ("two\nlines", "two lines"),
        ("# no heading", r"\# no heading"),
        ("1. no list", r"1\. no list"),
        ("- no list", r"\- no list"),
        ("see https://x.y or www.x.y or a@b.c", r"see https\://x.y or www\.x.y or a\@b.c"),
        ("10 minutes", "10 minutes"),
    ],
)
def test_markdown_escapes(text: str, expected: str) -> None:
    assert sheet_md.escaped(text) == expected


def test_markdown_tables_are_padded() -> None:
    grid = Grid("x", ("", "of 100"), (("this | card", "22"), ("alone", "3")), frozenset({0}))
    assert sheet_md.table(grid) == (
        "|                  | of 100 |\n"
        "| ---------------- | ------ |\n"
        "| **this \\| card** | **22** |\n"
        "| alone            | 3      |"
    )


def test_markdown_of_frost() -> None:
    text = markdown("frost")
    assert text.startswith(
        "# Frost tonight?\n\nFrost watch in two orchards\n\nOnly for **Mill field**, watching Upper"
    )
    line = "| B    | Dark, check 3 on; and known to be on watch | mild 4 or more | frost 3 or more"
    assert line in text
    assert not re.search(r"\n{4,}", text)
