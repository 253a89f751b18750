"""Numbers as text that people, spreadsheets and other programs read back unchanged."""

from __future__ import annotations

import math
from decimal import Decimal


def plain_decimal(number: float) -> str:
    """Write ``number`` as the shortest decimal that reads back as the same double.

    No exponent and no grouping; negative zero is written as zero. Infinite values, which are
    results (evidence that is impossible under one answer), are ``INF`` and ``-INF`` as in
    Table Schema.

    Raises
    ------
    ValueError
        If ``number`` is not a number (nan).
    """
    if math.isnan(number):
        raise ValueError("a figure that is not a number cannot be written")
    if math.isinf(number):
        return "INF" if number > 0 else "-INF"
    if number == 0:
        return "0"
    text = format(Decimal(repr(float(number))), "f")
    return text.rstrip("0").rstrip(".") if "." in text else text


DIGITS = 10
"""Significant digits of figures in files: the last ones of a double differ between machines."""


def json_number(number: float | None) -> float | str | None:
    """Return ``number`` as JSON can hold it: infinities, which JSON lacks, become text."""
    if number is None or math.isfinite(number):
        return number
    return plain_decimal(number)


def json_figure(number: float | None) -> float | str | None:
    """Return a computed figure for a file that may be compared from one machine to another."""
    if number is None or not math.isfinite(number):
        return json_number(number)
    return float(f"{number:.{DIGITS}g}")
