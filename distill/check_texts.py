"""What ``check`` prints: the case in short, the engine and its forecast, and what is odd."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

from thumbwright.distill.case import Case, is_crowd
from thumbwright.distill.columns import columns
from thumbwright.distill.crowds import ENUMERATED, CrowdEngine, crowd_in
from thumbwright.distill.texts import owner_of
from thumbwright.exact.forecast import Forecast
from thumbwright.exact.group import Agent, Group


def check_text(case: Case, group: Group, engine: Sequence[str]) -> str:
    """The case in short, the engine and its forecast as told by ``engine``, and what is odd."""
    return "\n".join(
        [
            f"{case.title}: “{case.question.plus}” or “{case.question.minus}”?",
            f"case {case.name}, digest {case.digest}",
            "",
            f"Rule for {_owner_in_full(case)}, up to "
            f"{case.rule.rows} rows, looking at {', '.join(case.rule.inputs)}; forms: "
            f"{', '.join(case.rule.forms)}.",
            f"{case.time.horizon} steps; what is shown is taken in "
            + ("from the next step on." if case.time.exchange == "once" else "at once, in rounds."),
            "",
            *_agents_table(group),
            "",
            *engine,
            *(f"Note: {text}" for text in _oddities(group)),
        ]
    )


def network_engine(expected: Forecast) -> list[str]:
    """How a network is played, and what that takes."""
    lines = [
        "Engine: exact display histories, contracted as matrix products; nothing is sampled.",
        f"Forecast: about {size(expected.memory)} of memory and {duration(expected.seconds)} for "
        f"the exact beliefs ({expected.events} display events per agent; widest: agent "
        f"{expected.widest}).",
    ]
    if expected.memory > 1e8:
        lines.append(
            "A shorter horizon, fewer agents in sight of each other, or exchange = “once” would "
            "make it smaller."
        )
    return lines


def crowd_engine(found: CrowdEngine) -> list[str]:
    """How a crowd is played, and what that takes."""
    kinds = "all alike" if found.kinds == 1 else f"of {found.kinds} kinds"
    lines = [
        f"Engine: the public histories of a crowd of {found.members}, {kinds}, by how many show "
        "what in which round."
    ]
    if found.sampled is None:
        lines.append(
            f"All are enumerated ({found.entries:,} moments of them; more than {ENUMERATED:,} "
            "would be sampled): nothing is sampled."
        )
    else:
        histories, seed = found.sampled
        lines.append(
            f"There are too many to enumerate (more than {ENUMERATED:,} moments of them), so "
            f"{histories:,} are sampled with seed {seed}; beliefs along each of them are exact, "
            "figures carry standard errors."
        )
        ways = ["a shorter horizon", "leaving out the least likely ones with --drop"]
        if found.largest is not None and found.largest > 1:
            ways.insert(0, f"a crowd of at most {found.largest} members")
        lines.append(f"For all to be enumerated: {', '.join(ways[:-1])}, or {ways[-1]}.")
    lines.append(
        f"Forecast: about {size(found.memory)} of memory and {duration(found.seconds)} for the "
        "exact beliefs."
    )
    return lines


MOST_LISTED = 12
"""A longer list of agents, and any crowd, is told by kinds of agents."""


def _agents_table(group: Group) -> list[str]:
    """One line per agent; in a large group one per sort of agent that differs."""
    cells = [_agent_cells(agent) for agent in group.agents]
    head = ("agent", "sees", "answers minus at or below", "plus at or above", "evidence")
    if len(cells) <= MOST_LISTED and crowd_in(group) is None:
        return columns([head, *cells])
    alike: dict[tuple[str, ...], list[str]] = {}
    for agent, (name, _, *rest) in zip(group.agents, cells, strict=True):
        alike.setdefault((f"{len(agent.sees)} others", *rest), []).append(name)
    rows: list[tuple[str, ...]] = [
        (names[0] if len(names) == 1 else f"{names[0]} and {len(names) - 1} like it", *shared)
        for shared, names in alike.items()
    ]
    return columns([head, *rows])


def _agent_cells(agent: Agent) -> tuple[str, str, str, str, str]:
    low = " or ".join(f"{bound.minus:.4g}" for _, bound in agent.thresholds)
    high = " or ".join(f"{bound.plus:.4g}" for _, bound in agent.thresholds)
    evidence = agent.evidence
    worth = f"{evidence.kind}, {evidence.information():.4g} nats of information each"
    if evidence.split:
        worth += (
            f", split in steps of {evidence.split.step:.4g} nats (twice as fine moves outcomes "
            f"alone by {evidence.split.change:.1g})"
        )
    return agent.id, ", ".join(agent.sees) or "nobody", f"{low} nats", f"{high} nats", worth


def _oddities(group: Group) -> list[str]:
    """What is odd about agents; said once where several are odd in the same way."""
    said: dict[str, list[str]] = {}
    for agent in group.agents:
        for text in _odd(agent, group.prior):
            said.setdefault(text, []).append(agent.id)
    return [
        text.replace(
            _WHO, f"{who[0]} and {len(who) - 1} others" if len(who) > 2 else " and ".join(who)
        )
        for text, who in said.items()
    ]


_WHO = "{who}"


def _odd(agent: Agent, prior: float) -> Iterator[str]:
    if any(not bound.minus < prior < bound.plus for _, bound in agent.thresholds):
        yield (
            f"the prior ({prior:.4g} nats) is not between the thresholds of {_WHO}, so an answer "
            "comes at the first step unless the first observation speaks against it"
        )
    if not agent.evidence.informative:
        yield f"the evidence of {_WHO} carries no information: only others can be followed"
    if agent.evidence.certain_plus or agent.evidence.certain_minus:
        yield (
            f"some evidence of {_WHO} is certain: one answer makes it impossible, so whoever meets "
            "it answers at once"
        )


def _owner_in_full(case: Case) -> str:
    owner = owner_of(case)
    return owner if is_crowd(case.agents) else f"{case.rule_agent} ({owner})"


def size(amount: float) -> str:
    """Bytes in words."""
    for unit, one in (("GB", 1e9), ("MB", 1e6)):
        if amount >= one:
            return f"{amount / one:.3g} {unit}"
    return "less than 1 MB"


def duration(seconds: float) -> str:
    """Seconds in words."""
    return "less than a second" if seconds < 1 else f"{seconds:.2g} seconds"
