"""The JSON Schema (draft 2020-12, an open standard) of a pydantic model, as editors want it."""

from __future__ import annotations

from typing import Any

from pydantic import BaseModel

DIALECT = "https://json-schema.org/draft/2020-12/schema"


def editor_schema(model: type[BaseModel]) -> dict[str, Any]:
    """Return the schema of ``model`` fitted to TOML and to the standard's own keywords.

    TOML has no null, so optional keys may be left out but never be null; a discriminator is no
    keyword of the standard; tables whose names follow a pattern allow no other names; either
    ``agents`` or ``network`` is there.
    """
    schema = model.model_json_schema(by_alias=True)
    fitted: dict[str, Any] = {"$schema": DIALECT, **_fit(schema)}
    if {"agents", "network"} <= set(fitted.get("properties", {})):
        fitted["oneOf"] = [{"required": ["agents"]}, {"required": ["network"]}]
    return fitted


def _fit(node: Any) -> Any:
    if isinstance(node, list):
        return [_fit(entry) for entry in node]
    if not isinstance(node, dict):
        return node
    fitted = {}
    for key, value in node.items():
        if key == "discriminator":
            continue
        if key == "default" and (value in (None, "") or isinstance(value, dict)):
            continue  # stands for "left out"
        if key == "title" and isinstance(value, str):
            continue  # made from the Python name; descriptions say more
        if key in ("default", "enum", "const"):
            fitted[key] = value
        else:
            fitted[key] = _fit(value)
    choices = fitted.get("anyOf")
    if isinstance(choices, list) and {"type": "null"} in choices:
        left = [choice for choice in choices if choice != {"type": "null"}]
        if len(left) == 1:
            del fitted["anyOf"]
            fitted = {**left[0], **fitted}
        else:
            fitted["anyOf"] = left
    if "patternProperties" in fitted:
        fitted.setdefault("additionalProperties", False)
    return fitted
