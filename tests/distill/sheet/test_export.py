"""The finished files: structure, safety, forbidden words on the card, and repeatable bytes."""

from __future__ import annotations

import re

import pytest

from tests.distill.sheet import more_findings as more
from tests.distill.sheet.markup import Page
from thumbwright.distill.exports import sheet_html, sheet_md
from thumbwright.distill.sheet.page import digest, policy
from thumbwright.distill.sheet.parts import Grid
from thumbwright.distill.sheet.view import sheet

BANNED = r"\b(points?|steps?|silen\w+|commit\w*|log-odds|nats?)\b"


def html(name: str) -> str:
    made = sheet_html.render(more.EVERY[name]())
    assert list(made) == ["sheet.html"]
    return str(made["sheet.html"])


def markdown(name: str) -> str:
    made = sheet_md.render(more.EVERY[name]())
    assert list(made) == ["sheet.md"]
    return str(made["sheet.md"])


names = pytest.mark.parametrize("name", list(more.EVERY))


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
    card = sheet(more.EVERY[name]()).card
    table = re.search(r'<table class="strips.*?</table>', html(name), re.DOTALL)
    assert (table is not None) == (card.kind == "strips")
    if table is None:
        return
    found = re.findall(r'<tr>\n<th scope="row".*?</tr>', table.group(), re.DOTALL)
    spans = [sum(map(int, re.findall(r'colspan="(\d+)"', row))) for row in found]
    pegs = len(re.findall(r'<th scope="col"(?: class="zero")?>(?:<span|0)', table.group()))
    assert pegs == len(card.pegs) > 0
    assert spans == [pegs] * len(card.lines)
    assert f'class="strips boxes-{pegs}"' in table.group()


@names
def test_nothing_but_its_own_style_and_script_is_let_in(name: str) -> None:
    text = html(name)
    stated = next(
        attrs["content"]
        for _, attrs in Page(text).tags
        if attrs.get("http-equiv") == "Content-Security-Policy"
    )
    (style,) = re.findall(r"<style>(.*?)</style>", text, re.DOTALL)
    (script,) = re.findall(r"<script>(.*?)</script>", text, re.DOTALL)
    assert (
        stated
        == policy(style, script)
        == (
            f"default-src 'none'; style-src '{digest(style)}'; script-src '{digest(script)}';"
            " base-uri 'none'; form-action 'none'"
        )
    )
    lower = text.lower()
    assert lower.count("<script") == 2  # and the data, which no browser runs
    for word in ("http:", "https:", "url(", "@import", "<link", "<img", "src=", "style="):
        assert word not in lower
    assert not re.search(r"\son\w+=", lower)
    for word in ("fetch(", "xmlhttp", "websocket", "eval(", "innerhtml", "storage", "cookie"):
        assert word not in script.lower()


def test_digest_is_that_of_the_standard() -> None:
    # Content Security Policy Level 3, section on hashes: alert('Hello, world.'); from memory.
    expected = "sha256-qznLcsROx4GACP2dm0UCKCzCG+HiZ1guq6ZZDob/Tng="
    assert digest("alert('Hello, world.');") == expected


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
        first = module.render(more.EVERY[name]())
        assert first == module.render(more.EVERY[name]())
        for content in first.values():
            assert not re.search(r"20\d\d-\d\d-\d\d", str(content))
            assert str(content).endswith("\n")
            assert not re.search(r"[ \t]+\n\n\n", str(content))


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
