"""What each number of rows costs, the limits that pick one, and stopping on the way."""

from __future__ import annotations

import json
from dataclasses import replace
from functools import cache
from typing import Any

import pytest

from tests.distill.forms.test_table import starter
from tests.distill.pricers import one_way
from tests.distill.test_crowds import case as crowd_case
from thumbwright.distill import job, sizes
from thumbwright.distill.assemble import Limits
from thumbwright.distill.case import Case
from thumbwright.distill.command import main
from thumbwright.distill.forms import Wanted, form
from thumbwright.distill.gather import gather
from thumbwright.distill.reading import case_from_text, starter_text
from thumbwright.exact.errors import ModelError
from thumbwright.exact.stopping import Losses

SHOWN = ("step", "shown")
FORMS = 'forms = ["lines", "table"]        #'
COSTS = "[costs]"


def frost(rule: str = "", forms: str = FORMS, horizon: int = 40, rows: int = 6) -> Case:
    text = starter_text("frost-watch").replace(FORMS, f"{rule}\n{forms} #")
    text = text.replace("horizon = 40", f"horizon = {horizon}").replace(
        "rows = 6", f"rows = {rows}"
    )
    return case_from_text(text, name="frost", file="frost.toml")


@cache
def found() -> dict[str, Any]:
    return job.sizes(frost(forms='forms = ["lines", "table", "table-by-risk", "tree"]', horizon=20))


@pytest.mark.parametrize("name", ["lines", "table", "table-by-risk", "tree"])
def test_each_size_is_what_the_form_makes_of_so_many_rows(name: str) -> None:
    case = frost(horizon=20)
    pricer = gathered_pricer(case)
    told = {size["rows"]: size for size in found()["forms"][name]["sizes"]}
    assert found()["complete"]
    assert list(told) == sorted(told)
    for rows in range(1, case.rule.rows + 1):
        made = form(name).distil(pricer, Wanted(rows, SHOWN))
        size = told[len(made.rule.rows)]
        figures = pricer.figures(pricer.rule_tally(made.rule))
        assert size["risk"] == pytest.approx(figures.risk, abs=1e-12)
        assert size["wrong_given_plus"] == pytest.approx(figures.wrong_given_plus, abs=1e-12)
        assert size["information_kept"] == pytest.approx(made.information_kept, abs=1e-12)


def gathered_pricer(case: Case) -> Any:
    from thumbwright.distill.pricing import pricer_of

    return pricer_of(case)[0]


def test_the_text_has_every_size_and_says_what_is_worse_than_not_watching() -> None:
    case = frost(forms='forms = ["table"]', horizon=20, rows=3)
    text = job.sizes_text(case, job.sizes(case))
    lines = text.splitlines()
    start = lines.index("table") + 2
    assert [line.split()[0] for line in lines[start : start + 3]] == ["1", "2", "3"]
    assert "worse than ignoring the neighbours" in lines[start]
    assert "worse than ignoring the neighbours" not in "".join(lines[start + 1 :])
    assert "accuracy lost" in lines[start - 1]
    assert "plain-count" in text
    assert "not a guarantee" in text
    assert "INCOMPLETE" not in text


@pytest.mark.parametrize("lines_done", [True, False])
def test_a_stopped_run_tells_what_it_has(
    monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str], lines_done: bool
) -> None:
    """Stopped at the third size of the table, or before anything was priced."""
    case, done = frost(horizon=12), []

    def progress(label: str, at: int, _total: int) -> None:
        done.append(label)
        if (label, at) == ("sizes, table", 3) or (label == "lines" and not lines_done):
            raise KeyboardInterrupt

    told = job.sizes(case, progress)
    assert not told["complete"]
    assert "INCOMPLETE" in job.sizes_text(case, told)
    if lines_done:
        assert [size["rows"] for size in told["forms"]["table"]["sizes"]] == [1, 2]
        whole = job.sizes(case)["forms"]
        assert told["forms"]["lines"] == whole["lines"]
        assert told["forms"]["table"]["sizes"] == whole["table"]["sizes"][:2]
    else:
        assert told["forms"] == {"lines": {"sizes": [], "fewest_rows_within_limits": None}}
    monkeypatch.setattr(job, "sizes", lambda *_: told)
    assert main(["sizes", "frost-watch"]) == 130
    assert "INCOMPLETE" in capsys.readouterr().out
    assert main(["sizes", "frost-watch", "--json"]) == 130
    assert json.loads(capsys.readouterr().out)["complete"] is False


@pytest.mark.parametrize("name", ["table", "table-by-risk", "tree", "lines"])
@pytest.mark.parametrize("least", [0.3, 0.9, 0.99])
def test_the_fewest_rows_that_keep_the_benefit(name: str, least: float) -> None:
    pricer = one_way((-2, 4), (-3, 3), 16)
    made = form(name).distil(pricer, Wanted(6, SHOWN, min_benefit_kept=least))
    kept = pricer.figures(pricer.rule_tally(made.rule)).benefit_kept
    assert kept is not None
    assert kept >= least
    assert any("share of the benefit that is asked for" in note for note in made.notes)
    for fewer in range(1, len(made.rule.rows)):
        other = form(name).distil(pricer, Wanted(fewer, SHOWN))
        less = pricer.figures(pricer.rule_tally(other.rule)).benefit_kept
        assert less is not None
        assert less < least


@pytest.mark.parametrize("name", ["table", "table-by-risk", "tree", "lines"])
def test_both_limits_at_once_and_what_none_can_meet(name: str) -> None:
    """By benefit alone two rows would do for the table, by accuracy alone the same."""
    pricer = one_way((-2, 4), (-3, 3), 16)

    def rows(lost: float | None, kept: float | None) -> int:
        made = form(name).distil(pricer, Wanted(6, SHOWN, lost, kept))
        figures = pricer.figures(pricer.rule_tally(made.rule))
        assert lost is None or figures.accuracy_lost <= lost
        assert kept is None or (figures.benefit_kept or 0.0) >= kept
        return len(made.rule.rows)

    assert rows(0.004, 0.95) >= max(rows(0.004, None), rows(None, 0.95))
    over = form(name).distil(pricer, Wanted(2, SHOWN, 0.004, 1.9))
    assert "of up to 2" in " ".join(over.notes)
    assert "within the accuracy that may be lost and" in " ".join(over.notes)
    assert "benefit" in " ".join(over.notes)


def test_sizes_name_the_fewest_rows_within_the_limits() -> None:
    case = frost("max_accuracy_lost = 0.01\nmin_benefit_kept = 0.9", horizon=20)
    told = job.sizes(case)
    for name, result in gather(case).forms.items():
        sizes_here = told["forms"][name]
        assert sizes_here["fewest_rows_within_limits"] == len(result.rule.rows)
        for size in sizes_here["sizes"]:
            within = size["accuracy_lost"] <= 0.01 and size["benefit_kept"] >= 0.9
            assert size["within_limits"] is within
    assert "fewest within the limits" in job.sizes_text(case, told)
    none = frost("max_accuracy_lost = 0.0\nmin_benefit_kept = 1.0", horizon=20, rows=2)
    text = job.sizes_text(none, job.sizes(none))
    assert "no table of up to 2 rows is within max_accuracy_lost = 0 and min_benefit" in text


@pytest.mark.parametrize("key", ["min_benefit_kept = 0.9", "polish = true"])
def test_what_needs_costs_is_refused_where_there_are_none(key: str) -> None:
    case = frost(key, horizon=8)
    # Such thresholds are best at no costs at all.
    odd = {"plus": 0.9999, "minus": 0.49, "unit": "probability"}
    dump = case.model_dump(by_alias=True) | {"costs": None}
    dump["thresholds"]["even"] = odd
    bare = Case.model_validate(dump)
    for work in (gather, job.sizes):
        with pytest.raises(ModelError, match=rf"rule\.{key.split()[0]}: needs costs.*\[costs\]"):
            work(bare)
    without = bare.rule.model_copy(update={"min_benefit_kept": None, "polish": False})
    told = job.sizes(bare.model_copy(update={"rule": without}))
    assert all(size["risk"] is None for size in told["forms"]["table"]["sizes"])
    assert "wrong answers only" in told["remarks"][0]


def test_new_keys_leave_old_digests_alone() -> None:
    assert frost("polish = false").digest == frost().digest
    changed = {frost(key).digest for key in ("polish = true", "min_benefit_kept = 0.9", "")}
    assert len(changed) == 3


def test_polished_sizes_are_at_least_as_good() -> None:
    plain = job.sizes(frost(horizon=20))
    case = frost("polish = true", horizon=20)
    better = job.sizes(case)
    for name in ("lines", "table"):
        risks = [
            {size["rows"]: size["risk"] for size in told["forms"][name]["sizes"]}
            for told in (plain, better)
        ]
        assert all(risks[1][rows] <= risk + 1e-12 for rows, risk in risks[0].items())
        assert any(risks[1][rows] < risk - 1e-4 for rows, risk in risks[0].items())
    assert "each rule polished" in job.sizes_text(case, better)
    made = gather(case).forms
    for name, result in made.items():
        assert any(note.startswith(("Polish", "Polished")) for note in result.notes), name
    rows = len(made["lines"].rule.rows)
    (same,) = (s for s in better["forms"]["lines"]["sizes"] if s["rows"] == rows)
    assert made["lines"].figures.risk == pytest.approx(same["risk"], abs=1e-12)


def test_watching_that_is_worth_nothing_is_called_so() -> None:
    text = starter_text("frost-watch").replace("horizon = 40", "horizon = 10")
    useless = '[agents.upper.evidence]\nkind = "coin"\np = 0.5001\n\n[agents.mill]'
    text = text.replace("[agents.mill]", useless).replace(FORMS, f"min_benefit_kept = 0.9\n{FORMS}")
    case = case_from_text(text, name="t", file="t.toml")
    told = job.sizes(case)
    said = job.sizes_text(case, told)
    assert "watching is worth nothing here" in said
    assert "min_benefit_kept is passed over" in said
    findings = gather(case)
    for result in findings.forms.values():
        assert any("passed over" in note for note in result.notes)
        assert len(result.rule.rows) == 1


def test_a_rule_that_is_worse_than_not_watching_is_called_so_everywhere() -> None:
    from thumbwright.distill.exports import render_all
    from thumbwright.distill.texts import sheet_text

    findings = gather(frost(forms='forms = ["table"]', horizon=20, rows=1))
    assert "The table is worse than ignoring the neighbours." in sheet_text(findings, [])
    for name in ("sheet.md", "sheet.html"):
        text = render_all(findings)[name]
        assert isinstance(text, str)
        assert "is worse than ignoring everybody." in text
        assert "The table is worse than ignoring the neighbours" in text
    good = gather(frost(forms='forms = ["table"]', horizon=20, rows=3))
    assert "worse than ignoring" not in sheet_text(good, [])


def test_a_sampled_crowd_has_standard_errors() -> None:
    case = crowd_case(more="rows = 3")
    told = job.sizes(case, limits=Limits(histories=400))
    assert not told["exact"]
    assert all(size["errors"]["risk"] > 0 for size in told["forms"]["table"]["sizes"][1:])
    text = job.sizes_text(case, told)
    assert "±" in text
    assert "not exact" in text


def test_sizes_on_a_sheet_are_those_of_the_verb_where_they_come_free() -> None:
    case = frost(horizon=20)
    on_sheet = gather(case).forms
    for name, told in job.sizes(case)["forms"].items():
        here = {size.rows: size.figures.risk for size in on_sheet[name].sizes}
        assert here == pytest.approx({size["rows"]: size["risk"] for size in told["sizes"]})
    _, pricer = starter("lot-inspection")
    wanted = Wanted(24, SHOWN)
    free = {name: sizes.come_free(name, pricer, wanted) for name in ("table", "lines", "tree")}
    assert free == {"table": True, "lines": False, "tree": True}
    assert not sizes.come_free("table", pricer, replace(wanted, rows=10_000))
    assert not sizes.come_free("table-by-risk", pricer, wanted)


def test_a_form_that_cannot_be_had_is_left_out_and_none_at_all_refused() -> None:
    case = frost(horizon=8)
    counts = case.rule.model_copy(update={"inputs": ["plus_shown", "minus_shown"]})
    told = job.sizes(case.model_copy(update={"rule": counts}))
    assert list(told["forms"]) == ["table"]
    assert "looks at step, shown and thresholds" in told["left_out"]["lines"]
    only = counts.model_copy(update={"forms": ["lines"]})
    with pytest.raises(ModelError, match="looks at step, shown and thresholds"):
        job.sizes(case.model_copy(update={"rule": only}))


def test_risk_and_benefit_say_the_same_of_every_size() -> None:
    """By the definition of benefit kept."""
    pricer = one_way((-2, 4), (-3, 3), 12, losses=Losses(1.0, 2.0, 0.02))
    made = form("table").distil(pricer, Wanted(5, SHOWN, every_size=True))
    assert [len(rule.rows) for rule, _ in made.sizes] == [1, 2, 3, 4, 5]
    alone, exact = (pricer.objective(t) for t in (pricer.alone_tally, pricer.exact_tally))
    for size in sizes.priced_sizes(pricer, made.sizes):
        assert size.figures.risk is not None
        share = (alone - size.figures.risk) / (alone - exact)
        assert size.figures.benefit_kept == pytest.approx(share, abs=1e-12)
        assert size.figures.worse_than(pricer.figures(pricer.alone_tally)) == (share < 0)


@pytest.mark.parametrize("name", ["shifts", "formula"])
def test_forms_without_rows_have_limits_and_sizes_too(name: str) -> None:
    pricer = one_way((-2, 4), (-3, 3), 16)
    made = form(name).distil(pricer, Wanted(6, SHOWN, min_benefit_kept=0.9))
    kept = pricer.figures(pricer.way_tally(made.rule)).benefit_kept
    assert kept is not None
    assert kept >= 0.9
    assert "keep the share of the benefit that is asked for" in made.notes[0]
    none = form(name).distil(pricer, Wanted(1, SHOWN, min_benefit_kept=0.9))
    assert "of up to 1" in none.notes[0]
    assert "keeps the share" in none.notes[0]
    case = frost("polish = true", f'forms = ["table", "{name}"]', horizon=16)
    told = job.sizes(case)
    sizes_here = told["forms"][name]["sizes"]
    assert len(sizes_here) >= 3
    assert [size["rows"] for size in sizes_here] == sorted({size["rows"] for size in sizes_here})
    made = form(name).distil(gathered_pricer(case), Wanted(6, SHOWN))
    risk = gathered_pricer(case).price(made.rule).risk
    assert any(size["risk"] == pytest.approx(risk, abs=1e-12) for size in sizes_here)
    assert any(note.startswith("Not polished") for note in gather(case).reckoned[name].notes)
