"""The group, as a case file states it: one table per agent, or a usual shape."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Annotated, Any, Literal

from pydantic import BeforeValidator, ConfigDict, Field, WithJsonSchema

from thumbwright.distill.evidence_keys import Evidence
from thumbwright.distill.faults import shown
from thumbwright.distill.fields import OptionalText, Part, Text, Within, fault
from thumbwright.distill.network import LARGEST_GROUP, who_sees_whom

LONGEST = 1000
"""Most steps that a case may have."""

MOST_LOOKS = 100
"""Most observations of one agent in one step."""


def _named_or_mixed(value: Any) -> Any:
    """Accept a name, ``{ unknown = { name = share } }`` or ``{ name = share }``."""
    if isinstance(value, str):
        return value
    if isinstance(value, dict) and isinstance(value.get("unknown"), dict) and len(value) == 1:
        value = value["unknown"]
    if not isinstance(value, dict):
        raise fault(
            f"must be the name of thresholds in quotes, not {shown(value)}; where they are "
            "unknown write unknown = { name = share, other-name = share }"
        )
    if not value:
        raise fault("names no thresholds; give each possible name its share")
    for name, share in value.items():
        if isinstance(share, bool) or not isinstance(share, int | float) or not 0 < share <= 1:
            raise fault(
                f"the share of {shown(name)} is {shown(share)} (allowed more than 0, at most 1)"
            )
    return {name: float(share) for name, share in value.items()}


_SHARES = {
    "type": "object",
    "additionalProperties": {"type": "number", "exclusiveMinimum": 0, "maximum": 1},
    "minProperties": 1,
}
WholeStep = Annotated[int, Within(1, LONGEST, whole=True)]
Looks = Annotated[int, Within(1, MOST_LOOKS, whole=True)]
Uses = Annotated[str | dict[str, float], BeforeValidator(_named_or_mixed)]


class Agent(Part):
    """One agent of a complete case."""

    name: Text
    thresholds: Uses
    """Name of its thresholds; or, where only the agent itself knows them, name to share."""
    sees: list[str]
    evidence: Evidence | None = None
    first_step: WholeStep = 1
    """Step of its first observation; until then it shows undecided and cannot answer."""
    looks_every: WholeStep = 1
    """Steps from one with observations to the next."""
    looks_per_step: Looks = 1
    """Observations at each of these steps."""

    def looks(self, horizon: int) -> tuple[int, ...] | None:
        """Number of observations at each step, from 1 on; None for the ordinary one at each."""
        if self.first_step == self.looks_every == self.looks_per_step == 1:
            return None
        looking = range(self.first_step, horizon + 1, self.looks_every)
        return tuple(self.looks_per_step * (step in looking) for step in range(1, horizon + 1))


class AgentTable(Part):
    """One [agents.ID] table of a case file."""

    model_config = ConfigDict(
        json_schema_extra={"oneOf": [{"required": ["thresholds"]}, {"required": ["unknown"]}]}
    )

    name: OptionalText = Field(default="", description="What people call it; left out: the id.")
    thresholds: Annotated[
        Uses | None,
        WithJsonSchema(
            {
                "anyOf": [
                    {"type": "string"},
                    {
                        "type": "object",
                        "properties": {"unknown": _SHARES},
                        "required": ["unknown"],
                        "additionalProperties": False,
                    },
                ]
            }
        ),
    ] = Field(default=None, description="Name of its [thresholds.*].")
    unknown: Annotated[
        dict[str, float] | None, BeforeValidator(_named_or_mixed), WithJsonSchema(_SHARES)
    ] = Field(
        default=None,
        description="In place of thresholds, where only the agent itself knows them: the "
        "probability of each name, summing to 1.",
    )
    sees: list[str] = Field(default=[], description="Ids of the agents whose shown state it sees.")
    evidence: Evidence | None = Field(
        default=None, description="Evidence of its own, in place of [evidence]."
    )
    first_step: WholeStep = Field(
        default=1,
        description="Step of its first observation; before that it shows no answer, whatever it "
        "is shown. The others know.",
    )
    looks_every: WholeStep = Field(
        default=1,
        description="It observes at first_step and at every so many steps after it; in between "
        "it only takes in what is shown.",
    )
    looks_per_step: Looks = Field(
        default=1, description="Number of observations it makes at each step at which it observes."
    )

    def complete(self, agent_id: str) -> Agent:
        """Return the agent with its name and thresholds settled."""
        uses = self.thresholds if self.unknown is None else self.unknown
        return Agent(
            name=self.name or agent_id,
            thresholds=uses if uses is not None else "",
            sees=list(self.sees),
            evidence=self.evidence,
            first_step=self.first_step,
            looks_every=self.looks_every,
            looks_per_step=self.looks_per_step,
        )


class Network(Part):
    """A group of one of the usual shapes, its agents called a1, a2 and so on; or from a file."""

    model_config = ConfigDict(
        json_schema_extra={"oneOf": [{"required": ["shape"]}, {"required": ["file"]}]}
    )

    shape: Literal["one-way", "mutual", "relay", "ring", "star", "crowd"] | None = Field(
        default=None,
        description="Who sees whom. one-way: a2 sees a1. mutual: a1 and a2 see each other. "
        "relay: each sees the one before it. ring: each sees both its neighbours. star: a1 sees "
        "everybody and everybody sees a1. crowd: everybody sees everybody.",
    )
    file: Text | None = Field(
        default=None,
        description="In place of a shape: a file that says who sees whom, its path relative to "
        "the case file. NAME.csv has the columns agent and sees, one line for each agent and "
        "agent that it sees; sees is blank where it sees nobody. In NAME.graphml, a directed "
        "graph, the source of an edge sees its target.",
    )
    size: Annotated[int, Within(2, LARGEST_GROUP, whole=True)] | None = Field(
        default=None, description="Number of agents; may be left out for one-way and mutual: 2."
    )
    thresholds: str = Field(description="Name of the [thresholds.*] that all of them have.")
    names: list[Text] | None = Field(
        default=None,
        description='What people call them, in order; left out: "Agent 1" ..., or, with a file, '
        "their ids.",
    )

    def agents(self, members: Mapping[str, list[str]] | None = None) -> dict[str, Agent]:
        """Return the agents of the group, by id.

        Parameters
        ----------
        members : mapping of str to list of str, optional
            Who sees whom by the network file, where there is one.

        Raises
        ------
        ValueError
            If the shape cannot have that many agents, or the file has not been read.
        """
        sees: Mapping[str, list[str]]
        if self.file is not None:
            if members is None:
                raise ValueError("the network file has not been read")
            sees, default = members, list(members)
        else:
            sees = who_sees_whom(self.shape or "", 2 if self.size is None else self.size)
            default = [f"Agent {number}" for number in range(1, len(sees) + 1)]
        names = self.names or default
        return {
            agent: Agent(name=name, thresholds=self.thresholds, sees=seen)
            for (agent, seen), name in zip(sees.items(), names, strict=True)
        }
