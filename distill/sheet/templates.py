"""The jinja2 environment that turns the parts of a sheet into text.

Templates and style are package data, so they are found in an installed wheel too. The
environment is sandboxed, undefined names are errors, and HTML escapes every value.
"""

from __future__ import annotations

from importlib.resources import files
from typing import Any

from jinja2 import FunctionLoader, StrictUndefined
from jinja2.sandbox import SandboxedEnvironment


def _source(name: str) -> str | None:
    """Return the text of a template of ours; ``None`` where there is none of that name."""
    if "/" in name or "\\" in name:
        return None
    found = files("thumbwright.templates") / name
    return found.read_text("utf-8") if found.is_file() else None


def environment(autoescape: bool) -> SandboxedEnvironment:
    """Return an environment; without ``autoescape`` the caller hands over escaped text."""
    return SandboxedEnvironment(
        loader=FunctionLoader(_source),
        autoescape=autoescape,
        undefined=StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
        keep_trailing_newline=True,
    )


def rendered(template: str, values: dict[str, Any], autoescape: bool = True) -> str:
    """Fill a template of ours.

    Raises
    ------
    jinja2.TemplateNotFound, jinja2.UndefinedError
        If the template, or a value that it uses, is missing.
    """
    return environment(autoescape).get_template(template).render(values)
