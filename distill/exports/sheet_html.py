"""The policy sheet as one HTML file: style, pictures and script inside, no network."""

from __future__ import annotations

from thumbwright.distill.findings import Findings
from thumbwright.distill.sheet.page import page
from thumbwright.distill.sheet.view import sheet

NAME = "policy sheet"


def render(findings: Findings) -> dict[str, str | bytes]:
    """Return ``sheet.html``."""
    return {"sheet.html": page(sheet(findings))}
