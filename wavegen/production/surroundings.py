"""What a spectrum is drawn beside: the channels that a signal fills and leaks into, and a mask."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from wavegen.core.errors import WavegenError
from wavegen.core.signal import Signal
from wavegen.core.site import Site
from wavegen.meters.aclr import AclrPlan, aclr
from wavegen.meters.mask import SpectralMask, reference_power
from wavegen.meters.spectrum import Spectrum
from wavegen.production.neighbours import (
    ChannelRequest,
    OccupiedBand,
    is_held,
    occupied_band,
    plan_channels,
)

RESOLVED = 10
"""Resolutions that a channel holds at least: else what is read beside it is the window's own."""

Corners = tuple[NDArray[np.float64], NDArray[np.float64]]


@dataclass(frozen=True, slots=True, kw_only=True)
class ChannelView:
    """One channel of a spectrum.

    Parameters
    ----------
    name : str
        ``carrier`` or ``adjacent``.
    low_hz, high_hz : float
        Its edges, Hz.
    leakage_db : float or None
        Its power over the carrier's, dB; None of the carrier itself.
    """

    name: str
    low_hz: float
    high_hz: float
    leakage_db: float | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Surroundings:
    """Where a signal stands in its spectrum.

    Parameters
    ----------
    band : OccupiedBand
        That it fills.
    plan : AclrPlan or None
        Its neighbours; None where the sample rate does not hold them.
    """

    band: OccupiedBand
    plan: AclrPlan | None

    @classmethod
    def of(cls, graph: Signal) -> Surroundings | None:
        """Find the band of a recipe's signal; None where there is none of any width.

        Parameters
        ----------
        graph : Signal
            Some of it is computed.
        """
        site = Site(
            sample_rate_hz=graph.sample_rate_hz,
            n_samples=graph.n_samples,
            seed=1,
            label="surroundings",
            path="signal",
        )
        band = occupied_band(site, graph)
        if band is None or not band.width_hz > 0:
            return None
        plan = plan_channels(ChannelRequest(), band)
        return cls(band=band, plan=plan if is_held(plan, graph, band.centre_hz) else None)

    def moved(self, centre_hz: float, *, sample_rate_hz: float) -> Surroundings:
        """Return where it stands around an intermediate frequency.

        Parameters
        ----------
        centre_hz : float
            By how much it is moved up, Hz.
        sample_rate_hz : float
            Neighbours that lie outside of what real samples of this rate hold are left out.
        """
        if not centre_hz:
            return self
        band = OccupiedBand(
            low_hz=self.band.low_hz + centre_hz, high_hz=self.band.high_hz + centre_hz
        )
        half = self.plan.needed_hz / 2 if self.plan else 0.0
        fits = band.centre_hz >= half and band.centre_hz + half <= sample_rate_hz / 2
        return Surroundings(band=band, plan=self.plan if fits else None)

    def channels(self, spectrum: Spectrum) -> tuple[ChannelView, ...]:
        """Return the channels with what leaks into them, by a spectrum.

        Parameters
        ----------
        spectrum : Spectrum
            Of the same signal.
        """
        carrier = ChannelView(
            name="carrier", low_hz=self.band.low_hz, high_hz=self.band.high_hz, leakage_db=None
        )
        if self.plan is None or self.band.width_hz < RESOLVED * spectrum.noise_bandwidth_hz:
            return (carrier,)
        centre = self.band.centre_hz
        try:
            found = aclr(
                spectrum,
                carrier=self.plan.carrier,
                neighbours=self.plan.neighbours,
                centre_hz=centre,
            )
        except WavegenError:  # a spectrum too coarse to read them in
            return (carrier,)
        return (
            carrier,
            *(
                ChannelView(
                    name="adjacent",
                    low_hz=centre + item.channel.offset_hz - item.channel.bandwidth_hz / 2,
                    high_hz=centre + item.channel.offset_hz + item.channel.bandwidth_hz / 2,
                    leakage_db=-item.ratio_db if math.isfinite(item.ratio_db) else None,
                )
                for item in found.ratios
            ),
        )


def mask_corners(mask: SpectralMask, spectrum: Spectrum, *, centre_hz: float) -> Corners:
    """Return the corners of a mask as a density, so that it can be drawn over a spectrum.

    Parameters
    ----------
    mask : SpectralMask
        Limits in its measurement bandwidth, over its reference.
    spectrum : Spectrum
        Of the signal.
    centre_hz : float
        Of the carrier, Hz.

    Returns
    -------
    frequencies, levels : float64 array, shape (n_corners,)
        Hz, and dBc/Hz over the total power. Where a mask for both sides does not begin at the
        centre, NaN parts the sides.

    Notes
    -----
    A limit of L dB in B hertz over a reference P is ``L + 10 log10(P / total) - 10 log10(B)``
    dBc/Hz.
    """
    over_total = 10 * math.log10(reference_power(spectrum, mask) / spectrum.total_power)
    shift = over_total - 10 * math.log10(mask.measurement_bandwidth_hz)
    offset = np.array([point.offset_hz for point in mask.points])
    level = np.array([point.level_db for point in mask.points]) + shift
    if mask.both_sides:
        parted = [np.nan] if offset[0] > 0 else []
        offset = np.concatenate([-offset[::-1], parted, offset])
        level = np.concatenate([level[::-1], parted, level])
    return centre_hz + offset, level
