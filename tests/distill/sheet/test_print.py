"""The sheet as a browser prints it on A4: what must stand on page 1 stands there.

Runs where Chromium, ``pdftotext`` and a face as wide as Arial are installed.
"""

from __future__ import annotations

import shutil
import subprocess
from pathlib import Path

import pytest

from tests.distill.sheet import sample_findings as samples
from thumbwright.distill.exports import sheet_html
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

pytestmark = pytest.mark.skipif(
    BROWSER is None or shutil.which("pdftotext") is None, reason="no browser to print with"
)


def pages(name: str, folder: Path) -> list[str]:
    """Print a sample and return the text of each page, spaces evened out."""
    made = samples.SAMPLES[name]()
    page, pdf = folder / "sheet.html", folder / "sheet.pdf"
    page.write_text(str(sheet_html.render(made)["sheet.html"]), encoding="utf-8")
    command = [str(BROWSER), *FLAGS, f"--user-data-dir={folder / 'profile'}"]
    subprocess.run(
        [*command, f"--print-to-pdf={pdf}", page.as_uri()],
        check=True,
        capture_output=True,
        timeout=120,
    )
    text = subprocess.run(
        ["pdftotext", "-raw", str(pdf), "-"], check=True, capture_output=True, text=True
    ).stdout
    return [" ".join(part.split()) for part in text.split("\f")]


@pytest.mark.parametrize("name", list(samples.SAMPLES))
def test_page_one_holds_card_caution_and_costs(name: str, tmp_path: Path) -> None:
    made = sheet(samples.SAMPLES[name]())
    printed = pages(name, tmp_path)
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
