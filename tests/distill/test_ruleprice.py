"""The verb that prices a rule: what a file may not be, and what is said of each of its rows."""

from __future__ import annotations

from functools import cache
from pathlib import Path
from typing import Any

import pytest

from thumbwright.distill import job
from thumbwright.distill.case import Case
from thumbwright.distill.faults import Faults
from thumbwright.distill.gather import gather, pricer_of
from thumbwright.distill.network_pricer import NetworkPricer
from thumbwright.distill.reading import case_from_text, read_case
from thumbwright.distill.ruleprice import priced

CARD = """step_from,step_to,upper_shows,minus_at_or_below,plus_at_or_above
,2,undecided,-3,3
3,,undecided,-4,3
,,plus,-7,-1
,,minus,-1,5
"""


@cache
def frost() -> tuple[Case, NetworkPricer]:
    case = read_case("frost-watch")
    return case, pricer_of(case)[0]


def price(folder: Path, text: str) -> dict[str, Any]:
    file = folder / "rule.csv"
    file.write_text(text)
    case, pricer = frost()
    return priced(case, pricer, str(file))


def faults(folder: Path, text: str) -> list[str]:
    with pytest.raises(Faults) as caught:
        price(folder, text)
    return caught.value.messages


def test_the_card_read_from_a_file_costs_what_it_does_on_the_sheet(tmp_path: Path) -> None:
    found = price(tmp_path, CARD)
    assert abs(found["figures"]["accuracy_lost"]) < 1e-5
    assert found["figures"]["benefit_kept"] == pytest.approx(1.0, abs=1e-5)
    assert found["remarks"] == []


def test_the_use_of_rows_adds_up(tmp_path: Path) -> None:
    """Every call is made under some row, and some row is in force at every step."""
    figures, rows = (price(tmp_path, CARD)[key] for key in ("figures", "rows"))
    undecided = sum(figures[side]["undecided"] for side in ("given_plus", "given_minus")) / 2
    assert sum(row["calls"] for row in rows) == pytest.approx(1.0 - undecided, abs=1e-12)
    assert sum(row["steps_in_force"] for row in rows) == pytest.approx(
        figures["mean_step"], abs=1e-12
    )
    assert all(row["calls"] > 0.01 for row in rows[1:])
    # Two steps cannot bring a count of three: nobody answers under the first row.
    assert rows[0]["calls"] == 0.0
    assert rows[0]["steps_in_force"] == pytest.approx(2.0, abs=0.05)


def test_use_is_counted_with_the_prior() -> None:
    text = (Path(__file__).parent / "forms" / "covers.toml").read_text()
    text = text.replace('stakes = "none"', 'stakes = "none"\nprior_plus = 0.3')
    case = case_from_text(text, name="t", file="t.toml")
    pricer = pricer_of(case)[0]
    found, uses = pricer.rule_uses(next(iter(gather(case).forms.values())).rule)
    undecided = 0.3 * found.undecided[0] + 0.7 * found.undecided[1]
    assert sum(use.calls for use in uses) == pytest.approx(1.0 - undecided, abs=1e-12)
    mean = 0.3 * found.steps[0] + 0.7 * found.steps[1]
    assert sum(use.steps_in_force for use in uses) == pytest.approx(mean, abs=1e-12)


def test_a_gap_is_reported_with_an_example(tmp_path: Path) -> None:
    (message,) = faults(tmp_path, CARD.replace(",,minus,-1,5\n", ""))
    assert "no row holds at step 3 with upper showing minus" in message
    assert "and in 37 more situations" in message
    assert message.endswith("add one, or widen a row")


def test_an_overlap_is_reported_with_an_example(tmp_path: Path) -> None:
    (message,) = faults(tmp_path, CARD.replace("3,,undecided", "2,,undecided"))
    assert "rows 1 and 2 all hold at step 2 with upper showing undecided" in message
    assert "more situations" not in message


def test_a_gap_and_an_overlap_are_reported_together(tmp_path: Path) -> None:
    text = CARD.replace(",,plus,", ",,plus|undecided,").replace(",,minus,", ",30,minus,")
    gap, overlap = faults(tmp_path, text)
    assert "at step 31 with upper showing minus (and in 9 more situations)" in gap
    assert "rows 1 and 3" in overlap


def test_what_cannot_arise_needs_no_row(tmp_path: Path) -> None:
    """The neighbour cannot have answered before step 2, or be seen to before step 3."""
    whole = price(tmp_path, CARD)
    text = CARD.replace(",,plus,", "5,,plus,").replace(",,minus,", "3,,minus,")
    assert price(tmp_path, text)["figures"] == whole["figures"]
    assert (
        "at step 3 with upper showing minus"
        in faults(tmp_path, CARD.replace(",,minus,", "4,,minus,"))[0]
    )


def test_unknown_labels_are_reported_with_their_lines(tmp_path: Path) -> None:
    text = CARD.replace(",,plus,", ",,pluss,").replace(",,minus,", ",x,minus,")
    first, second = faults(tmp_path, text)
    assert first.startswith(f"{tmp_path / 'rule.csv'}:4: upper_shows:")
    assert "pluss" in first
    assert "did you mean plus" in first
    assert second.startswith(f"{tmp_path / 'rule.csv'}:5: step_to:")
    (message,) = faults(tmp_path, CARD.replace("upper_shows", "lower_shows"))
    assert ":1: lower_shows: unknown column" in message


def test_a_row_that_never_applies_is_named(tmp_path: Path) -> None:
    text = CARD.replace(",,plus,", "5,,plus,") + ",4,plus,-6,0\n41,,minus,0,1\n"
    text = text.replace("\n,,minus,", "\n,40,minus,")
    found = price(tmp_path, text)
    assert found["remarks"] == [
        f"row {number} never applies: no such situation can arise" for number in (5, 6)
    ]
    unused = [row for row in found["rows"] if row["row"] in (5, 6)]
    assert [(row["calls"], row["steps_in_force"]) for row in unused] == [(0.0, 0.0)] * 2
    assert found["figures"] == price(tmp_path, CARD)["figures"]


def test_a_rule_worse_than_not_looking_is_called_so(tmp_path: Path) -> None:
    """Lit is taken for stood down, and the other way round."""
    text = CARD.replace(",,plus,-7,-1", ",,plus,-1,5").replace(",,minus,-1,5", ",,minus,-7,-1")
    found = price(tmp_path, text)
    assert found["figures"]["benefit_kept"] < 0.0
    assert "this rule is worse than ignoring the neighbours" in found["remarks"]


@pytest.mark.parametrize("name", ["exact", "plain-count", "alone"])
def test_ways_of_playing_that_have_a_name(name: str) -> None:
    case, pricer = frost()
    found = priced(case, pricer, name)
    assert found["figures"] == found["others"][name]
    assert found["rows"] == []
    kept = {"exact": 1.0, "alone": 0.0}.get(name)
    assert kept is None or found["figures"]["benefit_kept"] == kept


def test_a_rule_that_is_not_there() -> None:
    case, pricer = frost()
    for name, words in (("exactly", "no such rule"), ("none.csv", "No such file")):
        with pytest.raises(Faults, match=words):
            priced(case, pricer, name)


def test_values_as_a_table_and_in_observations(tmp_path: Path) -> None:
    nats = "upper_shows,nats\nundecided,0.40546510810816444\nplus,1.6218604324326575\nminus,-0.8\n"
    signs = "upper_shows,observations\nundecided,1\nplus,4\nminus,-1.9730427\n"
    one, other = price(tmp_path, nats)["figures"], price(tmp_path, signs)["figures"]
    assert other["accuracy"] == pytest.approx(one["accuracy"], abs=1e-12)
    assert other["mean_step"] == pytest.approx(one["mean_step"], abs=1e-12)


def test_watching_that_is_worth_nothing_is_called_so() -> None:
    text = (Path(__file__).parent / "forms" / "covers.toml").read_text()
    text = text.replace("horizon = 40", "horizon = 12").replace("[rule]", USELESS + "[rule]")
    text = text.replace('inputs = ["step", "shown", "thresholds"]\ncovers = ', "# ")
    case = case_from_text(text, name="t", file="t.toml")
    found = job.price(case, "exact")
    assert found["watching_is_worth_something"] is False
    assert found["figures"]["benefit_kept"] is None
    assert "worth nothing" in job.price_text(found)
    assert any("worth nothing" in text for text in gather(case).caveats)


USELESS = '[agents.watched.evidence]\nkind = "coin"\np = 0.5001\n\n'
