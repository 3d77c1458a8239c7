"""Sums of tones as signals: held for one short cycle, or summed cell by cell."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass
from fractions import Fraction
from functools import cached_property

import numpy as np
import scipy.fft
from numpy.typing import NDArray

from wavegen.core.signal import Samples, Signal

LONGEST_HELD = 1 << 20
"""A cycle up to this many samples is computed once and repeated (8 MB)."""
CELL = 1 << 10
_CELLS_AT_ONCE = 32
_EXACT_IN_INT64 = 1 << 31


def sum_tones(
    *,
    sample_rate_hz: Fraction,
    n_samples: int,
    bins: NDArray[np.int64],
    amplitudes: NDArray[np.complex128],
) -> Signal:
    """Return a sum of tones, in the form that suits the length of its own cycle.

    Parameters
    ----------
    sample_rate_hz : Fraction
        Rate, Hz.
    n_samples : int
        Samples in the loop.
    bins : int64 array, shape (n_tones,)
        Cycles per loop; different modulo ``n_samples``.
    amplitudes : complex128 array, shape (n_tones,)
        Amplitude and phase at sample 0; unit total power.

    Returns
    -------
    Signal
    """
    common = math.gcd(n_samples, *bins.tolist())
    is_held = n_samples // common <= LONGEST_HELD
    return (HeldTones if is_held else LongTones)(
        sample_rate_hz=sample_rate_hz,
        n_samples=n_samples,
        step=1 if is_held else CELL,
        bins=bins,
        amplitudes=amplitudes,
    )


@dataclass(frozen=True, eq=False, kw_only=True)
class HeldTones(Signal):
    """Tones whose own cycle is short: computed once, then repeated.

    Parameters
    ----------
    bins : int64 array, shape (n_tones,)
        Cycles per loop; different modulo ``n_samples``.
    amplitudes : complex128 array, shape (n_tones,)
        Amplitude and phase at sample 0.
    """

    bins: NDArray[np.int64]
    amplitudes: NDArray[np.complex128]

    @cached_property
    def held(self) -> Samples:
        """One cycle of all tones, shape (n_cycle,), by one transform in double precision."""
        common = math.gcd(self.n_samples, *self.bins.tolist())
        length = self.n_samples // common
        spectrum = np.zeros(length, np.complex128)
        spectrum[self.bins // common % length] = self.amplitudes
        wave = scipy.fft.ifft(spectrum, norm="forward", overwrite_x=True)
        return np.asarray(wave).astype(np.complex64)

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Repeat the cycle."""
        length = self.held.size
        first = start % length
        count = stop - start
        if first + count <= length:
            return self.held[first : first + count].copy()
        turned = np.roll(self.held, -first)
        return np.tile(turned, -(-count // length))[:count]


@dataclass(frozen=True, eq=False, kw_only=True)
class LongTones(Signal):
    """Tones whose common cycle is long: summed cell by cell of the absolute grid.

    Parameters
    ----------
    bins : int64 array, shape (n_tones,)
        Cycles per loop.
    amplitudes : complex128 array, shape (n_tones,)
        Amplitude and phase at sample 0.

    Notes
    -----
    The phase at a cell's start is exact (integers modulo the loop), then one ramp for all cells.
    """

    bins: NDArray[np.int64]
    amplitudes: NDArray[np.complex128]

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Sum the tones over whole cells."""
        n_cells = -(-(stop - start) // CELL)
        out = np.zeros((n_cells, CELL), np.complex64)
        work = np.empty((_CELLS_AT_ONCE, CELL), np.complex64)
        starts = start + CELL * np.arange(n_cells, dtype=np.int64)
        turns = list(self._turns(starts))
        for first in range(0, n_cells, _CELLS_AT_ONCE):
            block = out[first : first + _CELLS_AT_ONCE]
            for base, ramp in turns:
                part = work[: block.shape[0]]
                np.multiply(base[first : first + _CELLS_AT_ONCE, None], ramp, out=part)
                block += part
        return out.reshape(-1)[: stop - start]

    def _turns(self, starts: NDArray[np.int64]) -> Iterator[tuple[Samples, Samples]]:
        """Return for each tone its value at the cells' starts and its ramp within a cell."""
        within = np.arange(CELL, dtype=np.int64)
        for line, amplitude in zip(self.bins.tolist(), self.amplitudes, strict=True):
            base = amplitude * np.exp(2j * np.pi * self._fractions(line, starts))
            ramp = np.exp(2j * np.pi * self._fractions(line, within))
            yield base.astype(np.complex64), ramp.astype(np.complex64)

    def _fractions(self, line: int, indices: NDArray[np.int64]) -> NDArray[np.float64]:
        """Return ``line * indices / n_samples`` modulo 1, without rounding before the end."""
        n = self.n_samples
        if n <= _EXACT_IN_INT64:
            return np.asarray(line * indices % n / n)
        return np.array([line * index % n / n for index in indices.tolist()])
