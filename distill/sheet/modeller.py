"""The back of the sheet: what a modeller needs to judge the card and to make it again."""

from __future__ import annotations

import re
from collections import Counter
from collections.abc import Callable
from typing import Any

from thumbwright.distill.case import Agent, is_crowd
from thumbwright.distill.findings import Agreed, Figures, Findings, FormResult, ReckonedResult
from thumbwright.distill.rules import FIRST_ANSWERS, NUMBERS, SHOWN, Row
from thumbwright.distill.sheet.chart import chart
from thumbwright.distill.sheet.doubts import doubts_grid, doubts_notes
from thumbwright.distill.sheet.nested import nested
from thumbwright.distill.sheet.parts import Grid, Modeller, Nested, Note, Sentence
from thumbwright.distill.sheet.sizes import sizes_chart
from thumbwright.distill.sheet.voice import Voice, own_evidence
from thumbwright.distill.sheet.words import clean, five, listing, range_words, signed

FORM_TITLES = {
    "lines": "The lines: bars on the own count",
    "table": "The table: values in place of what others show",
    "table-by-risk": "The table by risk: boxes and values chosen for least risk",
    "table-for-all": "The table for all: values that are right where everybody uses it",
    "tree": "The tree: values found by one cut after another",
    "shifts": "The shifts: bars, and by how many boxes what is shown moves them",
    "formula": "The formula: worth reckoned from few numbers",
}

IN_SENTENCES = ("tree",)
"""Forms whose rows are read as nested sentences, not as a table."""


def modeller(findings: Findings, voice: Voice) -> Modeller:
    """Build the back."""
    return Modeller(
        intro=_intro(findings),
        chart=chart(findings, voice),
        rules=tuple(
            _rule(name, result, findings, voice)
            for name, result in _forms(findings)
            if name not in IN_SENTENCES
        ),
        said=tuple(
            nested(FORM_TITLES[name], result, findings, voice)
            for name, result in _forms(findings)
            if name in IN_SENTENCES
        )
        + tuple(_reckoned(name, one) for name, one in findings.reckoned.items()),
        rule_notes=_notes(findings),
        figures=_figures(findings),
        figure_notes=_figure_notes(findings),
        losses=_losses(findings),
        doubts=doubts_grid(findings) if findings.doubts else None,
        doubts_notes=doubts_notes(findings),
        exactness=_exactness(findings),
        settings=_settings(findings, voice),
        sizes=sizes_chart(findings),
    )


def _forms(findings: Findings) -> list[tuple[str, FormResult]]:
    order: list[str] = [name for name in ("lines", "table") if name in findings.forms]
    order += [name for name in findings.forms if name not in order]
    return [(name, findings.forms[name]) for name in order]


def _intro(findings: Findings) -> str:
    one = "the agent’s own observations so far, this one included"
    text = f"A step is one observation; its number counts {one}. Worths are in nats (log-odds)."
    if findings.count_is_whole and findings.alpha is not None:
        text += f" One unit of the own count is worth {five(findings.alpha)} nats"
        if findings.beta:
            text += f", and every observation {five(findings.beta)} nats besides"
        text += "."
    return text


def _steps(row: Row) -> str:
    first, last = row.step_from or 1, row.step_to
    if last is None:
        return f"{first} on"
    return str(first) if last == first else f"{first} to {last}"


def _shown(row: Row, findings: Findings, voice: Voice) -> str:
    parts = []
    for agent in findings.seen:
        states = [state for state in SHOWN if state in row.shows.get(agent, SHOWN)]
        text = "any" if len(states) == len(SHOWN) else " or ".join(states)
        parts.append(f"{voice.names[agent]} {text}")
    if not row.shows:
        parts = []
    numbers = [name for name in NUMBERS if name in row.ranges]
    parts += [f"{name.replace('_', ' ')} {range_words(*row.ranges[name])}" for name in numbers]
    if row.first_answer is not None:
        said = [answer for answer in FIRST_ANSWERS if answer in row.first_answer]
        parts.append(f"first answer {' or '.join(said)}")
    habits = voice.habits(row.thresholds)
    return "; ".join([*parts, habits] if habits else parts) or "any"


def _rule(name: str, result: FormResult, findings: Findings, voice: Voice) -> Grid:
    """Return the rows of one form with how often each is used."""
    bars = result.rule.has_bars
    in_units = not bars and findings.count_is_whole and bool(findings.alpha)
    head = ["row", "steps", "shown"]
    if bars:
        head += ["minus at or below", "plus at or above"]
    else:
        head += ["nats", "in units of the count"] if in_units else ["nats"]
    head += ["steps in force", "calls"]
    rows = []
    for place, (row, use) in enumerate(zip(result.rule.rows, result.uses, strict=True)):
        cells = [str(place + 1), _steps(row), _shown(row, findings, voice)]
        if bars:
            cells += [_bar(row.minus_at), _bar(row.plus_at)]
        else:
            cells.append(five(row.value))
            if in_units and row.value is not None and findings.alpha:
                cells.append(five(row.value / findings.alpha))
        rows.append((*cells, five(use.steps_in_force), five(use.calls)))
    return Grid(FORM_TITLES.get(name, f"The form {name}"), tuple(head), tuple(rows))


def _bar(bar: int | None) -> str:
    return "never" if bar is None else signed(bar)


def _reckoned(name: str, result: ReckonedResult) -> Nested:
    """Say a rule without rows, one sentence after the other."""
    texts = (re.sub(r"(?<!\w)-(?=\d)", "−", text) for text in result.rule.sentences())
    said = tuple(Sentence(clean(text), ()) for text in texts)
    return Nested(FORM_TITLES.get(name, f"The form {name}"), said)


def _notes(findings: Findings) -> tuple[Note, ...]:
    results: list[tuple[str, FormResult | ReckonedResult]] = list(_forms(findings))
    results += findings.reckoned.items()
    return tuple(Note(f"{name}:", " ".join(_rule_notes(result))) for name, result in results)


def _rule_notes(result: FormResult | ReckonedResult) -> list[str]:
    said = []
    if result.information_kept is not None:
        kept = five(result.information_kept)
        said.append(f"Information kept {kept} (share of the log-loss gain).")
    if isinstance(result, FormResult) and result.information_ceiling is not None:
        count = len(result.rule.rows)
        said.append(
            f"Ceiling over any {count} groups of situations: {five(result.information_ceiling)}."
        )
    return [*said, *(clean(note) for note in result.notes)] or ["no remarks."]


def _figures(findings: Findings) -> Grid:
    """Return every figure of every way of playing, with five digits."""
    forms = _forms(findings)
    ways = [
        ("exact", findings.exact),
        *((name, result.figures) for name, result in forms),
        *((f"{n}, all use it", r.everybody) for n, r in forms if r.everybody is not None),
        *((name, result.figures) for name, result in findings.reckoned.items()),
        ("plain count", findings.plain_count),
        ("alone", findings.alone),
    ]
    measures: list[tuple[str, Callable[[Figures], float | None]]] = [
        ("wrong, given plus", lambda way: way.wrong_given_plus),
        ("wrong, given minus", lambda way: way.wrong_given_minus),
        ("undecided at the horizon, given plus", lambda way: way.given_plus["undecided"]),
        ("undecided at the horizon, given minus", lambda way: way.given_minus["undecided"]),
        ("mean steps, given plus", lambda way: way.given_plus["steps"]),
        ("mean steps, given minus", lambda way: way.given_minus["steps"]),
        ("mean steps", lambda way: way.mean_step),
        ("accuracy", lambda way: way.accuracy),
        ("accuracy lost against exact", lambda way: way.accuracy_lost),
        ("delay added against exact (steps)", lambda way: way.delay_added),
        ("risk (loss)", lambda way: way.risk),
        ("benefit kept (share)", lambda way: way.benefit_kept),
        ("commitments read by the off-model convention", lambda way: way.off_model),
    ]
    rows = tuple(
        (label, *(_measure(measure(way), label, findings, way.errors) for _, way in ways))
        for label, measure in measures
    )
    agreed = {name: result.agreed for name, result in forms if result.agreed is not None}
    if agreed:
        rows += tuple(
            (label, *(_agreed_cell(agreed[n], name) if n in agreed else "" for n, _ in ways))
            for label, name in _AGREEMENT
        )
    return Grid(
        "Figures with five digits; one adopter where nothing else is said",
        ("measure (probability where no unit stands)", *(name for name, _ in ways)),
        rows,
    )


_AGREEMENT = (
    ("ends as exact play does on the same observations", "same"),
    ("ends opposite to it", "opposite"),
    ("steps apart from it, on the same observations", "steps_apart"),
)

_WITH_ERROR = {
    "wrong, given plus": "wrong_given_plus",
    "wrong, given minus": "wrong_given_minus",
    "mean steps": "mean_step",
    "accuracy": "accuracy",
    "accuracy lost against exact": "accuracy_lost",
    "delay added against exact (steps)": "delay_added",
    "risk (loss)": "risk",
    "benefit kept (share)": "benefit_kept",
}
"""Figures that have a standard error where histories were sampled, by the name of the error."""


def _agreed_cell(agreed: Agreed, name: str) -> str:
    value: float = getattr(agreed, name)
    return _sampled(value, (agreed.errors or {}).get(name))


def _sampled(value: float, error: float | None) -> str:
    """A figure, with its standard error where it was sampled."""
    return five(value) if error is None else f"{five(value)} ± {error:.2g}"


def _measure(
    value: float | None, label: str, findings: Findings, errors: dict[str, float] | None
) -> str:
    if value is None and label.startswith("benefit"):
        return "none" if findings.watching_is_worth else "not stated"
    if value is None:
        return five(value)
    return _sampled(value, (errors or {}).get(_WITH_ERROR.get(label, "")))


def _figure_notes(findings: Findings) -> tuple[str, ...]:
    said = [
        "One adopter: only this agent uses the rule; the others play exact and take everyone for"
        " exact. Exact play is a benchmark and no ceiling: thresholds are not chosen anew for"
        " company, so benefit kept may exceed 1.",
        "All use it: everybody who can, and the others play exact. What the agent’s exact play is"
        " held against is the group in which all play exact.",
        "Plain count: a commitment seen counts as that agent’s threshold less the prior, an"
        " undecided agent as nothing.",
    ]
    said += [
        f"The {name} is worse than ignoring the neighbours: its risk is larger than that of an"
        " agent alone."
        for name in findings.worse_than_alone
    ]
    results = findings.forms.values()
    if any((one.everybody or one.figures).errors or one.figures.errors for one in results):
        said.append("±: one standard error, where histories were sampled.")
    if not findings.watching_is_worth:
        said.append(
            "Watching is worth nothing here (exact play saves less than 1 % of the risk alone), so"
            " no benefit kept is stated."
        )
    return tuple(said)


def _span(ends: tuple[float, float] | None) -> str:
    return "" if ends is None else f"{five(ends[0])} to {five(ends[1])}"


def _losses(findings: Findings) -> Grid:
    """Return the losses that risk is counted in, and what they can be."""
    basis, head = findings.costs, ("loss", "used", "range that the thresholds allow")
    if basis is None:
        return Grid("Losses", head, (("all", "none stated, none inferred: no risk is known", ""),))
    ratio = basis.false_plus / basis.false_minus
    undecided = "answers by belief" if basis.undecided is None else five(basis.undecided)
    rows = [
        ("false plus", five(basis.false_plus), ""),
        ("false minus", five(basis.false_minus), ""),
        ("false plus over false minus", five(ratio), _span(basis.loss_ratio_range)),
        ("one step", five(basis.per_step), _span(basis.per_step_range)),
        ("undecided at the horizon", undecided, ""),
    ]
    if basis.benefit_kept_range is not None:
        name, result = _forms(findings)[0]
        kept = five(result.figures.benefit_kept)
        rows.append((f"benefit kept ({name})", kept, _span(basis.benefit_kept_range)))
    how = "inferred from the thresholds" if basis.inferred else "stated in the case"
    return Grid(f"Losses, {how}", head, tuple(rows))


def _exactness(findings: Findings) -> tuple[str, ...]:
    said = [
        "All figures are exact sums over the model: nothing was split, dropped, sampled or read"
        " by the off-model convention."
        if findings.is_exact
        else "Not all figures are exact; what is not:"
    ]
    said += [clean(text) for text in findings.caveats]
    said.append(
        "Probability decided by the tie rule (between 1e−12 and 1e−9 nats of a threshold):"
        f" {five(findings.near_tie_mass)}."
    )
    return tuple(said)


def _settings(findings: Findings, voice: Voice) -> Grid:
    """Return what is needed to make the same sheet again."""
    case = findings.case
    rows = [
        ("program", f"thumbwright {findings.version}"),
        ("case", f"{clean(case.name)}, digest {findings.digest}"),
        ("answers", f"plus: {voice.plus}; minus: {voice.minus}"),
        ("prior probability of plus", f"{case.question.prior_plus:g}"),
        ("stakes", case.question.stakes),
        ("evidence", _spec(own_evidence(findings))),
        ("horizon", f"{case.time.horizon} steps"),
        ("exchange", case.time.exchange),
        *((f"thresholds {clean(name)}", _spec(spec)) for name, spec in case.thresholds.items()),
        *_agents(findings, voice),
        ("rule for", f"{voice.owner}, looking at {listing(list(case.rule.inputs))}"),
    ]
    return Grid("Settings", ("setting", "value"), tuple(rows))


MOST_AGENTS = 30
"""More agents than this are not listed one by one where everybody sees everybody."""


def _agents(findings: Findings, voice: Voice) -> list[tuple[str, str]]:
    """Return one row per agent; a large crowd in short."""
    agents = findings.case.agents
    if len(agents) <= MOST_AGENTS or not is_crowd(agents):
        return [(f"agent {voice.names[key]}", _agent(key, findings, voice)) for key in agents]
    habits = Counter(_habit(agent) for agent in agents.values())
    said = "; ".join(f"{number} with thresholds {habit}" for habit, number in habits.items())
    return [(f"{len(agents)} agents", f"everybody sees everybody; {said}")]


def _habit(agent: Agent) -> str:
    if isinstance(agent.thresholds, str):
        return clean(agent.thresholds)
    return "unknown: " + ", ".join(f"{clean(n)} {s:g}" for n, s in agent.thresholds.items())


def _spec(spec: Any) -> str:
    """Write the keys of a part of the case that are set."""
    keys = spec.model_dump(by_alias=True, exclude_none=True)
    return "; ".join(f"{key} {_value(value)}" for key, value in keys.items())


def _value(value: Any) -> str:
    if isinstance(value, bool | int | float):
        return f"{value:g}".replace("-", "−") if isinstance(value, float) else str(value)
    if isinstance(value, list):
        return ", ".join(_value(item) for item in value)
    return clean(str(value))


def _agent(key: str, findings: Findings, voice: Voice) -> str:
    agent = findings.case.agents[key]
    habit = _habit(agent)
    sees = ", ".join(voice.names[other] for other in agent.sees) or "nobody"
    if len(agent.sees) > 1 and len(agent.sees) == len(findings.case.agents) - 1:
        sees = "everybody else"
    own = "" if agent.evidence is None else f"; own evidence: {_spec(agent.evidence)}"
    return f"id {key}; thresholds {habit}; sees {sees}{own}"
