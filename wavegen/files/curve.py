"""A CCDF curve in CSV: level over the mean, and the probability of being above it."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from wavegen.core.errors import FileError
from wavegen.files.csv_table import Heading, Table, open_table

_LEVELS = {"level", "power", "papr", "x", "db_above_average", "db_above_mean", "par", "papr0"}
_OVER = ("_above_average", "_above_mean", "_over_average", "_over_mean")
_COUNTS = ("n_samples", "samples", "sample_count", "number_of_samples")
_PROBABILITIES = {"ccdf", "probability", "prob", "p", "percent", "exceedance", "y"}
_FRACTIONS = {"", "1", "fraction", "ratio", "linear"}


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Curve:
    """A CCDF by its points; no recording.

    Parameters
    ----------
    level_db : float64 array, shape (n_points,)
        Levels over the mean power, dB, rising.
    probability : float64 array, shape (n_points,)
        Probability that the power is above them, from 0 to 1, falling.
    n_samples : int or None
        How many samples it was measured on, if the file says so.
    """

    level_db: NDArray[np.float64]
    probability: NDArray[np.float64]
    n_samples: int | None


def curve_columns(table: Table) -> tuple[int, int, float] | None:
    """Return the columns of level and probability and the probability's unit, or None.

    Parameters
    ----------
    table : Table
        Any table.

    Returns
    -------
    (int, int, float) or None
        The unit is 1, or 0.01 for percent. None if the headings are not those of a CCDF.
    """
    level = probability = None
    unit = 1.0
    for number, heading in enumerate(table.headings):
        if level is None and _is_level(heading):
            level = number
        elif probability is None and _is_probability(heading):
            probability = number
            is_percent = heading.unit == "%" or "percent" in heading.name or "%" in heading.name
            unit = 0.01 if is_percent else 1.0
    return None if level is None or probability is None else (level, probability, unit)


def _is_level(heading: Heading) -> bool:
    if heading.name in _LEVELS or heading.name.endswith(_OVER):
        return heading.unit.lower() in {"db", ""}
    return heading.name == "db" or heading.unit.lower().startswith("db above")


def _is_probability(heading: Heading) -> bool:
    name = heading.name.removesuffix("%").rstrip("_")  # of `Probability %`
    known = name in _PROBABILITIES or name.endswith("_ccdf")
    is_unit = heading.unit.lower() in _FRACTIONS or heading.unit == "%"
    return (known and is_unit) or (not heading.name and heading.unit == "%")


def read_curve(path: Path) -> Curve:
    """Read a CCDF curve.

    Parameters
    ----------
    path : Path
        CSV with headings that name a level in dB and a probability or percent (``level_db,
        ccdf``; ``Level [dB]; Probability [%]``), or two columns without headings: level in dB
        and probability. Further columns are passed over, and comments, of which ``# n_samples:
        1000000`` is understood.

    Returns
    -------
    Curve

    Raises
    ------
    FileError
        No such file or table, other columns, levels that do not rise (or fall) throughout,
        probabilities outside 0 to 1 or that rise with the level, or fewer than two points.
    """
    path = Path(path)
    table = open_table(path)
    columns = curve_columns(table)
    if columns is None:
        if table.headings or table.n_columns != 2:
            names = ", ".join(item.name for item in table.headings)[:120]
            raise _fault(
                path,
                f"has the columns {names}" if names else f"has {table.n_columns} columns",
            )
        columns = (0, 1, 1.0)
    rows = table.rows(0, table.n_rows)
    level, probability = rows[:, columns[0]], rows[:, columns[1]] * columns[2]
    if level.size > 1 and level[0] > level[-1]:
        level, probability = level[::-1], probability[::-1]
    if level.size < 2 or not (np.diff(level) > 0).all():
        raise _fault(path, "its levels do not rise from row to row, or there are fewer than two")
    if probability.min() < 0 or probability.max() > 1:
        unit = "%" if columns[2] != 1 else ""
        worst = probability.max() if probability.max() > 1 else probability.min()
        raise _fault(path, f"has the probability {worst / columns[2]:.6g} {unit}".strip())
    if (np.diff(probability) > 0).any():
        raise _fault(path, "its probabilities rise with the level: a CDF or a density, no CCDF")
    return Curve(
        level_db=np.ascontiguousarray(level),
        probability=np.ascontiguousarray(probability),
        n_samples=_n_samples(table),
    )


def _n_samples(table: Table) -> int | None:
    text = next((table.settings[key] for key in _COUNTS if key in table.settings), "")
    return int(text) if text.isascii() and text.isdigit() and len(text) < 19 else None


def _fault(path: Path, problem: str) -> FileError:
    return FileError(
        where=str(path),
        problem=problem,
        allowed="a level in dB that rises, and a probability from 0 to 1 (or percent) that falls",
        remedy="Name the columns, such as level_db,ccdf or level_db,percent.",
    )
