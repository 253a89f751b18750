from __future__ import annotations

import os
import subprocess
import sys

import pytest

from thumbwright.distill.progress import progress_on_terminal

WORK = """
from thumbwright.distill.progress import progress_on_terminal
with progress_on_terminal() as progress:
    if progress is not None:
        for label in ("exact", "lines"):
            for done in range(6):
                progress(label, done, 5)
print("done")
"""


def test_nothing_in_a_pipe() -> None:
    done = subprocess.run([sys.executable, "-c", WORK], capture_output=True, text=True, check=True)
    assert (done.stdout, done.stderr) == ("done\n", "")


def test_a_bar_for_each_label_on_a_terminal() -> None:
    pty = pytest.importorskip("pty")
    screen, terminal = pty.openpty()
    with subprocess.Popen(
        [sys.executable, "-c", WORK], stdout=subprocess.PIPE, stderr=terminal, text=True
    ) as running:
        os.close(terminal)
        out, _ = running.communicate(timeout=60)
        shown = os.read(screen, 100_000).decode()
    os.close(screen)
    assert out == "done\n"
    assert "exact" in shown
    assert "lines" in shown
    assert shown.count("100%") == 2


def test_closed_standard_error(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(sys, "stderr", None)
    with progress_on_terminal() as progress:
        assert progress is None
