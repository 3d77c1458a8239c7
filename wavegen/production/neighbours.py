"""Where a recipe's carrier stands, and the adjacent channels in which its leakage is read."""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction
from typing import Annotated

from annotated_types import Gt

from wavegen.core.errors import ArgumentsError
from wavegen.core.signal import Signal
from wavegen.core.site import Site
from wavegen.core.units import format_hz
from wavegen.meters.aclr import AclrPlan, MeasuredChannel, aclr_plan
from wavegen.meters.limits import aclr_row
from wavegen.meters.mask import SpectralMask
from wavegen.meters.spectrum import SpectrumMeter
from wavegen.stages.passband import filled_band

SPACING_OVER_BAND = Fraction(10, 9)
"""Channel spacing over the occupied band where neither is given: E-UTRA channels fill nine tenths
of their spacing (3GPP TS 36.104 Table 5.6-1)."""
BINS_PER_BAND = 256
"""Bins of the spectrum over the narrowest channel, at least."""
MOST_BINS = 1 << 17
FEWEST_BINS = 1 << 12


@dataclass(frozen=True, slots=True, kw_only=True)
class ChannelRequest:
    """Which adjacent channels are asked for; what is not said follows from the occupied band.

    Parameters
    ----------
    standard : str, optional
        Row of the table of standards: ``NR BS FR1``; see
        :func:`wavegen.meters.limits.aclr_row_names`.
    width_hz : Fraction, optional
        Channel width of the standard's carrier, Hz; the narrowest that holds the occupied band
        if not given.
    bandwidth_hz : Fraction, optional
        Own channels: measurement bandwidth of carrier and neighbours, Hz; the occupied band if
        not given.
    spacing_hz : Fraction, optional
        Own channels: from centre to centre, Hz; ten ninths of the bandwidth if not given.
    """

    standard: str | None = None
    width_hz: Annotated[Fraction, Gt(0)] | None = None
    bandwidth_hz: Annotated[Fraction, Gt(0)] | None = None
    spacing_hz: Annotated[Fraction, Gt(0)] | None = None

    def __post_init__(self) -> None:
        """Refuse channels of a standard and own ones together.

        Raises
        ------
        ArgumentsError
            The two do not go together.
        """
        own = self.bandwidth_hz is not None or self.spacing_hz is not None
        if self.standard is not None and own:
            raise ArgumentsError(
                where="channels",
                problem=f"a bandwidth or spacing is given beside {self.standard}",
                allowed="the channels of a standard, or a bandwidth and a spacing",
                remedy="Leave one of the two out.",
            )
        if self.standard is None and self.width_hz is not None:
            raise ArgumentsError(
                where="channels",
                problem="a channel width is given, but no standard that has such channels",
                allowed="a channel width beside the name of a standard",
                remedy="Name the standard, or give bandwidth and spacing instead.",
            )


@dataclass(frozen=True, slots=True, kw_only=True)
class OccupiedBand:
    """The band from the lowest to the highest edge that a signal fills, gaps included.

    Parameters
    ----------
    low_hz, high_hz : float
        Where the density has fallen by 20 dB, of each part of a sum by itself, Hz.
    """

    low_hz: float
    high_hz: float

    @property
    def centre_hz(self) -> float:
        """Its middle, Hz."""
        return (self.low_hz + self.high_hz) / 2

    @property
    def width_hz(self) -> float:
        """Distance of the edges, Hz."""
        return self.high_hz - self.low_hz


def occupied_band(site: Site, signal: Signal) -> OccupiedBand | None:
    """Return the band that a signal fills; None for one without power.

    Parameters
    ----------
    site : Site
        Where it is built; it takes no notes here.
    signal : Signal
        Some of it is computed.
    """
    quiet = Site(
        sample_rate_hz=signal.sample_rate_hz,
        n_samples=signal.n_samples,
        seed=site.seed,
        label=site.label,
        path=site.path,
    )
    found = filled_band(quiet, signal)
    if found is None:
        return None
    rate = float(signal.sample_rate_hz)
    return OccupiedBand(
        low_hz=min(band.low for band in found.bands) * rate,
        high_hz=max(band.high for band in found.bands) * rate,
    )


def plan_channels(request: ChannelRequest, band: OccupiedBand) -> AclrPlan:
    """Return carrier and neighbours.

    Parameters
    ----------
    request : ChannelRequest
        What was asked for.
    band : OccupiedBand
        Of the carrier.

    Returns
    -------
    AclrPlan
        Around the middle of the band. Its limits are those of the standard; own channels have
        none.

    Raises
    ------
    ArgumentsError
        No such row of a standard, or none of its channels is wide enough.

    Examples
    --------
    >>> band = OccupiedBand(low_hz=-9e6, high_hz=9e6)
    >>> plan = plan_channels(ChannelRequest(standard="NR BS FR1"), band)
    >>> plan.name, plan.neighbours[1].offset_hz
    ('NR BS FR1, 20 MHz', 20000000.0)
    >>> [c.offset_hz for c in plan_channels(ChannelRequest(), band).neighbours]
    [-20000000.0, 20000000.0]
    """
    if request.standard is not None:
        return aclr_plan(
            request.standard, channel_mhz=_width_mhz(request.standard, request.width_hz, band)
        )
    bandwidth = band.width_hz if request.bandwidth_hz is None else float(request.bandwidth_hz)
    spacing = (
        bandwidth * float(SPACING_OVER_BAND)
        if request.spacing_hz is None
        else float(request.spacing_hz)
    )
    origin = "found" if request.bandwidth_hz is None else "as asked"
    return AclrPlan(
        name=f"channels of {format_hz(round(bandwidth))}, {format_hz(round(spacing))} apart",
        carrier=MeasuredChannel(offset_hz=0.0, bandwidth_hz=bandwidth, name="carrier"),
        neighbours=tuple(
            MeasuredChannel(offset_hz=side * spacing, bandwidth_hz=bandwidth, name="first")
            for side in (-1, 1)
        ),
        source=f"occupied band of {format_hz(round(band.width_hz))}, bandwidth {origin}",
        status="own",
    )


def _width_mhz(standard: str, width_hz: Fraction | None, band: OccupiedBand) -> float:
    if width_hz is not None:
        return float(width_hz / 1_000_000)
    known, row = aclr_row(standard)
    widths = sorted(float(name) for name in row["carrier_bandwidth_mhz"])
    for width in widths:
        if width * 1e6 >= band.width_hz:
            return width
    raise ArgumentsError(
        where="channels",
        problem=f"the signal fills {format_hz(round(band.width_hz))}",
        allowed=f"bands up to the widest channel of {known}, {widths[-1]:g} MHz",
        remedy="Choose another standard, or give bandwidth and spacing.",
    )


def is_held(plan: AclrPlan, signal: Signal, centre_hz: float) -> bool:
    """Return whether the sample rate holds all channels of a plan around a centre."""
    return plan.needed_hz / 2 + abs(centre_hz) <= float(signal.sample_rate_hz) / 2 * (1 + 1e-9)


def spectrum_meter(signal: Signal, width_hz: float, mask: SpectralMask | None) -> SpectrumMeter:
    """Return the spectrum meter whose bins are narrow enough for a channel and a mask.

    Parameters
    ----------
    signal : Signal
        What is measured.
    width_hz : float
        Of the narrowest channel, Hz.
    mask : SpectralMask or None
        Whose measurement bandwidth holds two bins at least.
    """
    bin_hz = width_hz / BINS_PER_BAND
    if mask is not None:
        bin_hz = min(bin_hz, mask.measurement_bandwidth_hz / 2)
    wanted = min(max(float(signal.sample_rate_hz) / bin_hz, FEWEST_BINS), MOST_BINS)
    n_fft = 1 << max(int(wanted - 1).bit_length(), 3)
    while n_fft > max(signal.n_samples, 8):
        n_fft //= 2
    return SpectrumMeter(n_fft=n_fft)
