"""The data package and its table before a validator that is not ours."""

from __future__ import annotations

import hashlib
import json
import shutil
from pathlib import Path

import frictionless
import pytest

from tests.distill.exports import hand_built
from thumbwright.distill.exports import rule_csv as export
from thumbwright.distill.reading import starter_names

OUTPUTS = Path(__file__).resolve().parents[3] / "outputs"


def kinds(folder: Path) -> set[str]:
    """What the validator finds wrong; empty where all is well."""
    report = frictionless.validate(str(folder / "datapackage.json"))
    found = {kind for (kind,) in report.flatten(["type"])}
    assert report.valid == (not found)
    return found


def resealed(folder: Path) -> None:
    """Make length and checksum those of the table as it is now."""
    package = json.loads((folder / "datapackage.json").read_text("utf-8"))
    content = (folder / "rule.csv").read_bytes()
    package["resources"][0]["bytes"] = len(content)
    package["resources"][0]["hash"] = "sha256:" + hashlib.sha256(content).hexdigest()
    (folder / "datapackage.json").write_text(json.dumps(package), "utf-8")


@pytest.mark.parametrize("name", starter_names())
def test_the_finished_examples_are_valid(name: str) -> None:
    assert kinds(OUTPUTS / name) == set()


@pytest.mark.parametrize("name", hand_built.FINDINGS)
def test_every_kind_of_rule_is_valid(name: str, tmp_path: Path) -> None:
    for file, content in export.render(hand_built.FINDINGS[name]()).items():
        (tmp_path / file).write_text(str(content), "utf-8")
    assert kinds(tmp_path) == set()


@pytest.mark.parametrize(
    ("before", "after", "kind"),
    [
        (",2,undecided", ",2,silent", "constraint-error"),
        (",2,undecided", ",0,undecided", "constraint-error"),
        (",2,undecided", ",two,undecided", "type-error"),
        ("-3,3\n", "-3,3,7\n", "extra-cell"),
        ("-3,3\n", "-3\n", "missing-cell"),
        ("upper_shows", "shows_upper", "incorrect-label"),
    ],
)
@pytest.mark.parametrize("seal", [True, False], ids=["sealed again", "seal broken"])
def test_a_corrupted_table_is_not(
    before: str, after: str, kind: str, seal: bool, tmp_path: Path
) -> None:
    folder = tmp_path / "frost-watch"
    shutil.copytree(OUTPUTS / "frost-watch", folder)
    text = (folder / "rule.csv").read_text("utf-8")
    assert before in text
    (folder / "rule.csv").write_text(text.replace(before, after, 1), "utf-8")
    if seal:
        resealed(folder)
    # A change may leave the length as it was.
    assert kinds(folder) - {"byte-count"} == {kind} | (set() if seal else {"hash-count"})


def test_a_blank_worth_is_not_valid(tmp_path: Path) -> None:
    for file, content in export.render(hand_built.FINDINGS["worths"]()).items():
        (tmp_path / file).write_text(str(content).replace("0.30000000000000004\n", "\n"), "utf-8")
    resealed(tmp_path)
    assert kinds(tmp_path) == {"constraint-error"}
