"""The benchmarks run, at a size that takes no time."""

from __future__ import annotations

import pytest

from tests.bench.run import BENCHMARKS, main


@pytest.mark.parametrize("name", BENCHMARKS)
def test_a_benchmark_runs_and_prints(name: str, capsys: pytest.CaptureFixture[str]) -> None:
    main([name], tiny=True)
    printed = capsys.readouterr().out
    assert len([line for line in printed.splitlines() if " s  " in line]) >= 3
