"""The sheet as one page of HTML whose policy lets nothing in but its own style and script.

The policy names style and script by their digests, which are worked out from the very text that
stands in the page; anything else that would be styled, run, fetched or sent is refused by the
reader's browser.
"""

from __future__ import annotations

import base64
import hashlib

from markupsafe import Markup

from thumbwright.distill.faults import Faults
from thumbwright.distill.sheet.parts import Sheet
from thumbwright.distill.sheet.templates import rendered

STYLE, SCRIPT = "sheet.css", "sheet_lookup.js"


def page(sheet: Sheet) -> str:
    """Return the whole page.

    Raises
    ------
    Faults
        If a style or script that stands in for ours would end its own element.
    """
    style, script = _inner(STYLE, "style"), _inner(SCRIPT, "script")
    values = {
        "sheet": sheet,
        "style": Markup(style),  # noqa: S704 - a template of ours, which holds no word of the case
        "script": Markup(script),  # noqa: S704 - likewise
        "policy": policy(style, script),
    }
    return rendered("sheet.html.j2", values)


def policy(style: str, script: str) -> str:
    """Return the content-security policy of a page with this one style and this one script."""
    return "; ".join(
        (
            "default-src 'none'",
            f"style-src '{digest(style)}'",
            f"script-src '{digest(script)}'",
            "base-uri 'none'",
            "form-action 'none'",
        )
    )


def digest(text: str) -> str:
    """Return the source expression for an inline element that holds exactly this text."""
    # A browser hashes what its parser hands over, in which every line end is one line feed.
    return "sha256-" + base64.b64encode(hashlib.sha256(text.encode()).digest()).decode()


def _inner(template: str, element: str) -> str:
    text = rendered(template, {}).replace("\r\n", "\n").replace("\r", "\n").strip("\n") + "\n"
    if f"</{element}" in text.lower() or (element == "script" and "<!--" in text):
        raise Faults([f"{template}: may not hold </{element} or <!--, which would end it early"])
    return text
