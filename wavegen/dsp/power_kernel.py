"""Count instantaneous power exactly, at the speed of memory.

The bits of a positive float are already its place on a logarithmic scale: ``bits >> 14`` of a
float32 is one of 512 linear bins an octave. (Half a bin is added first, so that round powers, 1 or
a half, lie in the middle of a bin and rounding does not tear a wall there in two.) Counting is
therefore one addition, one shift and one increment a sample, the counts are integers and do not
depend on the order of merging, and no logarithm is taken. A compiled loop does it where numba is
installed; the same figures come, bit for bit, from plain NumPy otherwise, which is also the
referee of the compiled loop.
"""

from __future__ import annotations

import threading
from collections.abc import Callable
from dataclasses import dataclass
from functools import cache
from typing import Any

import numpy as np
from numpy.typing import NDArray

from wavegen.core.signal import Samples
from wavegen.dsp.cell_sums import CELL, sum_cells
from wavegen.dsp.compiled import compiled, numba_types
from wavegen.dsp.power_bins import (
    BINS_PER_OCTAVE,
    LOWEST_OCTAVE,
    N_BINS,
    bin_of,
)

_BIAS = 127
_SHIFT = (-LOWEST_OCTAVE - _BIAS) * BINS_PER_OCTAVE
_STEP_BITS = 14
_FINE_BITS = (1 << _STEP_BITS) - 1
_HALF = 1 << (_STEP_BITS - 1)
_LEAST_PLAIN = (_BIAS - 80) << 23
_ABOVE_PLAIN = (_BIAS + 80) << 23
"""Float32 bits of power 2^-80 and 2^80: what lies outside is squared again after scaling."""
_SCALE_BITS = 96
_UP = np.float32(2.0**_SCALE_BITS)
_DOWN = np.float32(2.0**-_SCALE_BITS)
_POWER_UP = 2.0 ** (2 * _SCALE_BITS)
_POWER_DOWN = 2.0 ** (-2 * _SCALE_BITS)
_BIN_OFFSET = 2 * _SCALE_BITS * BINS_PER_OCTAVE
_NOT_COUNTED = -1
_BANKS = 2
"""Interleaved copies of the counts, so that equal samples in a row need not wait; the loops and
sums below are written for two."""
_FINE_BANKS = 4
_FINE_STRIDE = (1 << _STEP_BITS) + 16
"""Copies of the counts of the highest bin, and how far apart: not a power of two, lest they meet in
one set of the cache."""
_NUMPY_BLOCK = 16 * CELL


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class PowerTally:
    """What one stretch of samples holds.

    Parameters
    ----------
    counts : int64 array, shape (n_bins,)
        Samples in the bins from ``first_bin``; exact zeros are not among them.
    first_bin : int
        Number of the first bin; see :func:`bin_edges`.
    n_zeros : int
        Samples that are exactly zero.
    peak, least : float
        Largest and smallest non-zero power; 0 and inf where every sample is zero.
    peak_index : int
        First sample with the largest power, counted from the start; -1 where all are zero.
    top_powers : float64 array, shape (n,)
        Every power in the bin of the peak, rising: there the counts are resolved to the bit.
    top_counts : int64 array, shape (n,)
        How many samples have each of them.
    sums, maxima : float64 arrays, shape (n_cells,)
        Sum and largest power of each cell of 1024 samples from the start; the last cell may be
        short.
    bad_index : int
        First sample that is not finite, or -1. Nothing else is valid then.
    """

    counts: NDArray[np.int64]
    first_bin: int
    n_zeros: int
    peak: float
    least: float
    peak_index: int
    top_powers: NDArray[np.float64]
    top_counts: NDArray[np.int64]
    sums: NDArray[np.float64]
    maxima: NDArray[np.float64]
    bad_index: int


def exact_powers(samples: Samples) -> NDArray[np.float64]:
    """Return ``|x|^2`` as the tally sees it: float32 precision at any scale, in float64.

    Parameters
    ----------
    samples : complex64 array, shape (n,)
        Finite samples on any scale.

    Returns
    -------
    float64 array, shape (n,)
    """
    return numbered_powers(samples)[0].astype(np.float64)


def numbered_powers(
    samples: Samples,
) -> tuple[NDArray[np.float32] | NDArray[np.float64], NDArray[np.int32]]:
    """Return power and bin of each sample.

    Parameters
    ----------
    samples : complex64 array, shape (n,)
        Finite samples on any scale.

    Returns
    -------
    powers : float32 or float64 array, shape (n,)
        float64 where float32 cannot hold one of them.
    bins : int32 array, shape (n,)
        As numbered by :mod:`wavegen.dsp.power_bins`; -1 for exact zeros.
    """
    with np.errstate(over="ignore", under="ignore", invalid="ignore"):
        power = samples.real * samples.real
        power += samples.imag * samples.imag
        bits = power.view(np.uint32)
        if not samples.size or (bits.min() >= _LEAST_PLAIN and bits.max() < _ABOVE_PLAIN):
            return power, _number(bits) + np.int32(_SHIFT)
        odd = np.flatnonzero((bits < _LEAST_PLAIN) | (bits >= _ABOVE_PLAIN))
        few = samples[odd]
        is_large = bits[odd] >= _ABOVE_PLAIN
        scale = np.where(is_large, _DOWN, _UP)
        real, imag = few.real * scale, few.imag * scale
        again = real * real + imag * imag
        exact = power.astype(np.float64)
        exact[odd] = again.astype(np.float64) * np.where(is_large, _POWER_UP, _POWER_DOWN)
        power[odd] = again
        number = _number(bits) + np.int32(_SHIFT)
        number[odd] += np.where(is_large, _BIN_OFFSET, -_BIN_OFFSET).astype(np.int32)
        number[odd[(few.real == 0) & (few.imag == 0)]] = _NOT_COUNTED
    return exact, number


def _number(bits: NDArray[np.uint32]) -> NDArray[np.int32]:
    """Return the bin of float32 bits, counted from that of bits 0."""
    return ((bits + np.uint32(_HALF)) >> np.uint32(_STEP_BITS)).view(np.int32)


class _Total:
    """Running figures of one tally in plain NumPy."""

    def __init__(self) -> None:
        self.counts = np.zeros(N_BINS, np.int64)
        self.n_zeros = 0
        self.peak = 0.0
        self.peak_index = -1
        self.least = np.inf
        self.top: dict[float, int] = {}

    def add(self, start: int, samples: Samples) -> NDArray[np.float32] | NDArray[np.float64]:
        """Count a block of finite samples and return their powers."""
        powers, number = numbered_powers(samples)
        counted = powers
        low = int(number.min())
        if low == _NOT_COUNTED:
            used = number != _NOT_COUNTED
            number, counted = number[used], powers[used]
            self.n_zeros += used.size - number.size
            if not number.size:
                return powers
            low = int(number.min())
        found = np.bincount(number - np.int32(low))
        self.counts[low : low + found.size] += found
        self.least = min(self.least, float(counted.min()))
        top = low + found.size - 1
        largest = float(powers.max())
        if largest > self.peak:
            if self.peak == 0.0 or top > bin_of(self.peak):
                self.top.clear()
            self.peak = largest
            self.peak_index = start + int(np.argmax(powers))
        if top == bin_of(self.peak):
            in_top = counted[number == top]
            for power, count in zip(*np.unique(in_top, return_counts=True), strict=True):
                self.top[float(power)] = self.top.get(float(power), 0) + int(count)
        return powers


def _first_bad(samples: Samples) -> int:
    """Return the first sample that is not finite, or -1."""
    finite = np.isfinite(samples)
    return -1 if finite.all() else int(np.argmin(finite))


def tally_by_numpy(samples: Samples) -> PowerTally:
    """Return the tally of a stretch, in plain NumPy: the referee of the compiled loop.

    Parameters
    ----------
    samples : complex64 array, shape (n,)
        On any scale.

    Returns
    -------
    PowerTally
    """
    total = _Total()
    sums, maxima = [np.empty(0)], [np.empty(0)]
    for start in range(0, samples.size, _NUMPY_BLOCK):
        block = samples[start : start + _NUMPY_BLOCK]
        bad = _first_bad(block)
        if bad >= 0:
            return _bad_tally(start + bad)
        powers = total.add(start, block)
        sums.append(sum_cells(powers))
        maxima.append(np.maximum.reduceat(powers, np.arange(0, powers.size, CELL)))
    top_powers = np.array(sorted(total.top))
    return PowerTally(
        **_cut(total.counts, total.least, total.peak),
        n_zeros=total.n_zeros,
        peak=total.peak,
        least=float(total.least),
        peak_index=total.peak_index,
        top_powers=top_powers,
        top_counts=np.array([total.top[power] for power in top_powers], np.int64),
        sums=np.concatenate(sums),
        maxima=np.concatenate(maxima),
        bad_index=-1,
    )


def _cut(counts: NDArray[np.int64], least: float, peak: float) -> dict[str, Any]:
    """Return the counts from the bin of the least power to that of the peak."""
    if peak == 0.0:
        return {"counts": np.zeros(0, np.int64), "first_bin": 0}
    first = bin_of(least)
    return {"counts": counts[first : bin_of(peak) + 1].copy(), "first_bin": first}


def tally(samples: Samples) -> PowerTally:
    """Return the tally of a stretch by the compiled loop, or by NumPy without numba.

    Parameters
    ----------
    samples : complex64 array, shape (n,)
        On any scale.

    Returns
    -------
    PowerTally
        The same, bit for bit, either way.
    """
    kernel = compiled_kernel()
    if kernel is None:
        return tally_by_numpy(samples)
    return _tally_compiled(kernel, np.ascontiguousarray(samples))


class _Workspace(threading.local):
    """Arrays reused by each thread; the counts are all zero between calls."""

    def __init__(self) -> None:
        self.counts = np.zeros(N_BINS * _BANKS, np.uint32)
        self.fine = np.zeros(_FINE_BANKS * _FINE_STRIDE, np.uint32)
        self.power = np.zeros(CELL, np.float32)
        self.wide = np.zeros(CELL, np.float64)


@cache
def _workspace() -> _Workspace:
    return _Workspace()


_LONGEST = 1 << 30
"""Samples a call of the compiled loop takes, so that its 32-bit counts cannot overflow."""


def _tally_compiled(kernel: Callable[..., None], samples: Samples) -> PowerTally:
    if samples.size > _LONGEST:
        return tally_by_numpy(samples)
    work = _workspace()
    n_cells = -(-samples.size // CELL)
    sums, maxima = np.empty(n_cells), np.empty(n_cells)
    state = np.array([-1, 0, -1, -1], np.int64)
    extremes = np.array([0.0, np.inf, 0.0])
    kernel(
        samples.view(np.float32),
        work.counts,
        work.fine,
        work.power,
        work.power.view(np.uint32),
        work.wide,
        sums,
        maxima,
        state,
        extremes,
    )
    top_bin, n_zeros, peak_index, bad = state.tolist()
    if bad >= 0:
        work.counts[:] = 0
        work.fine[:] = 0
        return _bad_tally(bad)
    peak, least, _ = extremes.tolist()
    counts = np.zeros(0, np.int64)
    first = 0
    banked = work.fine.reshape(_FINE_BANKS, -1)
    fine = (banked[0] + banked[1]) + (banked[2] + banked[3])
    codes = np.flatnonzero(fine != 0)  # many times as fast as on the numbers
    banked[:, codes] = 0
    top_powers = np.zeros(0)
    if peak > 0.0:
        first = bin_of(least)
        banks = work.counts[first * _BANKS : (top_bin + 1) * _BANKS]
        counts = (banks[0::2] + banks[1::2]).astype(np.int64)
        banks[:] = 0
        octave, mantissa = np.divmod((top_bin << _STEP_BITS) - _HALF + codes, 1 << 23)
        top_powers = np.ldexp(1.0 + mantissa / (1 << 23), octave + LOWEST_OCTAVE)
    return PowerTally(
        counts=counts,
        first_bin=first,
        n_zeros=n_zeros,
        peak=peak,
        least=least,
        peak_index=peak_index,
        top_powers=top_powers,
        top_counts=fine[codes].astype(np.int64),
        sums=sums,
        maxima=maxima,
        bad_index=-1,
    )


def _bad_tally(bad: int) -> PowerTally:
    empty = np.zeros(0, np.int64)
    none = np.zeros(0)
    return PowerTally(
        counts=empty,
        first_bin=0,
        n_zeros=0,
        peak=0.0,
        least=np.inf,
        peak_index=-1,
        top_powers=none,
        top_counts=empty,
        sums=none,
        maxima=none,
        bad_index=bad,
    )


_COMPILING = threading.Lock()


def compiled_kernel() -> Callable[..., None] | None:
    """Return the compiled loop, or None where numba is missing or switched off."""
    with _COMPILING:
        return _compile()


@cache
def _compile() -> Callable[..., None] | None:
    kinds = numba_types()
    if kinds is None:
        return None
    f32, u32 = kinds.float32, kinds.uint32
    f64, i64 = kinds.float64, kinds.int64
    signature = kinds.void(
        kinds.Array(f32, 1, "C", readonly=True),
        *(kinds.Array(kind, 1, "C") for kind in (u32, u32, f32, u32, f64, f64, f64, i64, f64)),
    )
    return compiled(signature, _count)


def _count(  # noqa: PLR0912, PLR0915, PLR0917 - one loop: what it calls is not inlined for sure
    parts: NDArray[np.float32],
    counts: NDArray[np.uint32],
    fine: NDArray[np.uint32],
    power: NDArray[np.float32],
    bits: NDArray[np.uint32],
    wide: NDArray[np.float64],
    sums: NDArray[np.float64],
    maxima: NDArray[np.float64],
    state: NDArray[np.int64],
    extremes: NDArray[np.float64],
) -> None:  # pragma: no cover - compiled
    """Count cell by cell; written for the compiler (see :func:`tally_by_numpy` for the sense).

    ``bits`` views ``power``. ``state`` is bin of the peak, zeros, index of the peak, index of a
    sample that is not finite; ``extremes`` is peak and least power, and a sum
    without sense that keeps the reads of the next cell from being left out.
    """
    half_bin = np.uint32(_HALF)
    even, odd = np.uint32(0xFFFFFFFE), np.uint32(1)
    plain = counts[_SHIFT * 2 :]  # unsigned indices need no test for being negative
    n_samples = parts.size // 2
    touched = np.float32(0.0)
    places = np.empty(CELL, np.uint32)
    top = state[0]
    peak = extremes[0]
    least = extremes[1]
    for cell in range(sums.size):
        first = cell * CELL
        size = min(CELL, n_samples - first)
        mine = parts[2 * first : 2 * (first + size)]
        high = np.uint32(0)
        low = np.uint32(0xFFFFFFFF)
        for i in range(size):
            real = mine[2 * i]
            imag = mine[2 * i + 1]
            of_one = real * real + imag * imag
            power[i] = of_one
            code = np.float32(of_one).view(np.uint32)
            high = max(high, code)
            low = min(low, code)
        if size == CELL and low >= np.uint32(_LEAST_PLAIN) and high < np.uint32(_ABOVE_PLAIN):
            number = np.int64((high + half_bin) >> np.uint32(14)) + _SHIFT
            if number > top:
                fine[:] = np.uint32(0)
                top = number
            code = np.uint32(top - _SHIFT)
            if ((low + half_bin) >> np.uint32(14)) == ((high + half_bin) >> np.uint32(14)):
                counts[number * 2] += np.uint32(CELL)
                if number == top:  # all of them are in the highest bin
                    for i in range(0, CELL, 4):
                        for k in range(4):
                            here = (bits[i + k] + half_bin) & np.uint32(_FINE_BITS)
                            fine[here + np.uint32(k * _FINE_STRIDE)] += np.uint32(1)
            else:
                # Reading the next cell on the way, a cache line at a time, counting never waits
                # for memory: 1.04 instead of 1.36 ns a sample where they come from far.
                ahead = mine
                if first + 2 * CELL <= n_samples:
                    ahead = parts[2 * (first + CELL) : 2 * (first + 2 * CELL)]
                for i in range(0, CELL, 2):
                    places[i] = ((bits[i] + half_bin) >> np.uint32(13)) & even
                    places[i + 1] = ((bits[i + 1] + half_bin) >> np.uint32(13)) | odd
                for i in range(0, CELL, 8):
                    touched += ahead[2 * i]
                    plain[places[i]] += np.uint32(1)
                    plain[places[i + 1]] += np.uint32(1)
                    plain[places[i + 2]] += np.uint32(1)
                    plain[places[i + 3]] += np.uint32(1)
                    plain[places[i + 4]] += np.uint32(1)
                    plain[places[i + 5]] += np.uint32(1)
                    plain[places[i + 6]] += np.uint32(1)
                    plain[places[i + 7]] += np.uint32(1)
                if number == top:
                    for i in range(0, CELL, 4):  # adding 0 or 1 costs less than a wrong guess
                        for k in range(4):
                            here = bits[i + k] + half_bin
                            place = (here & np.uint32(_FINE_BITS)) + np.uint32(k * _FINE_STRIDE)
                            fine[place] += np.uint32((here >> np.uint32(14)) == code)
            for i in range(256):
                wide[i] = (np.float64(power[i]) + np.float64(power[i + 512])) + (
                    np.float64(power[i + 256]) + np.float64(power[i + 768])
                )
            bits[0] = low
            least = min(least, np.float64(power[0]))
            bits[0] = high
            largest = np.float64(power[0])
            if largest > peak:
                peak = largest
                for i in range(CELL):
                    real = mine[2 * i]
                    imag = mine[2 * i + 1]
                    if np.float64(real * real + imag * imag) == largest:
                        state[2] = first + i
                        break
        else:
            largest = np.float64(0.0)
            for i in range(CELL):
                wide[i] = 0.0
            for i in range(size):
                real = mine[2 * i]
                imag = mine[2 * i + 1]
                if not (np.isfinite(real) and np.isfinite(imag)):
                    state[3] = first + i
                    return
                if real == 0 and imag == 0:
                    state[1] += 1
                    continue
                shift = np.int64(_SHIFT)
                scale = 1.0
                if bits[i] < np.uint32(_LEAST_PLAIN):
                    real *= _UP
                    imag *= _UP
                    power[i] = real * real + imag * imag
                    shift -= _BIN_OFFSET
                    scale = _POWER_DOWN
                elif bits[i] >= np.uint32(_ABOVE_PLAIN):
                    real *= _DOWN
                    imag *= _DOWN
                    power[i] = real * real + imag * imag
                    shift += _BIN_OFFSET
                    scale = _POWER_UP
                exact = np.float64(power[i]) * scale
                here = bits[i] + half_bin
                number = np.int64(here >> np.uint32(14)) + shift
                counts[number * 2] += np.uint32(1)
                wide[i] = exact
                largest = max(largest, exact)
                least = min(least, exact)
                if exact > peak:
                    peak = exact
                    state[2] = first + i
                if number > top:
                    fine[:] = np.uint32(0)
                    top = number
                if number == top:
                    fine[here & np.uint32(_FINE_BITS)] += np.uint32(1)
            for i in range(256):
                wide[i] = (wide[i] + wide[i + 512]) + (wide[i + 256] + wide[i + 768])
        maxima[cell] = largest
        half = 128
        while half >= 1:
            for i in range(half):
                wide[i] += wide[i + half]
            half >>= 1
        sums[cell] = wide[0]
    state[0] = top
    extremes[0] = peak
    extremes[1] = least
    extremes[2] = touched
