"""The sheet's sentences, costs, example and back."""

from __future__ import annotations

from dataclasses import replace

import pytest

from tests.distill.sheet import sample_findings as samples
from thumbwright.distill.cautions import cautions
from thumbwright.distill.findings import Findings, WorthCurve
from thumbwright.distill.sheet.chart import axis, chart, spread, step_ticks, value_at
from thumbwright.distill.sheet.fit import PAGE_HEIGHT, front_height, lines_of
from thumbwright.distill.sheet.parts import Sheet
from thumbwright.distill.sheet.view import sheet
from thumbwright.distill.sheet.voice import counting, voice


def said(made: Sheet, lead: str) -> str:
    """Return the remark that opens with ``lead``."""
    return next(note.text for note in made.notes if note.lead.startswith(lead))


def test_frost_in_the_groups_own_words() -> None:
    made = sheet(samples.frost())
    assert made.title == "Frost tonight?"
    assert (made.owner, made.watching) == ("Mill field", "Upper field")
    assert made.acts_heading == "At every check (each 10 minutes), in this order"
    assert [(act.number, act.lead, act.text) for act in made.acts] == [
        (1, "Look across at Upper field.", "Lamp: dark, lit or blinking?"),
        (
            2,
            "Take one fresh look.",
            "Frost sign: peg one box right. Mild sign: peg one box left.",
        ),
        (
            3,
            "Find the one line",
            "that fits what Upper field shows. Do what stands under your peg.",
        ),
    ]
    assert made.card.heading == "Your peg starts on 0. Read what stands under it."
    assert said(made, "Not sure") == (
        "Use line A all through. “lamp dark” does not show that anyone is there."
    )
    assert said(made, "Check 40, still no call?") == "No answer here. Follow your local rule."
    assert made.supposes == (
        "A sign is right 6 times in 10.",
        "Before the first look both answers are as likely.",
        "No two signs come from the same look at the same thing; all keep the same rhythm of"
        " checks.",
        "Upper field: watching nobody, calling at mild 2 or frost 4, and keeping to that.",
        "Only you use this card; the others judge by the full calculation.",
    )


def test_settle_looks_across_after_acting() -> None:
    findings = samples.frost(time={"horizon": 40, "exchange": "settle"})
    made = sheet(findings)
    assert [act.lead for act in made.acts] == [
        "Take one fresh look.",
        "Find the one line",
        "Look across at Upper field.",
    ]
    assert "repeat until nobody changes" in made.acts[2].text
    assert made.acts_heading == "At every check, in this order"


def news(*worths: float) -> tuple[WorthCurve, ...]:
    """Return the curve of an undecided neighbour alone."""
    steps = tuple(range(1, len(worths) + 1))
    return (WorthCurve("", ("undecided",), steps, worths, worths, worths),)


@pytest.mark.parametrize(
    ("lean", "worths", "expected"),
    [
        (
            "minus",
            (0.0, 0.4),
            "Upper field: sooner to “stand down” than to “light the lamp”, so “lamp dark” for long"
            " speaks a little for “frost tonight”. So stand down one box later.",
        ),
        (
            "plus",
            (0.01, -0.4),
            "Upper field: sooner to “light the lamp” than to “stand down”, so “lamp dark” for long"
            " speaks a little for “no frost tonight”. So stand down one box later.",
        ),
        (
            "even",
            (0.0, 0.4),
            "Upper field: as soon to one call as to the other, yet here “lamp dark” for long speaks"
            " a little for “frost tonight”. So stand down one box later.",
        ),
        (
            "minus",
            (-0.8, 0.4),
            "Upper field: at some checks one call comes sooner, at others the other, so “lamp"
            " dark” speaks now for one answer, now for the other. So stand down one box later.",
        ),
        (
            "minus",
            (0.0, -0.4),
            "Upper field: here “lamp dark” for long speaks a little for “no frost tonight”. So"
            " stand down one box later.",
        ),
        (
            "plus",
            (0.0, 0.001),
            "Upper field: here “lamp dark” says next to nothing until somebody calls. So stand down"
            " one box later.",
        ),
    ],
)
def test_why_an_undecided_neighbour_matters(
    lean: str, worths: tuple[float, ...], expected: str
) -> None:
    findings = replace(samples.frost(), leans={"upper": lean}, worth_curves=news(*worths))
    assert said(sheet(findings), "Why B differs from A:") == expected


def test_why_with_several_neighbours() -> None:
    assert said(sheet(samples.three()), "Why B differs from A:") == (
        "East gate and West gate: sooner to “stand down” than to “light the lamp”, so “lamp dark”"
        " for long speaks a little for “frost tonight”. North gate: “lamp dark” says nothing until"
        " somebody calls. So stand down one box later."
    )


def test_signs_not_boxes_where_there_are_no_boxes() -> None:
    text = said(sheet(samples.long_scale()), "Why B differs from A:")
    assert text.endswith("So stand down three signs later.")


def test_why_an_even_neighbour_changes_nothing() -> None:
    sample = samples.frost()
    rule = samples.bars(
        (None, None, [samples.QUIET], -3, 3),
        (None, None, [samples.PLUS], -6, 0),
        (None, None, [samples.MINUS], 0, 6),
        agent="mill",
        seen=("upper",),
    )
    forms = {"lines": samples.priced(rule, sample.exact)}
    made = sheet(replace(sample, forms=forms, leans={"upper": "even"}, worth_curves=news(0.0, 0.0)))
    assert said(made, "Why “lamp dark” changes nothing:").endswith("until somebody calls.")


def test_silence_is_not_presence_where_numbers_drift() -> None:
    assert said(sheet(samples.lots()), "Not sure").startswith("Use D all through.")
    unknown = replace(samples.lots(), alone_rows=())
    assert said(sheet(unknown), "Not sure").startswith("Put this card aside")
    assert said(sheet(samples.readings()), "Not sure").startswith("Count it as nothing.")


@pytest.mark.parametrize("stakes", ["people", "animals", "property", "none"])
def test_cautions_are_all_there_and_on_top_for_people(stakes: str) -> None:
    question = samples.FROST["question"] | {"stakes": stakes}
    made = sheet(samples.frost(question=question))
    assert made.cautions == cautions(stakes)
    assert made.caution_first == (stakes == "people")


def test_costs_of_a_hundred() -> None:
    made = sheet(samples.frost())
    assert made.costs.head == (
        "",
        "if “frost tonight”",
        "if “no frost tonight”",
        "average check",
    )
    assert made.costs.rows == (
        ("this card", "22", "17", "7"),
        ("full calculation", "22", "17", "7"),
        ("“lamp dark” ignored", "26", "16", "7"),
        ("everybody ignored", "23", "23", "8"),
    )
    assert made.cost_note == ""


def test_no_call_gets_a_column_once_it_matters() -> None:
    made = sheet(samples.lots())
    assert made.costs.head[3] == "no call, of 100"
    assert made.costs.rows[2] == ("“no tag yet” ignored", "5", "fewer than 1", "3", "22")


def test_worthless_watching_is_said() -> None:
    made = sheet(replace(samples.frost(), watching_is_worth=False))
    assert made.cost_note == "Here watching is worth next to nothing."
    assert any("nothing here" in note for note in made.modeller.figure_notes)


def test_example_runs_through_the_lines() -> None:
    made = sheet(samples.frost())
    assert made.example is not None
    assert made.example.head == ("Check", "Lamp", "Sign", "Peg", "Do")
    assert made.example.rows[0] == ("1", "dark", "mild", "mild\u00a01", "A: watch")
    assert made.example.rows[4] == ("5", "lit", "frost", "mild\u00a01", "C: light the lamp")
    assert made.example.marked == frozenset({4})
    lots = sheet(samples.lots()).example
    assert lots is not None
    assert lots.head == ("Item", "First inspector", "Sign", "Number", "Do")
    assert lots.rows[3] == ("24", "red tag", "defective", "2", "B: reject the lot")
    assert sheet(samples.readings()).example is None


EVIDENCE = [
    (
        {
            "kind": "calibration",
            "hits": 45,
            "misses": 5,
            "false_alarms": 6,
            "correct_rejections": 54,
        },
        (0, 1),
        "Frost sign: add 1 to your number. Mild sign: leave it.",
        "Frost sign, on trial: 45 of 50 if “frost tonight”, 6 of 60 if “no frost tonight”.",
    ),
    (
        {"kind": "binomial", "m": 5, "p_plus": 0.3, "p_minus": 0.1},
        (0, 1, 2, 3, 4, 5),
        "Add 1 to your number for each frost sign among the 5 of this check.",
        "Each of the 5 looked at is a frost sign 3 times in 10 if “frost tonight”, 1 time in 10 if"
        " “no frost tonight”.",
    ),
    (
        {"kind": "poisson", "rate_plus": 1.5, "rate_minus": 1.0},
        (0, 1, 2),
        "Add 1 to your number for each frost sign of this check.",
        "Frost sign: 15 in 10 checks if “frost tonight”, 1 in 1 check if “no frost tonight”, on"
        " average.",
    ),
    (
        {"kind": "bernoulli", "p_plus": 0.3, "p_minus": 0.0},
        (0,),
        "Frost sign: add 1 to your number. Mild sign: leave it. Frost sign settles it: light the"
        " lamp at once.",
        "Frost sign: 3 times in 10 if “frost tonight”, never if “no frost tonight”.",
    ),
    (
        {
            "kind": "listed",
            "plus": [0.2, 0.3, 0.5],
            "minus": [0.5, 0.3, 0.2],
            "values": ["dry", "damp", "wet"],
        },
        (-1, 0, 1),
        "Dry: 1 left. Damp: leave it. Wet: 1 right.",
        "What one look can show, and how often under either answer, is as told on the back.",
    ),
]


@pytest.mark.parametrize(("evidence", "offsets", "act", "worth"), EVIDENCE)
def test_every_kind_of_evidence_has_words(
    evidence: dict, offsets: tuple[int, ...], act: str, worth: str
) -> None:
    thresholds = {
        "even": {"plus": 1.2, "minus": -1.2, "unit": "nats"},
        "quick-to-stand-down": {"plus": 1.6, "minus": -0.8, "unit": "nats"},
    }
    findings = samples.frost(evidence=evidence, thresholds=thresholds)
    labels = tuple(evidence.get("values", map(str, range(len(offsets)))))
    findings = replace(findings, value_offsets=offsets, labels=labels)
    words = voice(findings)
    assert counting(findings, words).text == act
    assert sheet(findings).supposes[0] == worth


def test_back_has_five_digits_of_every_way() -> None:
    back = sheet(samples.frost()).modeller
    assert back.figures.head[1:] == ("exact", "lines", "table", "plain count", "alone")
    assert back.figures.rows[0] == (
        "wrong, given plus",
        "0.21872",
        "0.21873",
        "0.21873",
        "0.26012",
        "0.22857",
    )
    assert back.rules[0].rows[2] == (
        "3",
        "1 on",
        "Upper field plus",
        "−7",
        "−1",
        "1.7500",
        "0.25000",
    )
    assert back.losses.caption == "Losses, inferred from the thresholds"
    assert ("one step", "0.015000", "0.013300 to 0.017100") in back.losses.rows
    none = sheet(replace(samples.frost(), costs=None)).modeller.losses
    assert none.rows == (("all", "none stated, none inferred: no risk is known", ""),)
    assert back.exactness[0].startswith("All figures are exact sums")
    loose = sheet(samples.three()).modeller.exactness
    assert loose[:2] == (
        "Not all figures are exact; what is not:",
        "Some commitments were read by the off-model convention.",
    )


def test_chart_follows_its_numbers() -> None:
    findings = samples.frost()
    drawn = chart(findings, voice(findings))
    assert drawn is not None
    quiet, lit, _ = drawn.curves
    assert quiet.path.count("L") == 39
    assert lit.path.startswith("M")
    assert lit.path.count("L") == 35
    assert lit.label == "Lit"
    assert [curve.dash for curve in drawn.curves] == ["", "8 4", "2 3"]
    assert "Lit: from 1.6219 nats at step 5 to 1.6219 at step 40" in drawn.description
    assert drawn.figures.rows[0] == ("1", "0", "cannot be met", "cannot be met")
    assert chart(replace(findings, worth_curves=()), voice(findings)) is None


def test_chart_shades_where_the_time_of_a_call_matters() -> None:
    findings = samples.lots()
    drawn = chart(findings, voice(findings))
    assert drawn is not None
    assert all(curve.band.endswith("Z") for curve in drawn.curves)
    assert "Shaded" in drawn.reading


def test_table_values_are_looked_up_by_state_and_step() -> None:
    rule = samples.frost().forms["table"].rule
    assert value_at(rule, ("undecided",), 2) == 0.0
    assert value_at(rule, ("undecided",), 3) == 0.39
    assert value_at(rule, ("plus",), 1) == pytest.approx(4 * samples.ALPHA)


@pytest.mark.parametrize(
    ("low", "high"), [(-0.81, 1.62), (0.0, 0.0), (-1e-4, 3e-5), (-40.0, 900.0)]
)
def test_axis_holds_its_values(low: float, high: float) -> None:
    first, last, ticks = axis(low, high)
    assert first <= low
    assert last >= high
    assert 4 <= len(ticks) <= 9
    assert list(ticks) == sorted(ticks)


def test_step_ticks_end_at_the_last_step() -> None:
    assert step_ticks(1) == (1,)
    assert step_ticks(40) == (1, 5, 10, 15, 20, 25, 30, 35, 40)
    for last in range(2, 1001):
        ticks = step_ticks(last)
        assert (ticks[0], ticks[-1]) == (1, last)
        assert len(ticks) <= 12


def test_labels_are_spread_without_changing_order() -> None:
    assert spread([50.0, 51.0, 10.0], 0.0, 100.0, 13.0) == [50.0, 63.0, 10.0]
    crowded = spread([100.0] * 12, 0.0, 100.0, 13.0)
    assert crowded == sorted(crowded)
    assert max(crowded) == pytest.approx(100.0)
    assert min(crowded) >= -1e-9


@pytest.mark.parametrize("name", ["frost", "lots", "long-scale", "readings"])
def test_page_one_is_estimated_to_hold_the_card_cautions_and_costs(name: str) -> None:
    made = sheet(samples.SAMPLES[name]())
    assert front_height(made, made.example_on_front, made.tight) <= PAGE_HEIGHT
    assert not made.long


def test_a_card_longer_than_a_page_puts_caution_and_costs_first() -> None:
    sample = samples.frost()
    rows = [(step, step, [samples.QUIET], -3, 3) for step in range(1, 40)]
    rule = samples.bars(*rows, agent="mill", seen=("upper",))
    made = sheet(replace(sample, forms={"lines": samples.priced(rule, sample.exact)}))
    assert made.long
    assert made.caution_first
    assert made.card.lines[26].letter == "AA"


def test_lines_are_broken_between_words() -> None:
    assert lines_of("", 100.0) == 1
    assert lines_of("mmmm mmmm", 45.0) == 2
    assert lines_of("m" * 40, 100.0) == 4


def test_the_sheet_is_a_pure_function(capsys: pytest.CaptureFixture[str]) -> None:
    found: list[Findings] = [samples.three(), samples.three()]
    assert sheet(found[0]) == sheet(found[1])
    assert capsys.readouterr().out == ""
