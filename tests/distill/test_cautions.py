from __future__ import annotations

import pytest

from thumbwright.distill.cautions import cautions

STAKES = ("people", "animals", "property", "none")


@pytest.mark.parametrize("stakes", STAKES)
def test_every_rule_defers_and_promises_nothing(stakes: str) -> None:
    text = " ".join(cautions(stakes))
    for phrase in (
        "not a guarantee",
        "assumptions",
        "local rules",
        "codes of practice",
        "contracts",
        "licensed or trained",
        "usual practice",
    ):
        assert phrase in text
    assert all(sentence.endswith(".") for sentence in cautions(stakes))


@pytest.mark.parametrize("stakes", ["people", "animals", "property"])
def test_what_can_be_hurt_comes_first(stakes: str) -> None:
    assert stakes in cautions(stakes)[0].lower()
    assert "overrides" in cautions(stakes)[1]


def test_unknown_stakes_never_pass_without_a_caution() -> None:
    with pytest.raises(ValueError, match="stakes"):
        cautions("persons")
