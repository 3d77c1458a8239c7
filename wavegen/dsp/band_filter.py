"""A zero-phase filter that several signals of a graph share."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import cached_property

import numpy as np
import scipy.fft
from numpy.typing import NDArray

from wavegen.core.signal import Samples
from wavegen.dsp.overlap_save import (
    BLOCK_SAMPLES,
    ROWS_AT_LEAST,
    fft_length,
    filter_response,
)
from wavegen.dsp.row_kernels import put_samples, scale_lines, take_difference, take_samples

Put = Callable[[NDArray[np.complex64], int], None]
"""Fills rows with the samples that begin ``half_length`` before an output."""
Take = Callable[[NDArray[np.complex64], int, int], None]
"""Takes filtered rows, for the outputs from one to another."""


@dataclass(frozen=True, eq=False)
class BandFilter:
    """Taps, and what is made of them once.

    Parameters
    ----------
    taps : float64 or complex128 array, shape (2 h + 1,)
        The middle tap belongs to lag zero; conjugate-symmetric about it, so that the response
        is real.
    """

    taps: NDArray[np.float64] | NDArray[np.complex128]

    def __getstate__(self) -> dict[str, object]:
        """Pickle the taps only."""
        return {"taps": self.taps}

    @property
    def half_length(self) -> int:
        """Taps on each side of lag zero: the halo."""
        return self.taps.size // 2

    @cached_property
    def n_fft(self) -> int:
        """Transform length."""
        return fft_length(self.half_length)

    @property
    def hop(self) -> int:
        """Output samples of a row: the grid of what uses it."""
        return self.n_fft - 2 * self.half_length

    @cached_property
    def _response(self) -> NDArray[np.float32]:
        """The real response, shape (1, n_fft)."""
        response = filter_response(self.taps, self.n_fft).real
        return np.ascontiguousarray(response)[None]

    def run(self, n_out: int, put: Put, take: Take, *, n_parts: int = 1) -> None:
        """Filter rows that stay in cache, some at a time, and what goes on before and after.

        Parameters
        ----------
        n_out : int
            Samples wanted, from the grid on.
        put : callable
            ``put(rows, low)`` fills rows, shape (n_rows, n_fft), ``hop`` samples apart; the first
            begins ``half_length`` samples before output ``low``. They are overwritten after.
        take : callable
            ``take(rows, low, high)`` is given what has become of them: outputs ``low`` to ``high``
            stand from ``half_length`` on in each row, ``hop`` of them, fewer in the last.
        n_parts : int
            2 where each row holds two stretches of a real signal, the second as imaginary parts;
            the taps are real. The grid is then that of ``2 hop``.
        """
        per_row = n_parts * self.hop
        n_rows = -(-n_out // per_row)
        block = max(BLOCK_SAMPLES // self.n_fft, ROWS_AT_LEAST)
        block = min(block, -(-n_rows // ROWS_AT_LEAST) * ROWS_AT_LEAST)
        work = np.empty((block, self.n_fft), np.complex64)
        for first in range(0, n_rows, block):
            left = -(-(n_rows - first) // ROWS_AT_LEAST) * ROWS_AT_LEAST
            rows = work[: min(block, left)]
            low = first * per_row
            put(rows, low)
            rows = np.asarray(scipy.fft.fft(rows, axis=1, overwrite_x=True))
            scale_lines(rows, self._response)
            rows = np.asarray(scipy.fft.ifft(rows, axis=1, overwrite_x=True))
            take(rows, low, min(low + block * per_row, n_out))

    def apply(self, samples: Samples, n_out: int, *, base: Samples | None = None) -> Samples:
        """Filter a stretch that begins on the grid, and subtract it from another if given.

        Parameters
        ----------
        samples : complex64 array, shape (n_out + 2 half_length,)
            From ``half_length`` before the first output to as much after the last; not changed.
        n_out : int
            Samples wanted; the last row is padded with zeros and cut.
        base : complex64 array, shape (n_out,), optional
            The filtered samples are subtracted from these; not changed.

        Returns
        -------
        complex64 array, shape (n_out,)
            Owned by the caller.
        """
        half, hop = self.half_length, self.hop
        out = np.empty(n_out, np.complex64)

        def put(rows: Samples, low: int) -> None:
            put_samples(rows, samples[low:], hop=hop)

        def take(rows: Samples, low: int, high: int) -> None:
            if base is None:
                take_samples(out[low:high], rows, half=half, hop=hop)
            else:
                take_difference(out[low:high], base[low:high], rows, half=half, hop=hop)

        self.run(n_out, put, take)
        return out
