"""The case: a question, a group, its evidence and thresholds, and the rule that is wanted.

:class:`CaseFile` is what a user writes; :class:`Case` is the same, complete: words filled in,
a ``[network]`` shape written out as agents. Both are frozen. A :class:`Case` has also passed
the checks between sections (``distill.crosschecks``), so nothing downstream repeats them.
"""

from __future__ import annotations

import hashlib
import json
from collections.abc import Mapping
from typing import Annotated, Any, Literal, Self, get_args

from pydantic import ConfigDict, Field, ValidationInfo, field_validator, model_validator
from pydantic_core import PydanticCustomError

from thumbwright.distill import crosschecks
from thumbwright.distill.editor_schema import editor_schema
from thumbwright.distill.evidence_keys import Evidence
from thumbwright.distill.faults import key_text
from thumbwright.distill.fields import (
    PLAIN,
    Id,
    InnerProbability,
    NotNegative,
    Number,
    OptionalText,
    Part,
    Positive,
    Probability,
    Text,
    Within,
)
from thumbwright.distill.group_checks import TIMETABLE
from thumbwright.distill.group_keys import LONGEST, Agent, AgentTable, Network

__all__ = [
    "FORMS",
    "INPUTS",
    "Agent",
    "AgentTable",
    "Case",
    "CaseFile",
    "Costs",
    "Evidence",
    "Network",
    "Question",
    "RuleWanted",
    "Thresholds",
    "Time",
    "Words",
]

Form = Literal["lines", "table", "table-by-risk", "table-for-all", "tree", "shifts", "formula"]
Input = Literal[
    "step",
    "shown",
    "thresholds",
    "plus_shown",
    "minus_shown",
    "undecided_shown",
    "steps_since_first",
    "steps_since_last",
    "came_first",
    "first_answer",
]

FORMS: tuple[str, ...] = get_args(Form)
"""The forms a rule can be distilled into in this version."""

INPUTS: tuple[str, ...] = get_args(Input)
"""What a rule may look at."""


class Question(Part):
    """The two answers, how likely plus is beforehand, and what a wrong answer can hurt."""

    plus: Text = Field(description="The answer called plus, in the group's own words.")
    minus: Text = Field(description="The answer called minus, in the group's own words.")
    prior_plus: InnerProbability = Field(
        default=0.5, description="Probability of plus before anybody has observed anything."
    )
    stakes: Literal["people", "animals", "property", "none"] = Field(
        description="What a wrong answer can hurt; it decides the cautions that are printed."
    )


class Words(Part):
    """The group's own words for the sheet. Those left out are made from the two answers."""

    check: Text = Field(default="check", description="What one step is called.")
    plus_sign: OptionalText = Field(default="", description="One observation that points to plus.")
    minus_sign: OptionalText = Field(
        default="", description="One observation that points to minus."
    )
    shows_plus: OptionalText = Field(
        default="", description="How an agent looks that answered plus."
    )
    shows_minus: OptionalText = Field(
        default="", description="How an agent looks that answered minus."
    )
    shows_nothing: Text = Field(
        default="no answer yet", description="How an agent looks that is undecided."
    )
    do_plus: OptionalText = Field(default="", description="What to do to answer plus.")
    do_minus: OptionalText = Field(default="", description="What to do to answer minus.")

    def filled(self, plus: str, minus: str) -> Words:
        """Return the same words with a default, made from the two answers, in every gap."""
        defaults = {
            "plus_sign": f"sign of “{plus}”",
            "minus_sign": f"sign of “{minus}”",
            "shows_plus": f"says “{plus}”",
            "shows_minus": f"says “{minus}”",
            "do_plus": f"answer “{plus}”",
            "do_minus": f"answer “{minus}”",
        }
        gaps = {name: text for name, text in defaults.items() if not getattr(self, name)}
        return self.model_copy(update=gaps)


class Time(Part):
    """How long there is, what a step is, and when what was shown is taken in."""

    horizon: Annotated[int, Within(1, LONGEST, whole=True)] = Field(
        description="Number of steps after which no more answers are given."
    )
    step_label: OptionalText = Field(
        default="", description='How long one step takes, such as "10 minutes".'
    )
    exchange: Literal["once", "settle"] = Field(
        default="once",
        description='"once": what is shown in a step is used from the next step on. "settle": '
        "within a step, answers and silence are taken in until nobody would answer any more.",
    )


class Thresholds(Part):
    """The two beliefs at which an agent answers, in one of three ways of stating them.

    Levels (``plus``, ``minus`` and ``unit``), tolerated error rates (``false_plus`` and
    ``false_minus``), or the best ones for an agent alone at the costs of the case.
    """

    model_config = ConfigDict(
        json_schema_extra={
            "oneOf": [
                {"required": ["plus", "minus", "unit"]},
                {"required": ["false_plus", "false_minus"]},
                {"required": ["from"]},
            ]
        }
    )

    plus: Number | None = Field(default=None, description="Answer plus at this level or above.")
    minus: Number | None = Field(default=None, description="Answer minus at this level or below.")
    unit: Literal["observations", "nats", "probability"] | None = Field(
        default=None,
        description='"observations": signs for plus less signs for minus, counted from the prior '
        '(coin evidence only); "nats": log-odds of the belief; "probability": of plus.',
    )
    false_plus: InnerProbability | None = Field(
        default=None, description="Tolerated probability of answering plus when minus is true."
    )
    false_minus: InnerProbability | None = Field(
        default=None, description="Tolerated probability of answering minus when plus is true."
    )
    from_: Literal["costs"] | None = Field(
        default=None,
        alias="from",
        description='"costs": the best thresholds for an agent alone, from [costs].',
    )

    @property
    def from_costs(self) -> bool:
        """Whether these are the best thresholds for an agent alone at the case's costs."""
        return self.from_ is not None


class RuleWanted(Part):
    """What the rule is for and what it may look at."""

    agent: str = Field(description='Id of the agent the rule is for, or "any" if all are alike.')
    inputs: list[Input] = Field(
        default=["step", "shown"], min_length=1, description="What the rule may look at."
    )
    covers: list[str] = Field(
        default=[], description='With "thresholds" as an input: the names it tells apart.'
    )
    forms: list[Form] = Field(
        default=["lines", "table"], min_length=1, description="The forms to distil it into."
    )
    rows: Annotated[int, Within(1, 60, whole=True)] = Field(
        default=6, description="Most rows of the rule."
    )
    max_accuracy_lost: Probability | None = Field(
        default=None, description="Largest loss of accuracy, against exact play, to accept."
    )
    min_benefit_kept: Probability | None = Field(
        default=None,
        description="Least share of what exact watching saves over being alone; needs costs.",
    )
    polish: bool = Field(
        default=False,
        description="Whether to move bars, values and cuts for less risk; needs costs.",
    )

    def for_crowd(self) -> RuleWanted:
        """What is left out, filled in for a crowd: its rule counts the others."""
        defaults = {"inputs": ["step", "plus_shown", "minus_shown"], "forms": ["table"]}
        left_out = {k: v for k, v in defaults.items() if k not in self.model_fields_set}
        return self.model_copy(update=left_out)


NEWER = ("min_benefit_kept", "polish")
"""Keys of the rule that cases did not have at first."""

CROWD = 4
"""So many agents who all see each other are counted by a rule unless it says what it looks at."""


def is_crowd(agents: Mapping[str, Agent]) -> bool:
    """Whether these are many, and everybody sees everybody else."""
    return len(agents) >= CROWD and all(
        set(agent.sees) == agents.keys() - {key} for key, agent in agents.items()
    )


class Costs(Part):
    """What wrong answers and time cost, in one unit of the user's choice."""

    false_plus: Positive = Field(description="Loss of answering plus when minus is true.")
    false_minus: Positive = Field(description="Loss of answering minus when plus is true.")
    per_step: NotNegative = Field(description="Cost of one step.")
    undecided: NotNegative | None = Field(
        default=None,
        description="Loss of no answer by the horizon; left out: the belief answers there.",
    )


class _Shared(Part):
    title: Text = Field(description="What the case is called.")
    question: Question
    words: Words = Field(default=Words(), validate_default=True)
    evidence: Evidence = Field(description="What one agent learns in one step.")
    time: Time
    thresholds: dict[Id, Thresholds] = Field(min_length=1, description="Named pairs of thresholds.")
    rule: RuleWanted
    costs: Costs | None = None


class CaseFile(_Shared):
    """A thumbwright case file, as written: each table of the file is a field."""

    agents: dict[Id, AgentTable] | None = Field(
        default=None, min_length=1, description="The group, one table per agent."
    )
    network: Network | None = None

    def complete(
        self, name: str, source: str, members: Mapping[str, list[str]] | None = None
    ) -> Case:
        """Return the complete case; ``name`` and ``source`` as in :class:`Case`.

        ``members`` is who sees whom by the network file, for a case that names one.

        Raises
        ------
        pydantic.ValidationError
            If sections contradict each other.
        """
        if self.network is not None:
            agents = self.network.agents(members)
        else:
            agents = {key: table.complete(key) for key, table in (self.agents or {}).items()}
        parts = {field: getattr(self, field) for field in _Shared.model_fields}
        if is_crowd(agents):
            parts["rule"] = self.rule.for_crowd()
        return Case(**parts, agents=agents, name=name, source=source)


class Case(_Shared):
    """A complete, checked case.

    Attributes
    ----------
    name : str
        Slug of the file name, or the starter's name; names the folder of the results.
    source : str
        What the user typed to name the case.
    agents : dict of str to Agent
        By id, in the order of the file; never empty.
    words : Words
        Always filled.

    Raises
    ------
    pydantic.ValidationError
        (a ``ValueError``) on anything a case may not hold. ``reading.read_case`` gives the same
        faults in plain words with their lines.
    """

    name: str = "case"
    source: str = ""
    agents: dict[Id, Agent] = Field(min_length=1)

    @field_validator("words", mode="after")
    @classmethod
    def _fill_words(cls, words: Words, info: ValidationInfo) -> Words:
        question = info.data.get("question")
        return words if question is None else words.filled(question.plus, question.minus)

    @model_validator(mode="after")
    def _check_across(self) -> Self:
        found = crosschecks.contradictions(self.model_dump(by_alias=True, exclude_none=True))
        if found:
            text = "; ".join(f"{key_text(key)}: {text}" for key, text in found)
            raise PydanticCustomError(PLAIN, "{text}", {"text": text, "found": found})
        return self

    @property
    def rule_agent(self) -> str:
        """Id of the agent the rule is for; for "any" the first that sees somebody, or the first."""
        if self.rule.agent != "any":
            return self.rule.agent
        watchers = [key for key, agent in self.agents.items() if agent.sees]
        return watchers[0] if watchers else next(iter(self.agents))

    @property
    def digest(self) -> str:
        """First 12 hex digits of the SHA-256 of what the case says.

        Taken over canonical JSON of the complete case, defaults included and agents in order.
        Name and source are left out: a copy of a file says the same, and so does a file that
        spells out a default or a network shape. A network file counts by what it says.
        """
        content = self.model_dump(mode="json", by_alias=True, exclude={"name", "source"})
        for agent in content["agents"].values():
            # An ordinary timetable is left out, as in cases from before there were others.
            for key in TIMETABLE:
                if agent[key] == 1:
                    del agent[key]
        # So are keys of the rule that came later, unless they are used.
        for key in NEWER:
            if content["rule"][key] == RuleWanted.model_fields[key].default:
                del content["rule"][key]
        content["agents"] = list(content["agents"].items())
        canonical = json.dumps(content, sort_keys=True, separators=(",", ":"), allow_nan=False)
        return hashlib.sha256(canonical.encode("utf-8")).hexdigest()[:12]

    @classmethod
    def json_schema(cls) -> dict[str, Any]:
        """The JSON Schema (2020-12) of a case file, for editors.

        It knows keys, types and ranges; what must hold between sections it cannot say.
        """
        return editor_schema(CaseFile)
