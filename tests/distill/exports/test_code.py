"""Exported code: what it says, that it checks itself, what it refuses, and that labels are data."""

from __future__ import annotations

import keyword
import os
import subprocess
import sys
from collections.abc import Callable
from dataclasses import dataclass, replace
from functools import cache
from pathlib import Path

import pytest
from hypothesis import given, settings, strategies

from tests.distill.exports import code_engines, hand_built, sample
from tests.distill.exports.code_engines import WARNINGS, lacks
from thumbwright.distill.cautions import cautions
from thumbwright.distill.code.head import quiet
from thumbwright.distill.code.inputs import parts_of
from thumbwright.distill.exports import code_c, code_javascript, code_python, code_r
from thumbwright.distill.findings import Findings
from thumbwright.distill.rules import Row, Rule


@dataclass(frozen=True)
class Language:
    """An export, and the command that runs its file alone (after ``before`` has been run)."""

    render: Callable[[Findings], dict[str, str | bytes]]
    file: str
    comment: str
    command: tuple[str, ...]
    program: str = ""
    before: tuple[str, ...] = ()

    def text(self, findings: Findings) -> str:
        (content,) = self.render(findings).values()
        assert isinstance(content, str)
        return content

    def put(self, text: str, folder: Path) -> None:
        if self.program and lacks(self.program)():
            pytest.skip(lacks(self.program)())
        (folder / self.file).write_text(text, "utf-8")

    def run(self, text: str, folder: Path, **environment: str) -> subprocess.CompletedProcess[str]:
        self.put(text, folder)
        for command in filter(None, (self.before, self.command)):
            done = subprocess.run(
                command,
                cwd=folder,
                capture_output=True,
                text=True,
                encoding="utf-8",
                env={**os.environ, **environment},
                check=False,
            )
            assert command is self.command or done.returncode == 0, done.stderr
        return done


PYTHON = Language(
    code_python.render, "watch_rule.py", "#", (sys.executable, "-W", "error", "watch_rule.py")
)
R = Language(code_r.render, "watch_rule.R", "#", ("Rscript", "watch_rule.R"), "Rscript")
JAVASCRIPT = Language(
    code_javascript.render, "watch_rule.mjs", "//", ("node", "watch_rule.mjs"), "node"
)
C = Language(
    code_c.render,
    "watch_rule.c",
    "//",
    ("./a.out",),
    "gcc",
    ("gcc", *WARNINGS, "-DSELF_CHECK", "watch_rule.c"),
)
LANGUAGES = (PYTHON, R, JAVASCRIPT, C)
EACH = pytest.mark.parametrize("language", LANGUAGES, ids=lambda language: language.file)

NASTY = (
    "*/ } /* ?>",
    "?" + "?/",
    "ends in a backslash \\",
    "two\nlines\r\nand\x0bmore\x0cof\x85them\u2028here\u2029end",
    '""" \'\'\' ` ${process.exit(3)} "; quit(status = 3) #',
    "coding: utf-7 +AAo-import os",
    "#line 9 'x' # sourceMappingURL=x //# sourceMappingURL=y",
    "{{ 7 * 7 }} {% raw %} {# gone #}",
    "\\u000a \\N{BULLET} \\x41 %s %d %n",
    "</script><!-- --> ]]>",
    "left \u202e right \u2066 \u200b\ufeff\x00\x1b[31m",
    "Überwachung — наблюдение 見張り",
)


def labelled(label: str) -> Findings:
    """Findings of every kind of row in which every label of the case is this one."""
    found = hand_built.both()
    case = found.case
    agents = {key: a.model_copy(update={"name": label}) for key, a in case.agents.items()}
    texts = {"plus": label, "minus": label}
    words = case.words.model_copy(update=dict.fromkeys(type(case.words).model_fields, label))
    update = {
        "title": label,
        "name": label,
        "question": case.question.model_copy(update=texts),
        "words": words,
        "agents": agents,
        "time": case.time.model_copy(update={"step_label": label}),
    }
    return replace(
        found,
        case=case.model_copy(update=update),
        version=label,
        digest=label,
        labels=(label, label),
        caveats=(label,),
    )


def body(text: str, comment: str) -> list[str]:
    """All that follows the head comment, by every notion of a line."""
    lines = text.splitlines()
    first = next(n for n, line in enumerate(lines) if not line.startswith(comment))
    return lines[first:]


@cache
def plain_body(language: Language) -> list[str]:
    return body(language.text(hand_built.both()), language.comment)


@EACH
@pytest.mark.parametrize("name", hand_built.FINDINGS)
def test_it_finds_itself_right(language: Language, name: str, tmp_path: Path) -> None:
    done = language.run(language.text(hand_built.FINDINGS[name]()), tmp_path)
    assert (done.returncode, done.stdout, done.stderr) == (0, "all as it should be\n", "")


SPOILT = [
    (language, spoil)
    for language in LANGUAGES
    for spoil in next(e for e in code_engines.ENGINES if e.file == language.file).spoils
    if spoil.what != "the tie"  # nothing in the check is that close to a threshold
]


@pytest.mark.parametrize(
    ("language", "spoil"), SPOILT, ids=[f"{lang.file}, {spoil.what}" for lang, spoil in SPOILT]
)
def test_it_finds_what_is_spoilt(
    language: Language, spoil: code_engines.Spoil, tmp_path: Path
) -> None:
    spoilt = spoil.applied(language.text(hand_built.FINDINGS[spoil.on]()))
    done = language.run(spoilt, tmp_path)
    assert done.returncode == 1, done.stdout + done.stderr
    assert " wrong" in done.stdout


@EACH
def test_the_head_says_what_it_is_and_what_it_costs(language: Language) -> None:
    found = hand_built.worths()
    text = language.text(found)
    head = text.splitlines()[: -len(body(text, language.comment))]
    said = " ".join(line.removeprefix(language.comment).strip() for line in head)
    for sentence in cautions("property"):
        assert sentence in said
    for part in (found.digest, "thumbwright 9.9", "nats", "Upper field", "steps 1 to 40"):
        assert part in said
    by_rule = found.forms["table"].figures
    for name, f in {
        "decide(), by value()": by_rule,
        "the full calculation": found.exact,
        "undecided neighbours ignored": found.plain_count,
        "everybody ignored": found.alone,
    }.items():
        line = next(line for line in head if name in line)
        figures = [f"{f.wrong_given_plus:.4f}", f"{f.wrong_given_minus:.4f}", f"{f.mean_step:.2f}"]
        assert line.split()[-3:] == figures


@EACH
def test_the_same_text_every_time(language: Language) -> None:
    for make in (hand_built.both, hand_built.covers, hand_built.odd_ids):
        assert language.text(make()) == language.text(make())


@EACH
@pytest.mark.parametrize("label", NASTY)
def test_labels_are_data(language: Language, label: str, tmp_path: Path) -> None:
    text = language.text(labelled(label))
    assert body(text, language.comment) == plain_body(language)
    done = language.run(text, tmp_path)
    assert (done.returncode, done.stdout, done.stderr) == (0, "all as it should be\n", "")


@settings(max_examples=40)
@given(strategies.text(max_size=200))
def test_any_label_stays_within_the_comment(label: str) -> None:
    found = labelled(label)
    for language in LANGUAGES:
        text = language.text(found)
        text.encode("utf-8")
        assert body(text, language.comment) == plain_body(language)


def test_quiet_text() -> None:
    assert quiet("a\n b\u2028c") == "a b c"
    assert quiet("\\") == "[U+005C]"
    assert quiet("\u202e\x00") == "[U+202E][U+0000]"
    assert quiet("*/*/ ???/ </s>") == "* / * / ? ? ?/ < /s>"
    assert quiet("Übung 見張り “so” – 5 %") == "Übung 見張り “so” – 5 %"


@EACH
@pytest.mark.parametrize("name", ['up"', "a b", "x\n", "", "1st", "a;b", "é"])
def test_what_is_no_id_is_refused(language: Language, name: str) -> None:
    found = hand_built.bars()
    agents = {**found.case.agents, name: found.case.agents["upper"]}
    found = replace(found, case=found.case.model_copy(update={"agents": agents}))
    for row in (
        Row(shows={name: hand_built.PLUS}, plus_at=3),
        Row(thresholds={"upper": frozenset({name})}, plus_at=3),
    ):
        rule = Rule("lines", "mill", ("upper", name) if row.shows else ("upper",), (row,))
        with pytest.raises(ValueError, match="no id"):
            language.text(hand_built.of_rules(rule, found=found))


# The words are those of the language standards and manuals, from memory.
C99 = """auto break case char const continue default do double else enum extern float for goto if
inline int long register restrict return short signed sizeof static struct switch typedef union
unsigned void volatile while NAN INFINITY NULL EOF stdin stdout stderr main printf isnan wrong"""
ECMASCRIPT = """await break case catch class const continue debugger default delete do else enum
export extends false finally for function if implements import in instanceof interface let new null
package private protected public return static super switch this throw true try typeof var void
while with yield eval arguments undefined NaN Infinity"""
R_WORDS = "if else repeat while function for next break TRUE FALSE NULL Inf NaN NA in T F c list"
OURS = "step tally value decide first_answer plus_shown prior minus_at plus_at tie belief row never"
WORDS = [*keyword.kwlist, *keyword.softkwlist, *" ".join((C99, ECMASCRIPT, R_WORDS, OURS)).split()]
IDS = [word for word in dict.fromkeys(WORDS) if word[0].isalpha() and word != "mill"]


@EACH
@pytest.mark.parametrize("start", range(0, len(IDS), 60))
def test_no_id_is_taken_for_a_word_of_the_language(
    language: Language, start: int, tmp_path: Path
) -> None:
    ids = IDS[start : start + 60]
    people = {key: {"name": key, "thresholds": "even", "sees": []} for key in ids}
    agents = {**people, "mill": {"name": "Mill", "thresholds": "even", "sees": ids}}
    found = replace(sample.findings(), case=sample.case(agents=agents), seen=tuple(ids))
    states = (hand_built.QUIET, hand_built.PLUS, hand_built.MINUS)
    shows = {key: states[n % 3] for n, key in enumerate(ids)}
    rows = (
        Row(shows=shows, thresholds=dict.fromkeys(ids, hand_built.EVEN), value=0.5),
        Row(step_from=2, value=-0.5),
    )
    text = language.text(hand_built.of_rules(Rule("table", "mill", tuple(ids), rows), found=found))
    done = language.run(text, tmp_path)
    assert (done.returncode, done.stdout, done.stderr) == (0, "all as it should be\n", "")


def test_arguments_are_the_ids_and_only_what_the_rule_looks_at() -> None:
    def called(findings: Findings) -> list[str]:
        return [one.argument for one in parts_of(findings).decide.inputs]

    assert called(hand_built.bars()) == ["step", "upper", "lower"]
    assert called(hand_built.always()) == ["step"]
    assert called(hand_built.counts())[:3] == ["step", "plus_shown", "minus_shown"]
    assert called(hand_built.covers()) == ["step", "upper", "upper_thresholds", "lower_thresholds"]
    only_table = parts_of(hand_built.both()).value
    assert only_table is not None
    assert [one.argument for one in only_table.inputs] == ["step", "lower", "came_first"]


REFUSED = {
    "a state": '0, 1, "lit", "plus"',
    "a code": '0, 1, 3, "plus"',
    "no step": '0, 0, "plus", "plus"',
    "half a step": '0, 1.5, "plus", "plus"',
    "half a sign": '0.5, 1, "plus", "plus"',
    "no row": '0, 1, "minus", "plus"',
    "text for a number": '0, "1", "plus", "plus"',
}
CALLS = {
    PYTHON.file: (
        "import watch_rule\ntry:\n    print(watch_rule.decide(CALL))\n"
        "except ValueError:\n    print('refused')\n",
        (sys.executable, "-W", "error"),
    ),
    R.file: (
        'source("watch_rule.R")\n'
        'cat(tryCatch(decide(CALL), error = function(e) "refused"), "\\n", sep = "")\n',
        ("Rscript",),
    ),
    JAVASCRIPT.file: (
        'import { decide } from "./watch_rule.mjs";\n'
        "try { console.log(decide(CALL)); } catch (e) {\n"
        "  console.log(e instanceof RangeError ? 'refused' : e);\n}\n",
        ("node",),
    ),
}


@pytest.mark.parametrize("language", LANGUAGES[:3], ids=lambda language: language.file)
@pytest.mark.parametrize("call", [*REFUSED.values(), '3, 1, "undecided", "plus"', "3, 1, 0, 1"])
def test_unknown_input_is_refused(language: Language, call: str, tmp_path: Path) -> None:
    language.put(language.text(hand_built.bars()), tmp_path)
    text, command = CALLS[language.file]
    driver = tmp_path / f"driver.{language.file.split('.')[1]}"
    driver.write_text(text.replace("CALL", call), "utf-8")
    done = subprocess.run([*command, driver], cwd=tmp_path, capture_output=True, text=True)
    assert done.returncode == 0, done.stderr
    assert done.stdout == ("refused\n" if call in REFUSED.values() else "plus\n")


def test_c_refuses_codes_and_steps_that_there_are_not(tmp_path: Path) -> None:
    calls = ("0, 1, 3, 1", "0, 1, -1, 1", "0, 0, 1, 1", "0, 1, WATCH_MINUS, 1", "3, 1, 0, 1")
    prints = "".join(f'    printf("%d ", decide({call}));\n' for call in calls)
    text = C.text(hand_built.bars())
    main = f"#include <stdio.h>\nint main(void)\n{{\n{prints}    return 0;\n}}\n"
    assert replace(C, before=("gcc", "watch_rule.c")).run(text + main, tmp_path).stdout == (
        "-1 -1 -1 -1 1 "
    )


def test_r_reads_labels_in_a_plain_locale(tmp_path: Path) -> None:
    text = R.text(labelled("Überwachung 見張り"))
    done = R.run(text, tmp_path, LC_ALL="C")
    assert (done.returncode, done.stdout) == (0, "all as it should be\n")


def test_bars_without_numpy_and_lists_without_numpy(tmp_path: Path) -> None:
    PYTHON.put(PYTHON.text(hand_built.bars()), tmp_path)
    driver = tmp_path / "driver.py"
    driver.write_text(
        f"import sys\nsys.path.insert(0, {str(tmp_path)!r})\nimport watch_rule\n"
        "print(watch_rule.decide(tally=3, step=1, upper='undecided', lower='plus'))\n"
        "try:\n    watch_rule.decide([3], 1, 'undecided', 'plus')\n"
        "except ValueError as error:\n    print(error)\n",
        "utf-8",
    )
    command = [sys.executable, "-S", "-I", str(driver)]
    done = subprocess.run(command, capture_output=True, text=True, check=True)
    assert done.stdout == "plus\nmany situations at once need numpy\n"
