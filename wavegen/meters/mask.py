"""Spectral mask: the density of a signal against limits drawn from point to point."""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise
from typing import Annotated, Literal

import numpy as np
from annotated_types import Gt, MinLen
from numpy.typing import NDArray

from wavegen.core.errors import SignalError
from wavegen.core.table import Table
from wavegen.core.units import QuantityError, format_hz
from wavegen.meters.spectrum import Spectrum

Reference = Literal["total_power", "peak_density"]


@dataclass(frozen=True, slots=True, kw_only=True)
class MaskPoint:
    """A corner of a mask.

    Parameters
    ----------
    offset_hz : float
        Hz from the centre of the carrier.
    level_db : float
        Largest level allowed there, dB over the reference.
    """

    offset_hz: float
    level_db: float


@dataclass(frozen=True, slots=True, kw_only=True)
class SpectralMask:
    """Limits between points, straight in dB over frequency.

    Parameters
    ----------
    points : tuple of MaskPoint
        Two or more, offsets rising; two at one offset make a step, where the looser counts. What
        lies outside the first and the last is not judged.
    measurement_bandwidth_hz : float
        Width in which each level is read, Hz.
    reference : {"total_power", "peak_density"}
        What levels are over: the power of the whole signal, or the largest power in any
        measurement bandwidth.
    both_sides : bool
        Whether the points, all at offsets of 0 or more, hold below the centre too.
    """

    points: Annotated[tuple[MaskPoint, ...], MinLen(2)]
    measurement_bandwidth_hz: Annotated[float, Gt(0)]
    reference: Reference = "total_power"
    both_sides: bool = True

    def __post_init__(self) -> None:
        """Refuse points out of order."""
        offsets = [point.offset_hz for point in self.points]
        if any(b < a for a, b in pairwise(offsets)) or offsets[0] == offsets[-1]:
            raise QuantityError(
                problem="the points of the mask are not in order of frequency",
                allowed="rising offsets; two equal ones make a step",
                remedy="Sort them.",
                key="points",
            )
        if self.both_sides and offsets[0] < 0:
            raise QuantityError(
                problem=f"{format_hz(offsets[0])} lies below the centre of a mask for both sides",
                allowed="offsets of 0 or more, or both_sides: false",
                remedy="Give one side only.",
                key="points",
            )


@dataclass(frozen=True, slots=True, kw_only=True)
class MaskSegment:
    """What was found between two points.

    Parameters
    ----------
    low_hz, high_hz : float
        Its ends, Hz from the centre of the carrier.
    margin_db : float
        Least distance of the level below the limit, dB; negative where it is passed.
    at_hz : float
        Where that is.
    level_db, limit_db : float
        Level and limit there, dB over the reference.
    """

    low_hz: float
    high_hz: float
    margin_db: float
    at_hz: float
    level_db: float
    limit_db: float


@dataclass(frozen=True, slots=True, kw_only=True)
class MaskResult:
    """A signal against a mask.

    Parameters
    ----------
    segments : tuple of MaskSegment
        In order of frequency.
    """

    segments: tuple[MaskSegment, ...]

    @property
    def margin_db(self) -> float:
        """Least margin, dB; negative where the mask is passed."""
        return min(segment.margin_db for segment in self.segments)

    @property
    def is_kept(self) -> bool:
        """Whether the level is at or under the limit everywhere."""
        return self.margin_db >= 0

    def rows(self) -> tuple[tuple[str, str], ...]:
        """Return name and value, for tables."""
        return (("mask margin", f"{self.margin_db:+.2f} dB"),)

    def table(self) -> Table:
        """Return every segment, for people."""
        rows = tuple(
            (
                f"{format_hz(item.low_hz)} to {format_hz(item.high_hz)}",
                format_hz(round(item.at_hz, 1)),
                f"{item.level_db:.2f}",
                f"{item.limit_db:.2f}",
                f"{item.margin_db:+.2f}",
            )
            for item in self.segments
        )
        return Table(
            title="Spectral mask",
            headings=("offset", "tightest at", "level dB", "limit dB", "margin dB"),
            rows=rows,
            right=frozenset({1, 2, 3, 4}),
        )


def check_mask(spectrum: Spectrum, mask: SpectralMask, *, centre_hz: float = 0.0) -> MaskResult:
    """Compare a spectrum with a mask.

    Parameters
    ----------
    spectrum : Spectrum
        Of the signal; its resolution should be no wider than the measurement bandwidth.
    mask : SpectralMask
        The limits.
    centre_hz : float
        Centre of the carrier, Hz.

    Returns
    -------
    MaskResult

    Raises
    ------
    SignalError
        The sample rate does not hold the mask, or the spectrum is coarser than the measurement
        bandwidth.
    """
    width = mask.measurement_bandwidth_hz
    if width < spectrum.bin_hz:
        raise SignalError(
            where="mask",
            problem=f"a measurement bandwidth of {format_hz(width)} on bins of "
            f"{format_hz(round(spectrum.bin_hz, 3))}",
            allowed="bins as narrow as the measurement bandwidth, or narrower",
            remedy="Measure the spectrum with a longer transform.",
        )
    corners = [(point.offset_hz, point.level_db) for point in mask.points]
    sides = [pairwise(corners)]
    if mask.both_sides:
        sides.insert(0, pairwise([(-offset, level) for offset, level in reversed(corners)]))
    ends = [(low, high) for side in sides for low, high in side if low[0] < high[0]]
    for (low, _), (high, _) in ends:
        spectrum.check_band(centre_hz + low - width / 2, centre_hz + high + width / 2, where="mask")
    reference = reference_power(spectrum, mask)
    return MaskResult(
        segments=tuple(
            _segment(spectrum, low, high, width=width, reference=reference, centre_hz=centre_hz)
            for low, high in ends
        )
    )


def reference_power(spectrum: Spectrum, mask: SpectralMask) -> float:
    """Return the power that the levels of a mask are over.

    Parameters
    ----------
    spectrum : Spectrum
        Of the signal.
    mask : SpectralMask
        Says which power.
    """
    if mask.reference == "total_power":
        return spectrum.total_power
    half = (spectrum.sample_rate_hz - mask.measurement_bandwidth_hz) / 2
    places = spectrum.frequencies_hz
    places = places[np.abs(places) <= half]
    return float(_power_around(spectrum, places, mask.measurement_bandwidth_hz).max())


def _power_around(
    spectrum: Spectrum, places: NDArray[np.float64], width: float
) -> NDArray[np.float64]:
    return spectrum.power_below(places + width / 2) - spectrum.power_below(places - width / 2)


def _segment(
    spectrum: Spectrum,
    low: tuple[float, float],
    high: tuple[float, float],
    *,
    width: float,
    reference: float,
    centre_hz: float,
) -> MaskSegment:
    offsets = spectrum.frequencies_hz - centre_hz
    offsets = offsets[(offsets > low[0]) & (offsets < high[0])]
    offsets = np.concatenate(([low[0]], offsets, [high[0]]))
    power = _power_around(spectrum, offsets + centre_hz, width)
    levels = 10 * np.log10(np.maximum(power / reference, 1e-30))
    limits = np.interp(offsets, [low[0], high[0]], [low[1], high[1]])
    worst = int(np.argmin(limits - levels))
    return MaskSegment(
        low_hz=low[0],
        high_hz=high[0],
        margin_db=float(limits[worst] - levels[worst]),
        at_hz=float(offsets[worst]),
        level_db=float(levels[worst]),
        limit_db=float(limits[worst]),
    )
