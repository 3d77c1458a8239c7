"""The band in which crest-factor reduction may change a signal, and the filter that keeps it."""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction

import numpy as np
from numpy.typing import NDArray

from wavegen.core.signal import Signal
from wavegen.core.site import Note, Site
from wavegen.core.units import QuantityError, format_hz
from wavegen.dsp.band_filter import BandFilter
from wavegen.dsp.occupied_bands import (
    WHOLE,
    Band,
    band_span,
    design_bands,
    merge_bands,
    narrowest_gap,
    occupied_bands,
    stretch_spectrum,
)
from wavegen.dsp.overlap_save import Filtered
from wavegen.dsp.windows import STOPBAND_DB, kaiser_transition
from wavegen.stages.combine.sum import Summed

LONGEST_HALF_LENGTH = 1 << 14
"""Longest filter, taps each side of its middle: every round reads so much more of its input."""
WIDEST_TRANSITION = 1 / 20
NARROWEST_TRANSITION = 1 / 100
"""Width of an edge over the width of all bands, where it is not given: half the narrowest gap
between bands, but no more than the first and no less than the second."""
LEAST_OVERSAMPLING = 3.9
"""Below it more than 0.4 dB of peak can grow between the samples that are worked on: 4, less what
the edges found may be off."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Passband:
    """A band that the signal fills.

    Parameters
    ----------
    low_hz, high_hz : Fraction
        Its edges, Hz from the centre.
    """

    low_hz: Fraction
    high_hz: Fraction

    def __post_init__(self) -> None:
        """Refuse a band of no width."""
        if self.low_hz >= self.high_hz:
            raise QuantityError(
                problem=f"{format_hz(self.high_hz)} is not above {format_hz(self.low_hz)}",
                allowed="high above low",
                remedy="Exchange them.",
                key="high",
            )


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class FilledBand:
    """Where a signal has its power, and the filter that passes only that.

    Parameters
    ----------
    bands : tuple of Band
        Cycles per sample; one or more.
    transition : float
        Width of each edge, outside the bands, cycles per sample.
    band_filter : BandFilter
        Passes the bands.
    spectrum : float64 array, shape (n_bins,)
        Mean power spectrum of the signal.
    """

    bands: tuple[Band, ...]
    transition: float
    band_filter: BandFilter
    spectrum: NDArray[np.float64]

    @property
    def width(self) -> float:
        """Width of all bands together, cycles per sample."""
        return sum(band.width for band in self.bands)

    @property
    def oversampling(self) -> float:
        """Sample rate over the band from the lowest edge to the highest, gaps included."""
        return 1 / band_span(self.bands)


def filled_band(
    site: Site,
    source: Signal,
    *,
    passbands: tuple[Passband, ...] = (),
    transition_hz: Fraction | None = None,
) -> FilledBand | None:
    """Find the bands of a signal, or take those that are stated, and design their filter.

    Parameters
    ----------
    site : Site
        Told what was found, and warned of a sample rate below 4 times the band.
    source : Signal
        Some of it is computed: 64 stretches of 4096 samples, of each part if it is a sum.
    passbands : tuple of Passband
        Bands; where none is given, the bins that stand less than 20 dB under the density of
        the signal, of each part of a sum by itself.
    transition_hz : Fraction, optional
        Width of each edge, Hz.

    Returns
    -------
    FilledBand or None
        None for a signal without power.

    Raises
    ------
    RecipeError
        A passband beyond half the sample rate, or edges too steep to be filtered.
    """
    rate = source.sample_rate_hz
    spectrum = stretch_spectrum(source)
    if not spectrum.any():
        return None
    stated = _stated(site, passbands, rate) if passbands else ()
    found = stated or _found(source, spectrum)
    width = sum(band.width for band in merge_bands(found, gap=0.0))
    if transition_hz is None:
        gap = narrowest_gap(merge_bands(found, gap=2 * width * NARROWEST_TRANSITION))
        transition = min(max(gap / 2, width * NARROWEST_TRANSITION), width * WIDEST_TRANSITION)
    else:
        transition = float(transition_hz / rate)
    least = kaiser_transition(half_length=LONGEST_HALF_LENGTH, stopband_db=STOPBAND_DB + 1)
    if transition < least:
        if transition_hz is not None:
            raise site.error(
                key="transition",
                problem=f"edges of {format_hz(transition_hz)} at {format_hz(rate)} need more than "
                f"{LONGEST_HALF_LENGTH} taps each side",
                allowed=f"edges from {format_hz(least * float(rate))} on",
                remedy="Widen the transition.",
            )
        transition = least
    bands = merge_bands(found, gap=2 * transition * (1 - 1e-9))
    made = FilledBand(
        bands=bands,
        transition=transition,
        band_filter=BandFilter(design_bands(bands, transition=transition)),
        spectrum=spectrum,
    )
    _tell(site, made, rate, is_stated=bool(stated))
    return made


def _stated(site: Site, passbands: tuple[Passband, ...], rate: Fraction) -> list[Band]:
    for number, band in enumerate(passbands):
        for key, edge in (("low", band.low_hz), ("high", band.high_hz)):
            if abs(edge) > rate / 2:
                raise site.error(
                    key=f"passbands[{number}].{key}",
                    problem=f"{format_hz(edge)} lies outside the sampled band",
                    allowed=f"from {format_hz(-rate / 2)} to {format_hz(rate / 2)}",
                    remedy="Narrow the band, or raise the sample rate.",
                )
    return [Band(float(band.low_hz / rate), float(band.high_hz / rate)) for band in passbands]


def _found(source: Signal, spectrum: NDArray[np.float64]) -> list[Band]:
    """Return the bands of each part of the last sum, else of the signal itself."""
    inner = source
    while len(inner.inputs) == 1 and not isinstance(inner, Summed | Filtered):
        if inner.inputs[0].sample_rate_hz != source.sample_rate_hz:
            break
        inner = inner.inputs[0]
    if not isinstance(inner, Summed) or len(inner.inputs) == 1:
        return list(occupied_bands(spectrum))
    bands: list[Band] = []
    for part, placement in zip(inner.inputs, inner.placements, strict=True):
        shift = placement.n_cycles / inner.n_samples
        own = _found(part, stretch_spectrum(part))
        bands += [Band(band.low + shift, band.high + shift) for band in own]
    return bands


def _tell(site: Site, made: FilledBand, rate: Fraction, *, is_stated: bool) -> None:
    if made.bands == WHOLE:
        text = "the signal fills the whole sampled band: nothing is left to keep clear"
    else:
        edges = " and ".join(
            f"{format_hz(round(band.low * float(rate)))} to "
            f"{format_hz(round(band.high * float(rate)))}"
            for band in made.bands
        )
        text = (
            f"works in the band {'stated' if is_stated else 'found'}, {edges}, "
            f"with edges of {format_hz(round(made.transition * float(rate)))}, "
            f"at {made.oversampling:.2f} times its width"
        )
    site.notes.append(Note(kind="info", where=site.path, text=text))
    if made.oversampling < LEAST_OVERSAMPLING:
        text = (
            f"the sample rate is only {made.oversampling:.2f} times the band; below 4 times much "
            "of the peak stands between the samples, where it is not reduced"
        )
        site.notes.append(Note(kind="warning", where=site.path, text=text))
