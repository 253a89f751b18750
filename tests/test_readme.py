"""What the README shows on a terminal is what the program prints."""

from __future__ import annotations

import re
from pathlib import Path

import pytest

from thumbwright.distill.command import main

README = (Path(__file__).resolve().parent.parent / "README.md").read_text("utf-8")


@pytest.mark.slow
def test_every_console_block_is_what_the_program_prints(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.chdir(tmp_path)
    blocks = re.findall(r"```console\n(.*?)```", README, re.DOTALL)
    commands = 0
    for block in blocks:
        for command, shown in re.findall(r"^\$ (.*)\n((?:(?!\$ ).*\n)*)", block, re.MULTILINE):
            if command.startswith("cat "):
                Path(command.removeprefix("cat ")).write_text(shown, "utf-8")
                continue
            name, *words = command.split()
            assert name == "thumbwright"
            assert main(words) == 0
            assert capsys.readouterr().out.rstrip() == shown.rstrip(), command
            commands += 1
    assert commands >= 3
