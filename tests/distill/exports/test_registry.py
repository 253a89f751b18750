from __future__ import annotations

from importlib import import_module
from pathlib import Path

import pytest

from tests.distill.exports import sample
from thumbwright.distill import exports


def test_every_export_file_is_registered_and_keeps_the_interface() -> None:
    folder = Path(exports.__file__).parent
    files = {path.stem for path in folder.glob("*.py")} - {"__init__"}
    assert sorted(files) == sorted((*exports.MODULES, *exports.ON_REQUEST))
    for name in exports.MODULES:
        module = import_module(f"{exports.__name__}.{name}")
        assert module.NAME
        assert callable(module.render)


def test_all_files_in_the_order_of_the_registry(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(exports, "MODULES", ("rule_json", "rule_csv"))
    files = exports.render_all(sample.findings())
    assert list(files) == ["rule.json", "rule.csv", "datapackage.json"]


def test_two_exports_never_write_the_same_file(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(exports, "MODULES", ("rule_csv", "rule_json", "rule_csv"))
    with pytest.raises(ValueError, match=r"datapackage\.json, rule\.csv"):
        exports.render_all(sample.findings())
