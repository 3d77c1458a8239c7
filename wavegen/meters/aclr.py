"""Adjacent-channel leakage ratio through the measurement filters of the standards."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from wavegen.core.errors import ArgumentsError, SignalError
from wavegen.core.table import Table
from wavegen.core.units import format_hz
from wavegen.meters.limits import aclr_row
from wavegen.meters.spectrum import Spectrum

RRC_ROLL_OFF = 0.22
"""3GPP TS 38.101-1 cl. 6.5.2.4.2, TS 25.104 cl. 6.8.1."""

MeasurementFilter = Literal["square", "rrc"]


@dataclass(frozen=True, slots=True, kw_only=True)
class MeasuredChannel:
    """A channel and the filter through which its power is read.

    Parameters
    ----------
    offset_hz : float
        Its centre, Hz from that of the carrier.
    bandwidth_hz : float
        Noise bandwidth of the filter: the width of the square one, the chip rate of the root
        raised cosine.
    filter : {"square", "rrc"}
        ``rrc``: root raised cosine of roll-off 0.22.
    name : str
        What it is called in tables.
    limit_db : float or None
        Least ratio of the carrier's power over its own.
    """

    offset_hz: float
    bandwidth_hz: float
    filter: MeasurementFilter = "square"
    name: str = "adjacent"
    limit_db: float | None = None

    @property
    def reach_hz(self) -> float:
        """Half the width beyond which nothing passes, Hz."""
        factor = 1 + RRC_ROLL_OFF if self.filter == "rrc" else 1.0
        return self.bandwidth_hz / 2 * factor


@dataclass(frozen=True, slots=True, kw_only=True)
class AclrPlan:
    """A carrier and the channels beside it, from a row of a standard.

    Parameters
    ----------
    name : str
        Row and channel width.
    carrier : MeasuredChannel
        At offset 0.
    neighbours : tuple of MeasuredChannel
        Below and above.
    source, status : str
        Where they are from, and how far that is confirmed.
    """

    name: str
    carrier: MeasuredChannel
    neighbours: tuple[MeasuredChannel, ...]
    source: str
    status: str

    @property
    def needed_hz(self) -> float:
        """Sample rate that holds all channels around the carrier, Hz."""
        return max(2 * (abs(c.offset_hz) + c.reach_hz) for c in (self.carrier, *self.neighbours))


@dataclass(frozen=True, slots=True, kw_only=True)
class LeakageRatio:
    """The ratio for one channel.

    Parameters
    ----------
    channel : MeasuredChannel
        Which.
    ratio_db : float
        Power in the carrier's filter over that in the channel's, dB; more is better.
    """

    channel: MeasuredChannel
    ratio_db: float

    @property
    def margin_db(self) -> float | None:
        """Ratio over the limit, dB; None without a limit."""
        limit = self.channel.limit_db
        return None if limit is None else self.ratio_db - limit


@dataclass(frozen=True, slots=True, kw_only=True)
class Aclr:
    """Leakage into every channel asked for.

    Parameters
    ----------
    carrier_power : float
        In the carrier's filter, on the scale of the samples squared.
    ratios : tuple of LeakageRatio
        One for each channel.
    """

    carrier_power: float
    ratios: tuple[LeakageRatio, ...]

    @property
    def worst_db(self) -> float:
        """Smallest ratio, dB."""
        return min(ratio.ratio_db for ratio in self.ratios)

    @property
    def margin_db(self) -> float | None:
        """Smallest ratio over its limit, dB; None where no channel has one."""
        margins = [ratio.margin_db for ratio in self.ratios if ratio.margin_db is not None]
        return min(margins) if margins else None

    def rows(self) -> tuple[tuple[str, str], ...]:
        """Return name and value of each channel, for tables."""
        return tuple(
            (
                f"ACLR {item.channel.name}, {format_hz(item.channel.offset_hz)}",
                f"{item.ratio_db:.2f} dB",
            )
            for item in self.ratios
        )

    def table(self) -> Table:
        """Return every channel with its limit, for people."""
        rows = tuple(
            (
                item.channel.name,
                format_hz(item.channel.offset_hz),
                f"{format_hz(item.channel.bandwidth_hz)} {item.channel.filter}",
                f"{item.ratio_db:.2f}",
                "" if item.channel.limit_db is None else f"{item.channel.limit_db:g}",
                "" if item.margin_db is None else f"{item.margin_db:+.2f}",
            )
            for item in self.ratios
        )
        return Table(
            title="Adjacent-channel leakage ratio",
            headings=("channel", "offset", "filter", "ratio dB", "limit dB", "margin dB"),
            rows=rows,
            right=frozenset({1, 3, 4, 5}),
        )


def aclr_plan(name: str, *, channel_mhz: float) -> AclrPlan:
    """Return carrier and neighbours by a row of a standard.

    Parameters
    ----------
    name : str
        ``NR BS FR1``, ``E-UTRA UE to UTRA`` ...; see
        :func:`wavegen.meters.limits.aclr_row_names`.
    channel_mhz : float
        Channel width of the carrier, MHz.

    Returns
    -------
    AclrPlan

    Raises
    ------
    ArgumentsError
        No such row, or no such channel width in it.

    Examples
    --------
    >>> plan = aclr_plan("NR BS FR1", channel_mhz=20)
    >>> [round(c.offset_hz / 1e6) for c in plan.neighbours], plan.carrier.bandwidth_hz / 1e6
    ([-20, 20, -40, 40], 19.08)
    """
    known, row = aclr_row(name)
    widths = row["carrier_bandwidth_mhz"]
    own = widths.get(f"{channel_mhz:g}")
    if own is None:
        raise ArgumentsError(
            where=known,
            problem=f"{channel_mhz:g} MHz is no channel width of {known}",
            allowed=", ".join(f"{width} MHz" for width in widths),
            remedy="Choose one of these, or give channels of your own.",
        )
    carrier = MeasuredChannel(
        offset_hz=0.0, bandwidth_hz=own * 1e6, filter=row["carrier_filter"], name="carrier"
    )
    neighbours = tuple(
        MeasuredChannel(
            offset_hz=side
            * (item["offset_channels"] * channel_mhz + item["offset_plus_mhz"])
            * 1e6,
            bandwidth_hz=item.get("bandwidth_mhz", own) * 1e6,
            filter=item["filter"],
            name=item["name"],
            limit_db=item["limit_db"],
        )
        for item in row["neighbours"]
        for side in (-1, 1)
    )
    return AclrPlan(
        name=f"{known}, {channel_mhz:g} MHz",
        carrier=carrier,
        neighbours=neighbours,
        source=row["source"],
        status=row["status"],
    )


def channel_power(spectrum: Spectrum, channel: MeasuredChannel, *, centre_hz: float = 0.0) -> float:
    """Return the power that passes the filter of a channel.

    Parameters
    ----------
    spectrum : Spectrum
        Of the signal.
    channel : MeasuredChannel
        Where and through what.
    centre_hz : float
        Centre of the carrier, Hz.

    Returns
    -------
    float
        On the scale of the samples squared; the filter passes 1 in its middle.

    Raises
    ------
    SignalError
        The sample rate does not hold the channel.
    """
    middle = centre_hz + channel.offset_hz
    low, high = middle - channel.reach_hz, middle + channel.reach_hz
    half = spectrum.sample_rate_hz / 2
    if max(-low, high) > half * (1 + 1e-9):
        raise SignalError(
            where=channel.name,
            problem=f"the channel at {format_hz(middle)} reaches {format_hz(max(-low, high))} "
            f"from the centre of samples at {format_hz(spectrum.sample_rate_hz)}",
            allowed=f"channels up to {format_hz(half)} from the centre",
            remedy=f"Raise the sample rate to {format_hz(2 * max(-low, high))} or more, or ask "
            "for fewer channels.",
        )
    if channel.filter == "square":
        return spectrum.power(low, min(high, half))
    n = spectrum.density.size
    edges = (np.arange(n + 1) - n // 2 - 0.5) * spectrum.bin_hz
    passed = np.diff(passed_below(edges - np.float64(middle), chip_rate_hz=channel.bandwidth_hz))
    return math.fsum(spectrum.density * passed)


def passed_below(frequency_hz: NDArray[np.float64], *, chip_rate_hz: float) -> NDArray[np.float64]:
    """Return the integral of the power response of the RRC filter, 1 in its middle.

    Parameters
    ----------
    frequency_hz : float64 array
        Upper limits, Hz from the middle of the filter.
    chip_rate_hz : float
        Its noise bandwidth, Hz.

    Returns
    -------
    float64 array, same shape
        Hz: minus half the chip rate far below, plus half of it far above.

    Notes
    -----
    The power response is a raised cosine: 1 up to ``(1 - a) / 2`` chip rates, then
    ``(1 + cos(pi (f - (1 - a) / 2) / a)) / 2`` up to ``(1 + a) / 2``. Derivation.
    """
    a = RRC_ROLL_OFF
    f = np.abs(frequency_hz) / chip_rate_hz
    into = np.clip(f - (1 - a) / 2, 0.0, a)
    below = np.minimum(f, (1 - a) / 2) + into / 2 + a / (2 * np.pi) * np.sin(np.pi * into / a)
    return np.asarray(np.sign(frequency_hz) * below * chip_rate_hz)


def aclr(
    spectrum: Spectrum,
    *,
    carrier: MeasuredChannel,
    neighbours: Sequence[MeasuredChannel],
    centre_hz: float = 0.0,
) -> Aclr:
    """Return the leakage ratios of a carrier.

    Parameters
    ----------
    spectrum : Spectrum
        Its bins should be a tenth of the gap between filters or narrower.
    carrier : MeasuredChannel
        The carrier's own filter.
    neighbours : sequence of MeasuredChannel
        At least one.
    centre_hz : float
        Where the carrier stands, Hz.

    Returns
    -------
    Aclr

    Raises
    ------
    SignalError
        The sample rate does not hold a channel, or the carrier's has no power.

    Notes
    -----
    Ratio of filtered mean powers, the carrier's over its neighbour's: 3GPP TS 38.104 cl.
    6.6.3.1.
    """
    own = channel_power(spectrum, carrier, centre_hz=centre_hz)
    if own <= 0:
        raise SignalError(
            where=carrier.name,
            problem=f"there is no power in the carrier's channel at {format_hz(centre_hz)}",
            allowed="a carrier inside its channel",
            remedy="Correct the centre frequency.",
        )
    ratios = []
    for channel in neighbours:
        leaked = channel_power(spectrum, channel, centre_hz=centre_hz)
        ratio = 10 * math.log10(own / leaked) if leaked > 0 else math.inf
        ratios.append(LeakageRatio(channel=channel, ratio_db=ratio))
    return Aclr(carrier_power=own, ratios=tuple(ratios))
