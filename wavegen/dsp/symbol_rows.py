"""Useful OFDM symbols as rows, looked at between their samples."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from functools import cache

import numpy as np
import scipy.fft
from numpy.typing import NDArray

from wavegen.core.signal import Samples
from wavegen.dsp.envelope_excess import row_peaks
from wavegen.dsp.mapping_kernel import write_values
from wavegen.dsp.overlap_save import BLOCK_SAMPLES, ROWS_AT_LEAST

SLACK = 0.975
"""By how much a grid may be coarser than asked: 1201 subcarriers on 4 x 1200 points are enough."""


def half_turn(n_fft: int) -> NDArray[np.complex128]:
    """Return ``exp(j pi n / n_fft)``: a shift by half a subcarrier over a useful symbol."""
    return np.asarray(np.exp(1j * np.pi / n_fft * np.arange(n_fft)), np.complex128)


@cache
def _turn(n_fft: int) -> Samples:
    return half_turn(n_fft).astype(np.complex64)


@dataclass(frozen=True, slots=True, kw_only=True)
class SymbolRows:
    """Rows of one useful symbol each, and a finer grid of points on which their peaks are seen.

    Parameters
    ----------
    n_fft : int
        Samples of a symbol.
    n_points : int
        Points of the finer grid: a multiple of ``n_fft``.
    is_shifted : bool
        Whether every subcarrier stands half a spacing higher; the finer grid is without that
        shift, which changes no envelope.
    """

    n_fft: int
    n_points: int
    is_shifted: bool = False

    @classmethod
    def over_band(
        cls, *, n_fft: int, indices: NDArray[np.intp], per_band: float, is_shifted: bool
    ) -> SymbolRows:
        """Return the coarsest grid with so many points over the band in use.

        Parameters
        ----------
        n_fft : int
            Samples of a symbol.
        indices : intp array, shape (n_active,)
            Subcarriers in use, ascending.
        per_band : float
            Points over the span from the lowest to the highest, at least (less 2.5 %).
        is_shifted : bool
            As the field.
        """
        span = int(indices[-1]) - int(indices[0]) + 1
        times = 1
        while times * n_fft < SLACK * per_band * span:
            times += 1
        return cls(n_fft=n_fft, n_points=times * n_fft, is_shifted=is_shifted)

    def per_band(self, indices: NDArray[np.intp]) -> float:
        """Return the points over the span of the subcarriers in use."""
        return self.n_points / (int(indices[-1]) - int(indices[0]) + 1)

    def blocks(self, n_rows: int) -> Iterator[tuple[int, int]]:
        """Yield ranges of rows whose finer grids stay in cache."""
        length = max(BLOCK_SAMPLES // self.n_points, ROWS_AT_LEAST)
        for low in range(0, n_rows, length):
            yield low, min(low + length, n_rows)

    def bins(self, indices: NDArray[np.intp]) -> NDArray[np.uint32]:
        """Return the bins of subcarriers on the finer grid."""
        return (indices % self.n_points).astype(np.uint32)

    def lines(self, rows: Samples) -> Samples:
        """Return the bins of symbols, on the scale of the subcarriers.

        Parameters
        ----------
        rows : complex64 array, shape (n_rows, n_fft)
            Not changed.

        Returns
        -------
        complex64 array, shape (n_rows, n_fft)
            Owned by the caller.
        """
        if self.is_shifted:
            rows = rows * np.conj(_turn(self.n_fft))
        return np.asarray(scipy.fft.fft(rows, axis=1, norm="forward"), np.complex64)

    def widened(self, lines: Samples) -> Samples:
        """Return the finer grid of the bins of symbols.

        Parameters
        ----------
        lines : complex64 array, shape (n_rows, n_fft)
            Not changed.

        Returns
        -------
        complex64 array, shape (n_rows, n_points)
            Owned by the caller.
        """
        half = (self.n_fft + 1) // 2  # with n_fft even, bin n_fft / 2 is the lowest negative
        wide = np.zeros((lines.shape[0], self.n_points), np.complex64)
        wide[:, :half] = lines[:, :half]
        wide[:, half - self.n_fft :] = lines[:, half:]
        return self.inverse(wide)

    def finer(self, rows: Samples) -> Samples:
        """Return the finer grid of symbols.

        Parameters
        ----------
        rows : complex64 array, shape (n_rows, n_fft)
            Not changed.

        Returns
        -------
        complex64 array, shape (n_rows, n_points)
            Owned by the caller.
        """
        if self.n_points > self.n_fft:
            return self.widened(self.lines(rows))
        return rows * np.conj(_turn(self.n_fft)) if self.is_shifted else rows.copy()

    def samples(self, values: Samples, indices: NDArray[np.intp]) -> Samples:
        """Return symbols that hold values on some subcarriers and nothing else.

        Parameters
        ----------
        values : complex64 array, shape (n_rows, n)
            On the scale of :meth:`lines`.
        indices : intp array, shape (n,)
            Subcarriers.

        Returns
        -------
        complex64 array, shape (n_rows, n_fft)
            Owned by the caller.
        """
        lines = np.zeros((values.shape[0], self.n_fft), np.complex64)
        write_values(lines, values, bins=(indices % self.n_fft).astype(np.uint32))
        return self.from_lines(lines)

    def from_lines(self, lines: Samples) -> Samples:
        """Return the symbols of bins, which are overwritten; the reverse of :meth:`lines`."""
        rows = self.inverse(lines)
        if self.is_shifted:
            rows *= _turn(self.n_fft)
        return rows

    def inverse(self, lines: Samples) -> Samples:
        """Return the inverse transform of rows of lines, which are overwritten; unscaled."""
        made = scipy.fft.ifft(lines, axis=1, norm="forward", overwrite_x=True)
        return np.asarray(made, np.complex64)

    def peaks(self, points: Samples) -> NDArray[np.float32]:
        """Return the highest power of each row, shape (n_rows,)."""
        return row_peaks(points)
