"""Power against time in a table, as a signal whose ``|x|^2`` is that power."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from wavegen.core.errors import FileError
from wavegen.core.signal import Samples, Signal
from wavegen.files.csv_table import Heading, Table

_UNITS = {"W": 1e3, "mW": 1.0, "uW": 1e-3, "µW": 1e-3, "μW": 1e-3, "nW": 1e-6}
"""Units of power in mW; ``mW`` and ``MW`` differ by their case alone, and MW is not read."""

_NAMES = {"power", "p", "level", "envelope_power", "rf_power", "output_power", "watt", "watts"}


@dataclass(frozen=True, eq=False, kw_only=True)
class PowerSamples(Signal):
    """A column of power as a signal: ``|x|^2`` in mW, so that 0 dBFS is 0 dBm.

    Parameters
    ----------
    table : Table
        Where it stands.
    column : int
        Which column.
    unit : str
        ``dBm``, ``dB``, ``W``, ``mW``, ``uW`` or ``nW``.
    """

    table: Table
    column: int
    unit: str

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Read samples ``[start, stop)``; the phase is 0.

        Raises
        ------
        FileError
            A row that is no number, or a negative power.
        """
        return np.sqrt(self.power_mw(start, stop)).astype(np.complex64)

    def power_mw(self, start: int, stop: int) -> NDArray[np.float64]:
        """Return the power of samples ``[start, stop)``, mW (relative, for a unit of dB)."""
        figures = self.table.rows(start, stop)[:, self.column]
        if self.unit in {"dBm", "dB"}:
            if np.abs(figures).max() > 300:
                worst = figures[np.argmax(np.abs(figures))]
                raise self._fault(
                    problem=f"holds {worst:g} {self.unit}", allowed="levels from -300 to 300"
                )
            return np.asarray(10 ** (figures / 10))
        if figures.min() < 0:
            where = start + int(np.argmin(figures))
            problem = f"holds {figures.min():g} {self.unit} in row {where + 1}"
            raise self._fault(problem=problem, allowed="power from 0")
        return np.asarray(figures * _UNITS[self.unit])

    def _fault(self, *, problem: str, allowed: str) -> FileError:
        return FileError(
            where=str(self.table.path),
            problem=problem,
            allowed=allowed,
            remedy="Check the unit in the heading: dBm, mW or W.",
        )


def power_column(table: Table) -> tuple[int, str] | None:
    """Return the column and unit of power in a table, or None if it holds none.

    Parameters
    ----------
    table : Table
        With headings.

    Returns
    -------
    (int, str) or None
        The first column whose heading names power and its unit: ``Power [dBm]``, ``power_w``.
    """
    for number, heading in enumerate(table.headings):
        unit = _unit_of(heading)
        if unit is not None:
            return number, unit
    return None


def _unit_of(heading: Heading) -> str | None:
    spelt = {item.casefold(): item for item in ("dBm", "dB")}
    unit = spelt.get(heading.unit.casefold(), heading.unit)
    if unit == "dBm" or (unit in {"dB", *_UNITS} and heading.name in _NAMES):
        return unit
    if not heading.unit:
        if heading.name in {"dbm", "w", "mw"}:
            return {"dbm": "dBm", "w": "W", "mw": "mW"}[heading.name]
        if heading.name in {"watt", "watts"}:
            return "W"
    return None
