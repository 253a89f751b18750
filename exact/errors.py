"""The one error that the engine raises for input it cannot or will not compute."""

from __future__ import annotations


class ModelError(ValueError):
    """Input that the model refuses, in plain words, with the way out where there is one."""
