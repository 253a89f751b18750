"""What must hold between the keys and sections of a case, beyond each key on its own.

All checks run on the plain document and pass over what is missing or already known to be
faulty, so that a user reads every fault at once. Each yields ``(key, text)``.
"""

from __future__ import annotations

import math
from collections.abc import Collection, Iterator, Mapping
from typing import Any

from thumbwright.distill.doubt_checks import doubts
from thumbwright.distill.faults import Key, close_match, hint, quoted, shown
from thumbwright.distill.group_checks import agents_and_network, mixture, rule
from thumbwright.distill.plain import Plain

Found = Iterator[tuple[Key, str]]

LEVELS = ("plus", "minus", "unit")
RATES = ("false_plus", "false_minus")
UNITS = ("observations", "nats", "probability")

MASS_TOLERANCE = 1e-9
"""How far probabilities that must sum to 1 may miss it (decimals typed to ten places pass)."""


def contradictions(
    document: Mapping[str, Any],
    faulty: Collection[Key] = frozenset(),
    members: Mapping[str, list[str]] | None = None,
) -> list[tuple[Key, str]]:
    """Return what contradicts itself in a case, as ``(key, text)`` in no special order.

    Parameters
    ----------
    document : mapping
        A case as parsed from TOML, or as dumped from a complete case.
    faulty : collection of keys
        Keys already reported; nothing that rests on them is reported again.
    members : mapping of str to list of str, optional
        Who sees whom by the file that ``[network]`` names.
    """
    plain = Plain(document, faulty, members)
    checks = (
        distinct_words(plain),
        *(evidence(plain, *place) for place in evidence_places(plain)),
        *(thresholds(plain, name) for name in plain.table("thresholds")),
        observations(plain),
        costs(plain),
        agents_and_network(plain),
        rule(plain),
        doubts(plain, evidence),
    )
    return list(dict.fromkeys(found for check in checks for found in check))


def distinct_words(plain: Plain) -> Found:
    """Two things that people must tell apart need two different wordings."""
    pairs = (
        (("question", "plus"), ("question", "minus")),
        (("words", "plus_sign"), ("words", "minus_sign")),
        (("words", "shows_plus"), ("words", "shows_minus")),
        (("words", "shows_plus"), ("words", "shows_nothing")),
        (("words", "shows_minus"), ("words", "shows_nothing")),
        (("words", "do_plus"), ("words", "do_minus")),
    )
    for first, second in pairs:
        one, other = plain.text(*first), plain.text(*second)
        if one and other and one.strip() == other.strip():
            yield second, f"says the same as {first[1]}; the two must differ"


def evidence_places(plain: Plain) -> list[tuple[str, ...]]:
    """Where evidence is stated: the case's own, then that of single agents."""
    own = [
        ("agents", agent, "evidence")
        for agent in plain.table("agents")
        if plain.get("agents", agent, "evidence") is not None
    ]
    return [("evidence",), *own]


def evidence(plain: Plain, *place: str) -> Found:
    """What the keys of one piece of evidence must satisfy together."""
    kind = plain.text(*place, "kind")
    if kind == "coin":
        p = plain.number(*place, "p")
        if p is not None and p < 0.5:
            yield (
                (*place, "p"),
                f"{shown(p)} is below 0.5: such signs point the wrong way; swap what counts as "
                f"plus_sign and minus_sign and write {1 - p:.12g} (allowed from 0.5 to 1)",
            )
    elif kind == "calibration":
        for one, other, truth in (
            ("hits", "misses", "plus"),
            ("false_alarms", "correct_rejections", "minus"),
        ):
            if plain.number(*place, one) == 0 and plain.number(*place, other) == 0:
                yield (
                    (*place, one),
                    f"{one} and {other} are both 0: cases in which {truth} was true are needed",
                )
    elif kind == "listed":
        yield from listed(plain, *place)


def listed(plain: Plain, *place: str) -> Found:
    """Probabilities of listed values: equal lengths, sums of 1, no value that never comes."""
    masses = {side: plain.numbers(*place, side) for side in ("plus", "minus")}
    for side, given in masses.items():
        if given is not None and abs(math.fsum(given) - 1) > MASS_TOLERANCE:
            yield (*place, side), f"sums to {math.fsum(given):.12g} (allowed a sum of 1)"
    plus, minus = masses["plus"], masses["minus"]
    if plus is not None and minus is not None:
        if len(plus) != len(minus):
            yield (
                (*place, "minus"),
                f"has {len(minus)} values where plus has {len(plus)}; every value needs both",
            )
        else:
            for number, (one, other) in enumerate(zip(plus, minus, strict=True)):
                if one == 0 and other == 0:
                    yield (
                        (*place, "plus", number),
                        f"value {number + 1} has probability 0 under both answers; leave it out",
                    )
    names = plain.texts(*place, "values")
    if names is None:
        return
    if plus is not None and len(plain.get(*place, "values")) != len(plus):
        count = len(plain.get(*place, "values"))
        yield (*place, "values"), f"names {count} values where plus has {len(plus)}"
    seen: set[str] = set()
    for number, name in names:
        if name.strip() in seen:
            yield (*place, "values", number), f"{shown(name)} names two values; they must differ"
        seen.add(name.strip())


def thresholds(plain: Plain, name: str) -> Found:
    """One pair of thresholds: stated in one way only, complete, and the right way round."""
    place = ("thresholds", name)
    if not isinstance(plain.get(*place), Mapping):
        return
    ways = {
        "levels (plus, minus, unit)": any(plain.has(*place, key) for key in LEVELS),
        "error rates (false_plus, false_minus)": any(plain.has(*place, key) for key in RATES),
        'from = "costs"': plain.has(*place, "from"),
    }
    used = [way for way, is_used in ways.items() if is_used]
    if len(used) > 1:
        yield place, f"is stated in two ways: {' and '.join(used)}; keep one"
        return
    if not used:
        # A misspelt key may be all that is wrong; it has been reported with what was meant.
        if not plain.table(*place):
            yield place, f"says nothing (allowed {', or '.join(ways)})"
        return
    if plain.has(*place, "from"):
        if not plain.has("costs"):
            yield (*place, "from"), 'thresholds from "costs" need a [costs] section'
        return
    group = LEVELS if any(plain.has(*place, key) for key in LEVELS) else RATES
    unknown = [key for key in plain.table(*place) if key not in (*LEVELS, *RATES, "from")]
    for key in group:
        meant = any(close_match(word, group) == key for word in unknown)
        if not plain.has(*place, key) and not meant:
            yield (*place, key), f"is missing{hint('', UNITS) if key == 'unit' else ''}"
    if group == RATES:
        yield from error_rates(plain, *place)
    else:
        yield from levels(plain, *place)


def error_rates(plain: Plain, *place: str) -> Found:
    """Tolerated error rates leave something to decide only while they sum to less than 1."""
    wrong = [plain.number(*place, key) for key in RATES]
    if wrong[0] is not None and wrong[1] is not None and wrong[0] + wrong[1] >= 1:
        yield (
            (*place, "false_minus"),
            f"false_plus and false_minus sum to {wrong[0] + wrong[1]:.12g} (allowed less than 1)",
        )


def levels(plain: Plain, *place: str) -> Found:
    """Levels: minus below plus, each possible in its unit."""
    unit = plain.text(*place, "unit")
    plus, minus = (plain.number(*place, key) for key in ("plus", "minus"))
    for key, level in (("plus", plus), ("minus", minus)):
        if level is None:
            continue
        if unit == "probability" and not 0 < level < 1:
            yield (
                (*place, key),
                f"{shown(level)} cannot be reached as a probability (allowed more than 0 and "
                "less than 1)",
            )
        if unit == "observations" and level != int(level):
            yield (
                (*place, key),
                f"{shown(level)} cannot be a count of observations (allowed whole numbers)",
            )
    if plus is None or minus is None or minus < plus:
        return
    if minus == plus:
        yield (*place, "minus"), f"equals plus, {shown(plus)}; minus must lie below plus"
    else:
        yield (
            (*place, "minus"),
            f"{shown(minus)} lies above plus, {shown(plus)}: the wrong way round; swap the two",
        )


def observations(plain: Plain) -> Found:
    """Thresholds counted in observations need a coin whose signs tell something but not all."""
    users: dict[str, list[tuple[str, ...]]] = {}
    if plain.has("network"):
        users.setdefault(plain.text("network", "thresholds") or "", []).append(("evidence",))
    for agent in plain.table("agents"):
        has_own = plain.has("agents", agent, "evidence")
        place: tuple[str, ...] = ("agents", agent, "evidence") if has_own else ("evidence",)
        for name in mixture(plain, agent):
            users.setdefault(name, []).append(place)
    for name in plain.table("thresholds"):
        if plain.text("thresholds", name, "unit") != "observations":
            continue
        for place in users.get(name, [("evidence",)]):  # unused ones: the case's own
            kind = plain.text(*place, "kind")
            where = " of agent " + quoted(place[1]) if len(place) > 1 else ""
            if kind is not None and kind != "coin":
                yield (
                    ("thresholds", name, "unit"),
                    f'"observations" needs coin evidence, but the evidence{where} is '
                    f"{quoted(kind)} (allowed here nats, probability)",
                )
            p = plain.number(*place, "p") if kind == "coin" else None
            if p == 0.5:
                yield (
                    (*place, "p"),
                    "at 0.5 a sign carries no information, so no count of them is worth "
                    f"anything and thresholds {quoted(name)} in observations have no meaning; "
                    'raise p, or state the thresholds with unit "nats" or "probability"',
                )
            elif p == 1:
                yield (
                    (*place, "p"),
                    "at 1 a single sign is certain, so thresholds "
                    f"{quoted(name)} in observations have no meaning; lower p, or state the "
                    'thresholds with unit "nats" or "probability"',
                )


def costs(plain: Plain) -> Found:
    """Best thresholds exist only where waiting costs something."""
    from_costs = [
        name for name in plain.table("thresholds") if plain.get("thresholds", name, "from")
    ]
    if from_costs and plain.number("costs", "per_step") == 0:
        yield (
            ("costs", "per_step"),
            f"is 0, so an agent alone would never stop and thresholds {quoted(from_costs[0])} "
            'from "costs" do not exist (allowed more than 0)',
        )
