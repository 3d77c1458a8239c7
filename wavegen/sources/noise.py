"""Band-limited complex Gaussian noise."""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction
from typing import Annotated

import numpy as np
from annotated_types import Ge, Gt, Le

from wavegen.core.rng import stream_key
from wavegen.core.signal import Signal
from wavegen.core.site import Cycle, Note, Site
from wavegen.core.units import format_hz
from wavegen.dsp.overlap_save import Filtered, folded_energy
from wavegen.dsp.white_noise import WhiteNoise
from wavegen.dsp.windows import STOPBAND_DB, design_lowpass, kaiser_transition
from wavegen.laws.gaussian import GaussianLaw
from wavegen.laws.law import Law
from wavegen.laws.term import GaussianTerm, Term

LONGEST_HALF_LENGTH = 125_000
"""Longest filter taken on, taps each side of its middle: transforms of 2^19 then."""
DEFAULT_EDGE = 0.05


@dataclass(frozen=True, slots=True, kw_only=True)
class Noise:
    """Settings of band-limited complex Gaussian noise, centred on zero frequency.

    Parameters
    ----------
    bandwidth_hz : Fraction
        Full width between the half-amplitude (-6 dB) points, Hz. The whole sample rate means
        white noise, without a filter.
    edge_fraction : float, optional
        Width of each edge, from flat to 100 dB down, over the bandwidth; half of it lies
        outside. If not given 0.05, or as much as the longest filter needs (with a note).
    """

    bandwidth_hz: Annotated[Fraction, Gt(0)]
    edge_fraction: Annotated[float, Ge(0.001), Le(1.0)] | None = None

    def cycle(self, sample_rate_hz: Fraction, path: str) -> Cycle:
        """Return one sample: noise fits any loop."""
        return Cycle(n_samples=1)

    def build(self, site: Site) -> Signal:
        """Return the signal; unit mean power over seeds.

        Raises
        ------
        RecipeError
            The noise with its edges is wider than the sample rate, or so narrow and steep that
            the filter would be too long.
        """
        white = WhiteNoise(
            sample_rate_hz=site.sample_rate_hz,
            n_samples=site.n_samples,
            key=stream_key(site.seed, site.label),
        )
        if self.bandwidth_hz == site.sample_rate_hz:
            return white
        width = float(self.bandwidth_hz / site.sample_rate_hz)
        transition = width * self._edge(site)
        taps = design_lowpass(
            passband_edge=(width - transition) / 2,
            stopband_edge=(width + transition) / 2,
            stopband_db=STOPBAND_DB,
        )
        taps /= np.sqrt(folded_energy(taps, site.n_samples))
        return Filtered.of(white, taps, mean_power=1.0)

    def law(self, site: Site) -> Law:
        """Return the law of complex Gaussian noise, over seeds."""
        return GaussianLaw()

    def term(self, site: Site) -> Term:
        """Return what the noise is to a composite."""
        return GaussianTerm(data=frozenset({site.label}))

    def _edge(self, site: Site) -> float:
        """Return the edge to use, or complain about what cannot be filtered."""
        rate = site.sample_rate_hz
        width = float(self.bandwidth_hz / rate)
        narrowest = kaiser_transition(half_length=LONGEST_HALF_LENGTH, stopband_db=STOPBAND_DB)
        edge = self.edge_fraction
        if edge is None:
            edge = max(DEFAULT_EDGE, min(narrowest / width, 1.0))
        occupied = float(self.bandwidth_hz) * (1 + edge)
        if occupied > rate:
            raise site.error(
                key="bandwidth",
                problem=f"{format_hz(self.bandwidth_hz)} with an edge of {edge:g} "
                f"occupies {format_hz(occupied)}",
                allowed=f"up to the sample rate, {format_hz(rate)}, edges included, "
                "or a bandwidth of exactly that",
                remedy="Lower the bandwidth or the edge.",
            )
        if width * edge < narrowest * (1 - 1e-9):
            is_given = self.edge_fraction is not None
            raise site.error(
                key="edge" if is_given else "bandwidth",
                problem=f"edges of {format_hz(float(self.bandwidth_hz) * edge)} at "
                f"{format_hz(rate)} need a filter of more than {LONGEST_HALF_LENGTH} taps "
                "each side",
                allowed=f"edges from {format_hz(narrowest * float(rate))} on",
                remedy="Widen the edge or lower the sample rate."
                if is_given
                else "Widen the bandwidth or lower the sample rate.",
            )
        if self.edge_fraction is None and edge > DEFAULT_EDGE:
            site.notes.append(
                Note(
                    kind="info",
                    where=f"{site.path}.edge",
                    text=f"The edge is {edge:.3g} of the bandwidth instead of {DEFAULT_EDGE:g}: "
                    "the band is narrow against the sample rate.",
                )
            )
        return edge
