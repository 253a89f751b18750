"""From a case file on disk to figures on the command line, against literal enumeration.

The reference holds what enumerating every observation sequence gives for small networks.
"""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import pandas as pd
import pytest

from thumbwright.distill.command import main

ENTRIES = json.loads(
    (Path(__file__).parents[1] / "reference" / "small_networks.json").read_text("utf-8")
)
NAMES = [f"{entry['name']}, {entry['exchange']}" for entry in ENTRIES]


def case_text(entry: dict[str, Any]) -> str:
    """A case file for one entry: evidence as listed, thresholds in nats."""
    lines = [
        'title = "small network"',
        "[question]",
        'plus = "yes"\nminus = "no"\nstakes = "none"',
        f"prior_plus = {entry['prior_plus']!r}",
        "[evidence]",
        'kind = "listed"',
        f"plus = {entry['evidence']['values_plus']!r}",
        f"minus = {entry['evidence']['values_minus']!r}",
        "[time]",
        f'horizon = {entry["horizon"]}\nexchange = "{entry["exchange"]}"',
    ]
    for number, (minus, plus) in enumerate(entry["thresholds_nats"]):
        lines += [f"[thresholds.t{number}]", f"minus = {minus!r}\nplus = {plus!r}"]
        lines += ['unit = "nats"']
    for number, seen in enumerate(entry["sees"]):
        sees = json.dumps([f"a{k}" for k in seen])
        lines += [f"[agents.a{number}]", f'thresholds = "t{number}"\nsees = {sees}']
    watcher = next((number for number, seen in enumerate(entry["sees"]) if seen), None)
    lines += ["[rule]", f'agent = "a{watcher or 0}"']
    if watcher is None:
        lines.append('inputs = ["step"]')
    return "\n".join(lines) + "\n"


@pytest.mark.parametrize("entry", ENTRIES, ids=NAMES)
def test_outcomes_on_the_command_line(
    entry: dict[str, Any], tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    file = tmp_path / "case.toml"
    file.write_text(case_text(entry), "utf-8")
    assert main(["outcomes", str(file), "--json"]) == 0
    found = json.loads(capsys.readouterr().out)
    assert found["dropped_mass"] == 0.0
    assert found["near_tie_mass"] == 0.0
    assert [agent["id"] for agent in found["agents"]] == [
        f"a{number}" for number in range(len(entry["sees"]))
    ]
    for agent, expected in zip(found["agents"], entry["agents"], strict=True):
        for given in ("given_plus", "given_minus"):
            for key, value in expected[given].items():
                assert agent[given][key] == pytest.approx(value, abs=1e-10), (given, key)


@pytest.mark.parametrize("entry", ENTRIES, ids=NAMES)
def test_jumps_on_the_command_line(entry: dict[str, Any], tmp_path: Path) -> None:
    file, table = tmp_path / "case.toml", tmp_path / "jumps.csv"
    file.write_text(case_text(entry), "utf-8")
    assert main(["jumps", str(file), "--csv", str(table)]) == 0
    rows = pd.read_csv(table)
    for number, expected in enumerate(entry["agents"]):
        mine = rows[(rows["agent"] == f"a{number}") & (rows["round"] == 0)]
        for k in entry["sees"][number]:
            mine = mine[mine[f"a{k}_shows"] == "undecided"]
        worths = dict(zip(mine["step"], mine["worth"], strict=True))
        for step, value in enumerate(expected["social_when_nobody_has_committed"], start=1):
            if value is not None:
                # The reference prints 12 digits.
                assert worths[step] == pytest.approx(value, abs=2e-12)


def test_a_wrong_reference_would_be_noticed(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    entry = next(e for e in ENTRIES if e["name"] == "mutual pair, leaning")
    shifted = {**entry, "thresholds_nats": [[-0.9, 1.05], entry["thresholds_nats"][1]]}
    file = tmp_path / "case.toml"
    file.write_text(case_text(shifted), "utf-8")
    assert main(["outcomes", str(file), "--json"]) == 0
    found = json.loads(capsys.readouterr().out)
    expected = entry["agents"][0]["given_plus"]["plus"]
    assert abs(found["agents"][0]["given_plus"]["plus"] - expected) > 1e-3
