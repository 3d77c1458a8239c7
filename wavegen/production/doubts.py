"""What is legal but doubtful in a rendered loop and in its files, and what is past doubt."""

from __future__ import annotations

import math
from collections.abc import Sequence

from wavegen.core.errors import RecipeError
from wavegen.core.site import Note
from wavegen.files.datatypes import Datatype
from wavegen.production.export import ExportedFile
from wavegen.production.prepare import Prepared
from wavegen.production.waveform import Waveform
from wavegen.recipe.load import LoadedRecipe

MEAN_MARGIN_DB = 1.0
"""A realised mean this far from the nominal one is told."""
CANCELLED_DB = -100.0
"""Parts that leave less than this of their power leave little but the rounding of their sum:
float32 samples round at about -140 dB."""
ROUNDING_MARGIN_DB = 40.0
"""Rounding noise nearer to the mean than this is told: it limits EVM to 1 % by itself."""
SMALLEST_FLOAT = 1e-30
"""Amplitude that float32 still holds with all its digits."""


def doubts_of_mean(prepared: Prepared, waveform: Waveform) -> list[Note]:
    """Return a note where the loop's mean is far from nominal.

    Parameters
    ----------
    prepared : Prepared
        The nominal mean.
    waveform : Waveform
        The realised one.

    Returns
    -------
    list of Note
        One or none.

    Raises
    ------
    RecipeError
        The parts cancel each other.
    """
    nominal = prepared.built.signal.mean_power
    if not nominal:
        return []
    change_db = waveform.statistics.mean_db - 10 * math.log10(nominal)
    if change_db < CANCELLED_DB:
        raise prepared.loaded.resolve(
            RecipeError(
                where=prepared.site.path,
                problem=f"the parts cancel each other: {change_db:.1f} dB of their power are left",
                allowed=f"at least {CANCELLED_DB:.0f} dB; below, only rounding is left",
                remedy="Change the phase or frequency of a part, or let it draw its own data.",
            )
        )
    if abs(change_db) <= MEAN_MARGIN_DB:
        return []
    text = (
        f"the mean power of this loop stands {change_db:+.2f} dB from the nominal one: a short "
        "loop differs from its process, and parts that share data or frequencies add as amplitudes"
    )
    return [Note(kind="warning", where=prepared.site.path, text=text)]


def refuse_unresolved(
    loaded: LoadedRecipe,
    waveform: Waveform,
    gain: float,
    datatypes: Sequence[Datatype],
    channel: str = "",
) -> None:
    """Refuse a level at which a file's codes would all be zero.

    Parameters
    ----------
    loaded : LoadedRecipe
        For the place of the level.
    waveform : Waveform
        Its peak.
    gain : float
        Amplitude factor to full scale 1.0.
    datatypes : sequence of Datatype
        One for each file.
    channel : str
        Of several channels the one that the waveform is: ``of channel 1``.

    Raises
    ------
    RecipeError
        The peak is less than one code, or than :data:`SMALLEST_FLOAT`.
    """
    peak = gain * math.sqrt(waveform.peak.power)
    for number, datatype in enumerate(datatypes):
        least = 1 / datatype.full_scale if datatype.is_integer else SMALLEST_FLOAT
        if peak < least:
            raise loaded.resolve(
                RecipeError(
                    where="output",
                    problem=(
                        f"the peak between samples{channel and ' '}{channel} would stand at "
                        f"{_dbfs(peak)}, below the smallest step of output.iq[{number}], "
                        f"{datatype.label}"
                    ),
                    allowed=f"peaks from {_dbfs(least)}",
                    remedy="Raise the level, or write a float datatype.",
                )
            )


def doubts_of_files(files: Sequence[ExportedFile]) -> list[Note]:
    """Return what rounding to codes did to the files.

    Parameters
    ----------
    files : sequence of ExportedFile
        As written.

    Returns
    -------
    list of Note
        Codes cut at full scale; rounding noise near the mean.

    Notes
    -----
    Rounding noise of both rails has ``2/12`` of a code's power (uniform error; W. R. Bennett,
    1948), so that a mean of ``c`` codes RMS stands ``10 log10(6 c^2)`` above it.
    """
    notes = []
    for number, file in enumerate(files):
        where = f"output.iq[{number}]"
        if file.n_saturated:
            text = f"{file.n_saturated} I or Q codes were cut at full scale"
            notes.append(Note(kind="warning", where=where, text=text))
        if not file.datatype.is_integer:
            continue
        for channel, codes in enumerate(file.channels):
            margin_db = (
                codes.statistics.mean_db
                + 20 * math.log10(file.datatype.full_scale)
                + 10 * math.log10(6)
            )
            if margin_db < ROUNDING_MARGIN_DB:
                of = f" of channel {channel}" if len(file.channels) > 1 else ""
                text = (
                    f"the rounding to {file.datatype.label} stands only {margin_db:.1f} dB below "
                    f"the mean{of}; raise the level or choose a wider datatype"
                )
                notes.append(Note(kind="warning", where=where, text=text))
    return notes


def _dbfs(amplitude: float) -> str:
    return f"{20 * math.log10(amplitude):.1f} dBFS" if amplitude else "-inf dBFS"
