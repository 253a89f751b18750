"""Two independent engines that run the decision tables: one from PyPI, one from npm."""

from __future__ import annotations

import json
import math
import shutil
import subprocess
from collections.abc import Callable, Mapping, Sequence
from pathlib import Path
from types import SimpleNamespace
from typing import Any, ClassVar

import pytest

from tests.distill.exports.agreement import Answers, Asked, Engine, Run, Spoil
from thumbwright.distill.code.inputs import Part
from thumbwright.distill.exports.rule_csv import SHOWS, THRESHOLDS
from thumbwright.distill.exports.rule_dmn import BEYOND, input_names
from thumbwright.distill.findings import Findings
from thumbwright.distill.rules import Rule

FOLDER = Path(__file__).resolve().parent / "engines"

Situation = Mapping[str, int | float | str]


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

    class Script(PythonScriptEngine):
        """The engine's own, which looks through each cell once rather than in each situation."""

        sound: ClassVar[dict[str, bool]] = {}

        def validate(self, expression: str) -> None:
            if expression not in self.sound:
                try:
                    super().validate(expression)
                except SyntaxError:
                    self.sound[expression] = False
                else:
                    self.sound[expression] = True
            if not self.sound[expression]:
                raise SyntaxError(expression)

    script = Script()
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
    if node is None or not_here():
        pytest.skip(not_here())
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


def not_here() -> str:
    """Why the engine from npm cannot run here, or an empty text."""
    if shutil.which("node") and (FOLDER / "node_modules" / "feelin").is_dir():
        return ""
    return "needs node 20.12 or later, and: npm ci --prefix tests/distill/exports/engines"


def as_double(result: Any) -> Any:
    """A number as the double it is read as; Python reads one without a point as a whole number."""
    return float(result) if isinstance(result, int) else result


Ask = Callable[[str, Sequence[Situation]], list[Any]]


def asking(ask: Ask) -> Run:
    """Put the shared situations to the decision tables in a folder by one engine.

    Tables of worths answer nothing by themselves, so there the worths alone are compared.
    """

    def run(folder: Path, findings: Findings, asked: Asked) -> Answers:
        chosen = asked.parts.decide.rule

        def asked_of(part: Part, told: list[tuple[tuple[int | str, ...], float]]) -> list[Any]:
            name = "rule.dmn" if part.rule is chosen else f"rule-{part.rule.form}.dmn"
            words = called(part.rule)
            keys = [words.get(one.key, one.key) for one in part.inputs]
            each = list(dict.fromkeys(told))
            situations = [
                {**dict(zip(keys, given, strict=True)), "tally": tally} for given, tally in each
            ]
            found = ask((folder / name).read_text("utf-8"), situations)
            known = dict(zip(each, found, strict=True))
            return [known[one] for one in told]

        values, answers = None, None
        if asked.parts.value is not None:
            part = asked.parts.value
            values = [
                math.copysign(math.inf, one) if one in (BEYOND, -BEYOND) else one
                for one in asked_of(part, [(given, 0.0) for given in asked.given_to(part)])
            ]
        if not asked.parts.decide.valued:
            part = asked.parts.decide
            tallies = [situation.tally for situation in asked.situations]
            answers = asked_of(part, list(zip(asked.given_to(part), tallies, strict=True)))
        return Answers(values, answers)

    return run


def called(rule: Rule) -> dict[str, str]:
    """What inputs are called in a decision table, where that is not their key in rule.csv."""
    words = input_names(rule).items()
    return {agent + end: word + end for agent, word in words for end in (SHOWS, THRESHOLDS)}


ENGINES = {"SpiffWorkflow": spiff, "dmn-moddle with feelin": feelin}

SPOILS = (
    Spoil("a number", "&lt;= -4", "&lt;= -3"),
    Spoil("a comparison", "&lt;= 2<", "&gt;= 2<"),
    Spoil("an answer", '<text>"minus"</text>(\\s*</outputEntry>)', r'<text>"plus"</text>\1'),
)
"""How to spoil ``rule.dmn`` of the findings "bars"."""

SHARED = (
    Engine("DMN in SpiffWorkflow", "rule.dmn", asking(spiff), SPOILS),
    Engine("DMN in dmn-moddle with feelin", "rule.dmn", asking(feelin), SPOILS, missing=not_here),
)
