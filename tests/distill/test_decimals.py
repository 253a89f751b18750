from __future__ import annotations

import re

import pytest
from hypothesis import given, strategies as st

from thumbwright.distill.decimals import json_figure, json_number, plain_decimal


@given(st.floats(allow_nan=False, allow_infinity=False))
def test_reads_back_as_the_same_double_without_exponent(number: float) -> None:
    text = plain_decimal(number)
    assert float(text) == number
    assert re.fullmatch(r"-?\d+(\.\d+)?", text)


@pytest.mark.parametrize(
    ("number", "text"),
    [
        (0.0, "0"),
        (-0.0, "0"),
        (3.0, "3"),
        (-0.4054651081081645, "-0.4054651081081645"),
        (1e-7, "0.0000001"),
        (1e22, "10000000000000000000000"),
        (100, "100"),
        (float("inf"), "INF"),
        (float("-inf"), "-INF"),
    ],
)
def test_known_texts(number: float, text: str) -> None:
    assert plain_decimal(number) == text


def test_what_is_not_a_number_is_refused() -> None:
    with pytest.raises(ValueError, match="not a number"):
        plain_decimal(float("nan"))
    with pytest.raises(ValueError, match="not a number"):
        json_number(float("nan"))


def test_json_has_no_infinity() -> None:
    assert [json_number(x) for x in (None, 1.5, float("-inf"))] == [None, 1.5, "-INF"]


def test_figures_have_ten_digits() -> None:
    assert json_figure(0.1 + 0.2) == 0.3
    assert json_figure(1 / 3) == 0.3333333333
    assert [json_figure(x) for x in (None, float("inf"), 0.0)] == [None, "INF", 0.0]
