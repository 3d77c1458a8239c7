"""How long work tells whoever listens where it stands."""

from __future__ import annotations

from typing import Protocol

UNITS = {"hashing": "B", "seeds": "", "searching": ""}
"""What tasks count whose totals are no samples: bytes, or what has no rate.

A task is the part before a colon: ``searching: clip, 7.2 dB so far`` counts milliseconds."""


class Progress(Protocol):
    """Anything that can be told how far a task has come."""

    def __call__(self, task: str, done: int, total: int) -> None:
        """Take note of ``done`` out of ``total`` of ``task``: samples, if not in :data:`UNITS`."""


def silent(task: str, done: int, total: int) -> None:
    """Listen and do nothing: the default of every long task."""
