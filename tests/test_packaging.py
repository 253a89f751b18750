"""What is installed is what is here: the wheel leaves nothing out and works on its own."""

from __future__ import annotations

import os
import re
import shutil
import subprocess
import sys
import tomllib
import zipfile
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parent.parent
FOLDERS = ("exact", "distill", "templates")
PROJECT = tomllib.loads((ROOT / "pyproject.toml").read_text("utf-8"))


def files_of(folder: str) -> list[Path]:
    """Return what lies below a top folder, relative to the checkout, caches aside."""
    found = (path for path in (ROOT / folder).rglob("*") if path.is_file())
    return [path.relative_to(ROOT) for path in found if "__pycache__" not in path.parts]


def run(*words: str | Path, cwd: Path) -> subprocess.CompletedProcess[str]:
    """Run a program outside the checkout, without what this process was told about paths."""
    kept = {key: value for key, value in os.environ.items() if not key.startswith("PYTHON")}
    done = subprocess.run(
        words, cwd=cwd, env=kept, stdin=subprocess.DEVNULL, capture_output=True, text=True
    )
    assert done.returncode == 0, f"{words}\n{done.stdout}\n{done.stderr}"
    return done


@pytest.fixture(scope="module")
def wheel(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Build the wheel from a copy, so that the checkout stays clean; nothing is fetched."""
    work = tmp_path_factory.mktemp("wheel")
    source = work / "source"
    for folder in FOLDERS:
        ignored = shutil.ignore_patterns("__pycache__")
        shutil.copytree(ROOT / folder, source / folder, ignore=ignored)
    for name in ("pyproject.toml", "README.md", "LICENSE"):
        shutil.copy(ROOT / name, source / name)
    pip = (sys.executable, "-m", "pip", "--no-input", "wheel", "--quiet")
    run(*pip, "--no-index", "--no-deps", "--no-build-isolation", "-w", work, source, cwd=work)
    (built,) = work.glob("*.whl")
    return built


@pytest.fixture(scope="module")
def installed(wheel: Path, tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Install the wheel into a fresh environment that borrows only the dependencies from here."""
    place = tmp_path_factory.mktemp("installed") / "env"
    run(sys.executable, "-m", "venv", "--without-pip", place, cwd=wheel.parent)
    python = place / "bin" / "python"
    pip = (sys.executable, "-m", "pip", "--no-input", "--python", python, "install", "--quiet")
    run(*pip, "--no-index", "--no-deps", wheel, cwd=wheel.parent)
    (site,) = place.glob("lib/python*/site-packages")
    # A path in a .pth file makes packages importable but does not read the .pth files in it, so
    # an editable thumbwright in the borrowed folder stays out of sight.
    borrowed = [path for path in sys.path if path.endswith(("site-packages", "dist-packages"))]
    (site / "borrowed.pth").write_text("".join(f"{path}\n" for path in borrowed))
    return place / "bin"


def test_every_package_is_listed_and_no_other() -> None:
    tree = {
        "thumbwright." + ".".join(path.parent.parts)
        for folder in FOLDERS
        for path in files_of(folder)
        if path.suffix == ".py"
    }
    assert set(PROJECT["tool"]["setuptools"]["packages"]) == tree


def test_every_file_is_in_the_wheel(wheel: Path) -> None:
    with zipfile.ZipFile(wheel) as archive:
        packed = {name for name in archive.namelist() if ".dist-info/" not in name}
    tree = {f"thumbwright/{path.as_posix()}" for folder in FOLDERS for path in files_of(folder)}
    assert packed == tree


def test_wheel_tells_its_licence_and_its_types(wheel: Path) -> None:
    with zipfile.ZipFile(wheel) as archive:
        names = archive.namelist()
        (about,) = (name for name in names if name.endswith(".dist-info/METADATA"))
        assert "License-Expression: MIT" in archive.read(about).decode()
        assert any(name.endswith("/licenses/LICENSE") for name in names)
    assert {"thumbwright/exact/py.typed", "thumbwright/distill/py.typed"} <= set(names)


@pytest.mark.slow
def test_main_job_in_a_fresh_environment(installed: Path, tmp_path: Path) -> None:
    where = "import thumbwright.exact as e, thumbwright.distill as d; print(e.__file__, d.__file__)"
    for path in run(installed / "python", "-c", where, cwd=tmp_path).stdout.split():
        assert Path(path).is_relative_to(installed.parent)
    version = run(installed / "thumbwright", "--version", cwd=tmp_path).stdout
    assert version == f"thumbwright {PROJECT['project']['version']}\n"
    done = run(installed / "thumbwright", "sheet", "frost-watch", "--into", "here", cwd=tmp_path)
    assert done.stdout
    assert done.stderr == ""
    assert [path.name for path in tmp_path.iterdir()] == ["here"]
    written = {path.name: path.stat().st_size for path in (tmp_path / "here").iterdir()}
    assert written.keys() >= {"sheet.html", "sheet.md", "rule.csv", "datapackage.json", "rule.json"}
    assert all(written.values())


def test_engine_imports_nothing_of_the_rest() -> None:
    for path in files_of("exact"):
        if path.suffix == ".py":
            source = (ROOT / path).read_text("utf-8")
            assert not re.search(r"thumbwright\.(distill|templates)\b", source), path


def marked(name: str) -> list[str]:
    """Return the lines of the code block that README marks as ``name``."""
    readme = (ROOT / "README.md").read_text("utf-8")
    (block,) = re.findall(
        rf"<!-- {name} -->\n```sh\n(.*?)```\n<!-- end of {name} -->", readme, re.S
    )
    return str(block).splitlines()


def test_readme_has_one_line_for_each_of_its_two_commands() -> None:
    (main_job,) = marked("main job")
    (test,) = marked("test command")
    for command in (main_job, test):
        assert command.startswith("python3 -m venv .venv && .venv/bin/pip install ")
    assert main_job.endswith(".venv/bin/thumbwright sheet frost-watch")
    assert test.endswith(".venv/bin/pytest")


def test_what_ci_runs_is_the_test_command_of_the_readme() -> None:
    done = subprocess.run(
        ["bash", ROOT / ".ci" / "run", "--show"],
        stdin=subprocess.DEVNULL,
        capture_output=True,
        text=True,
        check=True,
    )
    assert done.stdout.splitlines() == marked("test command")
