"""The sin(x)/x droop of a converter that holds each value, and its inverse."""

from __future__ import annotations

import math
from dataclasses import dataclass
from fractions import Fraction
from typing import Annotated

import numpy as np
from annotated_types import Gt
from numpy.typing import NDArray

from wavegen.core.signal import Signal
from wavegen.core.site import Note, Site
from wavegen.core.units import format_hz
from wavegen.dsp.occupied_bands import Band
from wavegen.dsp.overlap_save import Filtered
from wavegen.dsp.pilot import power_beyond, power_gain
from wavegen.dsp.response_design import fit_response
from wavegen.laws.law import Law
from wavegen.laws.operations import filtered_law
from wavegen.laws.term import NoLaw
from wavegen.stages.linear import tell_power

DEFAULT_BAND = Fraction(9, 10)
"""Of the sample rate, where no band is given."""
WIDEST_BAND = Fraction(49, 50)
TOLERANCE = 1e-6
LONGEST = 1 << 11
NEGLIGIBLE = 1e-8
"""A droop below this is lost in float32."""
DOUBTFUL_SHARE = 1e-4
"""Power beyond the band worth a warning: more than the noise of good converters."""


@dataclass(frozen=True, slots=True, kw_only=True)
class HoldDroop:
    """Settings of the droop of a zero-order hold, or of the filter that makes up for it.

    Parameters
    ----------
    inverse : bool
        Whether the droop is made up for beforehand instead of applied.
    converter_rate_hz : Fraction, optional
        Rate at which the converter holds its values, Hz; the sample rate if not given, higher
        where it interpolates.
    band_hz : Fraction, optional
        Full width of the band in which droop or inverse hold, Hz; 0.9 of the sample rate if not
        given. Beyond it the response passes smoothly from one edge to the other.

    Notes
    -----
    A value held for ``T = 1 / rate`` is weighed by ``sin(pi f T) / (pi f T)`` (transform of the
    rectangle; -3.92 dB at half the rate). The delay of half a converter sample is left out, the
    images beyond half the sample rate are not in the samples. The filter follows the response to
    1e-6 inside the band. The mean power is left as the filter leaves it, and told.
    """

    inverse: bool = False
    converter_rate_hz: Annotated[Fraction, Gt(0)] | None = None
    band_hz: Annotated[Fraction, Gt(0)] | None = None

    def build(self, site: Site, source: Signal) -> Signal:
        """Return the signal with the droop, or with its inverse.

        Parameters
        ----------
        site : Site
            Where it is built. Told the droop at the edge of the band and what becomes of the
            mean power; warned of power beyond the band.
        source : Signal
            What is converted.

        Returns
        -------
        Signal
            Its mean power is to be measured. ``source`` itself where the converter is so fast
            that nothing droops.

        Raises
        ------
        RecipeError
            A converter slower than the samples, or a band wider than 0.98 of their rate.
        """
        rate = source.sample_rate_hz
        share = self._share(site, rate)
        band_hz = self.band_hz or DEFAULT_BAND * rate
        if band_hz > WIDEST_BAND * rate:
            raise site.error(
                key="band",
                problem=f"{format_hz(band_hz)} leave no room for an edge",
                allowed=f"up to {format_hz(WIDEST_BAND * rate)}",
                remedy="Narrow the band, or raise the sample rate.",
            )
        if 1 - np.sinc(share / 2) < NEGLIGIBLE:
            return source
        edge = float(band_hz / rate) / 2
        sign = -1.0 if self.inverse else 1.0

        def response(place: NDArray[np.float64]) -> NDArray[np.complex128]:
            return (sign * np.log(np.sinc(share * place))).astype(np.complex128)

        fit = fit_response(response, Band(-edge, edge), tolerance=TOLERANCE, longest=LONGEST)
        droop_db = -20 * math.log10(float(np.sinc(share * edge)))
        what = "makes up for" if self.inverse else "puts on"
        text = (
            f"{what} a droop of {droop_db:.3f} dB at {format_hz(edge * float(rate))}, "
            f"to {100 * fit.error:.1e} % inside the band; without delay"
        )
        site.notes.append(Note(kind="info", where=site.path, text=text))
        beyond = power_beyond(source, edge)
        if beyond > DOUBTFUL_SHARE:
            text = f"{beyond:.2g} of the power lies beyond {format_hz(edge * float(rate))}"
            site.notes.append(Note(kind="warning", where=f"{site.path}.band", text=text))
        tell_power(site, source, power_gain(source, fit.taps))
        return Filtered.of(source, fit.taps)

    def law(self, site: Site, source: Law) -> Law | NoLaw:
        """Return the law behind the filter: only complex Gaussian signals keep theirs."""
        return filtered_law(source, how="with the droop of a hold")

    def _share(self, site: Site, rate: Fraction) -> float:
        """Return the sample rate over that of the converter."""
        converter = self.converter_rate_hz or rate
        if converter < rate:
            raise site.error(
                key="converter_rate",
                problem=f"{format_hz(converter)} is below the sample rate of {format_hz(rate)}",
                allowed="the sample rate or above",
                remedy="Resample before, or leave it out.",
            )
        return float(rate / converter)
