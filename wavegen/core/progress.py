"""How long work tells whoever listens where it stands."""

from __future__ import annotations

from typing import Protocol


class Progress(Protocol):
    """Anything that can be told how far a task has come."""

    def __call__(self, task: str, done: int, total: int) -> None:
        """Take note of ``done`` out of ``total`` samples of ``task``."""


def silent(task: str, done: int, total: int) -> None:
    """Listen and do nothing: the default of every long task."""
