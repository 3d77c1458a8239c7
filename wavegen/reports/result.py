"""A document that shows itself: as text, in a notebook, and as rows for a table library."""

from __future__ import annotations

import html
from collections.abc import Callable, Iterator, Mapping, Sequence
from typing import Any

from wavegen.core.table import Table


class Result(Mapping[str, Any]):
    """What a verb found: a document, as ``--json`` prints it, with its tables and sentences.

    Parameters
    ----------
    document : dict
        Keys as on the command line.
    tables : callable
        Makes the tables, when they are wanted.
    lines : callable, optional
        Makes the sentences.

    Examples
    --------
    >>> table = Table(title="Levels", headings=("at", "dB"), rows=(("1 %", "6.63"),))
    >>> print(Result({"levels": []}, lambda: [table], lambda: ["All is well."]))
    Levels
      at   dB
      1 %  6.63
    All is well.
    """

    def __init__(
        self,
        document: Mapping[str, Any],
        tables: Callable[[], Sequence[Table]],
        lines: Callable[[], Sequence[str]] = tuple,
    ) -> None:
        self.document = dict(document)
        self._tables = tables
        self._lines = lines

    def __getitem__(self, key: str) -> Any:
        """Return a value of the document."""
        return self.document[key]

    def __iter__(self) -> Iterator[str]:
        """Iterate over the document's keys."""
        return iter(self.document)

    def __len__(self) -> int:
        """Return how many keys there are."""
        return len(self.document)

    @property
    def tables(self) -> list[Table]:
        """Its tables."""
        return list(self._tables())

    @property
    def lines(self) -> list[str]:
        """Its sentences."""
        return list(self._lines())

    def __str__(self) -> str:
        """Return it as plain text."""
        return "\n".join([*(text_of(table) for table in self.tables), *self.lines])

    def __repr__(self) -> str:
        """Return it as plain text: that is what one wants to see at a prompt."""
        return str(self)

    def _repr_html_(self) -> str:
        """Return it as a notebook shows it; every text is escaped."""
        said = "".join(f"<p>{html.escape(line)}</p>" for line in self.lines)
        return "".join(_table_html(table) for table in self.tables) + said


def text_of(table: Table) -> str:
    """Return a table as plain text, its columns aligned.

    Parameters
    ----------
    table : Table
        Any.
    """
    cells = [table.headings, *table.rows]
    widths = [max(len(row[column]) for row in cells) for column in range(len(table.headings))]
    lines = [table.title]
    for row in cells:
        padded = (
            cell.rjust(width) if column in table.right else cell.ljust(width)
            for column, (cell, width) in enumerate(zip(row, widths, strict=True))
        )
        lines.append("  " + "  ".join(padded).rstrip())
    return "\n".join(lines)


def _table_html(table: Table) -> str:
    def row(cells: Sequence[str], tag: str) -> str:
        made = []
        for column, cell in enumerate(cells):
            side = "right" if column in table.right else "left"
            made.append(f'<{tag} style="text-align:{side}">{html.escape(cell)}</{tag}>')
        return f"<tr>{''.join(made)}</tr>"

    body = "".join(row(cells, "td") for cells in table.rows)
    return (
        f"<table><caption>{html.escape(table.title)}</caption>"
        f"<thead>{row(table.headings, 'th')}</thead><tbody>{body}</tbody></table>"
    )
