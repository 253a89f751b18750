"""From pydantic's errors to faults in plain words, with allowed values and a likely meaning.

Only the shape of tables and lists is worded here; numbers and texts come with their own words
from ``distill.fields``.
"""

from __future__ import annotations

import re
from collections.abc import Mapping
from typing import Any

from pydantic import BaseModel, ValidationError
from pydantic_core import ErrorDetails

from thumbwright.distill.case import (
    CaseFile,
    Costs,
    Question,
    RuleWanted,
    Thresholds,
    Time,
    Words,
)
from thumbwright.distill.evidence_keys import EVIDENCE_KINDS
from thumbwright.distill.faults import Key, close_match, hint, quoted, shown
from thumbwright.distill.fields import PLAIN
from thumbwright.distill.group_keys import AgentTable, Network
from thumbwright.distill.plain import Plain

_SECTIONS: dict[str, type[BaseModel]] = {
    "question": Question,
    "words": Words,
    "time": Time,
    "network": Network,
    "rule": RuleWanted,
    "costs": Costs,
}
_NAMED: dict[str, type[BaseModel]] = {"thresholds": Thresholds, "agents": AgentTable}


def structural_faults(document: Mapping[str, Any]) -> tuple[list[tuple[Key, str]], set[Key]]:
    """Check every key of a document on its own.

    Returns
    -------
    faults : list of (key, text)
        In plain words.
    faulty : set of keys
        Where values cannot be relied on.
    """
    try:
        CaseFile.model_validate(dict(document))
    except ValidationError as error:
        details = error.errors(include_url=False)
    else:
        return [], set()
    faults: list[tuple[Key, str]] = []
    faulty: set[Key] = set()
    for detail in details:
        key = _key(detail)
        if detail["type"] != "string_pattern_mismatch":
            faulty.add(key)
        if not _is_explained(document, detail["type"], key):
            faults.append((key, _text(document, detail, key)))
    return faults, faulty


def allowed_keys(document: Mapping[str, Any], table: Key) -> list[str]:
    """The keys that may stand in a table of a case file, in the order of the models."""
    model: type[BaseModel] | None = None
    if not table:
        model = CaseFile
    elif table[-1] == "evidence" and len(table) in (1, 3):
        kind = Plain(document).get(*table, "kind")
        model = EVIDENCE_KINDS.get(kind) if isinstance(kind, str) else None
    elif len(table) == 1:
        model = _SECTIONS.get(str(table[0]))
    elif len(table) == 2:
        model = _NAMED.get(str(table[0]))
    if model is None:
        return []
    keys = [field.alias or name for name, field in model.model_fields.items()]
    # The kind leads, as people write it; the fields shared by all kinds come after.
    return sorted(keys, key=lambda name: (name != "kind", name == "tolerance"))


def _key(detail: ErrorDetails) -> Key:
    """Where an error is, without the marks pydantic adds for a kind or for a table's name."""
    key = detail["loc"]
    if key and key[-1] == "[key]" and detail["type"] == "string_pattern_mismatch":
        return key[:-1]
    for place in (1, 3):
        is_evidence = key[place - 1 : place] == ("evidence",) and (place == 1 or key[0] == "agents")
        if is_evidence and len(key) > place and key[place] in EVIDENCE_KINDS:
            return key[:place] + key[place + 1 :]
    return key


def _is_explained(document: Mapping[str, Any], kind: str, key: Key) -> bool:
    """Whether a missing key needs no message, because a better one says what is wrong."""
    if kind != "missing":
        return False
    allowed = allowed_keys(document, key[:-1])
    written = Plain(document).table(*key[:-1]) if key[:-1] else document
    return any(close_match(word, allowed) == key[-1] for word in written if word not in allowed)


def _text(document: Mapping[str, Any], detail: ErrorDetails, key: Key) -> str:
    kind, value, context = detail["type"], detail["input"], detail.get("ctx", {})
    if kind == PLAIN:
        return str(context["text"])
    if kind == "missing":
        return _missing(document, key)
    if kind == "extra_forbidden":
        name = "section" if isinstance(value, dict) and len(key) == 1 else "key"
        return f"is an unknown {name}{hint(key[-1], allowed_keys(document, key[:-1]))}"
    if kind == "literal_error":
        allowed = re.findall(r"'([^']*)'", str(context["expected"]))
        return f"{shown(value)} is not known here{hint(value, allowed)}"
    if kind == "union_tag_invalid":
        word = value.get("kind")
        return f"its kind is {shown(word)}{hint(word, [*EVIDENCE_KINDS])}"
    if kind == "union_tag_not_found":
        return f"its kind is missing{hint('', [*EVIDENCE_KINDS])}"
    if kind in ("model_type", "model_attributes_type", "dict_type"):
        return f"must be a table, not {shown(value)}"
    if kind == "list_type":
        return f"must be a list in [ ], not {shown(value)}"
    if kind in ("too_short", "too_long"):
        count = context.get("min_length", context.get("max_length"))
        what = "entry" if count == 1 else "entries"
        return f"has too {kind[4:]} a list (allowed {count} {what} or more)"
    if kind == "string_type":
        return f"must be text in quotes, not {shown(value)}"
    if kind == "string_pattern_mismatch":
        return (
            f"{quoted(str(value))} cannot name a column (allowed a letter first, then letters "
            "a-z A-Z, digits, - and _, at most 40 characters)"
        )
    return "is not what belongs here"


def _missing(document: Mapping[str, Any], key: Key) -> str:
    if len(key) == 1 and (key[0] in _SECTIONS or key[0] in _NAMED or key[0] == "evidence"):
        form = f"[{key[0]}.NAME]" if key[0] in _NAMED else f"[{key[0]}]"
        return f"the section {form} is missing"
    if key == ("rule", "agent"):
        agents = Plain(document).table("agents")
        return f"is missing, so the rule is for nobody{hint('', ['any', *agents])}"
    if key == ("question", "stakes"):
        return f"is missing{hint('', ['people', 'animals', 'property', 'none'])}"
    return "is missing"
