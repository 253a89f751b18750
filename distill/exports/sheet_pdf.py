"""The policy sheet as PDF, laid out by WeasyPrint; made on request, with the extra ``pdf``.

The file holds no date and no random mark, so that the same findings give the same bytes wherever
the same fonts and the same version of WeasyPrint are installed.
"""

from __future__ import annotations

import logging
from collections.abc import Iterator
from contextlib import contextmanager
from typing import Any

from thumbwright.distill.faults import Faults
from thumbwright.distill.findings import Findings
from thumbwright.distill.sheet.page import page
from thumbwright.distill.sheet.view import sheet

NAME = "policy sheet for printing"


def layout() -> Any:
    """Return the package that lays out pages.

    Raises
    ------
    Faults
        If it, or what it needs of the machine, is missing.
    """
    try:
        import weasyprint
    except (ImportError, OSError) as reason:
        raise Faults(
            [
                "--pdf needs the extra pdf: pip install 'thumbwright[pdf]', and the Pango library"
                f" of the machine ({str(reason).splitlines()[0]})",
            ]
        ) from reason
    return weasyprint


def render(findings: Findings) -> dict[str, str | bytes]:
    """Return ``sheet.pdf``.

    Raises
    ------
    Faults
        If the extra is not installed.
    """
    with _quietly():
        document = layout().HTML(string=page(sheet(findings)), url_fetcher=_refuse)
        made: bytes = document.write_pdf(pdf_tags=True)
    return {"sheet.pdf": made}


def _refuse(url: str, **_: Any) -> Any:
    raise ValueError(f"a sheet fetches nothing, and so not {url}")


@contextmanager
def _quietly() -> Iterator[None]:
    """Keep remarks on styles for the screen, which do not matter on paper, off the terminal."""
    logger = logging.getLogger("weasyprint")
    before = logger.level
    logger.setLevel(logging.CRITICAL)
    try:
        yield
    finally:
        logger.setLevel(before)
