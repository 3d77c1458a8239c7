"""Occupied bandwidth: the band that leaves a share of the power out, half on each side."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from wavegen.core.table import Table
from wavegen.core.units import format_hz
from wavegen.meters.spectrum import Spectrum

SHARE = 0.99
"""ITU-R SM.328; 3GPP TS 38.104 cl. 6.6.2: 0.5 % of the mean power beyond each edge."""


@dataclass(frozen=True, slots=True, kw_only=True)
class OccupiedBandwidth:
    """The band that holds a share of the power.

    Parameters
    ----------
    low_hz, high_hz : float
        Its edges, Hz from the centre.
    share : float
        Share of the mean power between them.
    """

    low_hz: float
    high_hz: float
    share: float

    @property
    def width_hz(self) -> float:
        """Distance of the edges, Hz."""
        return self.high_hz - self.low_hz

    def rows(self) -> tuple[tuple[str, str], ...]:
        """Return name and value, for tables."""
        name = f"occupied bandwidth ({100 * self.share:g} %)"
        return ((name, format_hz(round(self.width_hz, 1))),)

    def table(self) -> Table:
        """Return width and edges, for people."""
        edges = (
            ("lower edge", format_hz(round(self.low_hz, 1))),
            ("upper edge", format_hz(round(self.high_hz, 1))),
        )
        return Table(
            title="Occupied bandwidth",
            headings=("", "value"),
            rows=(*self.rows(), *edges),
            right=frozenset({1}),
        )


def occupied_bandwidth(
    spectrum: Spectrum,
    *,
    share: float = SHARE,
    low_hz: float | None = None,
    high_hz: float | None = None,
) -> OccupiedBandwidth:
    """Return the band that holds a share of the power, the rest in halves beyond its edges.

    Parameters
    ----------
    spectrum : Spectrum
        Of the signal; edges are interpolated inside its bins.
    share : float
        Above 0, below 1.
    low_hz, high_hz : float, optional
        What is looked at: one carrier of several. All of the sampled band if not given.

    Returns
    -------
    OccupiedBandwidth

    Raises
    ------
    SignalError
        The part to look at is not inside the sampled band.

    Notes
    -----
    Definition: ITU-R SM.328 and 3GPP TS 38.104 cl. 6.6.2.1.
    """
    half = spectrum.sample_rate_hz / 2
    low, high = -half if low_hz is None else low_hz, half if high_hz is None else high_hz
    spectrum.check_band(low, high, where="occupied bandwidth")
    edges = np.arange(spectrum.density.size + 1) - spectrum.density.size // 2 - 0.5
    grid = np.clip(edges * spectrum.bin_hz, low, high)
    grid = np.unique(np.append(grid, high))
    below = spectrum.power_below(grid)
    below = (below - below[0]) / (below[-1] - below[0])
    rest = (1 - share) / 2
    found = np.interp([rest, 1 - rest], below, grid)
    return OccupiedBandwidth(low_hz=float(found[0]), high_hz=float(found[1]), share=share)
