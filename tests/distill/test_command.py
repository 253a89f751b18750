from __future__ import annotations

import json
import os
import signal
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pandas as pd
import pytest

from thumbwright.distill import job
from thumbwright.distill.assemble import Limits
from thumbwright.distill.case import Case
from thumbwright.distill.command import TRACE, main, verbs
from thumbwright.distill.faults import Faults
from thumbwright.distill.reading import starter_names, starter_text
from thumbwright.exact.errors import ModelError

PROGRAM = [sys.executable, "-c", "import sys; from thumbwright.distill.command import main; "]
PROGRAM[2] += "sys.exit(main())"
Patch = Callable[[str, Any], None]


@pytest.fixture(autouse=True)
def in_an_empty_folder(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(tmp_path)


@pytest.fixture
def patch(monkeypatch: pytest.MonkeyPatch) -> Patch:
    """Replace one function of the library, to see what a verb asks of it."""

    def replace(name: str, instead: Any) -> None:
        assert hasattr(job, name)
        monkeypatch.setattr(job, name, instead)

    return replace


def raising(error: BaseException) -> Callable[..., str]:
    def call(*_: Any) -> str:
        raise error

    return call


def program(*words: str, before: str = "", **options: Any) -> subprocess.CompletedProcess[str]:
    """Run the program in a process of its own, after the statements ``before``."""
    command = [*PROGRAM[:2], before + "\n" + PROGRAM[2], *words]
    options = {"stdout": subprocess.PIPE} | options
    return subprocess.run(command, stderr=subprocess.PIPE, text=True, timeout=120, **options)


# What is started


@pytest.mark.parametrize("words", [["--help"], ["-h"], ["sheet", "--help"]])
def test_help_needs_nothing_heavy(words: list[str]) -> None:
    heavy = {"numpy", "scipy", "pandas", "sklearn", "pydantic", "jinja2", "importlib.metadata"}
    tell = f"import atexit, sys\nloaded = lambda: print(*({heavy} & set(sys.modules)))\n"
    done = program(*words, before=tell + "atexit.register(loaded)")
    assert done.returncode == 0
    assert done.stdout.startswith("Usage: thumbwright")
    assert done.stdout.splitlines()[-1] == ""


def test_help_names_every_verb(capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["--help"]) == 0
    text = capsys.readouterr().out
    known = ["starter", "check", "sheet", "jumps", "outcomes", "price", "replay", "sizes"]
    assert list(verbs.commands) == known
    assert all(f"  {verb} " in text for verb in verbs.commands)


def test_version(capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["--version"]) == 0
    assert capsys.readouterr().out.startswith("thumbwright 0.")


@pytest.mark.parametrize("words", [["shet", "x"], ["sheet"], ["check"], ["check", "x", "--yes"]])
def test_wrong_use(words: list[str], capsys: pytest.CaptureFixture[str]) -> None:
    assert main(words) == 2
    captured = capsys.readouterr()
    assert captured.out == ""
    assert "Error: " in captured.err


# What each verb asks of the library


def test_starters_are_listed_and_written(capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["starter"]) == 0
    listed = capsys.readouterr().out.splitlines()
    assert [line.split()[0] for line in listed] == list(starter_names())
    assert {"frost-watch", "lot-inspection"} <= set(starter_names())
    for name in starter_names():
        assert main(["starter", name]) == 0
        assert Path(f"{name}.toml").read_text("utf-8") == starter_text(name)
    assert main(["starter", "frost-watch", "deep/mine.toml"]) == 0
    assert Path("deep/mine.toml").read_text("utf-8") == starter_text("frost-watch")


def test_a_starter_never_overwrites(capsys: pytest.CaptureFixture[str]) -> None:
    Path("frost-watch.toml").write_text("mine")
    assert main(["starter", "frost-watch"]) == 2
    assert Path("frost-watch.toml").read_text() == "mine"
    message = capsys.readouterr().err
    assert "exists already" in message
    assert "thumbwright starter frost-watch FILE" in message


def test_unknown_starter(capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["starter", "frostwatch"]) == 2
    assert "did you mean frost-watch" in capsys.readouterr().err
    assert list(Path().iterdir()) == []


def test_check(patch: Patch, capsys: pytest.CaptureFixture[str]) -> None:
    patch("check", lambda case, _limits: f"looked at {case.name}\n")
    assert main(["check", "frost-watch"]) == 0
    assert capsys.readouterr().out == "looked at frost-watch\n"


def test_schema_of_case_files(capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["check", "--schema"]) == 0
    assert json.loads(capsys.readouterr().out) == Case.json_schema()


@pytest.mark.parametrize(
    ("words", "folder"), [([], Path("outputs/frost-watch")), (["--into", "x/y"], Path("x/y"))]
)
def test_sheet(
    patch: Patch, capsys: pytest.CaptureFixture[str], words: list[str], folder: Path
) -> None:
    asked = []

    def sheet(case: Case, into: Path, progress: object, limits: object, *own: object) -> str:
        asked.append((case.name, into, progress, limits, *own))
        return "done\n"

    patch("sheet", sheet)
    assert main(["sheet", "frost-watch", *words]) == 0
    assert asked == [("frost-watch", folder, None, Limits(), None, False)]
    assert main(["sheet", "frost-watch", "--templates", ".", "--pdf"]) == 0
    assert asked[1][-2:] == (Path(), True)
    capsys.readouterr()
    assert main(["sheet", "frost-watch", *words]) == 0
    assert capsys.readouterr() == ("done\n", "")


def test_jumps(patch: Patch, capsys: pytest.CaptureFixture[str]) -> None:
    table = pd.DataFrame({"agent": ["mill"], "worth": [0.1 + 0.2]})
    patch("jumps", lambda _case, _progress, _limits: table)
    assert main(["jumps", "frost-watch"]) == 0
    text = "agent,worth\nmill,0.30000000000000004\n"
    assert capsys.readouterr().out == text
    assert main(["jumps", "frost-watch", "--csv", "deep/jumps.csv"]) == 0
    assert Path("deep/jumps.csv").read_bytes() == text.encode()
    assert "deep/jumps.csv (1 histories)" in capsys.readouterr().out


def test_outcomes_and_price(patch: Patch, capsys: pytest.CaptureFixture[str]) -> None:
    patch("outcomes", lambda case, _limits: {"who": case.name, "mean": None, "share": 0.1 + 0.2})
    patch("outcomes_text", lambda found: f"text of {found['who']}")
    patch("price", lambda case, rule, _progress, _limits, _use: {"who": case.name, "rule": rule})
    patch("price_text", lambda found: f"price of {found['rule']}")
    assert main(["outcomes", "frost-watch"]) == 0
    assert capsys.readouterr().out == "text of frost-watch\n"
    assert main(["outcomes", "frost-watch", "--json"]) == 0
    found = json.loads(capsys.readouterr().out)
    assert found == {"who": "frost-watch", "mean": None, "share": 0.30000000000000004}
    assert main(["price", "frost-watch", "alone"]) == 0
    assert capsys.readouterr().out == "price of alone\n"
    assert main(["price", "frost-watch", "my.csv", "--json"]) == 0
    assert json.loads(capsys.readouterr().out) == {"who": "frost-watch", "rule": "my.csv"}


def test_sizes(patch: Patch, capsys: pytest.CaptureFixture[str]) -> None:
    told = {"complete": True, "kept": 0.1 + 0.2}
    patch("sizes", lambda case, _progress, _limits: told | {"who": case.name})
    patch("sizes_text", lambda case, found: f"sizes of {found['who']} {case.title[:5]}")
    assert main(["sizes", "frost-watch"]) == 0
    assert capsys.readouterr().out == "sizes of frost-watch Frost\n"
    assert main(["sizes", "frost-watch", "--json"]) == 0
    assert json.loads(capsys.readouterr().out) == told | {"who": "frost-watch"}


def test_sizes_stopped_by_the_user_print_what_there_is() -> None:
    before = """
import os, signal
from thumbwright.distill import sizes
def fill(case, pricer, wanted, found, left_out, progress, whole=sizes._fill):
    def stop(label, done, total):
        if label == "sizes, table" and done == 2:
            os.kill(os.getpid(), signal.SIGINT)
    whole(case, pricer, wanted, found, left_out, stop)
sizes._fill = fill
"""
    done = program("sizes", "frost-watch", before=before)
    assert done.returncode == 130
    assert done.stderr == ""
    assert done.stdout.splitlines()[-1].startswith("INCOMPLETE")
    assert "lines\nrows" in done.stdout


# What goes wrong


@pytest.mark.parametrize(
    ("error", "status", "message"),
    [
        (Faults(["a.toml:1: x: one", "a.toml:2: two"]), 2, "a.toml:1: x: one\na.toml:2: two\n"),
        (ModelError("no information"), 2, "no information\n"),
        (MemoryError(), 2, "this case needs more memory than there is"),
        (PermissionError(13, "Permission denied", "/x/a.md"), 1, "/x/a.md: Permission denied\n"),
        (OSError(28, "No space left on device"), 1, "No space left on device\n"),
        (KeyError("slip"), 1, "a fault in the program itself, not in your case: KeyError: 'slip'"),
        (ValueError("not a ModelError"), 1, "a fault in the program itself"),
        (RecursionError("deep"), 1, "a fault in the program itself"),
    ],
)
def test_errors_in_plain_words(
    patch: Patch,
    capsys: pytest.CaptureFixture[str],
    error: Exception,
    status: int,
    message: str,
) -> None:
    patch("check", raising(error))
    assert main(["check", "frost-watch"]) == status
    captured = capsys.readouterr()
    assert captured.out == ""
    assert captured.err.startswith(message)
    assert "Traceback" not in captured.err


def test_a_fault_of_the_program_can_be_seen_in_full(
    patch: Patch, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setenv(TRACE, "1")
    patch("check", raising(KeyError("slip")))
    with pytest.raises(KeyError):
        main(["check", "frost-watch"])


def test_no_such_case(capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["sheet", "nowhere.toml"]) == 2
    captured = capsys.readouterr()
    assert "nowhere.toml" in captured.err
    assert list(Path().iterdir()) == []


def test_file_in_place_of_the_folder(capsys: pytest.CaptureFixture[str]) -> None:
    Path("taken").write_text("mine")
    assert main(["sheet", "frost-watch", "--into", "taken"]) == 2
    assert "taken" in capsys.readouterr().err
    assert Path("taken").read_text() == "mine"


@pytest.mark.parametrize("words", [["--help"], ["check", "--schema"]])
def test_a_closed_pipe_ends_quietly(words: list[str]) -> None:
    reading, writing = os.pipe()
    os.close(reading)
    try:
        done = program(*words, stdout=writing)
    finally:
        os.close(writing)
    assert done.stderr == ""
    assert done.returncode == 1


@pytest.mark.skipif(not Path("/dev/full").exists(), reason="needs the device that is always full")
@pytest.mark.parametrize("words", [["--help"], ["check", "--schema"]])
def test_a_full_disk_in_plain_words(words: list[str]) -> None:
    with Path("/dev/full").open("w") as full:
        done = program(*words, stdout=full)
    assert done.stderr == "No space left on device\n"
    assert done.returncode == 1


@pytest.mark.parametrize(("number", "status"), [(signal.SIGINT, 130), (signal.SIGTERM, 143)])
def test_stopped_while_writing(number: signal.Signals, status: int) -> None:
    before = f"""
import os
from thumbwright.distill import job, writing
def write(path, content):
    path.write_bytes(content)
    os.kill(os.getpid(), {int(number)})
writing._write = write
files = {{"a": "1", "b": "2"}}
job.sheet = lambda case, into, *_: str(writing.write_files(into, files))
"""
    done = program("sheet", "frost-watch", "--into", "deep/here", before=before)
    assert done.returncode == status
    assert (done.stdout, done.stderr.strip()) == ("", "")
    assert list(Path().iterdir()) == []


def test_limits_reach_the_run(patch: Patch) -> None:
    asked: list[object] = []

    def outcomes(_case: Case, limits: object) -> dict[str, object]:
        asked.append(limits)
        return {}

    patch("outcomes", outcomes)
    assert main(["outcomes", "frost-watch", "--json", "--drop", "1e-9", "--memory", "2"]) == 0
    assert asked == [Limits(1e-9, 2e9)]
    assert main(["outcomes", "frost-watch", "--drop", "0.5"]) == 2


def test_a_case_too_large_for_the_memory_is_refused(capsys: pytest.CaptureFixture[str]) -> None:
    told_apart = CROWD + 'inputs = ["step", "shown"]\n'
    Path("crowd.toml").write_text(told_apart, "utf-8")
    for verb in ("check", "jumps", "sheet"):
        assert main([verb, "crowd.toml", "--memory", "0.1"]) == 2
        told = capsys.readouterr()
        assert "more than the" in told.err
        assert "Ways out" in told.err
        assert 'inputs = ["step", "plus_shown", "minus_shown"]' in told.err
        assert told.out == ""
    assert [path.name for path in Path().iterdir()] == ["crowd.toml"]


CROWD = """title = "everybody sees everybody"
[question]
plus = "yes"
minus = "no"
stakes = "none"
[evidence]
kind = "coin"
p = 0.6
[time]
horizon = 40
[thresholds.even]
plus = 3
minus = -3
unit = "observations"
[network]
shape = "crowd"
size = 8
thresholds = "even"
[rule]
agent = "any"
"""
