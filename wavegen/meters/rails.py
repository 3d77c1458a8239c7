"""The largest value of each rail, between the samples too: what a converter must reach."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from wavegen.core.evaluate import evaluate
from wavegen.core.signal import Samples, Signal
from wavegen.dsp.cell_sums import CELL
from wavegen.dsp.highest import highest
from wavegen.meters.peak import Located, peak_between_samples

_BLOCK = 256 * CELL
_CRESTS = 16
"""Cells of highest envelope in which a first peak of each rail is looked for."""


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
        What was measured, cheap to read again.
    statistics : Located
        Tells where it starts and how long it is.
    loops : bool
        Whether the last sample is followed by the first.

    Returns
    -------
    RailPeaks

    Notes
    -----
    The search is that of :func:`wavegen.meters.peak.peak_between_samples`, on each rail alone. A
    rail never exceeds the envelope: cells whose envelope lies too low for the rail's peak are
    left out, so that little of the signal is read again.
    """
    lowest = _rails_at_crests(signal, statistics)
    powers = []
    for name, found in zip(("i", "q"), lowest, strict=True):
        power, place = found
        if not power:
            powers.append(_whole(signal, statistics, name))
            continue
        located = _Found(
            start=statistics.start,
            n_samples=statistics.n_samples,
            peak=power,
            peak_index=place,
            cell_maxima=statistics.cell_maxima,
        )
        powers.append(peak_between_samples(_rail(signal, name), located, loops=loops).power)
    return RailPeaks(i=powers[0], q=powers[1])


def _rail(signal: Signal, name: str) -> Rail:
    return Rail(
        sample_rate_hz=signal.sample_rate_hz,
        n_samples=signal.n_samples,
        inputs=(signal,),
        mean_power=None,
        rail="i" if name == "i" else "q",
    )


def _rails_at_crests(signal: Signal, statistics: Located) -> list[tuple[float, int]]:
    """Return the largest square of each rail, and its index, in the cells of highest envelope."""
    first, last = statistics.start, statistics.start + statistics.n_samples
    highest_cells = highest(statistics.cell_maxima, _CRESTS)
    best = [(0.0, first), (0.0, first)]
    for cell in sorted(int(number) for number in highest_cells):
        start = max((first // CELL + cell) * CELL, first)
        samples = evaluate({signal: (start, min((start // CELL + 1) * CELL, last))})[signal]
        for row, values in enumerate((samples.real, samples.imag)):
            index = int(np.argmax(np.abs(values)))
            best[row] = max(
                best[row], (float(values[index]) ** 2, start + index), key=lambda one: one[0]
            )
    return best


def _whole(signal: Signal, statistics: Located, name: str) -> float:
    """Return the largest square of a rail that is zero where the envelope is highest."""
    first, last = statistics.start, statistics.start + statistics.n_samples
    largest = 0.0
    for start in range(first, last, _BLOCK):
        samples = evaluate({signal: (start, min(start + _BLOCK, last))})[signal]
        values = samples.real if name == "i" else samples.imag
        largest = max(largest, float(np.max(np.abs(values))) ** 2)
    return largest
