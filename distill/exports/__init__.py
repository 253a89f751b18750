"""Exports: one file per format, each a pure function of the findings.

An export module has ``NAME``, a word or two for messages, and
``render(findings) -> dict[str, str | bytes]``, file name to content. It computes no figure of
its own and writes nothing. To add one, write the module and name it in :data:`MODULES`.
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from thumbwright.distill.findings import Findings

MODULES = (
    "sheet_html",
    "sheet_md",
    "rule_csv",
    "rule_json",
    "rule_schema",
    "rule_dmn",
    "code_python",
    "code_r",
    "code_javascript",
    "code_c",
)
"""The export modules of this package, in the order in which they are rendered."""

ON_REQUEST = ("sheet_pdf",)
"""Export modules that need an extra, rendered only where they are asked for."""


def render_all(findings: Findings) -> dict[str, str | bytes]:
    """Render every export; return all files, in the order of :data:`MODULES`.

    Modules are imported here, not at the top, so that the command line starts quickly.

    Raises
    ------
    ValueError
        If two exports write a file of the same name.
    """
    files: dict[str, str | bytes] = {}
    for module in MODULES:
        made = import_module(f"{__name__}.{module}").render(findings)
        twice = sorted(files.keys() & made.keys())
        if twice:
            raise ValueError(f"export {module} writes {', '.join(twice)}, which another wrote")
        files.update(made)
    return files
