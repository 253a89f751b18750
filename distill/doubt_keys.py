"""What a case file may say about how it may be wrong: one table per doubted world."""

from __future__ import annotations

from typing import Literal

from pydantic import Field

from thumbwright.distill.evidence_keys import Evidence
from thumbwright.distill.fields import Id, OptionalText, Part


class DoubtedAgent(Part):
    """What may really be so of one agent, while everybody goes by the case."""

    thresholds: str | None = Field(default=None, description="Name of its real [thresholds.*].")
    sees: list[str] | None = Field(
        default=None, description="Whom it really sees; only the agent itself knows."
    )
    evidence: Evidence | None = Field(
        default=None, description="What its observations are really like, of the same kind."
    )
    answers: Literal["never", "at random"] | None = Field(
        default=None,
        description='"never": it shows no answer. "at random": it looks at nobody and its own '
        "observations tell nothing.",
    )


class Doubt(Part):
    """One [doubts.NAME] table: a world in which the case is not right."""

    says: OptionalText = Field(
        default="", description="What is really so, in plain words; left out: the name."
    )
    evidence: Evidence | None = Field(
        default=None,
        description="What observations are really like, for all who have the case's evidence; of "
        "the same kind.",
    )
    agents: dict[Id, DoubtedAgent] = Field(
        default={}, description="What is really so of single agents."
    )
