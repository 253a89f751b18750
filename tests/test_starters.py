"""The finished examples: made again byte for byte, twice the same, and what they must say."""

from __future__ import annotations

import json
from pathlib import Path

import pytest

from thumbwright.distill import job
from thumbwright.distill.gather import gather
from thumbwright.distill.reading import read_case, starter_names

OUTPUTS = Path(__file__).resolve().parent.parent / "outputs"


def test_every_starter_has_its_finished_example_and_no_other() -> None:
    kept = sorted(path.name for path in OUTPUTS.iterdir() if (path / "sheet.html").is_file())
    assert kept == sorted(starter_names())


@pytest.mark.slow
@pytest.mark.parametrize("name", starter_names())
def test_the_finished_example_is_made_again(name: str, tmp_path: Path) -> None:
    job.sheet(read_case(name), tmp_path / "one")
    job.sheet(read_case(name), tmp_path / "two")
    made = {path.name: path.read_bytes() for path in (tmp_path / "one").iterdir()}
    again = {path.name: path.read_bytes() for path in (tmp_path / "two").iterdir()}
    kept = {path.name: path.read_bytes() for path in (OUTPUTS / name).iterdir()}
    assert made == again
    assert sorted(made) == sorted(kept)
    for file, content in made.items():
        assert content == kept[file], f"{file} differs: run thumbwright sheet {name}"


def test_frost_watch_is_four_lines() -> None:
    rule = json.loads((OUTPUTS / "frost-watch" / "rule.json").read_text("utf-8"))
    lines = rule["forms"]["lines"]
    bars = [
        (
            row["step_from"],
            row["step_to"],
            row["shows"]["upper"],
            row["minus_at_or_below"],
            row["plus_at_or_above"],
        )
        for row in lines["rows"]
    ]
    assert bars == [
        (None, 2, ["undecided"], -3, 3),
        (3, None, ["undecided"], -4, 3),
        (None, None, ["plus"], -7, -1),
        (None, None, ["minus"], -1, 5),
    ]
    assert rule["is_exact"] is True


def test_lot_inspection_alone_is_the_published_plan() -> None:
    """NIST/SEMATECH e-Handbook of Statistical Methods, section 6.2.6, table of the plan.

    First items at which 0, 2 and 3 defectives accept, and 2, 3 and 6 reject.
    """
    findings = gather(read_case("lot-inspection"))
    accepts: dict[int, int] = {}
    rejects: dict[int, int] = {}
    for row in findings.alone_rows:
        first = row.step_from or 1
        if row.minus_at is not None:
            accepts.setdefault(row.minus_at, first)
        if row.plus_at is not None:
            rejects.setdefault(row.plus_at, first)
    assert [accepts[number] for number in (0, 2, 3)] == [24, 74, 100]
    # A lot with two defectives is rejected from the second item on: there are no earlier two.
    assert rejects[2] == 1
    assert [rejects[number] for number in (3, 6)] == [20, 96]
