"""Kinds of value a case file may hold, each with its own plain words for what is wrong.

The classes here are metadata for ``typing.Annotated``: they check a raw value before pydantic
does, so that a user reads "1.4 is not allowed (allowed from 0 to 1)" and no library's wording,
and they write the same bounds into the JSON Schema.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Annotated, Any

from pydantic import BaseModel, ConfigDict, Field, GetCoreSchemaHandler, GetJsonSchemaHandler
from pydantic_core import PydanticCustomError, core_schema

from thumbwright.distill.faults import is_control, shown

LONGEST_TEXT = 200
"""Most characters that one text of a case may have."""

ID_PATTERN = "^[A-Za-z][A-Za-z0-9_-]{0,39}$"
"""What names columns and code arguments: a letter, then letters, digits, ``-`` and ``_``."""

PLAIN = "plain"
"""Type of a pydantic error whose text is already in plain words."""


class Part(BaseModel):
    """Base of every table of a case: frozen, no unknown keys, no silent conversions."""

    model_config = ConfigDict(frozen=True, extra="forbid", strict=True)


def fault(text: str) -> PydanticCustomError:
    """An error that a model may raise and that is shown to the user word for word."""
    return PydanticCustomError(PLAIN, "{text}", {"text": text})


@dataclass(frozen=True)
class Within:
    """A finite number between two bounds; ``above`` and ``below`` exclude the bound itself.

    On an ``int`` field only whole numbers pass (3.0 does not); true and false never do.
    """

    low: float | None = None
    high: float | None = None
    above: float | None = None
    below: float | None = None
    whole: bool = False

    def check(self, value: Any) -> float | int:
        """Return the value, or raise in plain words."""
        if isinstance(value, bool) or not isinstance(value, int | float):
            unquote = "; write it without quotes" if isinstance(value, str) else ""
            raise fault(f"must be a number, not {shown(value)}{unquote}{self._allowed()}")
        if self.whole and not isinstance(value, int):
            raise fault(f"must be a whole number, not {shown(value)}{self._allowed()}")
        # Whole numbers of a case file can be too long for a float: abs() of them still compares.
        if abs(value) > 1e300 or not math.isfinite(value):
            raise fault(f"must be a finite number, not {shown(value)}{self._allowed()}")
        if not self._holds(value):
            raise fault(f"{shown(value)} is out of range{self._allowed()}")
        return value if self.whole else float(value) + 0.0  # no minus zero in digests

    def _holds(self, value: float) -> bool:
        return (
            (self.low is None or value >= self.low)
            and (self.high is None or value <= self.high)
            and (self.above is None or value > self.above)
            and (self.below is None or value < self.below)
        )

    def _allowed(self) -> str:
        if self.low is not None and self.high is not None:
            text = f"from {self.low:g} to {self.high:g}"
        else:
            bounds = (
                (self.low, "{:g} or more"),
                (self.above, "more than {:g}"),
                (self.high, "at most {:g}"),
                (self.below, "less than {:g}"),
            )
            text = " and ".join(form.format(bound) for bound, form in bounds if bound is not None)
        if not text:
            return ""
        return f" (allowed {'a whole number ' if self.whole else ''}{text})"

    def __get_pydantic_core_schema__(
        self, source: Any, handler: GetCoreSchemaHandler
    ) -> core_schema.CoreSchema:
        return core_schema.no_info_before_validator_function(self.check, handler(source))

    def __get_pydantic_json_schema__(
        self, schema: core_schema.CoreSchema, handler: GetJsonSchemaHandler
    ) -> dict[str, Any]:
        described = handler(schema)
        bounds = {
            "minimum": self.low,
            "maximum": self.high,
            "exclusiveMinimum": self.above,
            "exclusiveMaximum": self.below,
        }
        described.update({name: bound for name, bound in bounds.items() if bound is not None})
        return described


@dataclass(frozen=True)
class OneLine:
    """A text that people read: not empty, one line, at most :data:`LONGEST_TEXT` characters.

    Blanks around it are taken off. ``may_be_empty`` lets an empty text mean "left out".
    """

    may_be_empty: bool = False

    def check(self, value: Any) -> str:
        """Return the text, or raise in plain words."""
        if not isinstance(value, str):
            raise fault(f"must be text in quotes, not {shown(value)}")
        odd = next((char for char in value if is_control(char)), None)
        if odd is not None:
            raise fault(f"has a control character (U+{ord(odd):04X}): write one plain line of text")
        text = value.strip()
        if not text and not self.may_be_empty:
            raise fault("must not be empty")
        if len(text) > LONGEST_TEXT:
            raise fault(f"has {len(text)} characters (allowed at most {LONGEST_TEXT})")
        return text

    def __get_pydantic_core_schema__(
        self, source: Any, handler: GetCoreSchemaHandler
    ) -> core_schema.CoreSchema:
        return core_schema.no_info_before_validator_function(self.check, handler(source))

    def __get_pydantic_json_schema__(
        self, schema: core_schema.CoreSchema, handler: GetJsonSchemaHandler
    ) -> dict[str, Any]:
        described = handler(schema)
        described["minLength"] = 0 if self.may_be_empty else 1
        described["maxLength"] = LONGEST_TEXT
        return described


Number = Annotated[float, Within()]
Probability = Annotated[float, Within(0, 1)]
InnerProbability = Annotated[float, Within(above=0, below=1)]
Positive = Annotated[float, Within(above=0)]
NotNegative = Annotated[float, Within(low=0)]
Text = Annotated[str, OneLine()]
OptionalText = Annotated[str, OneLine(may_be_empty=True)]
Id = Annotated[str, Field(pattern=ID_PATTERN)]
