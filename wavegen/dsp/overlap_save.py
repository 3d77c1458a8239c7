"""Finite filters on cyclic signals by overlap-save: FFT rows on the absolute grid.

A row of ``n_fft`` input samples gives ``hop = n_fft - 2 h`` output samples, where the filter has
``h`` taps on each side of lag zero. Rows start at multiples of ``hop``, so that a sample's bits
do not depend on the range in which it is asked for.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import Self

import numpy as np
import scipy.fft
from numpy.typing import NDArray

from wavegen.core.signal import Range, Samples, Signal

ROWS_AT_LEAST = 4
"""Rows are transformed four at a time or more (single rows ran 3.5 times slower); a short last
group is filled up, so that every row takes the same path through the transform."""
BLOCK_SAMPLES = 1 << 16
"""Samples transformed at once: 512 kB, which stays in a core's second-level cache."""
SHORTEST_FFT = 1 << 10
LONGEST_EASY_FFT = 1 << 17


def fft_length(half_length: int) -> int:
    """Return a transform length for a filter.

    Parameters
    ----------
    half_length : int
        Taps on each side of lag zero.

    Returns
    -------
    int
        A power of two: at least 8 times ``half_length`` (three quarters of each row are
        output), from 2^17 on at least 4 times (half), because longer rows leave the cache.

    Examples
    --------
    >>> fft_length(321), fft_length(100000)
    (4096, 524288)
    """
    wanted = max(8 * half_length, SHORTEST_FFT)
    if wanted > LONGEST_EASY_FFT:
        wanted = max(4 * half_length, LONGEST_EASY_FFT)
    return 1 << (wanted - 1).bit_length()


def filter_response(
    taps: NDArray[np.float64] | NDArray[np.complex128], n_fft: int
) -> NDArray[np.complex64]:
    """Return the frequency response of taps about lag zero.

    Parameters
    ----------
    taps : float64 or complex128 array, shape (2 h + 1,)
        The middle tap belongs to lag zero.
    n_fft : int
        Transform length, at least ``2 h + 1``.

    Returns
    -------
    complex64 array, shape (n_fft,)
        In the order of the FFT; computed in double precision.
    """
    half = taps.size // 2
    placed = np.zeros(n_fft, np.complex128)
    placed[: half + 1] = taps[half:]
    placed[n_fft - half :] = taps[:half]
    return np.asarray(scipy.fft.fft(placed)).astype(np.complex64)


def folded_energy(taps: NDArray[np.float64] | NDArray[np.complex128], period: int) -> float:
    """Return the energy of taps wrapped onto a loop: white noise of that period gains this.

    Parameters
    ----------
    taps : float64 or complex128 array, shape (n_taps,)
        Any filter.
    period : int
        Samples in the loop; taps further apart than it act together.

    Returns
    -------
    float
        Sum of squared magnitudes after adding taps that are a period apart.
    """
    padded = np.zeros(-(-taps.size // period) * period, taps.dtype)
    padded[: taps.size] = taps
    folded = padded.reshape(-1, period).sum(axis=0)
    return float(np.sum(np.abs(folded) ** 2))


def filter_rows(
    samples: Samples, *, response: NDArray[np.complex64], half_length: int, n_out: int
) -> Samples:
    """Filter a stretch of samples that starts on the grid, less ``half_length``.

    Parameters
    ----------
    samples : complex64 array, shape (n_out + 2 half_length,)
        Input from ``start - half_length`` to ``stop + half_length``; not changed.
    response : complex64 array, shape (n_fft,)
        From :func:`filter_response`: at most ``half_length`` taps on each side of lag zero.
    half_length : int
        Halo on each side.
    n_out : int
        Samples wanted; the last row is padded with zeros and cut.

    Returns
    -------
    complex64 array, shape (n_out,)
        Owned by the caller.
    """
    n_fft = response.size
    hop = n_fft - 2 * half_length
    n_rows = -(-n_out // hop)
    n_whole = max((samples.size - n_fft) // hop + 1, 0)
    block = max(BLOCK_SAMPLES // n_fft, 1)
    block = min(-(-block // ROWS_AT_LEAST), -(-n_rows // ROWS_AT_LEAST)) * ROWS_AT_LEAST
    work = np.empty((block, n_fft), np.complex64)
    out = np.empty(n_out, np.complex64)
    windows = samples[:0].reshape(0, n_fft)
    if n_whole:
        windows = np.lib.stride_tricks.sliding_window_view(samples, n_fft)[::hop]
    for first in range(0, n_rows, block):
        count = min(block, n_rows - first)
        whole = min(max(n_whole - first, 0), count)
        work[:whole] = windows[first : first + whole]
        for row in range(whole, count):
            rest = samples[(first + row) * hop :]
            work[row, : rest.size] = rest
            work[row, rest.size :] = 0
        used = -(-count // ROWS_AT_LEAST) * ROWS_AT_LEAST
        work[count:used] = 0
        lines = scipy.fft.fft(work[:used], axis=1, overwrite_x=True)
        lines *= response
        rows = scipy.fft.ifft(lines, axis=1, overwrite_x=True)
        begin = first * hop
        full = min((n_out - begin) // hop, count)
        end = begin + full * hop
        out[begin:end].reshape(full, hop)[...] = rows[:full, half_length : half_length + hop]
        if full < count:
            out[end:] = rows[full, half_length : half_length + n_out - end]
    return out


@dataclass(frozen=True, eq=False, kw_only=True)
class Filtered(Signal):
    """A signal through a finite filter: ``y[n] = sum_k taps[h + k] x[n - lag - k]``.

    Parameters
    ----------
    taps : float64 or complex128 array, shape (2 h + 1,)
        Odd count; the middle tap belongs to ``lag``.
    n_fft : int
        Transform length, at least ``2 h + 1``; ``step`` is ``n_fft - 2 h``.
    lag : int
        Delay of the middle tap, samples; 0 for a filter without delay.

    Notes
    -----
    Use :meth:`of`, which sets the grid. The loop may be shorter than the filter.
    """

    taps: NDArray[np.float64] | NDArray[np.complex128]
    n_fft: int
    lag: int = 0

    @classmethod
    def of(
        cls,
        source: Signal,
        taps: NDArray[np.float64] | NDArray[np.complex128],
        *,
        mean_power: float | None = None,
        n_fft: int | None = None,
        lag: int = 0,
    ) -> Self:
        """Filter a signal.

        Parameters
        ----------
        source : Signal
            What is filtered; the result keeps its rate and period.
        taps : float64 or complex128 array, shape (2 h + 1,)
            Odd count; the middle tap belongs to ``lag``.
        mean_power : float, optional
            Of the result, where it is known in closed form.
        n_fft : int, optional
            Transform length; :func:`fft_length` if not given.
        lag : int
            Delay of the middle tap, samples.

        Returns
        -------
        Filtered
        """
        half = taps.size // 2
        length = n_fft or fft_length(half)
        return cls(
            sample_rate_hz=source.sample_rate_hz,
            n_samples=source.n_samples,
            step=length - 2 * half,
            inputs=(source,),
            mean_power=mean_power,
            taps=taps,
            n_fft=length,
            lag=lag,
        )

    @property
    def half_length(self) -> int:
        """Taps on each side of lag zero."""
        return self.taps.size // 2

    @cached_property
    def response(self) -> NDArray[np.complex64]:
        """Frequency response, shape (n_fft,)."""
        return filter_response(self.taps, self.n_fft)

    def needs(self, start: int, stop: int) -> tuple[Range, ...]:
        """Return the range with the filter's halo on both sides."""
        reach = self.half_length
        return ((start - self.lag - reach, stop - self.lag + reach),)

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Filter whole cells."""
        return filter_rows(
            arrays[0],
            response=self.response,
            half_length=self.half_length,
            n_out=stop - start,
        )
