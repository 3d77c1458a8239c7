"""Samples to symbols through the pulse that made them: matched filter and decimation in one."""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise

import numpy as np
import scipy.fft
from numpy.typing import NDArray

from wavegen.core.signal import Range, Samples
from wavegen.dsp.pulse import Pulse, mean_energy

ROWS_AT_LEAST = 4
BLOCK_SAMPLES = 1 << 16
"""Samples transformed at once: 512 kB, inside the cache."""
SILENT = 1e-8
"""Lines of the filter below this share of its highest are left out."""
LATTICE = 4
"""Points a sample at which the spectrum of a pulse is taken where instants fall between."""
LEAST_HOP = 8
"""Symbols that a row completes, over those it loses at each end."""


@dataclass(frozen=True, eq=False, slots=True)
class _Piece:
    source: slice
    target: slice
    weight: NDArray[np.complex64]


@dataclass(frozen=True, eq=False, kw_only=True)
class MatchedRows:
    """Matched filtering in FFT rows of samples, each giving a row of symbols.

    Parameters
    ----------
    n_samples, n_symbols : int
        Samples and symbols of one cycle, in lowest terms.
    units : int
        Cycles in a row.
    lead : int
        Cycles lost at each end of a row.
    pieces : tuple
        The filter on the row's grid of frequencies, cut where lines fold over each other.

    Notes
    -----
    ``y[k] = c sum_n x[n] h(n b / a - k)``, with ``c`` so that symbols shaped by ``h`` to unit
    mean power come back as they were. The spectrum of a row, times that of the filter, is folded
    to the symbol rate before it is transformed back: no sample is computed that is not wanted.
    """

    n_samples: int
    n_symbols: int
    units: int
    lead: int
    pieces: tuple[_Piece, ...]

    @property
    def hop_cycles(self) -> int:
        """Return the cycles by which rows follow each other."""
        return self.units - 2 * self.lead

    @property
    def step(self) -> int:
        """Return the grid, symbols."""
        return self.hop_cycles * self.n_symbols

    def needs(self, start: int, stop: int) -> Range:
        """Return the samples wanted for symbols ``[start, stop)``; ``start`` on the grid."""
        n_rows = -(-(stop - start) // self.step)
        first = (start // self.n_symbols - self.lead) * self.n_samples
        return first, first + ((n_rows - 1) * self.hop_cycles + self.units) * self.n_samples

    def receive(self, start: int, stop: int, samples: Samples) -> Samples:
        """Return symbols ``[start, stop)`` from the samples of :meth:`needs`."""
        n_in, n_out = self.units * self.n_samples, self.units * self.n_symbols
        windows = np.lib.stride_tricks.sliding_window_view(samples, n_in)
        windows = windows[:: self.hop_cycles * self.n_samples]
        out = np.empty(stop - start, np.complex64)
        most = max(BLOCK_SAMPLES // n_in // ROWS_AT_LEAST, 1) * ROWS_AT_LEAST
        most = min(most, -(-windows.shape[0] // ROWS_AT_LEAST) * ROWS_AT_LEAST)
        work = np.empty((most, n_in), np.complex64)
        for first in range(0, windows.shape[0], most):
            count = min(most, windows.shape[0] - first)
            used = -(-count // ROWS_AT_LEAST) * ROWS_AT_LEAST
            work[:count] = windows[first : first + count]
            work[count:used] = 0
            lines = scipy.fft.fft(work[:used], axis=1, overwrite_x=True)
            folded = np.zeros((used, n_out), np.complex64)
            for piece in self.pieces:
                folded[:, piece.target] += lines[:, piece.source] * piece.weight
            rows = scipy.fft.ifft(folded, axis=1, norm="forward", overwrite_x=True)
            offset = self.lead * self.n_symbols
            for row in range(count):
                low = (first + row) * self.step
                part = out[low : low + self.step]
                part[...] = rows[row, offset : offset + part.size]
        return out


def is_receivable(pulse: Pulse, *, n_symbols: int) -> bool:
    """Return whether :func:`plan_matched` has a filter: instants on samples, or a smooth pulse."""
    return n_symbols == 1 or (pulse.is_smooth and pulse.half_band is not None)


def plan_matched(
    pulse: Pulse, *, n_samples: int, n_symbols: int, period_symbols: int
) -> MatchedRows:
    """Design the filter matched to a pulse.

    Parameters
    ----------
    pulse : Pulse
        The shape, real, on any scale.
    n_samples, n_symbols : int
        ``n_samples`` samples hold ``n_symbols`` symbols, in lowest terms.
    period_symbols : int
        Symbols in the loop; it enters the scale alone.

    Returns
    -------
    MatchedRows
    """
    a, b = n_samples, n_symbols
    lead = -(-pulse.span_symbols // b)
    units = scipy.fft.next_fast_len(max((LEAST_HOP + 2) * lead, -(-1024 // a)))
    n_in, n_out = units * a, units * b
    points = 1 if b == 1 else LATTICE
    numbers = np.arange(-lead * a * points, lead * a * points + 1)
    values = pulse.values(numbers * np.float64(b / (a * points)))
    circle = np.zeros(n_in * points)
    circle[numbers] = values
    energy = mean_energy(pulse, per_symbol=a, period_symbols=period_symbols)
    free = mean_energy(pulse, per_symbol=a, period_symbols=4 * pulse.span_symbols + 1)
    gain = energy**0.5 / free * b / a
    spectrum = np.conj(scipy.fft.fft(circle)) * (gain / points / n_in)
    lines = np.arange(-(n_in // 2), n_in - n_in // 2)
    spectrum = spectrum[lines]
    heard = np.flatnonzero(np.abs(spectrum) > SILENT * np.abs(spectrum).max())
    low, high = int(lines[heard[0]]), int(lines[heard[-1]]) + 1
    borders = {low, high}
    for period in (n_in, n_out):
        borders |= set(range(low + -low % period, high, period))
    places = sorted(borders)
    pieces = tuple(
        _Piece(
            slice(first % n_in, first % n_in + last - first),
            slice(first % n_out, first % n_out + last - first),
            spectrum[first - lines[0] : last - lines[0]].astype(np.complex64),
        )
        for first, last in pairwise(places)
    )
    return MatchedRows(n_samples=a, n_symbols=b, units=units, lead=lead, pieces=pieces)
