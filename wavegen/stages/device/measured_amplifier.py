"""The user's own amplifier: AM/AM and AM/PM as measured, from a table."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path
from typing import Annotated

import numpy as np
from annotated_types import Ge, Le, MinLen

from wavegen.core.signal import Signal
from wavegen.core.site import Site
from wavegen.core.units import QuantityError
from wavegen.dsp.monotone_cubic import MonotoneCubic
from wavegen.laws.law import Law
from wavegen.laws.term import NoLaw, Term
from wavegen.stages.amplifier import Amplifier, BackOffFrom, Complexes, Reals
from wavegen.stages.drive import BackedOff, drive
from wavegen.stages.driven_law import driven_law, driven_term
from wavegen.stages.numbers_file import Column, fault, read_columns

COLUMNS = (
    Column(names=("input", "input_power", "pin", "p_in"), units={"dbm": 1.0}),
    Column(names=("output", "output_power", "pout", "p_out"), units={"dbm": 1.0}),
    Column(names=("phase", "am_pm"), units={"deg": 1.0, "°": 1.0, "degrees": 1.0}),
)
LEAST_ROWS = 3
WIDEST_DBM = 300.0


@dataclass(frozen=True, eq=False, kw_only=True)
class MeasuredCurve(Amplifier):
    """Curves through the points; amplitudes are in roots of a milliwatt.

    Parameters
    ----------
    output_dbm, phase_rad : MonotoneCubic
        Over the input in dBm.
    """

    output_dbm: MonotoneCubic
    phase_rad: MonotoneCubic

    def gain(self, amplitude: Reals) -> Complexes:
        """Return the gain; below the first point and above the last that of the point."""
        x = self.output_dbm.x
        input_dbm: Reals = 20 * np.log10(np.maximum(amplitude, 1e-30))
        held: Reals = np.clip(input_dbm, x[0], x[-1])
        size = 10 ** ((self.output_dbm(held) - held) / 20)
        angle = self.phase_rad(held)
        return np.asarray(size * (np.cos(angle) + 1j * np.sin(angle)))


def read_amplifier(path: Path) -> Amplifier:
    """Return an amplifier from its measured points.

    Parameters
    ----------
    path : Path
        CSV with the columns ``input_dbm,output_dbm,phase_deg``, three rows or more, inputs
        rising from row to row.

    Raises
    ------
    FileError
        As raised by :func:`wavegen.stages.numbers_file.read_columns`; inputs that do not rise;
        levels beyond 300 dBm.
    """
    (x, y, phase_deg), _ = read_columns(path, COLUMNS, least_rows=LEAST_ROWS)
    rises = np.diff(x) > 1e-9
    if not rises.all():
        row = int(np.argmin(rises)) + 2
        raise fault(path, f"the input of row {row} does not rise above that before it", COLUMNS)
    if max(np.abs(x).max(), np.abs(y).max()) > WIDEST_DBM:
        raise fault(path, f"has a level beyond {WIDEST_DBM:g} dBm", COLUMNS)
    amplitude = 10 ** (x / 20)
    return MeasuredCurve(
        name=f"measured amplifier {path.name}",
        saturation=float(amplitude[np.argmax(y)]),
        largest=float(amplitude[-1]),
        smallest=float(amplitude[0]),
        kinks=tuple(amplitude.tolist()),
        output_dbm=MonotoneCubic(x=x, y=y),
        phase_rad=MonotoneCubic(x=x, y=np.unwrap(np.deg2rad(phase_deg))),
    )


@dataclass(frozen=True, slots=True, kw_only=True)
class MeasuredAmplifier:
    """Settings of an amplifier known by its measured points.

    Parameters
    ----------
    path : str
        CSV, relative to the recipe: input dBm, output dBm, phase in degrees
        (``input_dbm,output_dbm,phase_deg``), at least three rows, inputs rising.
    input_power_dbm : float, optional
        Mean input power (of a gated signal: of its on-time), dBm. This, or a back-off.
    input_back_off_db : float, optional
        Instead: how far the mean input power stands below the reference, dB.
    back_off_from : {"saturation", "compression"}
        The reference at the input: the point of the highest output in the table, or the 1 dB
        compression point, below the highest gain.

    Notes
    -----
    Output power and phase follow monotone cubic pieces over the input in dBm (F. N. Fritsch,
    J. Butland, 1984). Below the first point the gain and phase of that point are held, and it is
    told how often; above the last nothing is extrapolated: a signal that peaks there is refused.
    The output has the mean power of the input; the gain that was undone is told.
    """

    path: Annotated[str, MinLen(1)]
    input_power_dbm: Annotated[float, Ge(-300), Le(300)] | None = None
    input_back_off_db: Annotated[float, Ge(-20), Le(200)] | None = None
    back_off_from: BackOffFrom = "compression"

    def __post_init__(self) -> None:
        """Refuse anything but one way to set the level."""
        if (self.input_power_dbm is None) == (self.input_back_off_db is None):
            raise QuantityError(
                problem="it is not said how the amplifier is driven",
                allowed="input_power or input_back_off, one of them",
                remedy="Write it like input_power: -12 dBm.",
            )

    def build(self, site: Site, source: Signal) -> Signal:
        """Return the signal behind the amplifier at the mean power it had.

        Raises
        ------
        FileError
            As raised by :func:`read_amplifier`.
        RecipeError
            The signal is zero, peaks beyond the last point, or the table does not reach the
            reference.
        """
        amplifier, rms, told = self._driven(site)
        return drive(site, source, amplifier, rms, told=told)

    def law(self, site: Site, source: Law) -> Law | NoLaw:
        """Return the law behind the amplifier; none where the input has no highest level."""
        amplifier, rms, _ = self._driven(site)
        return driven_law(source, amplifier, rms, n_samples=site.n_samples)

    def term(self, site: Site, source: Term) -> Term | NoLaw:
        """Return what a part of a composite is behind the amplifier."""
        amplifier, rms, _ = self._driven(site)
        return driven_term(source, amplifier, rms)

    def _driven(self, site: Site) -> tuple[Amplifier, float, str]:
        amplifier = read_amplifier(site.folder / self.path)
        if self.input_power_dbm is not None:
            told = f"mean input power {self.input_power_dbm:g} dBm"
            return amplifier, 10 ** (self.input_power_dbm / 20), told
        backed = BackedOff(
            amplifier=amplifier,
            back_off_db=self.input_back_off_db or 0.0,
            back_off_from=self.back_off_from,
        )
        return amplifier, backed.rms(site), backed.told
