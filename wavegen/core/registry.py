"""Tables from the names used in recipes to the classes behind them, loaded only when named."""

from __future__ import annotations

import difflib
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from importlib import import_module
from typing import Any


class Registry(Mapping[str, str]):
    """A table of kinds: name in recipes -> ``"module:Class"``.

    Parameters
    ----------
    kind : str
        What the members are called in messages, such as ``"source"``.
    members : mapping of str to str
        Name to import target. Nothing is imported until :meth:`load`.
    """

    def __init__(self, kind: str, members: Mapping[str, str]) -> None:
        self.kind = kind
        self._members = dict(members)

    def __getitem__(self, name: str) -> str:
        """Return the import target of a member."""
        return self._members[name]

    def __iter__(self) -> Iterator[str]:
        """Iterate over the names in the table's order."""
        return iter(self._members)

    def __len__(self) -> int:
        """Return the number of members."""
        return len(self._members)

    def load(self, name: str) -> Any:
        """Import and return a member.

        Raises
        ------
        KeyError
            No member has that name.
        """
        module, _, attribute = self._members[name].partition(":")
        return getattr(import_module(module), attribute)

    def nearest(self, name: str) -> str | None:
        """Return the member whose name is closest to a misspelt one, if any is close."""
        return nearest(name, self)


@dataclass(frozen=True, slots=True)
class Member:
    """Annotation of a settings field that holds one member of a table, chosen by ``kind:``.

    Parameters
    ----------
    tables : tuple of str
        Names of the tables that may hold it, as the recipe room knows them:
        ``signal``, ``stage``, ``pulse``, ``data``.
    default : str, optional
        Member that a mapping without ``kind:`` means; without it ``kind`` must be given.
    """

    tables: tuple[str, ...]
    default: str | None = None


def nearest(name: str, known: Mapping[str, object] | list[str] | tuple[str, ...]) -> str | None:
    """Return the known name closest to a misspelt one, or None if none is close.

    Examples
    --------
    >>> nearest("symbol_rat", ["symbol_rate", "seed"])
    'symbol_rate'
    """
    found = difflib.get_close_matches(str(name), list(known), n=1, cutoff=0.6)
    return found[0] if found else None
