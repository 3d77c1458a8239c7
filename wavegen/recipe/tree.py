"""A recipe as a tree of text that remembers where each piece stood, and faults that say so."""

from __future__ import annotations

from dataclasses import dataclass

from wavegen.core.errors import RecipeError


@dataclass(frozen=True, slots=True, order=True)
class Place:
    """Where a piece of a recipe stands.

    Parameters
    ----------
    line, column : int
        From 1.
    override : str
        Path of the ``--set`` it came from instead; empty for the file.
    """

    line: int
    column: int
    override: str = ""


@dataclass(frozen=True, slots=True)
class Scalar:
    """One value as text.

    Parameters
    ----------
    text : str
        What was written, without quotes.
    is_plain : bool
        Whether it stood without quotes, so that ``true``, ``null`` and numbers are themselves.
    place : Place
        Where.
    """

    text: str
    is_plain: bool
    place: Place


@dataclass(frozen=True, slots=True)
class Items:
    """A list of nodes."""

    nodes: tuple[Node, ...]
    place: Place


@dataclass(frozen=True, slots=True)
class Entry:
    """One key of a mapping, where the key stood, and its value."""

    key: str
    place: Place
    node: Node


@dataclass(frozen=True, slots=True)
class Table:
    """A mapping: entries in the order of the file, keys unique."""

    entries: tuple[Entry, ...]
    place: Place

    def get(self, key: str) -> Node | None:
        """Return the value of a key, or None."""
        return next((entry.node for entry in self.entries if entry.key == key), None)


Node = Scalar | Items | Table


@dataclass(frozen=True, slots=True)
class Fault:
    """A complaint before it knows the file's name.

    Parameters
    ----------
    place : Place
        Where it stands.
    path : str
        Recipe path; empty where the text itself is at fault.
    problem, allowed, remedy : str
        As in :class:`wavegen.core.errors.WavegenError`.
    """

    place: Place
    path: str
    problem: str
    allowed: str
    remedy: str

    def error(self, file: str) -> RecipeError:
        """Return it as an error at ``file:line:column: path``."""
        return RecipeError(
            where=describe(self.place, self.path, file),
            problem=self.problem,
            allowed=self.allowed,
            remedy=self.remedy,
        )


class FaultError(Exception):
    """Stops reading at a fault that leaves no tree."""

    def __init__(self, fault: Fault) -> None:
        super().__init__(fault)
        self.fault = fault


def describe(place: Place, path: str, file: str) -> str:
    """Return how a message names a place.

    Examples
    --------
    >>> describe(Place(3, 7), "signal.kind", "a.yaml")
    'a.yaml:3:7: signal.kind'
    >>> describe(Place(1, 1, "seed"), "seed", "a.yaml")
    '--set seed'
    """
    start = f"--set {place.override}" if place.override else f"{file}:{place.line}:{place.column}"
    return start if path in {"", place.override} else f"{start}: {path}"
