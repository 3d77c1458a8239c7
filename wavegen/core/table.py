"""A table as data: whoever shows it decides how it looks."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True, slots=True, kw_only=True)
class Table:
    """Rows of text under headings.

    Parameters
    ----------
    title : str
        What the rows are about.
    headings : tuple of str
        One for each column, units included.
    rows : tuple of tuple of str
        As many cells a row as headings.
    right : frozenset of int
        Columns of numbers, aligned at the right.
    """

    title: str
    headings: tuple[str, ...]
    rows: tuple[tuple[str, ...], ...]
    right: frozenset[int] = frozenset()
