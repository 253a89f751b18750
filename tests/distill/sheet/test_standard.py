"""The sheet against the standards of HTML, CSS, SVG and ARIA, by the Nu checker from npm."""

from __future__ import annotations

import json
import shutil
import subprocess
from pathlib import Path
from typing import Any

import pytest

from tests.distill.sheet import more_findings as more, nasty, sample_findings as samples
from thumbwright.distill.exports import sheet_html
from thumbwright.distill.findings import Findings

FOLDER = Path(__file__).resolve().parent / "checker"
CHECKER = FOLDER / "node_modules" / "vnu-jar" / "build" / "dist" / "vnu.jar"
UNREAD = "violates Content Security Policy (meta tag): blocked by"
"""The checker does not compare digests; that a browser does is tested with the look-up."""

pytestmark = pytest.mark.skipif(
    shutil.which("java") is None or not CHECKER.is_file(),
    reason="needs java, and: npm ci --ignore-scripts --prefix tests/distill/sheet/checker",
)


def write(page: str, place: Path) -> None:
    place.write_text(page, encoding="utf-8")


def remarks(folder: Path) -> list[dict[str, Any]]:
    """What the checker says of all pages in a folder, remarks on style included."""
    done = subprocess.run(
        ["java", "-jar", str(CHECKER), "--format", "json", *map(str, sorted(folder.iterdir()))],
        capture_output=True,
        text=True,
        timeout=300,
    )
    found: list[dict[str, Any]] = json.loads(done.stderr)["messages"]
    return [one for one in found if UNREAD not in one["message"]]


def page_of(findings: Findings) -> str:
    return str(sheet_html.render(findings)["sheet.html"])


def test_every_sample_keeps_to_the_standards(tmp_path: Path) -> None:
    for name, make in more.EVERY.items():
        write(page_of(make()), tmp_path / f"{name}.html")
    for number, label in enumerate(nasty.LABELS[:12]):
        write(page_of(samples.frost(**nasty.case_of(label))), tmp_path / f"label-{number}.html")
    assert len(list(tmp_path.iterdir())) == len(more.EVERY) + 12
    assert remarks(tmp_path) == []


SLIPS = (
    ("</caption>", "</capton>"),
    ('<th scope="row">', '<th scope="line">'),
    ("<h1 ", '<h1 role="row" '),
    ("margin: 0;", "margin: red;"),
    ('<path class="axis"', '<pth class="axis"'),
)


def test_slips_are_noticed(tmp_path: Path) -> None:
    page = page_of(samples.frost())
    for number, (good, bad) in enumerate(SLIPS):
        assert good in page
        write(page.replace(good, bad, 1), tmp_path / f"slip-{number}.html")
    wrong = {Path(one["url"]).name for one in remarks(tmp_path) if one["type"] == "error"}
    assert wrong == {f"slip-{number}.html" for number in range(len(SLIPS))}
