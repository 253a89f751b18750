"""Settings for all tests."""

from __future__ import annotations

from hypothesis import settings

# The same examples on every machine and every run, and no deadline: timings on a shared machine
# say nothing. More examples for a search by hand: --hypothesis-profile=search.
settings.register_profile("repeatable", derandomize=True, deadline=None, print_blob=True)
settings.register_profile("search", deadline=None, max_examples=2000)
settings.load_profile("repeatable")
