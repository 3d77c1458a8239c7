"""The frequency response of a path, applied or corrected beforehand, from a measured table."""

from __future__ import annotations

import math
from dataclasses import dataclass
from fractions import Fraction
from pathlib import Path
from typing import Annotated, NamedTuple

import numpy as np
from annotated_types import MinLen
from numpy.typing import NDArray

from wavegen.core.signal import Signal
from wavegen.core.site import Note, Site
from wavegen.core.units import format_hz, format_s
from wavegen.dsp.monotone_cubic import MonotoneCubic
from wavegen.dsp.occupied_bands import Band
from wavegen.dsp.overlap_save import Filtered
from wavegen.dsp.pilot import pilot_spectrum, power_gain
from wavegen.dsp.response_design import LogResponse, fit_response
from wavegen.laws.law import Law
from wavegen.laws.operations import filtered_law
from wavegen.laws.term import NoLaw
from wavegen.stages.linear import tell_power
from wavegen.stages.numbers_file import Column, fault, read_columns

COLUMNS = (
    Column(names=("frequency", "freq", "f"), units={"hz": 1.0, "khz": 1e3, "mhz": 1e6, "ghz": 1e9}),
    Column(names=("magnitude", "mag", "gain", "s21"), units={"db": 1.0}),
    Column(names=("phase", "s21_phase"), units={"deg": 1.0, "°": 1.0, "degrees": 1.0}),
)
LEAST_ROWS = 3
LARGEST_DB = 200.0
WIDEST_STEP_DEG = 120.0
"""Points whose phase, its mean delay taken away, steps further may have turned unseen."""
EDGE = 0.49
"""The table is followed up to this part of the sample rate."""
TOLERANCE = 1e-4
LONGEST = 1 << 13
NEGLIGIBLE = 1e-8
DOUBTFUL_SHARE = 1e-6


class PathTable(NamedTuple):
    """A measured path without its mean delay.

    Parameters
    ----------
    magnitude_db, phase_rad : MonotoneCubic
        Over the frequency from the centre, Hz.
    delay_s : float
        Mean delay that was taken away.
    """

    magnitude_db: MonotoneCubic
    phase_rad: MonotoneCubic
    delay_s: float


def read_path(path: Path, *, centre_hz: float) -> PathTable:
    """Return the response of a path about a centre.

    Parameters
    ----------
    path : Path
        CSV with the columns ``frequency_hz,magnitude_db,phase_deg`` (kHz, MHz, GHz too), three
        rows or more, frequencies rising.
    centre_hz : float
        Frequency in the table at which the signal is centred.

    Raises
    ------
    FileError
        As raised by :func:`wavegen.stages.numbers_file.read_columns`; frequencies that do not
        rise, magnitudes beyond 200 dB, or phases too far apart to be followed.
    """
    (frequency, magnitude, phase_deg), _ = read_columns(path, COLUMNS, least_rows=LEAST_ROWS)
    rises = np.diff(frequency) > 0
    if not rises.all():
        row = int(np.argmin(rises)) + 2
        raise fault(path, f"the frequency of row {row} does not rise above that before", COLUMNS)
    if np.abs(magnitude).max() > LARGEST_DB:
        raise fault(path, f"has a magnitude beyond {LARGEST_DB:g} dB", COLUMNS)
    place = frequency - centre_hz
    phase = np.unwrap(np.deg2rad(phase_deg))
    middle = place - place.mean()
    slope = float(np.sum(middle * phase) / np.sum(middle**2))  # least squares
    phase = phase - slope * place
    step = float(np.abs(np.diff(phase)).max())
    if step > math.radians(WIDEST_STEP_DEG):
        problem = f"its phase steps by {math.degrees(step):.0f} degrees between two rows"
        raise fault(path, problem, COLUMNS)
    return PathTable(
        magnitude_db=MonotoneCubic(x=place, y=magnitude),
        phase_rad=MonotoneCubic(x=place, y=phase),
        delay_s=-slope / (2 * math.pi),
    )


@dataclass(frozen=True, slots=True, kw_only=True)
class PathResponse:
    """Settings of a path known by its frequency response.

    Parameters
    ----------
    path : str
        CSV, relative to the recipe: frequency, magnitude in dB, phase in degrees
        (``frequency_hz,magnitude_db,phase_deg``), at least three rows, frequencies rising.
    inverse : bool
        Whether the signal is corrected beforehand for the path instead of sent through it.
    centre_hz : Fraction
        Frequency in the table at which the signal is centred, Hz; 0 for tables of offsets.

    Notes
    -----
    Magnitude in dB and phase follow monotone cubic pieces between the points (F. N. Fritsch,
    J. Butland, 1984). The mean delay of the table is neither applied nor corrected: a loop has
    no beginning; it is told. Beyond the table, or beyond 0.49 of the sample rate, the response
    passes smoothly from one end to the other; power there is warned of. How closely the filter
    follows the table is told. The mean power is left as the filter leaves it, and told.
    """

    path: Annotated[str, MinLen(1)]
    inverse: bool = False
    centre_hz: Fraction = Fraction(0)

    def build(self, site: Site, source: Signal) -> Signal:
        """Return the signal behind the path, or corrected for it.

        Parameters
        ----------
        site : Site
            Where it is built. Told the band, the error of the filter, the delay left out and
            what becomes of the mean power; warned of power beyond the table.
        source : Signal
            What is sent.

        Returns
        -------
        Signal
            Its mean power is to be measured. ``source`` itself where the path changes nothing.

        Raises
        ------
        FileError
            As raised by :func:`read_path`.
        RecipeError
            The table lies outside the band of the samples.
        """
        table = read_path(site.folder / self.path, centre_hz=float(self.centre_hz))
        rate = float(source.sample_rate_hz)
        x = table.magnitude_db.x
        band = Band(max(float(x[0]) / rate, -EDGE), min(float(x[-1]) / rate, EDGE))
        if band.width < 1e-6:
            raise site.error(
                key="centre",
                problem=f"the table reaches from {format_hz(float(x[0]))} to "
                f"{format_hz(float(x[-1]))} about the centre",
                allowed=f"tables that cover some of {format_hz(-EDGE * rate)} to "
                f"{format_hz(EDGE * rate)}",
                remedy="State the centre at which the signal stands in the table.",
            )
        response = self._response(table, rate)
        if np.abs(response(np.linspace(band.low, band.high, 1001))).max() < NEGLIGIBLE:
            return source
        fit = fit_response(response, band, tolerance=TOLERANCE, longest=LONGEST)
        self._tell(site, source, table, band, fit.error)
        tell_power(site, source, power_gain(source, fit.taps))
        return Filtered.of(source, fit.taps)

    def law(self, site: Site, source: Law) -> Law | NoLaw:
        """Return the law behind the filter: only complex Gaussian signals keep theirs."""
        return filtered_law(source, how="corrected for a path" if self.inverse else "sent through")

    def _response(self, table: PathTable, rate: float) -> LogResponse:
        sign = -1.0 if self.inverse else 1.0

        def response(place: NDArray[np.float64]) -> NDArray[np.complex128]:
            hz = place * rate
            neper = table.magnitude_db(hz) * (math.log(10) / 20)
            return np.asarray(sign * (neper + 1j * table.phase_rad(hz)))

        return response

    def _tell(self, site: Site, source: Signal, table: PathTable, band: Band, error: float) -> None:
        rate = float(source.sample_rate_hz)
        low, high = format_hz(round(band.low * rate)), format_hz(round(band.high * rate))
        done = "corrects for" if self.inverse else "applies"
        text = (
            f"{done} the path from {low} to {high} about the centre to {100 * error:.1e} %; "
            f"its mean delay, {format_s(table.delay_s)}, is left out"
        )
        site.notes.append(Note(kind="info", where=site.path, text=text))
        spectrum = pilot_spectrum(source)
        place = (np.fft.fftfreq(spectrum.size) - band.low) % 1.0
        beyond = float(spectrum[place > band.width].sum() / max(float(spectrum.sum()), 1e-300))
        if beyond > DOUBTFUL_SHARE:
            text = f"{beyond:.2g} of the power lies beyond the table, where nothing is known"
            site.notes.append(Note(kind="warning", where=f"{site.path}.path", text=text))
