"""What one agent learns in one step, as a case file states it: one model per kind of evidence.

Only shapes and ranges are checked here; ``distill.crosschecks`` looks at what must hold
between keys, and ``thumbwright.exact.evidence`` does the mathematics.
"""

from __future__ import annotations

from typing import Annotated, Literal

from pydantic import Field

from thumbwright.distill.fields import Part, Positive, Probability, Text, Within

Count = Annotated[int, Within(0, 1_000_000_000, whole=True)]


class EvidenceKeys(Part):
    """Keys that every kind of evidence accepts."""

    tolerance: Annotated[float, Within(above=0, high=0.1)] = Field(
        default=1e-3,
        description="Relative change of error probabilities and mean steps of the agent alone "
        "that is accepted where evidence has to be split onto a ladder.",
    )


class CoinEvidence(EvidenceKeys):
    """One sign for plus or for minus, each right with the same probability."""

    kind: Literal["coin"]
    p: Probability = Field(
        description="Probability that one sign points to the true answer, from 0.5 to 1.",
        json_schema_extra={"minimum": 0.5},  # below it, crosschecks says how to swap the signs
    )


class BernoulliEvidence(EvidenceKeys):
    """A sign that is there or not, with its probability under each answer."""

    kind: Literal["bernoulli"]
    p_plus: Probability = Field(description="Probability of the sign if plus is true.")
    p_minus: Probability = Field(description="Probability of the sign if minus is true.")


class CalibrationEvidence(EvidenceKeys):
    """A sign that is there or not, known from counts of earlier cases whose truth came out."""

    kind: Literal["calibration"]
    hits: Count = Field(description="Sign seen, and plus was true.")
    misses: Count = Field(description="No sign seen, and plus was true.")
    false_alarms: Count = Field(description="Sign seen, and minus was true.")
    correct_rejections: Count = Field(description="No sign seen, and minus was true.")


class BinomialEvidence(EvidenceKeys):
    """How many of m looks in one step show the sign."""

    kind: Literal["binomial"]
    m: Annotated[int, Within(1, 10_000, whole=True)] = Field(description="Looks in one step.")
    p_plus: Probability = Field(description="Probability of the sign in one look, given plus.")
    p_minus: Probability = Field(description="Probability of the sign in one look, given minus.")


class PoissonEvidence(EvidenceKeys):
    """How many events one step brings."""

    kind: Literal["poisson"]
    rate_plus: Annotated[float, Within(above=0, high=10_000)] = Field(
        description="Mean number of events in one step, given plus."
    )
    rate_minus: Annotated[float, Within(above=0, high=10_000)] = Field(
        description="Mean number of events in one step, given minus."
    )


class ListedEvidence(EvidenceKeys):
    """Any finite list of values, with the probability of each under both answers."""

    kind: Literal["listed"]
    plus: list[Probability] = Field(
        min_length=2, description="Probability of each value given plus; they sum to 1."
    )
    minus: list[Probability] = Field(
        min_length=2, description="Probability of each value given minus; they sum to 1."
    )
    values: list[Text] | None = Field(
        default=None, min_length=2, description="What each value is called, in the same order."
    )


class NormalEvidence(EvidenceKeys):
    """A measurement that is normally distributed, with the same spread under both answers."""

    kind: Literal["normal"]
    d: Positive = Field(description="Distance of the two means, in standard deviations.")
    tail: Annotated[float, Within(above=0, high=0.01)] = Field(
        default=1e-12, description="Probability that is cut off at the far ends."
    )


Evidence = Annotated[
    CoinEvidence
    | BernoulliEvidence
    | CalibrationEvidence
    | BinomialEvidence
    | PoissonEvidence
    | ListedEvidence
    | NormalEvidence,
    Field(discriminator="kind"),
]

EVIDENCE_KINDS: dict[str, type[EvidenceKeys]] = {
    "coin": CoinEvidence,
    "bernoulli": BernoulliEvidence,
    "calibration": CalibrationEvidence,
    "binomial": BinomialEvidence,
    "poisson": PoissonEvidence,
    "listed": ListedEvidence,
    "normal": NormalEvidence,
}
"""The model of every kind, by the word that a case file uses for it."""
