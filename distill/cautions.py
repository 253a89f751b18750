"""The cautions that travel with every rule, by what a wrong answer can hurt.

Plain sentences, most pressing first. Every output that can be read on its own (sheet, data,
code) carries them, so that a rule never arrives without them.
"""

from __future__ import annotations

_FIRST = {
    "people": (
        "People can be hurt by a wrong answer: this never holds back an alarm, an evacuation,"
        " a rescue or medical help.",
        "An alarm, an order or sure evidence overrides it at once.",
    ),
    "animals": (
        "Animals can suffer from a wrong answer: animal welfare law and veterinary advice"
        " come before it.",
        "An alarm, an order or sure evidence overrides it at once.",
    ),
    "property": (
        "Property or money can be lost by a wrong answer: contracts, agreed standards and"
        " insurance terms prevail over it.",
        "An alarm, an order or sure evidence overrides it at once.",
    ),
    "none": (),
}

_ALWAYS = (
    "This is a calculation under the assumptions stated with it, not a guarantee.",
    "It defers to local rules, codes of practice, contracts and the judgement of licensed or"
    " trained people; where they differ from it, follow them.",
    "Where an assumption is clearly untrue, put it aside and fall back on usual practice.",
)


def cautions(stakes: str) -> tuple[str, ...]:
    """Return the sentences for ``stakes`` (``people``, ``animals``, ``property`` or ``none``).

    Raises
    ------
    ValueError
        If ``stakes`` is none of the four: a missing caution must never pass unseen.
    """
    if stakes not in _FIRST:
        raise ValueError(f"stakes {stakes!r} is not one of {', '.join(_FIRST)}")
    return _FIRST[stakes] + _ALWAYS
