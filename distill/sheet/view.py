"""From findings to the plain parts of a sheet (pure; the templates add markup only)."""

from __future__ import annotations

from dataclasses import replace

from thumbwright.distill.cautions import cautions
from thumbwright.distill.findings import Findings
from thumbwright.distill.sheet.card import card
from thumbwright.distill.sheet.costs import cost_note, costs, example
from thumbwright.distill.sheet.fit import PAGE_HEIGHT, front_height
from thumbwright.distill.sheet.lookup import lookup
from thumbwright.distill.sheet.modeller import modeller
from thumbwright.distill.sheet.notes import acts, acts_heading, notes, supposes, thing
from thumbwright.distill.sheet.parts import Sheet
from thumbwright.distill.sheet.voice import counting, for_all_alike, voice
from thumbwright.distill.sheet.words import capital, clean


def sheet(findings: Findings) -> Sheet:
    """Build the sheet for the agent of ``findings``."""
    words = voice(findings)
    kept = counting(findings, words)
    front = card(findings, words, kept)
    case = findings.case
    title = capital(words.plus).rstrip("?!. ") + "?"
    made = Sheet(
        page_title=f"{title} For {words.owner}",
        title=title,
        case_title=clean(case.title),
        owner_lead="For" if for_all_alike(findings) else "Only for",
        owner=words.owner,
        watching=words.those,
        override=(
            f"Plain evidence, an alarm or an order: act on that. This {thing(front)} is for when"
            " you are not sure."
        ),
        caution_first=case.question.stakes == "people",
        caution_lead=f"Caution with this {thing(front)}.",
        cautions=tuple(cautions(case.question.stakes)),
        supposes=supposes(findings, words, front),
        acts_heading=acts_heading(findings, words),
        acts=acts(findings, words, kept, front),
        card=front,
        notes=notes(findings, words, kept, front),
        cost_heading="Wrong calls of 100, if only you use it",
        costs=costs(findings, words),
        cost_note=cost_note(findings, words),
        example_heading="A made-up example",
        example=example(findings, words, kept, front),
        foot=(
            f"thumbwright {findings.version} · case {clean(case.name)}, digest {findings.digest} ·"
            f" up to {words.check} {case.time.horizon:,} · counts rounded; figures and settings on"
            " the back"
        ),
        lookup=lookup(findings, words, kept, front),
        modeller=modeller(findings, words),
    )
    return _fitted(made)


def _fitted(made: Sheet) -> Sheet:
    """Choose spacing, and the place of the example, so that page 1 holds what it must."""
    for front, tight in ((True, False), (True, True), (False, False)):
        if front_height(made, with_example=front, tight=tight) <= PAGE_HEIGHT:
            return replace(made, example_on_front=front, tight=tight)
    if front_height(made, with_example=False, tight=True) <= PAGE_HEIGHT:
        return replace(made, example_on_front=False, tight=True)
    # The card alone is longer than a page: what must be on page 1 goes before it.
    return replace(made, example_on_front=False, tight=True, long=True, caution_first=True)
