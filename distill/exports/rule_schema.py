"""The JSON Schema of ``rule.json`` (draft 2020-12, an open standard), laid beside it.

It is the same for every case, and kept as a file of the package.
"""

from __future__ import annotations

import importlib.resources

from thumbwright.distill.findings import Findings

NAME = "schema of the rule as JSON"

FILE = "rule.schema.json"


def render(_findings: Findings) -> dict[str, str | bytes]:
    """Return ``rule.schema.json``."""
    return {FILE: schema_text()}


def schema_text() -> str:
    """The schema as it stands in the package."""
    return importlib.resources.files("thumbwright.templates").joinpath(FILE).read_text("utf-8")
