"""Tables of measured numbers that a stage reads: named columns of a CSV, within limits."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from wavegen.core.errors import FileError
from wavegen.files.csv_table import Heading, Table, open_table
from wavegen.files.faults import regular_size

Reals = NDArray[np.float64]

MOST_BYTES = 1_000_000
MOST_ROWS = 10_000


@dataclass(frozen=True, slots=True, kw_only=True)
class Column:
    """What a column is called.

    Parameters
    ----------
    names : tuple of str
        Headings, lower case, words joined by ``_``; the first is the one to recommend.
    units : dict of str to float
        Units accepted in the heading, lower case, and their size; the first is meant where none
        is given.
    """

    names: tuple[str, ...]
    units: dict[str, float]


def read_columns(path: Path, columns: Sequence[Column], *, least_rows: int) -> tuple[Reals, Table]:
    """Return the columns of a table by their headings, else by their order.

    Parameters
    ----------
    path : Path
        CSV of up to 1 MB and 10 000 rows, with ``#`` comments.
    columns : sequence of Column
        What is wanted. A table without headings has these columns in this order and no other.
    least_rows : int
        Fewest rows that make sense.

    Returns
    -------
    values : float64 array, shape (n_columns, n_rows)
        In the first unit of each column.
    table : Table
        For its settings.

    Raises
    ------
    FileError
        Out of reach, too large, no table, a column missing or twice, a unit not known, numbers
        that are not finite, or too few rows.
    """
    size = regular_size(path)
    if size > MOST_BYTES:
        raise fault(path, f"has {size / 1e6:.1f} MB", columns)
    table = open_table(path)
    if table.headings:
        found = [_find(path, table.headings, column, columns) for column in columns]
    elif table.n_columns == len(columns):
        found = [(number, 1.0) for number in range(table.n_columns)]
    else:
        raise fault(path, f"has {table.n_columns} columns and no headings", columns)
    if not least_rows <= table.n_rows <= MOST_ROWS:
        raise fault(path, f"has {table.n_rows} rows, not {least_rows} to {MOST_ROWS}", columns)
    rows = table.rows(0, table.n_rows)
    values = np.stack([rows[:, place] * size for place, size in found])
    return np.ascontiguousarray(values), table


def _find(
    path: Path, headings: tuple[Heading, ...], column: Column, columns: Sequence[Column]
) -> tuple[int, float]:
    """Return the place of a column and the size of its unit."""
    wanted = {_plain(name, unit): size for name in column.names for unit, size in _units(column)}
    places = [
        (number, wanted[key])
        for number, heading in enumerate(headings)
        if (key := _plain(heading.name, heading.unit)) in wanted
    ]
    if len(places) != 1:
        count = f"{len(places)} columns" if places else "no column"
        raise fault(path, f"has {count} {column.names[0]}", columns)
    return places[0]


def _units(column: Column) -> list[tuple[str, float]]:
    first = next(iter(column.units.values()), 1.0)
    return [*column.units.items(), ("", first)]


def _plain(name: str, unit: str) -> str:
    """Return heading and unit as one word, so that ``in (dBm)`` and ``in_dbm`` are the same."""
    return f"{name}_{unit}".lower().strip("_").replace(" ", "_")


def fault(path: Path, problem: str, columns: Sequence[Column]) -> FileError:
    """Return the error of a table that is not what a stage wants.

    Parameters
    ----------
    path : Path
        The file.
    problem : str
        What is wrong.
    columns : sequence of Column
        What is wanted.
    """
    names = ",".join(
        f"{column.names[0]}_{unit}".rstrip("_")
        for column in columns
        for unit in list(column.units)[:1] or [""]
    )
    return FileError(
        where=str(path),
        problem=problem,
        allowed=f"CSV of up to {MOST_BYTES // 10**6} MB and {MOST_ROWS} rows with the columns "
        f"{names}",
        remedy="Name the columns like that in the first row.",
    )
