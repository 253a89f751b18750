"""The jinja2 environment that turns the parts of a sheet into text.

Templates and style are package data, so they are found in an installed wheel too. The
environment is sandboxed, undefined names are errors, and HTML escapes every value.

Templates of the user's own stand in for ours by name while :func:`in_place_of_ours` is in force.
They belong to one run, not to an export: every export stays a function of the findings alone.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from contextlib import contextmanager
from contextvars import ContextVar
from dataclasses import dataclass, field
from functools import lru_cache, partial
from importlib.resources import files
from pathlib import Path
from types import MappingProxyType
from typing import Any

from jinja2 import FunctionLoader, StrictUndefined, TemplateError, TemplateSyntaxError
from jinja2.sandbox import SandboxedEnvironment

from thumbwright.distill.faults import Faults, fault_line

SUFFIXES = (".j2", ".css", ".js")
"""How the names of templates end; other package data cannot be replaced."""


@dataclass(frozen=True, eq=False)
class Templates:
    """Templates by name that stand in for ours, and the folder they come from, for messages."""

    folder: str = ""
    texts: Mapping[str, str] = field(default_factory=lambda: MappingProxyType({}))


OURS = Templates()
_IN_FORCE: ContextVar[Templates] = ContextVar("templates", default=OURS)


def template_names() -> tuple[str, ...]:
    """Return the names of our templates: those that can be replaced."""
    found = (item.name for item in files("thumbwright.templates").iterdir() if item.is_file())
    return tuple(sorted(name for name in found if name.endswith(SUFFIXES)))


def read_templates(folder: Path) -> Templates:
    """Read a folder of templates that stand in for ours by name; hidden files are passed over.

    Raises
    ------
    Faults
        If a name is none of ours, or a file is no text or no template; all such files at once.
    """
    allowed, texts, messages = template_names(), {}, []
    places = sorted(place for place in folder.iterdir() if not place.name.startswith("."))
    unknown = [place.name for place in places if place.name not in allowed or not place.is_file()]
    if unknown:
        text = f"no template of that name: {', '.join(unknown)} (allowed: {', '.join(allowed)})"
        messages.append(fault_line(str(folder), None, "", text))
    for place in places:
        if place.name in unknown:
            continue
        try:
            texts[place.name] = place.read_bytes().decode("utf-8-sig")
        except UnicodeDecodeError:
            messages.append(fault_line(str(place), None, "", "is not UTF-8 text"))
            continue
        try:
            environment(True).parse(texts[place.name])
        except TemplateSyntaxError as error:
            messages.append(fault_line(str(place), error.lineno, "", str(error.message)))
    if not places:
        text = f"holds no template (allowed: {', '.join(allowed)})"
        messages.append(fault_line(str(folder), None, "", text))
    if messages:
        raise Faults(messages)
    return Templates(str(folder), MappingProxyType(texts))


@contextmanager
def in_place_of_ours(own: Templates) -> Iterator[None]:
    """Let templates stand in for ours until the end of the block.

    Raises
    ------
    Faults
        In place of any error of a template while there are such templates, with file and line
        where they are known.
    """
    before = _IN_FORCE.set(own)
    try:
        yield
    except TemplateError as error:
        if own is OURS:
            raise
        raise Faults([_told(error, own)]) from error
    finally:
        _IN_FORCE.reset(before)


@lru_cache(maxsize=4)
def environment(autoescape: bool, own: Templates = OURS) -> SandboxedEnvironment:
    """Return an environment; without ``autoescape`` the caller hands over escaped text.

    The same one is returned again, since it keeps its compiled templates.
    """
    return SandboxedEnvironment(
        loader=FunctionLoader(partial(_source, own)),
        autoescape=autoescape,
        undefined=StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
        keep_trailing_newline=True,
    )


def rendered(template: str, values: dict[str, Any], autoescape: bool = True) -> str:
    """Fill a template of ours, or the one that stands in for it.

    Raises
    ------
    jinja2.TemplateError
        If the template, or a value that it uses, is missing, or the sandbox refuses it.
    """
    return environment(autoescape, _IN_FORCE.get()).get_template(template).render(values)


def _source(own: Templates, name: str) -> tuple[str, str, None] | None:
    """Return the text of a template and where it is from; ``None`` where there is none."""
    if name in own.texts:
        return own.texts[name], str(Path(own.folder) / name), None
    if "/" in name or "\\" in name or not name.endswith(SUFFIXES):
        return None
    found = files("thumbwright.templates") / name
    return (found.read_text("utf-8"), name, None) if found.is_file() else None


def _told(error: TemplateError, own: Templates) -> str:
    """Say what is wrong with a template, and where: the innermost line of a template."""
    place, line, trace = own.folder, None, error.__traceback__
    while trace is not None:
        name = trace.tb_frame.f_code.co_filename
        if Path(name).name in template_names():
            place, line = name, trace.tb_lineno
        trace = trace.tb_next
    return fault_line(place, line, "", error.message or type(error).__name__)
