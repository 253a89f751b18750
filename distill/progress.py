"""How long work shows how far it is: a bar on the terminal, nothing in a pipe or a file."""

from __future__ import annotations

import sys
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from typing import Any

import click

Progress = Callable[[str, int, int], None]
"""Called as ``progress(label, done, total)``; a new label begins a new bar."""


class _Bars:
    """One bar after another on standard error, each named by its label."""

    def __init__(self) -> None:
        self.label: str | None = None
        self.bar: Any = None
        self.done = 0

    def __call__(self, label: str, done: int, total: int) -> None:
        if label != self.label or done < self.done:
            self.close()
            self.label, self.done = label, 0
            self.bar = click.progressbar(length=max(total, 1), label=label, file=sys.stderr)
            self.bar.__enter__()
        self.bar.update(done - self.done)
        self.done = done

    def close(self) -> None:
        if self.bar is not None:
            self.bar.__exit__(None, None, None)
            self.bar = None


@contextmanager
def progress_on_terminal() -> Iterator[Progress | None]:
    """Give a callable that draws bars where standard error is a terminal, else ``None``."""
    if sys.stderr is None or not sys.stderr.isatty():
        yield None
        return
    bars = _Bars()
    try:
        yield bars
    finally:
        bars.close()
