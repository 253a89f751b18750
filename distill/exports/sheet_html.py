"""The policy sheet as one HTML file: style and pictures inside, no network, no script."""

from __future__ import annotations

from thumbwright.distill.findings import Findings
from thumbwright.distill.sheet.templates import rendered
from thumbwright.distill.sheet.view import sheet

NAME = "policy sheet"


def render(findings: Findings) -> dict[str, str | bytes]:
    """Return ``sheet.html``."""
    return {"sheet.html": rendered("sheet.html.j2", {"sheet": sheet(findings)})}
