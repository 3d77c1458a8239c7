"""The spectra of two sides beside each other, and whether they can be compared at all."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from wavegen.comparison.side import Side
from wavegen.core.errors import SignalError
from wavegen.core.excerpt import excerpt
from wavegen.core.progress import Progress, silent
from wavegen.core.render import Tap, render, samples_of
from wavegen.core.signal import Signal
from wavegen.core.units import format_hz
from wavegen.meters.occupied_bandwidth import OccupiedBandwidth, occupied_bandwidth
from wavegen.meters.spectrum import Spectrum, SpectrumMeter

Reals = NDArray[np.float64]

LONGEST_FFT = 4096
SHORTEST_FFT = 64
FEWEST_SEGMENTS = 8
LONG_RECORD = 1 << 23
N_STRETCHES, STRETCH_SAMPLES = 32, 1 << 17
"""Of a longer record so many stretches, spread evenly, are looked at, a thousand segments in all:
the spectrum of a gigabyte then costs no more than that of 32 MB."""
N_BANDS = 40
"""Bands over the occupied width in which the densities are compared."""
ALIKE = 0.8
"""Occupied widths closer than this ratio are told as alike."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class SideSpectrum:
    """Where a side has its power.

    Parameters
    ----------
    spectrum : Spectrum
        Its density.
    occupied : OccupiedBandwidth
        The band with 99 % of the power.
    """

    spectrum: Spectrum
    occupied: OccupiedBandwidth

    @property
    def centre_hz(self) -> float:
        """Middle of the occupied band, Hz."""
        return (self.occupied.low_hz + self.occupied.high_hz) / 2


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class SpectrumDifference:
    """How two spectra differ.

    Parameters
    ----------
    first, second : SideSpectrum
        Both.
    offset_hz : float
        Centre of the first less that of the second: taken off before densities are compared.
    band_hz : float64 array, shape (n_bands,)
        Middles of bands over the wider occupied band, from its centre.
    difference_db : float64 array, shape (n_bands,)
        Power of the first in each over its total, less that of the second.
    """

    first: SideSpectrum
    second: SideSpectrum
    offset_hz: float
    band_hz: Reals
    difference_db: Reals

    @property
    def width_ratio(self) -> float:
        """Occupied width of the first over that of the second."""
        return self.first.occupied.width_hz / self.second.occupied.width_hz

    @property
    def largest_db(self) -> float:
        """Largest difference in a band, within the narrower occupied band."""
        half = min(self.first.occupied.width_hz, self.second.occupied.width_hz) / 2
        inside = self.difference_db[np.abs(self.band_hz) <= half]
        return float(inside[np.argmax(np.abs(inside))]) if inside.size else 0.0


def side_spectrum(
    side: Side, *, workers: int = 1, progress: Progress = silent
) -> SideSpectrum | None:
    """Return the spectrum of a side.

    Parameters
    ----------
    side : Side
        Any.
    workers, progress
        As in :func:`wavegen.core.render.render`.

    Returns
    -------
    SideSpectrum or None
        None where it has no samples, no phase, or too few samples.
    """
    signal = side.signal
    if signal is None or side.is_power or signal.n_samples < SHORTEST_FFT * FEWEST_SEGMENTS:
        return None
    n_fft = 1 << min(signal.n_samples // FEWEST_SEGMENTS, LONGEST_FFT).bit_length() - 1
    options: dict[str, Any] = {"n_fft": n_fft, "where": side.name, "overlap": 0.5}
    if signal.n_samples <= LONG_RECORD:
        meter = SpectrumMeter(loops=side.loops, **options)
        tap = Tap(name="spectrum", signal=signal, meter=meter)
        spectrum: Spectrum = render(
            signal, taps=(tap,), workers=workers, progress=progress, task=f"spectrum of {side.name}"
        )["spectrum"]
    else:
        spectrum = _of_stretches(signal, SpectrumMeter(loops=False, **options))
    return SideSpectrum(spectrum=spectrum, occupied=occupied_bandwidth(spectrum))


def _of_stretches(signal: Signal, meter: SpectrumMeter) -> Spectrum:
    """Return the mean spectrum of stretches spread over a signal; silent ones add nothing."""
    found = []
    for number in range(N_STRETCHES):
        start = number * (signal.n_samples - STRETCH_SAMPLES) // (N_STRETCHES - 1)
        part = excerpt(signal, start, start + STRETCH_SAMPLES)
        samples = samples_of(part)
        if samples.any():
            reading = meter.begin(part)
            reading.feed(0, samples)
            found.append(reading.result())
    if not found:
        raise SignalError(
            where=meter.where,
            problem="is silent wherever it was looked at",
            allowed="a signal with power",
            remedy="Check the level, or take the part of it that is on with --from and --to.",
        )
    density = sum(item.density for item in found) / N_STRETCHES
    return replace(found[0], density=np.asarray(density))


def spectrum_difference(
    first: SideSpectrum, second: SideSpectrum, *, is_centred: bool = True
) -> SpectrumDifference:
    """Return how two spectra differ, in bands of equal width.

    Parameters
    ----------
    first, second : SideSpectrum
        Of any rates: powers in bands are compared, as far as both sample them.
    is_centred : bool
        Whether they are put centre on centre first; else every band of the second is compared
        with the same frequencies of the first.
    """
    half = max(first.occupied.width_hz, second.occupied.width_hz) / 2
    edges = np.linspace(-half, half, N_BANDS + 1)
    powers, is_seen = [], np.ones(N_BANDS, np.bool_)
    for side in (first, second):
        place = edges + (side if is_centred else second).centre_hz
        limit = side.spectrum.sample_rate_hz / 2
        is_seen &= (np.abs(place) <= limit)[:-1] & (np.abs(place) <= limit)[1:]
        below = side.spectrum.power_below(np.clip(place, -limit, limit))
        powers.append(np.maximum(np.diff(below) / side.spectrum.total_power, 1e-12))
    return SpectrumDifference(
        first=first,
        second=second,
        offset_hz=first.centre_hz - second.centre_hz,
        band_hz=((edges[1:] + edges[:-1]) / 2)[is_seen],
        difference_db=(10 * np.log10(powers[0] / powers[1]))[is_seen],
    )


def refuse_too_narrow(sides: tuple[Side, Side], found: SpectrumDifference) -> None:
    """Refuse a side that cannot hold what the other one is.

    Raises
    ------
    SignalError
        Its sample rate is less than the occupied bandwidth of the other.
    """
    spectra = (found.first, found.second)
    for side, own, other, theirs in (
        (sides[0], spectra[0], sides[1], spectra[1]),
        (sides[1], spectra[1], sides[0], spectra[0]),
    ):
        rate_hz = own.spectrum.sample_rate_hz
        width_hz = theirs.occupied.width_hz
        if rate_hz < width_hz:
            raise SignalError(
                where=side.name,
                problem=f"is sampled at {format_hz(rate_hz)} and cannot hold {other.name}, "
                f"which occupies {format_hz(width_hz, digits=4)}",
                allowed="sides that are at least as wide as the other one's signal",
                remedy="Record more bandwidth, or compare with a narrower signal.",
            )


def spectrum_warnings(sides: tuple[Side, Side], found: SpectrumDifference) -> list[str]:
    """Return what the spectra make doubtful about a comparison of levels."""
    ratio = found.width_ratio
    if ALIKE <= ratio <= 1 / ALIKE:
        return []
    widths = [item.occupied.width_hz for item in (found.first, found.second)]
    narrow, wide = (0, 1) if ratio < 1 else (1, 0)
    told = [format_hz(width, digits=4) for width in widths]
    text = (
        f"{sides[narrow].name} occupies {told[narrow]}, "
        f"{sides[wide].name} {told[wide]}: a filter narrower than the signal "
        "changes its levels, and signals of different widths have peaks of different lengths"
    )
    return [text]
