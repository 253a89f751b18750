"""Which agents are alike, so that one of them can be worked out for all.

What an agent does and is shown depends on those it sees, those they see, and so on. Where a
one-to-one mapping takes one agent and all these to another agent and all of its own, and keeps
evidence, thresholds, timetables and who sees whom, the two are alike: by induction over the rounds
whatever holds of the first holds of the second, with the axis of every seen agent at the place of
its image. Nobody outside these matters, since nothing that they show can reach them.

Candidates are found by colour refinement (kinds of agents are told apart by what they are and by
the kinds of those they see, until no more can be), and then a mapping is built edge by edge. A
search that takes too long is given up: agents that are not known to be alike each do their own
work, which costs time and changes nothing.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from thumbwright.exact.group import Agent, Group

_MOST_AGENTS = 100
_MOST_TRIES = 20_000


@dataclass(frozen=True)
class Likeness:
    """Who is worked out for whom.

    Attributes
    ----------
    lead : tuple of int
        Per agent the agent that is worked out for it: itself, or one that it is like.
    seen : tuple of tuple of int
        Per agent those it sees, each where its lead sees the agent that stands for it: the order
        of the axes of what was worked out.
    """

    lead: tuple[int, ...]
    seen: tuple[tuple[int, ...], ...]

    @property
    def leads(self) -> tuple[int, ...]:
        """The agents that are worked out, ascending."""
        return tuple(i for i, lead in enumerate(self.lead) if i == lead)


def each_for_itself(group: Group) -> Likeness:
    """Nobody is worked out for another."""
    return Likeness(tuple(range(len(group.agents))), group.sees)


def likeness(group: Group) -> Likeness:
    """Find out who is like whom, as far as that is quickly done."""
    if len(group.agents) > _MOST_AGENTS:
        return each_for_itself(group)
    search = _Search(group.sees, _kinds(group))
    lead, seen, leads = [], [], dict[int, list[int]]()
    for i, kind in enumerate(search.kinds):
        for other in leads.setdefault(kind, []):
            found = search.mapping(other, i)
            if found:
                lead.append(other)
                seen.append(tuple(found[k] for k in group.sees[other]))
                break
        else:
            leads[kind].append(i)
            lead.append(i)
            seen.append(group.sees[i])
    return Likeness(tuple(lead), tuple(seen))


def _kinds(group: Group) -> list[int]:
    """A number per agent; agents of different numbers are not alike."""
    kinds = _numbered([_attributes(agent) for agent in group.agents])
    while True:
        finer = _numbered(
            [(kinds[i], *sorted(kinds[k] for k in seen)) for i, seen in enumerate(group.sees)]
        )
        if max(finer) == max(kinds):
            return kinds
        kinds = finer


def _numbered(keys: Sequence[tuple[object, ...]]) -> list[int]:
    numbers: dict[tuple[object, ...], int] = {}
    return [numbers.setdefault(key, len(numbers)) for key in keys]


def _attributes(agent: Agent) -> tuple[object, ...]:
    """All that an agent is, apart from its id and whom it sees."""
    one = agent.evidence
    arrays = (one.plus, one.minus, one.offsets, one.alpha)
    rest = (one.beta, one.certain_plus, one.certain_minus, agent.thresholds, agent.looks)
    return (*(array.tobytes() for array in arrays), *rest)


class _Search:
    """Builds mappings from an agent and all that can reach it to another and all of its own."""

    def __init__(self, sees: Sequence[tuple[int, ...]], kinds: list[int]) -> None:
        self._sees, self.kinds = sees, kinds
        self._tries = _MOST_TRIES

    def mapping(self, one: int, other: int) -> dict[int, int] | None:
        """A mapping that takes one agent to the other, or None where none was found."""
        return self._completed({one: other}, [(one, k) for k in self._sees[one]])

    def _completed(
        self, found: dict[int, int], links: list[tuple[int, int]]
    ) -> dict[int, int] | None:
        """Complete a mapping; of the links (agent, seen agent) these are not yet known to be kept.

        Agents of one kind see equally many, so a mapping that keeps all links adds none.
        """
        for number, (watcher, k) in enumerate(links):
            places = self._sees[found[watcher]]
            if k in found:
                if found[k] not in places:
                    return None
                continue
            taken = set(found.values())
            for place in places:
                if place in taken or self.kinds[place] != self.kinds[k]:
                    continue
                self._tries -= 1
                if self._tries < 0:
                    return None
                more = [*links[number + 1 :], *((k, m) for m in self._sees[k])]
                completed = self._completed({**found, k: place}, more)
                if completed:
                    return completed
            return None
        return found
