"""Plain phrases: exact text of small parts."""

from __future__ import annotations

import pytest

from thumbwright.distill.sheet import words as words


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        ("  two\n lines\t here ", "two lines here"),
        ("turned\u202e round\u2066", "turned round"),
        ("nul\x00 and bell\x07", "nul and bell"),
        ("می\u200cخواهم", "می\u200cخواهم"),
        ("soft\u00adhyphen", "softhyphen"),
    ],
)
def test_clean_leaves_one_honest_line(text: str, expected: str) -> None:
    assert words.clean(text) == expected


@pytest.mark.parametrize(
    ("phrase", "expected"),
    [
        ("frost sign", "frost signs"),
        ("defective", "defectives"),
        ("batch", "batches"),
        ("survey", "surveys"),
        ("city", "cities"),
        ("glass", "glasses"),
        ("signs", "signs"),
        ("sign of “frost tonight”", "signs of “frost tonight”"),
        ("", ""),
    ],
)
def test_plural(phrase: str, expected: str) -> None:
    assert words.plural(phrase) == expected


@pytest.mark.parametrize(
    ("first", "second", "expected"),
    [
        ("frost sign", "mild sign", ("frost", "mild")),
        ("defective", "sound item", ("defective", "sound item")),
        ("sign", "sign", ("sign", "sign")),
        ("sign of “frost”", "sign of “no frost”", ("frost", "no frost")),
    ],
)
def test_apart(first: str, second: str, expected: tuple[str, str]) -> None:
    assert words.apart(first, second) == expected


def test_shared_start_leaves_every_phrase_a_word() -> None:
    lamps = ("lamp lit", "lamp dark", "Lamp blinking fast")
    assert words.shared_start(lamps) == ("lamp", ("lit", "dark", "blinking fast"))
    assert words.shared_start(("up", "up high")) == ("", ("up", "up high"))


@pytest.mark.parametrize(
    ("minus", "plus", "expected"),
    [
        ("stand down", "light the lamp", (("stand down", "down"), ("light the lamp", "light"))),
        (
            "accept the lot",
            "reject the lot",
            (("accept the lot", "accept"), ("reject the lot", "reject")),
        ),
        ("say no", "say yes", (("say no", "no"), ("say yes", "yes"))),
        (
            "answer “no frost”",
            "answer “frost”",
            (("answer “no frost”", "no frost", "no"), ("answer “frost”", "frost")),
        ),
        ("go home now", "go home", (("go home now",), ("go home",))),
    ],
)
def test_act_forms_never_agree(
    minus: str, plus: str, expected: tuple[tuple[str, ...], tuple[str, ...]]
) -> None:
    found = words.act_forms(minus, plus)
    assert found[0][-1] != found[1][-1]
    if minus != "go home now":
        assert found == expected


def test_fitting_takes_the_longest_that_fits() -> None:
    forms = ("stand down", "down")
    assert words.fitting(forms, 20.0) == "stand down"
    assert words.fitting(forms, 4.0) == "down"
    assert words.fitting(forms, 1.0) == ""


@pytest.mark.parametrize(
    ("share", "expected"),
    [
        (0.6, "6 times in 10"),
        (0.1, "1 time in 10"),
        (0.35, "35 times in 100"),
        (0.001, "1 time in 1,000"),
        (0.61803, "about 618 times in 1,000"),
        (0.00012345, "about 123 times in 1,000,000"),
        (1e-9, "less than 1 time in 100,000"),
        (1 - 1e-9, "all but always"),
        (0.0, "never"),
        (1.0, "always"),
    ],
)
def test_times_in(share: float, expected: str) -> None:
    assert words.times_in(share) == expected


@pytest.mark.parametrize(
    ("share", "expected"),
    [
        (0.21873, "22"),
        (0.225, "23"),
        (0.01, "1"),
        (0.0099, "fewer than 1"),
        (1e-7, "fewer than 1"),
        (0.0, "none"),
        (1.0, "100"),
    ],
)
def test_of_hundred_has_no_decimals(share: float, expected: str) -> None:
    assert words.of_hundred(share) == expected


@pytest.mark.parametrize(
    ("value", "expected"),
    [
        (0.0, "says nothing either way"),
        (-0.04, "says nothing either way"),
        (0.39, "about 15 to 10 for “yes”"),
        (-0.8109302162, "about 22 to 10 for “no”"),
        (3.0, "about 20 to 1 for “yes”"),
        (6.0, "about 400 to 1 for “yes”"),
        (float("-inf"), "more than 1,000 to 1 for “no”"),
    ],
)
def test_odds_in_words(value: float, expected: str) -> None:
    assert words.odds_in_words(value, "yes", "no") == expected


@pytest.mark.parametrize(
    ("number", "expected"),
    [
        (0.218734999, "0.21873"),
        (7.0, "7.0000"),
        (-1.25e-6, "−1.2500e−06"),
        (12345.6, "12346"),
        (-0.0, "0"),
        (None, "none"),
        (float("-inf"), "−∞"),
    ],
)
def test_five_significant_digits(number: float | None, expected: str) -> None:
    assert words.five(number) == expected


def test_letters_go_on_after_z() -> None:
    found = [words.letters(place) for place in (0, 25, 26, 701, 702)]
    assert found == ["A", "Z", "AA", "ZZ", "AAA"]


def test_counted() -> None:
    found = [words.counted(count, "box") for count in (1, 2, 12)]
    assert found == ["one box", "two boxes", "12 boxes"]
