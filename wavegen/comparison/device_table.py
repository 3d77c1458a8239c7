"""A gain curve as a table of a device, for the stage that takes measured amplifiers."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from wavegen.comparison.alignment import Alignment
from wavegen.comparison.gain import GainPoints, RappFit, SmallSignal
from wavegen.files.atomic import Drafts

Reals = NDArray[np.float64]

LOWEST_DB = -40.0
"""First row, over the mean input: linear below what was measured."""
ROOM_DB = 3.0
"""Last row, over the highest input seen: longer records have higher peaks."""
STEP_DB = 0.5
ROUGH_DB = 0.3
"""Points less sure than this are left to the extrapolation."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class DeviceTable:
    """Output and phase over the input.

    Parameters
    ----------
    input_dbm, output_dbm, phase_deg : float64 array, shape (n,)
        Inputs rise, outputs never fall.
    measured_to_dbm : float
        Highest input that is not extrapolated.
    is_fit : bool
        Whether it is a fitted Rapp curve throughout.
    """

    input_dbm: Reals
    output_dbm: Reals
    phase_deg: Reals
    measured_to_dbm: float
    is_fit: bool


def device_table(
    points: GainPoints,
    small: SmallSignal,
    fit: RappFit | None,
    alignment: Alignment | None,
    *,
    mean_db: float,
    peak_db: float,
    by_fit: bool,
) -> DeviceTable:
    """Return a device by rows of input and output.

    Parameters
    ----------
    points : GainPoints
        As measured.
    small : SmallSignal
        Its gain below them.
    fit : RappFit or None
        Goes on above them; without one the last gain is held.
    alignment : Alignment or None
        Gives the phase, where both sides are of one signal.
    mean_db, peak_db : float
        Mean and highest input, on the scale of the points.
    by_fit : bool
        Whether the fitted curve is wanted in place of the points.

    Returns
    -------
    DeviceTable
        Levels in dBm as the points have them.
    """
    sure = points.error_db <= max(ROUGH_DB, float(points.error_db.min()))
    x, y = points.input_db[sure], np.maximum.accumulate(points.output_db[sure])
    last = float(x[-1])
    low = np.arange(mean_db + LOWEST_DB, x[0] - STEP_DB / 2, 5.0)
    high = np.arange(last + STEP_DB, max(peak_db, last) + ROOM_DB + STEP_DB, STEP_DB)
    if by_fit and fit is not None:
        inputs = np.concatenate([low, x, high])
        outputs = fit.output_db(inputs)
    else:
        above = y[-1] + np.zeros(high.size)
        if fit is not None:
            above = above + fit.output_db(high) - fit.output_db(np.array([last]))
        elif high.size:
            above = above + (high - last)
        inputs = np.concatenate([low, x, high])
        outputs = np.concatenate([low + small.gain_db, y, above])
    phase = np.zeros(inputs.size)
    if alignment is not None and alignment.input_db.size:
        phase = np.interp(inputs - mean_db, alignment.input_db, alignment.phase_deg)
    return DeviceTable(
        input_dbm=inputs,
        output_dbm=np.maximum.accumulate(outputs),
        phase_deg=phase,
        measured_to_dbm=last,
        is_fit=by_fit and fit is not None,
    )


def write_device(
    table: DeviceTable, path: Path, *, is_absolute: bool, has_phase: bool, overwrite: bool = False
) -> None:
    """Write a device as CSV: ``input_dbm,output_dbm,phase_deg``.

    Parameters
    ----------
    table : DeviceTable
        Its rows.
    path : Path
        The file.
    is_absolute : bool
        Whether its levels are dBm indeed; else 0 dBm stands for the mean input, and the
        small-signal gain is 0 dB.
    has_phase : bool
        Whether its phase was measured.
    overwrite : bool
        Whether a file that exists may be replaced.

    Raises
    ------
    FileError
        It exists, or cannot be written.
    """
    whence = (
        f"# {'fitted Rapp curve' if table.is_fit else 'as measured'} up to "
        f"{table.measured_to_dbm:.2f} dBm at the input, beyond it extrapolated"
    )
    lines = ["# gain of a device, from the power distributions at its input and output", whence]
    if not is_absolute:
        lines.append(
            "# 0 dBm stands for the mean input power; the small-signal gain is set to 0 dB"
        )
    if not has_phase:
        lines.append("# the phase is not known, and written as 0")
    lines.append("input_dbm,output_dbm,phase_deg")
    lines += [
        f"{x:.4f},{y:.4f},{angle:.3f}"
        for x, y, angle in zip(table.input_dbm, table.output_dbm, table.phase_deg, strict=True)
    ]
    with Drafts(path.parent, overwrite=overwrite) as drafts:
        drafts.add(path.name).write_text("\n".join(lines) + "\n", encoding="utf-8")
