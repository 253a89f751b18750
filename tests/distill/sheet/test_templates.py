"""Templates of a user's own: by name, in a sandbox, with variables that are written down."""

from __future__ import annotations

import dataclasses
import html
import inspect
import re
from collections.abc import Iterator
from pathlib import Path

import pytest
from jinja2 import meta, nodes

from tests.distill.sheet import more_findings as more, sample_findings as samples
from thumbwright.distill import job
from thumbwright.distill.case import Case
from thumbwright.distill.command import main
from thumbwright.distill.exports import sheet_html, sheet_md
from thumbwright.distill.faults import Faults
from thumbwright.distill.sheet import parts
from thumbwright.distill.sheet.page import digest
from thumbwright.distill.sheet.templates import (
    environment,
    in_place_of_ours,
    read_templates,
    template_names,
)

ROOT = Path(__file__).resolve().parents[3]
WRITTEN = (ROOT / "templates" / "VARIABLES.md").read_text("utf-8")
PARTS = {
    name: [field.name for field in dataclasses.fields(kind)]
    for name, kind in inspect.getmembers(parts, dataclasses.is_dataclass)
}


def own(folder: Path, **texts: str) -> Path:
    """Write templates into a folder; underscores before the last two parts of a name are dots."""
    folder.mkdir(exist_ok=True)
    for name, text in texts.items():
        (folder / name.replace("__", ".")).write_text(text, encoding="utf-8")
    return folder


def sections() -> Iterator[tuple[str, list[str]]]:
    of_the_sheet = WRITTEN.split("\n# ")[0]
    for part in re.split(r"^## ", of_the_sheet, flags=re.M)[2:]:
        yield part.split("\n", 1)[0].strip(), re.findall(r"^- `(\w+)`: \S", part, flags=re.M)


def written_templates() -> dict[str, set[str]]:
    rows = re.findall(r"^\| `(\S+)` \|[^|]*\| ([^|]*) \|$", WRITTEN, flags=re.M)
    return {name: set(re.findall(r"`(\w+)`", allowed)) for name, allowed in rows}


def test_every_field_is_written_down_and_no_other() -> None:
    assert dict(sections()) == PARTS


def test_every_template_is_written_down() -> None:
    assert set(written_templates()) == set(template_names())


def test_templates_use_what_is_written_down_and_no_more() -> None:
    fields = {field for names in PARTS.values() for field in names} | {"table", "card_tables"}
    fields |= set(re.findall(r"`(\w+)`", WRITTEN.split("\n# ")[1]))
    fields |= {"upper"}  # a method of texts
    engine = environment(True)
    for name, allowed in written_templates().items():
        text = (ROOT / "templates" / name).read_text("utf-8")
        tree = engine.parse(text)
        used = meta.find_undeclared_variables(tree) - {"range"}
        assert used <= allowed, (name, used - allowed)
        for node in tree.find_all(nodes.Getattr):
            root = node.node
            if not (isinstance(root, nodes.Name) and root.name == "loop"):
                assert node.attr in fields, (name, node.attr)


def test_one_template_stands_in_for_ours(tmp_path: Path) -> None:
    folder = own(
        tmp_path / "own",
        sheet_caution__html__j2="<p>{{ sheet.caution_lead }} Ask Jo & co.</p>\n",
        sheet__css="body { color: black }\r\n",
    )
    ours = str(sheet_html.render(samples.frost())["sheet.html"])
    with in_place_of_ours(read_templates(folder)):
        text = str(sheet_html.render(samples.frost())["sheet.html"])
        markdown = sheet_md.render(samples.frost())
    assert "<p>Caution with this card. Ask Jo & co.</p>" in text
    assert "<style>body { color: black }\n</style>" in text
    assert f"style-src '{digest('body { color: black }' + chr(10))}'" in html.unescape(text)
    assert 'id="lookup"' in text
    assert str(sheet_html.render(samples.frost())["sheet.html"]) == ours
    assert markdown == sheet_md.render(samples.frost())


def test_labels_are_escaped_in_templates_of_ones_own(tmp_path: Path) -> None:
    folder = own(tmp_path / "own", sheet__html__j2="<p title='{{ sheet.owner }}'>{{ sheet.title }}")
    agents = samples.FROST["agents"] | {"mill": {"name": "<b>'x", "thresholds": "even"}}
    agents["mill"]["sees"] = ["upper"]
    with in_place_of_ours(read_templates(folder)):
        text = sheet_html.render(samples.frost(agents=agents))["sheet.html"]
    assert text == "<p title='&lt;b&gt;&#39;x'>Frost tonight?"


@pytest.mark.parametrize(
    ("text", "line", "said"),
    [
        ("one\n{{ sheet.nothing }}", 2, "no attribute 'nothing'"),
        ("{{ nothing }}", 1, "'nothing' is undefined"),
        ("\n\n{{ sheet.title.__class__.__mro__ }}", 3, "unsafe"),
        ("{{ ''.__class__ }}", 1, "unsafe"),
        ("{% include 'starters/frost-watch.toml' %}", 1, "frost-watch.toml"),
        ("{% include '__init__.py' %}", 1, "__init__.py"),
    ],
)
def test_what_goes_wrong_is_told_with_its_line(
    text: str, line: int, said: str, tmp_path: Path
) -> None:
    folder = own(tmp_path / "own", sheet_card__html__j2=text)
    with pytest.raises(Faults) as found, in_place_of_ours(read_templates(folder)):
        sheet_html.render(samples.frost())
    (message,) = found.value.messages
    assert message.startswith(f"{folder / 'sheet_card.html.j2'}:{line}: ")
    assert said in message


@pytest.mark.parametrize("name", ["sheet__css", "sheet_lookup__js"])
def test_a_style_or_script_cannot_end_itself(name: str, tmp_path: Path) -> None:
    end = "</STYLE>" if name == "sheet__css" else "</script >"
    folder = own(tmp_path / "own", **{name: f"/* {end} */"})
    with (
        pytest.raises(Faults, match="would end it early"),
        in_place_of_ours(read_templates(folder)),
    ):
        sheet_html.render(samples.frost())


def test_every_fault_of_a_folder_at_once(tmp_path: Path) -> None:
    folder = own(
        tmp_path / "own",
        sheet__html="x",
        sheet__md__j2="{% for %}",
        rule_csv="x",
        sheet__css="{{ 1 }}",
    )
    (folder / "sheet_grid.html.j2").write_bytes(b"\xff\xfe")
    (folder / "sheet_card.html.j2").mkdir()
    (folder / ".hidden").write_text("passed over")
    with pytest.raises(Faults) as found:
        read_templates(folder)
    messages = found.value.messages
    assert len(messages) == 3
    assert (
        "no template of that name: rule_csv, sheet.html, sheet_card.html.j2 (allowed: "
        in (messages[0])
    )
    for name in template_names():
        assert name in messages[0]
    assert messages[1].startswith(f"{folder / 'sheet.md.j2'}:1: ")
    assert messages[2] == f"{folder / 'sheet_grid.html.j2'}: is not UTF-8 text"
    with pytest.raises(Faults, match="holds no template"):
        read_templates(own(tmp_path / "empty"))


def test_the_verb_refuses_before_it_computes(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    def gather(*_: object) -> None:
        raise AssertionError("computed")

    monkeypatch.setattr(job, "gather", gather)
    folder = own(tmp_path / "own", wrong__j2="x")
    into = tmp_path / "out"
    words = ["sheet", "frost-watch", "--into", str(into), "--templates", str(folder)]
    assert main(words) == 2
    assert "wrong.j2 (allowed: " in capsys.readouterr().err
    assert not into.exists()
    assert main([*words[:-1], str(tmp_path / "missing")]) == 2


def test_nothing_is_written_where_a_template_fails(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    def gather(_case: Case, *_: object) -> object:
        return more.table_alone()

    monkeypatch.setattr(job, "gather", gather)
    folder = own(tmp_path / "own", sheet__md__j2="{{ sheet.wrong }}")
    into = tmp_path / "out"
    words = ["sheet", "frost-watch", "--into", str(into), "--templates", str(folder)]
    assert main(words) == 2
    assert "sheet.md.j2:1: " in capsys.readouterr().err
    assert not into.exists()
    (folder / "sheet.md.j2").write_text("{{ sheet.title }}\n")
    assert main(words) == 0
    assert (into / "sheet.md").read_text("utf-8") == "Frost tonight?\n"
