"""A device's gain curve from two power distributions, as a document."""

from __future__ import annotations

from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any

from wavegen.comparison.device_gain import DeviceGain, device_gain
from wavegen.comparison.device_table import device_table, write_device
from wavegen.comparison.difference import DOWN_TO, TOLERANCE_DB
from wavegen.comparison.gain_document import gain_document
from wavegen.comparison.side import SideSettings
from wavegen.comparison.sides import open_side
from wavegen.comparison.spectra import side_spectrum, spectrum_difference
from wavegen.core.allocation import keep_large_blocks
from wavegen.core.progress import Progress, silent


@dataclass(frozen=True, slots=True, kw_only=True)
class GainSettings:
    """What is asked of a gain curve.

    Parameters
    ----------
    tolerance_db : float
        A device whose curves agree within this is linear.
    down_to : float
        Least probability at which that is looked at.
    model : Path or None
        CSV to write the device to.
    by_fit : bool
        Whether the fitted Rapp curve is written in place of the points.
    overwrite : bool
        Whether a file that exists may be replaced.
    """

    tolerance_db: float = TOLERANCE_DB
    down_to: float = DOWN_TO
    model: Path | None = None
    by_fit: bool = False
    overwrite: bool = False


DEFAULT = GainSettings()


def gain_curve(
    source: SideSettings,
    output: SideSettings,
    settings: GainSettings = DEFAULT,
    *,
    workers: int = 1,
    progress: Progress = silent,
) -> dict[str, Any]:
    """Return the gain curve of a device from what goes in and what comes out.

    Parameters
    ----------
    source, output : SideSettings
        Input and output; they need not be of the same time.
    settings : GainSettings
        What is asked.
    workers, progress
        As in :func:`wavegen.core.render.render`.

    Returns
    -------
    dict
        JSON values; ``verdict`` is ``match`` for a linear device, ``differ`` for one that
        compresses or expands, else ``undecided``.

    Raises
    ------
    FileError, RecipeError, SignalError
        A side cannot be read, made or measured; or they resolve too few levels.
    ArgumentsError
        A setting that means nothing.
    """
    keep_large_blocks()
    sides = tuple(open_side(side, workers=workers, progress=progress) for side in (source, output))
    spectra = [side_spectrum(side, workers=workers, progress=progress) for side in sides]
    both = None
    if spectra[0] is not None and spectra[1] is not None:
        both = spectrum_difference(spectra[0], spectra[1])
    found = device_gain(
        (sides[0], sides[1]), both, tolerance_db=settings.tolerance_db, down_to=settings.down_to
    )
    if settings.model is not None:
        _write(found, settings)
    return gain_document(found, model=str(settings.model) if settings.model else None)


def _write(found: DeviceGain, settings: GainSettings) -> None:
    assert settings.model is not None  # noqa: S101 - asked for where it is given
    points, small, fit, alignment = found.points, found.small, found.fit, found.alignment
    peak_db = found.source.peak_db
    table = device_table(
        points,
        small,
        fit,
        alignment,
        mean_db=found.means_db[0],
        peak_db=float(points.input_db[-1]) if peak_db is None else peak_db,
        by_fit=settings.by_fit,
    )
    if not found.is_absolute:
        moved = table.input_dbm - found.means_db[0]
        table = replace(
            table,
            input_dbm=moved,
            output_dbm=table.output_dbm - found.means_db[0] - small.gain_db,
            measured_to_dbm=table.measured_to_dbm - found.means_db[0],
        )
    write_device(
        table,
        settings.model,
        is_absolute=found.is_absolute,
        has_phase=alignment is not None,
        overwrite=settings.overwrite,
    )
