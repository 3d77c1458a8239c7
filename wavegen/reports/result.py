"""A document that shows itself: as text, in a notebook, and as rows for a table library."""

from __future__ import annotations

import html
from collections.abc import Callable, Iterator, Mapping, Sequence
from typing import TYPE_CHECKING, Any

from wavegen.core.table import Table
from wavegen.reports.text import fold, text_of, visible

if TYPE_CHECKING:
    from matplotlib.figure import Figure


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
      at    dB
      1 %   6.63
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

    def figures(self) -> dict[str, Figure]:
        """Return the pictures of what it holds, as Matplotlib figures by their names.

        Raises
        ------
        ArgumentsError
            There is nothing to draw in it, or Matplotlib is not installed.
        """
        from wavegen.reports.figures.of_document import figures_in

        return figures_in(self.document)

    def row(self) -> dict[str, str | float | None]:
        """Return its single figures as one row of a table library; lists are left out.

        Returns
        -------
        dict
            Keys of what is nested are joined: ``law_verdict``. ``pandas.DataFrame([a.row(),
            b.row()])`` compares two; ``pandas.DataFrame(a["levels"])`` shows the levels of one.

        Examples
        --------
        >>> Result({"papr_db": 7.5, "law": {"verdict": "agrees"}, "levels": []}, list).row()
        {'papr_db': 7.5, 'law_verdict': 'agrees'}
        """
        return _flat(self.document)

    def __str__(self) -> str:
        """Return it as plain text of at most 80 columns."""
        said = (fold(visible(line)) for line in self.lines)
        return "\n".join([*(text_of(table) for table in self.tables), *said])

    def __repr__(self) -> str:
        """Return it as plain text: that is what one wants to see at a prompt."""
        return str(self)

    def _repr_html_(self) -> str:
        """Return it as a notebook shows it; every text is escaped."""
        said = "".join(f"<p>{html.escape(line)}</p>" for line in self.lines)
        return "".join(_table_html(table) for table in self.tables) + said


def _flat(document: Mapping[str, Any], lead: str = "") -> dict[str, str | float | None]:
    row: dict[str, str | float | None] = {}
    for key, value in document.items():
        if isinstance(value, Mapping):
            row |= _flat(value, f"{lead}{key}_")
        elif value is None or isinstance(value, str | int | float):
            row[f"{lead}{key}"] = value
    return row


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
