"""Settings for all tests."""

from __future__ import annotations

import sys

import pytest
from hypothesis import settings

# The same examples on every machine and every run, and no deadline: timings on a shared machine
# say nothing. More examples for a search by hand: --hypothesis-profile=search.
settings.register_profile("repeatable", derandomize=True, deadline=None, print_blob=True)
settings.register_profile("search", deadline=None, max_examples=2000)
settings.load_profile("repeatable")


def pytest_terminal_summary(terminalreporter: pytest.TerminalReporter) -> None:
    """Say how many answers of each way of running a rule were compared with the rule itself."""
    agreement = sys.modules.get("tests.distill.exports.agreement")
    if agreement is not None and agreement.ran:
        terminalreporter.section("answers compared with the rule")
        for engine, times in sorted(agreement.ran.items()):
            terminalreporter.write_line(f"{engine}: {times}")
