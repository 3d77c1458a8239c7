"""A zero-phase filter that several signals of a graph share."""

from __future__ import annotations

from collections.abc import Iterator
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

CHUNK_SAMPLES = 1 << 17
"""Samples transformed in one chunk: what goes on between transforms stays near the core."""


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
        """The real response, each bin twice: once for each rail; shape (2 n_fft,)."""
        return np.repeat(filter_response(self.taps, self.n_fft).real, 2)

    def chunks(self, n_out: int) -> Iterator[tuple[int, int]]:
        """Yield ranges of whole rows whose intermediate results stay in cache.

        Parameters
        ----------
        n_out : int
            Samples wanted, from the grid on.
        """
        length = max(CHUNK_SAMPLES // self.n_fft, ROWS_AT_LEAST) * self.hop
        for low in range(0, n_out, length):
            yield low, min(low + length, n_out)

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
        n_fft, half, hop = self.n_fft, self.half_length, self.hop
        n_rows = -(-n_out // hop)
        block = max(BLOCK_SAMPLES // n_fft, ROWS_AT_LEAST)
        block = min(block, -(-n_rows // ROWS_AT_LEAST) * ROWS_AT_LEAST)
        n_whole = max((samples.size - n_fft) // hop + 1, 0)
        work = np.empty((block, n_fft), np.complex64)
        out = np.empty(n_out, np.complex64)
        for first in range(0, n_rows, block):
            count = min(block, n_rows - first)
            whole = min(max(n_whole - first, 0), count)
            if whole:
                stretch = samples[first * hop :]
                work[:whole] = np.lib.stride_tricks.sliding_window_view(stretch, n_fft)[
                    : (whole - 1) * hop + 1 : hop
                ]
            for row in range(whole, count):
                rest = samples[(first + row) * hop :]
                work[row, : rest.size] = rest
                work[row, rest.size :] = 0
            used = -(-count // ROWS_AT_LEAST) * ROWS_AT_LEAST
            work[count:used] = 0
            lines = np.asarray(scipy.fft.fft(work[:used], axis=1, overwrite_x=True))
            flat = lines.view(np.float32)
            np.multiply(flat, self._response, out=flat)
            rows = np.asarray(scipy.fft.ifft(lines, axis=1, overwrite_x=True))
            begin = first * hop
            full = min((n_out - begin) // hop, count)
            end = begin + full * hop
            _put(out[begin:end], rows[:full, half : half + hop], base, begin)
            if full < count:
                _put(out[end:], rows[full : full + 1, half : half + n_out - end], base, end)
        return out


def _put(out: Samples, rows: NDArray[np.complex64], base: Samples | None, first: int) -> None:
    """Write rows in a row, or what is left of the base without them."""
    into = out.reshape(rows.shape)
    if base is None:
        into[...] = rows
    else:
        np.subtract(base[first : first + out.size].reshape(rows.shape), rows, out=into)
