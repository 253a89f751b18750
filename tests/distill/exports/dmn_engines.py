"""Two independent engines that run the decision tables: one from PyPI, one from npm."""

from __future__ import annotations

import json
import shutil
import subprocess
from collections.abc import Mapping, Sequence
from pathlib import Path
from types import SimpleNamespace
from typing import Any

import pytest

FOLDER = Path(__file__).resolve().parent / "engines"

Situation = Mapping[str, int | str]


def spiff(xml: str, situations: Sequence[Situation]) -> list[Any]:
    """Result of SpiffWorkflow in each situation; None where no row holds."""
    from lxml import etree
    from SpiffWorkflow.bpmn.script_engine import PythonScriptEngine
    from SpiffWorkflow.dmn.engine.DMNEngine import DMNEngine
    from SpiffWorkflow.dmn.parser.DMNParser import DMNParser

    root = etree.fromstring(xml.encode())
    parser = DMNParser(None, root, {"dmn": root.nsmap[None]}, filename="rule.dmn")
    parser.parse()
    (table,) = parser.decision.decisionTables
    assert table.hit_policy == "FIRST"
    engine = DMNEngine(table)
    script = PythonScriptEngine()
    results = []
    for situation in situations:
        # The engine asks a task for its data and its script engine only.
        task = SimpleNamespace(
            data=dict(situation),
            workflow=SimpleNamespace(script_engine=script),
            task_spec=SimpleNamespace(name="rule"),
        )
        found = engine.result(task)
        results.append(as_double(next(iter(found.values()))) if found else None)
    return results


def feelin(xml: str, situations: Sequence[Situation]) -> list[Any]:
    """Result of dmn-moddle with feelin in each situation; None where no row holds."""
    return feelin_all([(xml, situations)])[0]


def feelin_all(jobs: Sequence[tuple[str, Sequence[Situation]]]) -> list[list[Any]]:
    """As :func:`feelin`, for several tables in one go."""
    node = shutil.which("node")
    if node is None or not (FOLDER / "node_modules" / "feelin").is_dir():
        pytest.skip("needs node 20.12 or later, and: npm ci --prefix tests/distill/exports/engines")
    told = [{"xml": xml, "situations": [dict(one) for one in told]} for xml, told in jobs]
    done = subprocess.run(
        [node, str(FOLDER / "run_dmn.mjs")],
        input=json.dumps(told),
        capture_output=True,
        text=True,
        check=False,
    )
    assert done.returncode == 0, done.stderr
    found: list[list[Any]] = json.loads(done.stdout)
    return [
        [None if one is None else as_double(next(iter(one.values()))) for one in answers]
        for answers in found
    ]


def as_double(result: Any) -> Any:
    """A number as the double it is read as; Python reads one without a point as a whole number."""
    return float(result) if isinstance(result, int) else result


ENGINES = {"SpiffWorkflow": spiff, "dmn-moddle with feelin": feelin}
