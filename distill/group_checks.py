"""Checks of the group and of the rule wanted: who there is, who sees whom, who the rule is for.

Part of ``distill.crosschecks``; each check yields ``(key, text)``.
"""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping
from typing import Any

from thumbwright.distill.faults import Key, close_match, hint, quoted, shown
from thumbwright.distill.network import ENDINGS, LARGEST_GROUP, PAIRS, SMALLEST, who_sees_whom
from thumbwright.distill.plain import Plain

Found = Iterator[tuple[Key, str]]

ANY = "any"
UNKNOWN = "unknown"
SHARE_TOLERANCE = 1e-9
RECKONED = ("shifts", "formula")
"""Forms that have no rows and stand beside one that has."""

WITH_ROWS = ("lines", "table", "table-by-risk", "tree")

TIMETABLE = ("first_step", "looks_every", "looks_per_step")
"""Keys of an agent that say when it observes."""


def agents_and_network(plain: Plain) -> Found:
    """The group is stated once, its names differ, and its members and thresholds exist."""
    has_agents, has_network = plain.has("agents"), plain.has("network")
    if has_agents and has_network:
        yield ("network",), "the group is stated twice; keep either [network] or [agents.*]"
    if not has_agents and not has_network:
        yield ("agents",), "the group is missing: write [agents.ID] tables, or [network]"
    yield from names_of(plain, "thresholds", reserved=UNKNOWN)
    yield from names_of(plain, "agents", reserved=ANY)
    if has_network:
        yield from network(plain)
    called: dict[str, str] = {}
    for agent in plain.table("agents"):
        yield from thresholds_of(plain, agent)
        yield from seen_by(plain, agent)
        yield from timetable(plain, agent)
        name = (plain.text("agents", agent, "name") or agent).strip()
        if name in called:
            yield (
                ("agents", agent, "name"),
                f"{shown(name)} is also what agent {quoted(called[name])} is called; "
                "names must differ",
            )
        called.setdefault(name, agent)


def names_of(plain: Plain, section: str, reserved: str) -> Found:
    """Ids become column and code names, in which ``-`` is written ``_``."""
    by_column: dict[str, str] = {}
    for name in plain.table(section):
        column = name.replace("-", "_")
        if column in by_column:
            yield (
                (section, name),
                f"is the same name as {quoted(by_column[column])} once - is written _, as in "
                "columns and code; rename one",
            )
        by_column.setdefault(column, name)
        if name == reserved:
            yield (section, name), f"{quoted(name)} has a meaning of its own; choose another name"


def network(plain: Plain) -> Found:
    """A shape must be possible with its size, a file is of a known kind, and names must fit."""
    yield from shape_or_file(plain)
    shape, size = plain.text("network", "shape"), plain.number("network", "size")
    names = plain.get("network", "names")
    if shape in SMALLEST:
        if size is None and shape not in PAIRS and not plain.has("network", "size"):
            yield ("network", "size"), f"is missing: a {shape} needs a number of agents"
        if size is not None and shape in PAIRS and size != 2:
            yield ("network", "size"), f"{shown(size)} agents do not form a {shape} (allowed 2)"
        elif size is not None and size < SMALLEST[shape]:
            yield (
                ("network", "size"),
                f"{shown(size)} agents do not form a {shape} (allowed {SMALLEST[shape]} or more)",
            )
    agents = network_agents(plain)
    if agents is not None and isinstance(names, list) and len(names) != len(agents):
        yield ("network", "names"), f"has {len(names)} names for {len(agents)} agents"
    met: set[str] = set()
    for place, name in plain.texts("network", "names") or []:
        if name.strip() in met:
            yield ("network", "names", place), f"{shown(name)} names two agents; they must differ"
        met.add(name.strip())
    name_used = plain.text("network", "thresholds")
    if name_used is not None:
        yield from known_thresholds(plain, ("network", "thresholds"), name_used)


def shape_or_file(plain: Plain) -> Found:
    """A network is given by a shape or by a file."""
    written = plain.get("network", "file")
    if not plain.has("network", "file"):
        if not plain.has("network", "shape"):
            odd = plain.table("network")
            # A misspelt key has been reported with what was meant.
            if not any(close_match(key, ("shape", "file")) for key in odd):
                yield ("network", "shape"), f"is missing{hint('', list(SMALLEST))}; or name a file"
        return
    if plain.has("network", "shape"):
        yield ("network", "file"), "shape and file are both given; keep one"
    if plain.has("network", "size"):
        yield ("network", "size"), "goes with a shape only; a file says itself who there is"
    if isinstance(written, str) and not written.lower().endswith(ENDINGS):
        yield (
            ("network", "file"),
            f"{quoted(written)} is of no known kind (allowed names ending in "
            f"{' or '.join(ENDINGS)})",
        )


def timetable(plain: Plain, agent: str) -> Found:
    """Whoever starts late must still start before the end."""
    first, horizon = plain.number("agents", agent, "first_step"), plain.number("time", "horizon")
    if first is not None and horizon is not None and first > horizon:
        yield (
            ("agents", agent, "first_step"),
            f"{shown(first)} lies after the last step, {shown(horizon)}, so it would never observe "
            "anything",
        )


def known_thresholds(plain: Plain, key: Key, name: str) -> Found:
    """A name of thresholds must be one that the case defines."""
    defined = list(plain.table("thresholds"))
    if defined and name not in defined:
        yield key, f"there are no thresholds {quoted(name)}{hint(name, defined)}"


def thresholds_of(plain: Plain, agent: str) -> Found:
    """An agent has known thresholds, or unknown ones whose shares sum to 1."""
    place = ("agents", agent)
    if not isinstance(plain.get(*place), Mapping):
        return
    stated = [key for key in ("thresholds", UNKNOWN) if plain.has(*place, key)]
    if len(stated) == 2:
        yield (*place, UNKNOWN), "thresholds and unknown are both given; keep one"
        return
    if not stated:
        known = ("name", "thresholds", UNKNOWN, "sees", "evidence", *TIMETABLE)
        odd = [key for key in plain.table(*place) if key not in known]
        # A misspelt key has been reported with what was meant.
        if not any(close_match(key, known) in ("thresholds", UNKNOWN) for key in odd):
            names = list(plain.table("thresholds"))
            yield (*place, "thresholds"), f"is missing{hint('', names)}"
        return
    key = (*place, stated[0])
    used = mixture(plain, agent)
    for name in used:
        yield from known_thresholds(plain, key, name)
    shares = [share for share in used.values() if share is not None]
    if shares and abs(math.fsum(shares) - 1) > SHARE_TOLERANCE:
        yield key, f"the shares sum to {math.fsum(shares):.12g} (allowed a sum of 1)"


def mixture(plain: Plain, agent: str) -> dict[str, float | None]:
    """Names of thresholds an agent may have, with shares; a name alone has no share.

    Empty where nothing usable is stated.
    """
    for key in ("thresholds", UNKNOWN):
        value: Any = plain.get("agents", agent, key)
        if isinstance(value, str):
            return {value: None} if key == "thresholds" else {}
        if isinstance(value, Mapping):
            inner = value.get(UNKNOWN)
            return dict(inner) if isinstance(inner, Mapping) else dict(value)
    return {}


def seen_by(plain: Plain, agent: str) -> Found:
    """An agent sees other agents of the case, each once."""
    others = plain.table("agents")
    met: set[str] = set()
    for place, name in plain.texts("agents", agent, "sees") or []:
        key = ("agents", agent, "sees", place)
        if name == agent:
            yield key, "an agent cannot see itself; it knows its own state without looking"
        elif name not in others:
            yield key, f"there is no agent {quoted(name)}{hint(name, list(others))}"
        elif name in met:
            yield key, f"{quoted(name)} is listed twice; once is enough"
        met.add(name)


def network_agents(plain: Plain) -> dict[str, list[str]] | None:
    """Who sees whom in the ``[network]``; ``None`` where that cannot be told."""
    if plain.has("network", "file"):
        return None if plain.members is None else dict(plain.members)
    shape, size = plain.text("network", "shape"), plain.get("network", "size")
    if shape in PAIRS and not plain.has("network", "size"):
        size = 2
    if shape is None or not isinstance(size, int) or size > LARGEST_GROUP:
        return None
    try:
        return who_sees_whom(shape, size)
    except ValueError:
        return None


def known_agents(plain: Plain) -> dict[str, list[str] | None] | None:
    """Every agent with the ids it sees (``None``: unclear which); ``None``: no telling who."""
    if plain.has("agents") and plain.has("network"):
        return None
    if plain.table("agents"):
        found: dict[str, list[str] | None] = {}
        for agent in plain.table("agents"):
            seen = [name for _, name in plain.texts("agents", agent, "sees") or []]
            written: Any = plain.get("agents", agent, "sees")
            is_table = isinstance(plain.get("agents", agent), Mapping)
            if is_table and not plain.has("agents", agent, "sees"):
                written = []
            is_clear = isinstance(written, list) and len(written) == len(seen)
            found[agent] = seen if is_clear else None
        return found
    shaped = network_agents(plain)
    return None if shaped is None else {agent: list(seen) for agent, seen in shaped.items()}


def rule(plain: Plain) -> Found:
    """The rule is for somebody, who sees somebody if it is to look at what is shown."""
    yield from lists_of_rule(plain)
    inputs = plain.texts("rule", "inputs")
    looks_at = ["step", "shown"] if inputs is None else [name for _, name in inputs]
    agents, wanted = known_agents(plain), plain.text("rule", "agent")
    chosen: str | None = None
    if agents is not None and wanted is not None:
        if wanted != ANY and wanted not in agents:
            yield (
                ("rule", "agent"),
                f"there is no agent {quoted(wanted)}, so the rule is for nobody"
                f"{hint(wanted, [ANY, *agents])}",
            )
        elif set(looks_at) - {"step"}:
            watchers = [agent for agent, seen in agents.items() if seen is None or seen]
            chosen = next(iter(watchers), None) if wanted == ANY else wanted
            if wanted == ANY and not watchers:
                yield (
                    ("rule", "agent"),
                    "nobody in this group sees anybody, so there is nothing shown to look at; "
                    'give an agent something to see, or write inputs = ["step"]',
                )
            elif wanted != ANY and wanted not in watchers:
                yield (
                    ("rule", "agent"),
                    f"agent {quoted(wanted)} sees nobody, so there is nothing shown to look at; "
                    f'choose another agent, or write inputs = ["step"]{hint("", watchers)}',
                )
    yield from covered(plain, looks_at, (agents or {}).get(chosen or "") or [])


def lists_of_rule(plain: Plain) -> Found:
    """Lists of the rule name each thing once."""
    for key in ("inputs", "covers", "forms"):
        met: set[str] = set()
        for place, name in plain.texts("rule", key) or []:
            if name in met:
                yield ("rule", key, place), f"{quoted(name)} is listed twice; once is enough"
            met.add(name)
    forms = {name for _, name in plain.texts("rule", "forms") or []}
    if forms and forms <= set(RECKONED):
        yield (
            ("rule", "forms"),
            f"{' and '.join(sorted(forms))} have no rows, which the card and rule.csv are made of; "
            f'add a form of rows, such as "table" (rows: {", ".join(WITH_ROWS)})',
        )


def covered(plain: Plain, looks_at: list[str], seen: list[str]) -> Found:
    """A rule that looks at thresholds must say which ones it tells apart, and they must do."""
    covers = plain.texts("rule", "covers")
    defined = list(plain.table("thresholds"))
    for place, name in covers or []:
        yield from known_thresholds(plain, ("rule", "covers", place), name)
    if not isinstance(plain.get("rule"), Mapping):
        return
    if "thresholds" not in looks_at:
        written = plain.get("rule", "inputs")
        is_clear = not plain.has("rule", "inputs") or (
            isinstance(written, list) and len(written) == len(looks_at)
        )
        if covers and is_clear:
            yield ("rule", "covers"), 'is used only where inputs has "thresholds"; add it there'
        return
    names = {name for _, name in covers or []}
    if len(names) < 2 and (covers is not None or not plain.has("rule", "covers")):
        yield (
            ("rule", "covers"),
            'needs two or more names of thresholds, because inputs has "thresholds"'
            f"{hint('', defined)}",
        )
        return
    for agent in seen:
        for name in mixture(plain, agent):
            if covers is not None and name in defined and name not in names:
                yield (
                    ("rule", "covers"),
                    f"leaves out {quoted(name)}, which agent {quoted(agent)} has and the rule's "
                    "agent would meet; add it",
                )
