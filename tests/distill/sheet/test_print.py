"""The sheet as a browser prints it on A4: what must stand on page 1 stands there.

Runs where Chromium, ``pdftotext`` and a face as wide as Arial are installed.
"""

from __future__ import annotations

import re
import shutil
import subprocess
import sys
import time
from pathlib import Path

import pytest

from tests.distill.sheet import more_findings as more
from thumbwright.distill.exports import sheet_html, sheet_pdf
from thumbwright.distill.faults import Faults
from thumbwright.distill.sheet.view import sheet

BROWSER = next(filter(None, map(shutil.which, ("chromium", "chromium-browser"))), None)
FLAGS = (
    "--headless",
    "--no-sandbox",
    "--disable-gpu",
    "--disable-quic",
    "--no-first-run",
    "--disable-background-networking",
    "--disable-component-update",
    "--disable-sync",
    "--no-pdf-header-footer",
)

PLAIN = r"[\u0370-\u03ff−½⅓¼¾⅔]|log-odds|\bnats?\b|(?<![\w-])-\s?\d|\d\s?/\s?\d|\d\.\d|%"
"""What has no place on a card: Greek letters, minus signs, fractions, the modeller's units."""


def no_pdf() -> str:
    """Why the extra ``pdf`` cannot run here, or an empty text."""
    try:
        sheet_pdf.layout()
    except Faults as missing:
        return missing.messages[0]
    return ""


reads_print = pytest.mark.skipif(shutil.which("pdftotext") is None, reason="no pdftotext")
needs_browser = pytest.mark.skipif(BROWSER is None, reason="no browser to print with")
needs_pdf = pytest.mark.skipif(bool(no_pdf()), reason=no_pdf() or "-")
names = pytest.mark.parametrize("name", list(more.EVERY))


def pages(name: str, folder: Path) -> list[str]:
    """Print a sample and return the text of each page, spaces evened out."""
    made = more.EVERY[name]()
    page, pdf = folder / "sheet.html", folder / "sheet.pdf"
    page.write_text(str(sheet_html.render(made)["sheet.html"]), encoding="utf-8")
    command = [str(BROWSER), *FLAGS, f"--user-data-dir={folder / 'profile'}"]
    subprocess.run(
        [*command, f"--print-to-pdf={pdf}", page.as_uri()],
        check=True,
        capture_output=True,
        timeout=120,
    )
    return text_of(pdf)


def text_of(pdf: Path) -> list[str]:
    """Return the text of each page."""
    text = subprocess.run(
        ["pdftotext", "-raw", str(pdf), "-"], check=True, capture_output=True, text=True
    ).stdout
    return [" ".join(part.split()) for part in text.split("\f")]


@reads_print
@needs_browser
@names
def test_page_one_holds_card_caution_and_costs(name: str, tmp_path: Path) -> None:
    check_pages(name, pages(name, tmp_path))


@reads_print
@needs_pdf
@names
def test_page_one_of_the_pdf_too(name: str, tmp_path: Path) -> None:
    (tmp_path / "sheet.pdf").write_bytes(bytes_of(name))
    check_pages(name, text_of(tmp_path / "sheet.pdf"))


def bytes_of(name: str) -> bytes:
    made = sheet_pdf.render(more.EVERY[name]())
    assert list(made) == ["sheet.pdf"]
    content = made["sheet.pdf"]
    assert isinstance(content, bytes)
    return content


@needs_pdf
def test_pdf_repeats_and_knows_no_date() -> None:
    first = bytes_of("frost")
    time.sleep(1.1)  # dates in a PDF are told to the second
    assert bytes_of("frost") == first
    assert b"CreationDate" not in first
    assert first.startswith(b"%PDF")


def test_pdf_without_its_extra_is_a_plain_fault(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setitem(sys.modules, "weasyprint", None)
    with pytest.raises(Faults, match=r"pip install 'thumbwright\[pdf\]'"):
        sheet_pdf.render(more.EVERY["frost"]())


def joined(text: str) -> str:
    """Leave out blanks: a line may end after a hyphen."""
    return "".join(text.split())


def check_pages(name: str, printed: list[str]) -> None:
    """Page 1 holds the card, the caution and the costs, in plain words; the back comes after."""
    made = sheet(more.EVERY[name]())
    assert not re.search(PLAIN, printed[0].split("thumbwright ")[0])
    assert re.search(PLAIN, " ".join(printed[1:]))
    assert made.lookup.heading not in " ".join(printed)
    if made.card.kind in ("strips", "numbers") and not made.long:
        for line in made.card.lines:
            assert joined(f"{line.letter} {line.heading}") in joined(printed[0])
    for sentence in (*made.cautions, *made.supposes):
        assert sentence in printed[0]
    assert made.cost_heading in printed[0]
    for row in made.costs.rows:
        assert row[0] in printed[0]
    if not made.long:
        assert all(note.lead in printed[0] for note in made.notes)
        assert made.foot in printed[0]
    assert "For the modeller" not in printed[0]
    assert any("For the modeller" in page for page in printed[1:])
