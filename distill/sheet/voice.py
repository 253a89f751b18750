"""The group's own words, cleaned and cut to the lengths that a sheet needs, and how it counts."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from thumbwright.distill.case import is_crowd
from thumbwright.distill.findings import Findings
from thumbwright.distill.rules import SHOWN
from thumbwright.distill.sheet.words import (
    act_forms,
    apart,
    capital,
    clean,
    listing,
    shared_start,
)

FRESH = "Take one fresh look."

MOST_NAMES = 4
"""Agents watched that are named one by one; more are told by their number."""


@dataclass(frozen=True)
class Voice:
    """Words for one agent's sheet.

    Attributes
    ----------
    shows, shows_short : dict of str to str
        Wording per shown state (members of ``SHOWN``); the short one without the words that all
        three begin with, which stand in ``thing`` ("lamp").
    minus_forms, plus_forms : tuple of str
        Wordings of the two acts, full one first.
    minus_short, plus_short : str
        The two signs without the words that both end with ("frost", "mild").
    names : dict of str to str
        Agent id to name.
    """

    owner: str
    seen: tuple[str, ...]
    names: dict[str, str]
    plus: str
    minus: str
    check: str
    plus_sign: str
    minus_sign: str
    plus_short: str
    minus_short: str
    shows: dict[str, str]
    shows_short: dict[str, str]
    thing: str
    do_plus: str
    do_minus: str
    plus_forms: tuple[str, ...]
    minus_forms: tuple[str, ...]
    horizon: int

    @property
    def seen_names(self) -> tuple[str, ...]:
        """Names of the agents watched, in the order of the case."""
        return tuple(self.names[agent] for agent in self.seen)

    @property
    def those(self) -> str:
        """The agents watched, as one phrase."""
        return self.whom(self.seen_names) or "nobody"

    def whom(self, names: Sequence[str]) -> str:
        """Say some of the agents watched; all of many of them by their number."""
        if len(names) == len(self.seen) > MOST_NAMES:
            return f"the {len(names)} others"
        return listing(names)

    def checks(self, first: int | None, last: int | None) -> str:
        """Say a range of checks in words; "" for all of them."""
        start = max(first or 1, 1)
        end = None if last is None or last >= self.horizon else last
        if end is None:
            if start == 1:
                return ""
            return f"{self.check} {start}" if start >= self.horizon else f"{self.check} {start} on"
        if end <= start:
            return f"{self.check} {start}"
        between = "or" if end == start + 1 else "to"
        return f"{self.check} {start} {between} {end}"

    def span(self, first: int | None, last: int | None) -> str:
        """Say a range of checks by its numbers alone, for a column of ranges."""
        start = max(first or 1, 1)
        end = self.horizon if last is None else min(last, self.horizon)
        return str(start) if end <= start else f"{start} to {end}"

    def states(self, accepted: Iterable[str], short: bool = True) -> str:
        """Say a set of shown states; "" where every state is accepted."""
        chosen = set(accepted)
        if chosen >= set(SHOWN):
            return ""
        words = self.shows_short if short else self.shows
        return listing([words[state] for state in SHOWN if state in chosen], "or")

    def habits(self, thresholds: Mapping[str, frozenset[str]]) -> str:
        """Say which habits (named thresholds) of the watched agents a row is for; "" for any."""
        parts = []
        for agent in self.seen:
            names = sorted(clean(name) for name in thresholds.get(agent, ()))
            if names:
                whose = "" if len(self.seen) == 1 else f" of {self.names[agent]}"
                parts.append(f"habit{whose}: {listing(names, 'or')}")
        return "; ".join(parts)

    def situation(self, shows: Mapping[str, frozenset[str]]) -> str:
        """Say what the watched agents show, as a heading."""
        groups: dict[str, list[str]] = {}
        for agent in self.seen:
            text = self.states(shows.get(agent, SHOWN))
            groups.setdefault(text, []).append(self.names[agent])
        groups.pop("", None)
        if not groups:
            return "Whatever is shown"
        if len(self.seen) == 1:
            return capital(next(iter(groups)))
        if len(groups) == 1:
            text, names = next(iter(groups.items()))
            if len(names) == len(self.seen):
                return capital(("both " if len(names) == 2 else "all ") + text)
        return capital("; ".join(f"{listing(names)}: {text}" for text, names in groups.items()))


def for_all_alike(findings: Findings) -> bool:
    """Whether the rule is for anybody in a crowd."""
    return findings.case.rule.agent == "any" and is_crowd(findings.case.agents)


def _owner(findings: Findings, names: dict[str, str]) -> str:
    """Whose sheet it is: one agent's, or anybody's in a crowd of which all are meant."""
    if for_all_alike(findings):
        return f"any of the {len(findings.case.agents)}"
    return names[findings.agent]


def voice(findings: Findings) -> Voice:
    """Collect the words of a case for the sheet of ``findings.agent``."""
    case = findings.case
    words, question = case.words, case.question
    names = {agent: clean(spec.name) for agent, spec in case.agents.items()}
    full = tuple(clean(text) for text in (words.shows_nothing, words.shows_plus, words.shows_minus))
    thing, short = shared_start(full)
    plus_sign, minus_sign = clean(words.plus_sign), clean(words.minus_sign)
    plus_short, minus_short = apart(plus_sign, minus_sign)
    do_plus, do_minus = clean(words.do_plus), clean(words.do_minus)
    minus_forms, plus_forms = act_forms(do_minus, do_plus)
    return Voice(
        owner=_owner(findings, names),
        seen=findings.seen,
        names=names,
        plus=clean(question.plus),
        minus=clean(question.minus),
        check=clean(words.check),
        plus_sign=plus_sign,
        minus_sign=minus_sign,
        plus_short=plus_short,
        minus_short=minus_short,
        shows=dict(zip(SHOWN, full, strict=True)),
        shows_short=dict(zip(SHOWN, short, strict=True)),
        thing=thing,
        do_plus=do_plus,
        do_minus=do_minus,
        plus_forms=plus_forms,
        minus_forms=minus_forms,
        horizon=case.time.horizon,
    )


@dataclass(frozen=True)
class Counting:
    """How the one number is kept.

    Attributes
    ----------
    tally : bool
        True where signs only ever add to the number; False where a peg moves both ways.
    flipped : bool
        True where the printed number is minus the own count of the rule, because the group
        counts the signs that speak for minus.
    lead, text : str
        The act of looking, in words.
    sign : str
        What is counted, where only one kind of sign counts.
    """

    tally: bool
    flipped: bool
    lead: str
    text: str
    sign: str


def own_evidence(findings: Findings) -> Any:
    """Return the evidence spec that the sheet's agent looks at."""
    spec = findings.case.agents[findings.agent].evidence
    return findings.case.evidence if spec is None else spec


def counting(findings: Findings, voice: Voice) -> Counting:
    """Say how the agent keeps its number with the evidence it has."""
    evidence, offsets = own_evidence(findings), findings.value_offsets
    flipped = offsets is not None and max(offsets, default=0) <= 0 and min(offsets, default=0) < 0
    tally = offsets is not None and (flipped or min(offsets, default=0) >= 0)
    sign = voice.minus_sign if flipped else voice.plus_sign
    if evidence.kind in ("binomial", "poisson"):
        among = f" among the {evidence.m}" if evidence.kind == "binomial" else ""
        text = f"Add 1 to your number for each {sign}{among} of this {voice.check}."
        return Counting(True, flipped, "Count afresh.", text, sign)
    if evidence.kind in ("bernoulli", "calibration"):
        text = f"{capital(sign)}: add 1 to your number. {_otherwise(voice, flipped)}: leave it."
        return Counting(True, flipped, FRESH, text + _certain(evidence, voice), sign)
    if evidence.kind == "listed" and offsets is not None:
        return Counting(tally, flipped, FRESH, _moves(findings.labels, offsets, tally), sign)
    text = (
        f"{capital(voice.plus_sign)}: peg one box right. "
        f"{capital(voice.minus_sign)}: peg one box left."
    )
    return Counting(False, False, FRESH, text, sign)


def _otherwise(voice: Voice, flipped: bool) -> str:
    return capital(voice.plus_sign if flipped else voice.minus_sign)


def _certain(evidence: Any, voice: Voice) -> str:
    """Say which sign settles the question at once, where one answer makes it impossible."""
    p_plus, p_minus = getattr(evidence, "p_plus", None), getattr(evidence, "p_minus", None)
    if evidence.kind == "calibration":
        p_plus, p_minus = evidence.hits, evidence.false_alarms
    settled = []
    if p_minus == 0:
        settled.append((voice.plus_sign, voice.do_plus))
    if p_plus == 0:
        settled.append((voice.plus_sign, voice.do_minus))
    return "".join(f" {capital(sign)} settles it: {act} at once." for sign, act in settled)


def _moves(labels: tuple[str, ...], offsets: tuple[int, ...], tally: bool) -> str:
    """Say what each listed value does to the number."""
    moves = []
    for label, offset in zip(labels, offsets, strict=True):
        value = capital(clean(label))
        if offset == 0:
            moves.append(f"{value}: leave it.")
        elif tally:
            moves.append(f"{value}: add {abs(offset)}.")
        else:
            moves.append(f"{value}: {abs(offset)} {'right' if offset > 0 else 'left'}.")
    return " ".join(moves)
