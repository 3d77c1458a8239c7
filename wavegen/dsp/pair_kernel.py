"""Neighbouring samples counted by the lower of their two powers, and sums of higher powers.

A run is a stretch of samples in a row above a level. Runs need not be followed to be counted: of
``n`` samples above a level that form ``r`` runs, ``n - r`` are followed by one that is above it
too. The count of pairs whose lower power exceeds a level is therefore all that is missing, for
every level at once, and it adds up over stretches but for the one pair at each joint.

Sums of ``p^2`` and ``p^3`` are taken on the way, cell by cell, as those of ``p`` are.
"""

from __future__ import annotations

import threading
from collections.abc import Callable
from dataclasses import dataclass
from functools import cache

import numpy as np
from numpy.typing import NDArray

from wavegen.core.signal import Samples
from wavegen.dsp.cell_sums import CELL, sum_cells
from wavegen.dsp.compiled import compiled, numba_types
from wavegen.dsp.power_bins import BINS_PER_OCTAVE, LOWEST_OCTAVE, bin_edges
from wavegen.dsp.power_kernel import numbered_powers

FINE_PER_COARSE = 8
"""Bins of :mod:`wavegen.dsp.power_bins` in one coarse bin: 64 an octave, 0.07 dB at most."""
_BIAS = 127
_SHIFT = (-LOWEST_OCTAVE - _BIAS) * BINS_PER_OCTAVE // FINE_PER_COARSE
_HALF = 1 << 13
"""Half a fine bin, in units of the last place of a float32."""
_COARSE_BITS = 17
_LEAST_PLAIN = (_BIAS - 80) << 23
_ABOVE_PLAIN = (_BIAS + 80) << 23
"""Float32 bits of power 2^-80 and 2^80; exact zeros are plain too."""
_BANKS = 2
_PLAIN_BINS = 256 * BINS_PER_OCTAVE // FINE_PER_COARSE
_NUMPY_BLOCK = 64 * CELL


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class PairTally:
    """What the pairs of neighbours in one stretch hold.

    Parameters
    ----------
    counts : int64 array, shape (n_bins,)
        Pairs by the lower of their powers, in coarse bins from ``first_bin``; pairs with an
        exact zero are not among them.
    first_bin : int
        Number of the first; see :func:`coarse_edges`.
    squares, cubes : float64 arrays, shape (n_cells,)
        Sums of ``p^2`` and ``p^3`` over cells of 1024 samples from the start; the last may be
        short.
    """

    counts: NDArray[np.int64]
    first_bin: int
    squares: NDArray[np.float64]
    cubes: NDArray[np.float64]


def coarse_edges(first_bin: int, n_bins: int) -> NDArray[np.float64]:
    """Return the edges of coarse bins, as power.

    Parameters
    ----------
    first_bin, n_bins : int
        Which bins.

    Returns
    -------
    float64 array, shape (n_bins + 1,)
        Bin ``k`` holds powers from its edge (included) to the next (excluded).

    Examples
    --------
    >>> coarse_edges(-LOWEST_OCTAVE * 64, 1).round(4).tolist()
    [0.9995, 1.0146]
    """
    fine = bin_edges(first_bin * FINE_PER_COARSE, n_bins * FINE_PER_COARSE)
    return fine[::FINE_PER_COARSE].copy()


def coarsened(counts: NDArray[np.int64], first_bin: int) -> tuple[NDArray[np.int64], int]:
    """Return counts of fine bins added up in coarse ones.

    Parameters
    ----------
    counts : int64 array, shape (n_bins,)
        Of the bins of :mod:`wavegen.dsp.power_bins`.
    first_bin : int
        Number of the first.

    Returns
    -------
    counts : int64 array, shape (n_coarse_bins,)
    first_bin : int
        Number of the first coarse bin.
    """
    if not counts.size:
        return counts, 0
    before = first_bin % FINE_PER_COARSE
    size = -(-(before + counts.size) // FINE_PER_COARSE)
    padded = np.zeros(size * FINE_PER_COARSE, np.int64)
    padded[before : before + counts.size] = counts
    halved = padded[0::2] + padded[1::2]
    halved = halved[0::2] + halved[1::2]
    return halved[0::2] + halved[1::2], first_bin // FINE_PER_COARSE


def tally_pairs_by_numpy(samples: Samples) -> PairTally:
    """Return the tally of a stretch in plain NumPy: the referee of the compiled loop.

    Parameters
    ----------
    samples : complex64 array, shape (n,)
        Finite samples on any scale.

    Returns
    -------
    PairTally
    """
    total, low = np.zeros(0, np.int64), 0
    squares, cubes = [np.zeros(0)], [np.zeros(0)]
    for start in range(0, samples.size, _NUMPY_BLOCK):
        # One sample more, so that the pair across the edge of the block is counted here.
        powers, number = numbered_powers(samples[start : start + _NUMPY_BLOCK + 1])
        lower = np.minimum(number[1:], number[:-1])
        lower = lower[lower >= 0]
        if lower.size:
            first = int(lower.min()) // FINE_PER_COARSE
            found = np.bincount(lower // FINE_PER_COARSE - first)
            total, low = added(total, low, found, first)
        wide = powers[:_NUMPY_BLOCK].astype(np.float64)
        square = wide * wide
        squares.append(sum_cells(square))
        cubes.append(sum_cells(square * wide))
    return PairTally(
        counts=total,
        first_bin=low,
        squares=np.concatenate(squares),
        cubes=np.concatenate(cubes),
    )


def _trimmed(counts: NDArray[np.int64], first_bin: int) -> tuple[NDArray[np.int64], int]:
    """Return counts without the zeros at both ends."""
    used = np.flatnonzero(counts != 0)
    if not used.size:
        return np.zeros(0, np.int64), 0
    low, high = int(used[0]), int(used[-1]) + 1
    return counts[low:high].copy(), first_bin + low


def tally_pairs(samples: Samples) -> PairTally:
    """Return the tally of a stretch by the compiled loop, or by NumPy without numba.

    Parameters
    ----------
    samples : complex64 array, shape (n,)
        Finite samples on any scale.

    Returns
    -------
    PairTally
        The same, bit for bit, either way.
    """
    kernel = compiled_kernel()
    n_cells = samples.size // CELL
    if kernel is None or not n_cells or samples.size > _LONGEST:
        return tally_pairs_by_numpy(samples)
    samples = np.ascontiguousarray(samples)
    work = _workspace()
    squares, cubes = np.empty(n_cells), np.empty(n_cells)
    is_plain = kernel(
        samples.view(np.float32), work.counts, work.power, work.power.view(np.uint32), work.places,
        work.wide, squares, cubes,
    )  # fmt: skip
    banks = work.counts[: _BANKS * _PLAIN_BINS]
    total = banks[0::2].astype(np.int64) + banks[1::2]
    work.counts[:] = 0
    if not is_plain:
        return tally_pairs_by_numpy(samples)
    total[0] = 0  # pairs with an exact zero; what is plain and no zero lies far above
    counts, first = _trimmed(total, _SHIFT)
    body = PairTally(counts=counts, first_bin=first, squares=squares, cubes=cubes)
    rest = samples[n_cells * CELL :]
    if not rest.size:
        return body
    last = tally_pairs_by_numpy(rest)
    counts, first = added(counts, first, last.counts, last.first_bin)
    edge = n_cells * CELL
    counts, first = added(counts, first, *joint(samples[edge - 1 : edge + 1]))
    return PairTally(
        counts=counts,
        first_bin=first,
        squares=np.concatenate([squares, last.squares]),
        cubes=np.concatenate([cubes, last.cubes]),
    )


def joint(samples: Samples) -> tuple[NDArray[np.int64], int]:
    """Return the count of the one pair that two samples make.

    Parameters
    ----------
    samples : complex64 array, shape (2,)
        The last of one stretch and the first of the next.

    Returns
    -------
    counts : int64 array, shape (1,) or (0,)
        Empty where one is exactly zero.
    first_bin : int
    """
    lower = int(numbered_powers(samples)[1].min())
    if lower < 0:
        return np.zeros(0, np.int64), 0
    return np.ones(1, np.int64), lower // FINE_PER_COARSE


def added(
    counts: NDArray[np.int64], first_bin: int, more: NDArray[np.int64], more_first_bin: int
) -> tuple[NDArray[np.int64], int]:
    """Return the sum of two arrays of counts that begin at different bins.

    Parameters
    ----------
    counts, more : int64 arrays, shapes (n_bins,) and (m_bins,)
        Neither is changed.
    first_bin, more_first_bin : int
        Where they begin.

    Returns
    -------
    counts : int64 array
        May be one of the two arguments where the other is empty.
    first_bin : int
    """
    if not more.size:
        return counts, first_bin
    if not counts.size:
        return more, more_first_bin
    low = min(first_bin, more_first_bin)
    high = max(first_bin + counts.size, more_first_bin + more.size)
    total = np.zeros(high - low, np.int64)
    total[first_bin - low : first_bin - low + counts.size] = counts
    total[more_first_bin - low : more_first_bin - low + more.size] += more
    return total, low


class _Workspace(threading.local):
    """Arrays reused by each thread; the counts are all zero between calls."""

    def __init__(self) -> None:
        self.counts = np.zeros(_PLAIN_BINS * _BANKS, np.uint32)
        self.power = np.zeros(CELL + 1, np.float32)
        self.places = np.zeros(CELL, np.uint32)
        self.wide = np.zeros(2 * CELL, np.float64)


@cache
def _workspace() -> _Workspace:
    return _Workspace()


_LONGEST = 1 << 30
"""Samples a call of the compiled loop takes, so that its 32-bit counts cannot overflow."""
_COMPILING = threading.Lock()


def compiled_kernel() -> Callable[..., bool] | None:
    """Return the compiled loop, or None where numba is missing or switched off."""
    with _COMPILING:
        return _compile()


@cache
def _compile() -> Callable[..., bool] | None:
    kinds = numba_types()
    if kinds is None:
        return None
    f32, u32, f64 = kinds.float32, kinds.uint32, kinds.float64
    signature = kinds.boolean(
        kinds.Array(f32, 1, "C", readonly=True),
        *(kinds.Array(kind, 1, "C") for kind in (u32, f32, u32, u32, f64, f64, f64)),
    )
    return compiled(signature, _count)


def _count(  # noqa: PLR0915, PLR0917 - one loop: what it calls is not inlined for sure
    parts: NDArray[np.float32],
    counts: NDArray[np.uint32],
    power: NDArray[np.float32],
    bits: NDArray[np.uint32],
    places: NDArray[np.uint32],
    wide: NDArray[np.float64],
    squares: NDArray[np.float64],
    cubes: NDArray[np.float64],
) -> bool:  # pragma: no cover - compiled
    """Count whole cells; False, with counts without sense, where a power is not plain.

    ``bits`` views ``power``, whose first entry is the last power of the cell before: so each
    cell counts the pair that it makes with its predecessor.
    """
    half = np.uint32(_HALF)
    even, odd = np.uint32(0xFFFFFFFE), np.uint32(1)
    least = np.uint32(_LEAST_PLAIN)
    shift = np.uint32(_COARSE_BITS - 1)
    bits[0] = np.uint32(0)
    touched = np.float32(0.0)
    for cell in range(squares.size):
        first = 2 * cell * CELL
        mine = parts[first : first + 2 * CELL]
        ahead = mine
        if first + 4 * CELL <= parts.size:
            # Read on the way, a cache line at a time, so that no cell waits for memory.
            ahead = parts[first + 2 * CELL : first + 4 * CELL]
        high = np.uint32(0)
        low = np.uint32(0xFFFFFFFF)
        for i in range(CELL):
            real = mine[2 * i]
            imag = mine[2 * i + 1]
            of_one = real * real + imag * imag
            power[i + 1] = of_one
            code = np.float32(of_one).view(np.uint32)
            high = max(high, code)
            low = min(low, code)
        if high >= np.uint32(_ABOVE_PLAIN):
            return False
        if low < least:
            for i in range(CELL):
                if bits[i + 1] < least and (mine[2 * i] != 0 or mine[2 * i + 1] != 0):
                    return False
        for i in range(0, CELL, 2):
            places[i] = ((min(bits[i], bits[i + 1]) + half) >> shift) & even
            places[i + 1] = ((min(bits[i + 1], bits[i + 2]) + half) >> shift) | odd
        for i in range(0, CELL, 8):
            touched += ahead[2 * i]
            counts[places[i]] += np.uint32(1)
            counts[places[i + 1]] += np.uint32(1)
            counts[places[i + 2]] += np.uint32(1)
            counts[places[i + 3]] += np.uint32(1)
            counts[places[i + 4]] += np.uint32(1)
            counts[places[i + 5]] += np.uint32(1)
            counts[places[i + 6]] += np.uint32(1)
            counts[places[i + 7]] += np.uint32(1)
        for i in range(256):
            p = np.float64(power[i + 1])
            q = np.float64(power[i + 257])
            r = np.float64(power[i + 513])
            s = np.float64(power[i + 769])
            p2, q2, r2, s2 = p * p, q * q, r * r, s * s
            wide[i] = (p2 + r2) + (q2 + s2)
            wide[CELL + i] = (p2 * p + r2 * r) + (q2 * q + s2 * s)
        width = 128
        while width >= 1:
            for i in range(width):
                wide[i] += wide[i + width]
                wide[CELL + i] += wide[CELL + i + width]
            width >>= 1
        squares[cell] = wide[0]
        cubes[cell] = wide[CELL]
        bits[0] = bits[CELL]
    wide[1] = touched  # kept, lest the reads be left out
    return True
