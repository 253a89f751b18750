"""The group, as a case file states it: one table per agent, or a usual shape."""

from __future__ import annotations

from typing import Annotated, Any, Literal

from pydantic import BeforeValidator, ConfigDict, Field, WithJsonSchema

from thumbwright.distill.evidence_keys import Evidence
from thumbwright.distill.faults import shown
from thumbwright.distill.fields import OptionalText, Part, Text, Within, fault
from thumbwright.distill.network import LARGEST_GROUP, who_sees_whom


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
Uses = Annotated[str | dict[str, float], BeforeValidator(_named_or_mixed)]


class Agent(Part):
    """One agent of a complete case."""

    name: Text
    thresholds: Uses
    """Name of its thresholds; or, where only the agent itself knows them, name to share."""
    sees: list[str]
    evidence: Evidence | None = None


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

    def complete(self, agent_id: str) -> Agent:
        """Return the agent with its name and thresholds settled."""
        uses = self.thresholds if self.unknown is None else self.unknown
        return Agent(
            name=self.name or agent_id,
            thresholds=uses if uses is not None else "",
            sees=list(self.sees),
            evidence=self.evidence,
        )


class Network(Part):
    """A group of one of the usual shapes; its agents get the ids a1, a2 and so on."""

    shape: Literal["one-way", "mutual", "relay", "ring", "star", "crowd"] = Field(
        description="Who sees whom. one-way: a2 sees a1. mutual: a1 and a2 see each other. "
        "relay: each sees the one before it. ring: each sees both its neighbours. star: a1 sees "
        "everybody and everybody sees a1. crowd: everybody sees everybody."
    )
    size: Annotated[int, Within(2, LARGEST_GROUP, whole=True)] | None = Field(
        default=None, description="Number of agents; may be left out for one-way and mutual: 2."
    )
    thresholds: str = Field(description="Name of the [thresholds.*] that all of them have.")
    names: list[Text] | None = Field(
        default=None, description='What people call them, in order; left out: "Agent 1" ...'
    )

    def agents(self) -> dict[str, Agent]:
        """Return the agents of the group, by id.

        Raises
        ------
        ValueError
            If the shape cannot have that many agents.
        """
        sees = who_sees_whom(self.shape, 2 if self.size is None else self.size)
        names = self.names or [f"Agent {number}" for number in range(1, len(sees) + 1)]
        return {
            agent: Agent(name=name, thresholds=self.thresholds, sees=seen)
            for (agent, seen), name in zip(sees.items(), names, strict=True)
        }
