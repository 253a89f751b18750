"""The sentences round the card: how to act, why lines differ, and what was assumed."""

from __future__ import annotations

from typing import Any

from thumbwright.distill.findings import Findings
from thumbwright.distill.sheet.parts import Act, Card, Note
from thumbwright.distill.sheet.voice import Counting, Voice, own_evidence
from thumbwright.distill.sheet.why import why
from thumbwright.distill.sheet.words import (
    capital,
    clean,
    listing,
    plural,
    quoted,
    times_in,
)


def acts(findings: Findings, voice: Voice, counting: Counting, card: Card) -> tuple[Act, ...]:
    """Return the three acts of a check in the order in which the model takes them.

    Under ``once`` what was shown at the last check is used before the new sign; under
    ``settle`` the agent acts, then looks across again until nobody changes.
    """
    look = (counting.lead, counting.text)
    if card.kind == "numbers" and not counting.tally:
        low, high = voice.minus_short, voice.plus_short
        look = (
            counting.lead,
            f"{counting.text.replace('peg one box', 'one to the')} "
            f"… {low} 2, {low} 1, 0, {high} 1, {high} 2 …",
        )
    read = {
        "strips": "Do what stands under your peg.",
        "numbers": "Do what it says for your peg.",
        "blocks": "Do what it says for your number.",
        "table": "Add what it counts to what you have seen yourself.",
    }[card.kind]
    fits = "what is shown" if len(voice.seen) > 1 else f"what {voice.those} shows"
    if card.kind == "table" and not findings.count_is_whole:
        look = ("Take one fresh look.", "Keep account of all you have seen as you always do.")
    states = [voice.shows_short[state] for state in ("undecided", "plus", "minus")]
    if any(not result.rule.is_grid for result in findings.forms.values()):
        asked = f"how many {listing(states)}?"
        asked = capital(f"{plural(voice.thing)}: {asked}" if voice.thing else asked)
    else:
        asked = listing(states, "or") + "?"
        asked = capital(f"{voice.thing}: {asked}" if voice.thing else asked)
    if findings.case.time.exchange == "settle":
        parts = (
            look,
            ("Find the one line", f"that fits {fits}. {read}"),
            (
                f"Look across at {voice.those}.",
                f"{asked} If anything changed, find your line again; repeat until nobody changes.",
            ),
        )
    else:
        parts = (
            (f"Look across at {voice.those}.", asked),
            look,
            ("Find the one line", f"that fits {fits}. {read}"),
        )
    return tuple(Act(place + 1, lead, text) for place, (lead, text) in enumerate(parts))


def acts_heading(findings: Findings, voice: Voice) -> str:
    """Return the heading over the acts, with the length of a check where it is told."""
    label = clean(findings.case.time.step_label or "")
    each = ""
    check = voice.check.lower()
    if label and label.lower() not in (check, f"one {check}", f"1 {check}", f"each {check}"):
        every = "" if label.lower().startswith(("each ", "every ")) else "each "
        each = f" ({every}{label})"
    return f"At every {voice.check}{each}, in this order"


def notes(findings: Findings, voice: Voice, counting: Counting, card: Card) -> tuple[Note, ...]:
    """Return the remarks beside the card."""
    kept = "your number" if counting.tally else "the peg"
    found = [
        Note("One line at a time.", f"What {voice.those} shows changes the line, never {kept}.")
        if len(voice.seen) == 1
        else Note("One line at a time.", f"What the others show changes the line, never {kept}.")
    ]
    if card.kind == "table":
        found = [
            Note(
                "Why there is no card:",
                "none was asked for. This sheet says only how strongly what is shown speaks; the"
                " look-up on the screen puts it together with your own signs."
                if findings.count_is_whole
                else "what you see here does not come in whole signs, so there is no count to keep"
                " by hand. Let someone who has the other side of this sheet keep it.",
            )
        ]
    reason = why(findings, voice, card)
    if reason:
        found.append(reason)
    found.append(_nobody(voice, card))
    found.append(
        Note(
            "Made your call?",
            f"It stands: this {thing(card)} takes nothing back. If things change, follow your local"
            " rule.",
        )
    )
    found.append(
        Note(
            f"{capital(voice.check)} {voice.horizon:,}, still no call?",
            "No answer here. Follow your local rule.",
        )
    )
    return tuple(found)


def thing(card: Card) -> str:
    """Return what page 1 is called: a card, or a sheet where no card is possible."""
    return "sheet" if card.kind == "table" else "card"


def _nobody(voice: Voice, card: Card) -> Note:
    """Say what to do where nobody may be on watch: silence is not presence."""
    lead = "Not sure anyone is on watch there?"
    if len(voice.seen) > 1:
        lead = "Not sure they are all on watch?"
    proof = f" {quoted(voice.shows['undecided'])} does not show that anyone is there."
    if card.alone:
        return Note(lead, f"Use {card.alone} all through.{proof}")
    if card.kind == "table":
        return Note(lead, f"Count it as nothing.{proof}")
    return Note(lead, f"Put this card aside and follow your usual practice.{proof}")


def supposes(findings: Findings, voice: Voice, card: Card) -> tuple[str, ...]:
    """Return what the figures suppose, as plain sentences."""
    case = findings.case
    sentences = [_sign_worth(findings, voice)]
    prior = case.question.prior_plus
    if abs(prior - 0.5) < 1e-9:
        sentences.append("Before the first look both answers are as likely.")
    else:
        sentences.append(f"Before the first look {quoted(voice.plus)} is true {times_in(prior)}.")
    sentences.append(
        "No two signs come from the same look at the same thing; all keep the same rhythm of"
        f" {plural(voice.check)}."
    )
    habits: dict[str, list[str]] = {}
    for agent in voice.seen:
        habits.setdefault(_habit(findings, voice, agent), []).append(voice.names[agent])
    named = {
        name
        for result in findings.forms.values()
        for row in result.rule.rows
        for names in row.thresholds.values()
        for name in names
    }
    for name in sorted(named):
        bars = _named_bars(case, name, voice)
        if bars:
            sentences.append(f"Habit {quoted(clean(name))}: calling at {bars}.")
    sentences.extend(f"{capital(voice.whom(n))}: {habit}" for habit, n in habits.items())
    sentences.append(f"Only you use this {thing(card)}; the others judge by the full calculation.")
    return tuple(sentences)


def _habit(findings: Findings, voice: Voice, agent: str) -> str:
    """Say whom a watched agent watches, and where it calls as far as that can be said."""
    case = findings.case
    spec = case.agents[agent]
    others = ["you" if other == findings.agent else voice.names[other] for other in spec.sees]
    if len(others) > 1 and len(others) == len(case.agents) - 1:
        others = ["everybody else"]
    watched = f"watching {listing(others) if others else 'nobody'}"
    if any(agent in row.thresholds for form in findings.forms.values() for row in form.rule.rows):
        return f"{watched}, with one of these habits, known to you, and keeping to it."
    bars = _own_bars(case, spec, voice)
    if bars:
        alone = "" if not others else " when alone"
        return f"{watched}, calling at {bars}{alone}, and keeping to that."
    return f"{watched}, and keeping to fixed habits (on the back)."


def _own_bars(case: Any, spec: Any, voice: Voice) -> str:
    """Return "mild 2 or frost 4" for thresholds counted in signs; "" for others."""
    return _named_bars(case, spec.thresholds, voice) if isinstance(spec.thresholds, str) else ""


def _named_bars(case: Any, name: str, voice: Voice) -> str:
    threshold = case.thresholds[name]
    if getattr(threshold, "unit", None) != "observations":
        return ""
    low, high = round(threshold.minus), round(threshold.plus)
    if not low < 0 < high:
        return ""
    return f"{voice.minus_short} {-low} or {voice.plus_short} {high}"


def _sign_worth(findings: Findings, voice: Voice) -> str:
    """Say in plain words what one look is worth."""
    evidence: Any = own_evidence(findings)
    if evidence.kind == "coin":
        return f"A sign is right {times_in(evidence.p)}."
    if evidence.kind == "bernoulli":
        return (
            f"{capital(voice.plus_sign)}: {times_in(evidence.p_plus)} if {quoted(voice.plus)}, "
            f"{times_in(evidence.p_minus)} if {quoted(voice.minus)}."
        )
    if evidence.kind == "calibration":
        with_plus = evidence.hits + evidence.misses
        with_minus = evidence.false_alarms + evidence.correct_rejections
        return (
            f"{capital(voice.plus_sign)}, on trial: {evidence.hits:,} of {with_plus:,} if"
            f" {quoted(voice.plus)}, {evidence.false_alarms:,} of {with_minus:,} if"
            f" {quoted(voice.minus)}."
        )
    if evidence.kind == "binomial":
        return (
            f"Each of the {evidence.m:,} looked at is a {voice.plus_sign}"
            f" {times_in(evidence.p_plus)} if {quoted(voice.plus)}, {times_in(evidence.p_minus)} if"
            f" {quoted(voice.minus)}."
        )
    if evidence.kind == "poisson":
        return (
            f"{capital(voice.plus_sign)}: {_per(evidence.rate_plus, voice)} if"
            f" {quoted(voice.plus)}, {_per(evidence.rate_minus, voice)} if {quoted(voice.minus)},"
            " on average."
        )
    return "What one look can show, and how often under either answer, is as told on the back."


def _per(rate: float, voice: Voice) -> str:
    """Say a mean count per check with whole numbers."""
    for base in (1, 10, 100, 1000):
        if abs(rate * base - round(rate * base)) < 1e-9 * base:
            break
    many = voice.check if base == 1 else plural(voice.check)
    return f"{round(rate * base):,} in {base:,} {many}"
