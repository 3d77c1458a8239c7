"""The largest value of each rail, between the samples too: what a converter must reach."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from wavegen.core.evaluate import evaluate
from wavegen.core.signal import Samples, Signal
from wavegen.dsp.cell_sums import CELL
from wavegen.meters.peak import Located, peak_between_samples

_BLOCK = 256 * CELL


@dataclass(frozen=True, slots=True, kw_only=True)
class RailPeaks:
    """Largest magnitude of each rail on 16 points a sample, as a power.

    Parameters
    ----------
    i, q : float
        Largest ``I^2`` and ``Q^2``; neither exceeds the envelope's peak power.
    """

    i: float
    q: float

    @property
    def largest(self) -> float:
        """The larger of the two."""
        return max(self.i, self.q)


@dataclass(frozen=True, eq=False, kw_only=True)
class Rail(Signal):
    """One rail of a signal, as a signal without quadrature.

    Parameters
    ----------
    rail : {"i", "q"}
        Which.
    """

    rail: Literal["i", "q"]

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Return the rail's values."""
        source = arrays[0]
        return (source.real if self.rail == "i" else source.imag).astype(np.complex64)


@dataclass(frozen=True, slots=True, kw_only=True)
class _Found:
    start: int
    n_samples: int
    peak: float
    peak_index: int
    cell_maxima: NDArray[np.float64]


def rail_peaks(signal: Signal, statistics: Located, *, loops: bool = True) -> RailPeaks:
    """Return the largest value of each rail between samples.

    Parameters
    ----------
    signal : Signal
        What was measured, cheap to read again: it is read once over.
    statistics : Located
        Tells where it starts and how long it is.
    loops : bool
        Whether the last sample is followed by the first.

    Returns
    -------
    RailPeaks

    Notes
    -----
    The search is that of :func:`wavegen.meters.peak.peak_between_samples`, on each rail alone.
    """
    first, last = statistics.start, statistics.start + statistics.n_samples
    n_cells = (last - 1) // CELL - first // CELL + 1
    maxima = np.zeros((2, n_cells))
    for block in range(first // _BLOCK * _BLOCK, last, _BLOCK):
        start, stop = max(block, first), min(block + _BLOCK, last)
        samples = evaluate({signal: (start, stop)})[signal]
        edges = np.arange(-(-(start + 1) // CELL) * CELL, stop, CELL) - start
        cuts = np.concatenate(([0], edges)).astype(np.intp)
        low = start // CELL - first // CELL
        for row, values in enumerate((samples.real, samples.imag)):
            found = np.maximum.reduceat(np.abs(values), cuts).astype(np.float64) ** 2
            maxima[row, low : low + found.size] = found
    powers = []
    for row, name in enumerate(("i", "q")):
        peak = float(maxima[row].max())
        if not peak:
            powers.append(0.0)
            continue
        rail = Rail(
            sample_rate_hz=signal.sample_rate_hz,
            n_samples=signal.n_samples,
            inputs=(signal,),
            mean_power=None,
            rail="i" if name == "i" else "q",
        )
        cell = int(maxima[row].argmax())
        located = _Found(
            start=first,
            n_samples=statistics.n_samples,
            peak=peak,
            peak_index=max(first, (first // CELL + cell) * CELL),
            cell_maxima=maxima[row],
        )
        powers.append(peak_between_samples(rail, located, loops=loops).power)
    return RailPeaks(i=powers[0], q=powers[1])
