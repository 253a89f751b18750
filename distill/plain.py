"""Reading a raw document without trusting it: every look-up may come back empty.

Checks between sections must say what they can even where other keys are wrong. They read
the document through :class:`Plain`, which hides what is missing, of the wrong type, or
already reported.
"""

from __future__ import annotations

from collections.abc import Collection, Mapping
from dataclasses import dataclass, field
from typing import Any

from thumbwright.distill.faults import Key


@dataclass(frozen=True)
class Plain:
    """A document as parsed, the keys in it that are known to be faulty, and its network file.

    ``members`` is who sees whom by the file that ``[network]`` names; ``None`` where it names none
    or none that can be relied on.
    """

    document: Mapping[str, Any]
    faulty: Collection[Key] = field(default=frozenset())
    members: Mapping[str, list[str]] | None = None

    def get(self, *key: str | int) -> Any:
        """The value at ``key``, or ``None`` where there is none that can be relied on."""
        value: Any = self.document
        for length, part in enumerate(key, start=1):
            if key[:length] in self.faulty:
                return None
            in_table = isinstance(value, Mapping) and isinstance(part, str) and part in value
            in_list = isinstance(value, list) and isinstance(part, int) and part < len(value)
            if not in_table and not in_list:
                return None
            value = value[part]
        return value

    def has(self, *key: str | int) -> bool:
        """Whether something is written at ``key``, right or wrong."""
        return Plain(self.document).get(*key) is not None

    def text(self, *key: str | int) -> str | None:
        """The text at ``key``."""
        value = self.get(*key)
        return value if isinstance(value, str) else None

    def number(self, *key: str | int) -> float | None:
        """The number at ``key``; true and false are no numbers."""
        value = self.get(*key)
        return value if isinstance(value, int | float) and not isinstance(value, bool) else None

    def table(self, *key: str | int) -> Mapping[str, Any]:
        """The table at ``key``; empty where there is none."""
        value = self.get(*key)
        return value if isinstance(value, Mapping) else {}

    def texts(self, *key: str | int) -> list[tuple[int, str]] | None:
        """The usable texts of the list at ``key`` with their positions; ``None``: no list."""
        value = self.get(*key)
        if not isinstance(value, list):
            return None
        # Who sees whom in a large crowd is a million such texts: no look-up of each on its own.
        bad = {faulty[-1] for faulty in self.faulty if faulty[:-1] == key}
        return [(n, text) for n, text in enumerate(value) if isinstance(text, str) and n not in bad]

    def numbers(self, *key: str | int) -> list[float] | None:
        """The list of numbers at ``key``; ``None`` unless every entry can be relied on."""
        value = self.get(*key)
        if not isinstance(value, list):
            return None
        found = [self.number(*key, place) for place in range(len(value))]
        numbers = [number for number in found if number is not None]
        return numbers if len(numbers) == len(found) else None
