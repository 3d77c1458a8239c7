"""Filter rows filled with what the peaks of a signal ask for, in one pass each.

As in :mod:`wavegen.dsp.row_kernels`: rows begin ``hop`` samples apart, everything is local and
elementwise, compiled loops do it where numba is installed, and plain NumPy gives the same bits.
"""

from __future__ import annotations

from collections.abc import Callable
from functools import cache

import numpy as np

from wavegen.core.signal import Samples
from wavegen.dsp.compiled import compiled, numba_types
from wavegen.dsp.envelope_excess import dilate, local_peaks, power_of, shortfall_of
from wavegen.dsp.row_kernels import Rails, put_samples, take_samples


def put_peaks(rows: Samples, samples: Samples, *, hop: int, reach: int, amplitude: float) -> None:
    """Fill rows with the excess of each peak where it stands, and zero elsewhere.

    Parameters
    ----------
    rows : complex64 array, shape (n_rows, n_fft)
        Written to; contiguous.
    samples : complex64 array, shape (n,)
        From ``reach`` before the first row begins; not changed.
    hop : int
        Samples from row to row, at least half of ``n_fft``.
    reach : int
        A peak is the highest sample within so many on each side; of equals the first.
    amplitude : float
        What peaks stand above.
    """
    kernels = _compile()
    if kernels is None:
        put_peaks_by_numpy(rows, samples, hop=hop, reach=reach, amplitude=amplitude)
        return
    flat = rows.view(np.float32), samples.view(np.float32)
    kernels[0](*flat, (hop, reach), (np.float32(amplitude**2), np.float32(amplitude)))


def put_peaks_by_numpy(
    rows: Samples, samples: Samples, *, hop: int, reach: int, amplitude: float
) -> None:
    """Do what :func:`put_peaks` does, without a compiler; same parameters, same bits."""
    stretch = samples[: (rows.shape[0] - 1) * hop + rows.shape[1] + 2 * reach]
    power = power_of(stretch)
    peaks = local_peaks(power, over=amplitude**2, reach=reach)
    share = np.float32(1) - np.float32(amplitude) / np.sqrt(power[peaks])
    placed = np.zeros(max(stretch.size - 2 * reach, 0), np.complex64)
    placed.real[peaks - reach] = stretch.real[peaks] * share
    placed.imag[peaks - reach] = stretch.imag[peaks] * share
    put_samples(rows, placed, hop=hop)


def put_lack(rows: Samples, samples: Samples, *, hop: int, reach: int, amplitude: float) -> None:
    """Fill rows with the largest gain that any sample within reach lacks, two stretches a row.

    Parameters
    ----------
    rows : complex64 array, shape (n_rows, n_fft)
        Written to; contiguous. The real parts of a row are one stretch, the imaginary parts
        the next, ``hop`` samples later: a real filter keeps them apart.
    samples : complex64 array, shape (n,)
        From ``reach`` before the first stretch begins; not changed.
    hop : int
        Samples from stretch to stretch.
    reach : int
        Neighbours on each side.
    amplitude : float
        What no sample should pass: one of envelope ``|x|`` above it lacks ``1 - A / |x|``.
    """
    kernels = _compile()
    if kernels is None:
        put_lack_by_numpy(rows, samples, hop=hop, reach=reach, amplitude=amplitude)
        return
    flat = rows.view(np.float32), samples.view(np.float32)
    kernels[1](*flat, (hop, reach), (np.float32(amplitude * amplitude), np.float32(amplitude)))


def put_lack_by_numpy(
    rows: Samples, samples: Samples, *, hop: int, reach: int, amplitude: float
) -> None:
    """Do what :func:`put_lack` does, without a compiler; same parameters, same bits."""
    parts = np.zeros((2 * rows.shape[0], rows.shape[1]), np.complex64)
    if samples.size > 2 * reach:
        spread = dilate(shortfall_of(samples, amplitude), reach)
        put_samples(parts, spread.astype(np.complex64), hop=hop)
    rows.real, rows.imag = parts.real[::2], parts.real[1::2]


def take_lowered(
    out: Samples, source: Samples, rows: Samples, *, half: int, hop: int, gain: float
) -> None:
    """Write ``x (1 - w) gain``, where ``w`` stands in rows as :func:`put_lack` fills them.

    Parameters
    ----------
    out : complex64 array, shape (n,)
        Written to.
    source : complex64 array, shape (n,) or longer
        ``x``; not changed.
    rows : complex64 array, shape (n_rows, n_fft)
        Contiguous; not changed.
    half, hop : int
        Where in a stretch its first output stands, and how many there are.
    gain : float
        Amplitude ratio.
    """
    kernels = _compile()
    if kernels is None:
        take_lowered_by_numpy(out, source, rows, half=half, hop=hop, gain=gain)
        return
    flat = (each.view(np.float32) for each in (out, source, rows))
    kernels[2](*flat, (half, hop), np.float32(gain))


def take_lowered_by_numpy(
    out: Samples, source: Samples, rows: Samples, *, half: int, hop: int, gain: float
) -> None:
    """Do what :func:`take_lowered` does, without a compiler; same parameters, same bits."""
    parts = np.empty((2 * rows.shape[0], rows.shape[1]), np.complex64)
    parts[::2], parts[1::2] = rows.real, rows.imag
    lack = np.empty(out.size, np.complex64)
    take_samples(lack, parts, half=half, hop=hop)
    factor = (np.float32(1) - lack.real) * np.float32(gain)
    np.multiply(source.real[: out.size], factor, out=out.real)
    np.multiply(source.imag[: out.size], factor, out=out.imag)


@cache
def _compile() -> tuple[Callable[..., None], ...] | None:
    """Return the compiled loops, or None where numba is missing or switched off."""
    kinds = numba_types()
    if kinds is None:
        return None
    f32 = kinds.float32
    plane, line = kinds.Array(f32, 2, "C"), kinds.Array(f32, 1, "C")
    held = kinds.Array(f32, 1, "C", readonly=True)
    grid = kinds.UniTuple(kinds.int64, 2)
    filled = kinds.void(plane, held, grid, kinds.UniTuple(f32, 2))
    taken = kinds.void(line, held, plane, grid, f32)
    return compiled(filled, _peaks), compiled(filled, _lack), compiled(taken, _lower)


def _peaks(
    rows: Rails, samples: Rails, grid: tuple[int, int], limits: tuple[np.float32, np.float32]
) -> None:
    (hop, reach), (limit, top) = grid, limits
    shared = rows.shape[1] - 2 * hop
    power = np.empty(rows.shape[1] // 2 + 2 * reach, np.float32)
    for number in range(rows.shape[0]):
        first = 0
        if number:  # what the row before has already
            held = rows[number - 1, 2 * hop :]
            for k in range(shared):
                rows[number, k] = held[k]
            first = shared
        row, taken = rows[number, first:], samples[2 * number * hop + first :]
        for k in range(row.size):
            row[k] = np.float32(0)
        n = min(row.size // 2, taken.size // 2 - 2 * reach)
        for k in range(n + 2 * reach if n > 0 else 0):
            power[k] = taken[2 * k] * taken[2 * k] + taken[2 * k + 1] * taken[2 * k + 1]
        for k in range(n):
            here = power[k + reach]
            if here > limit:
                step = 1
                while step <= reach and here > power[k + reach - step]:
                    if here < power[k + reach + step]:
                        break
                    step += 1
                if step > reach:
                    share = np.float32(1) - top / np.sqrt(here)
                    place = 2 * (k + reach)
                    row[2 * k], row[2 * k + 1] = taken[place] * share, taken[place + 1] * share


def _lack(
    rows: Rails, samples: Rails, grid: tuple[int, int], limits: tuple[np.float32, np.float32]
) -> None:
    (hop, reach), (limit, top) = grid, limits
    one, zero = np.float32(1), np.float32(0)
    n_fft = rows.shape[1] // 2
    room = np.empty((2, n_fft + 2 * reach), np.float32)
    for part in range(2 * rows.shape[0]):
        row, taken = rows[part // 2, part % 2 :], samples[2 * part * hop :]
        n = max(min(n_fft, taken.size // 2 - 2 * reach), 0)
        left, width, which = 2 * reach, 1, 0
        short = room[0]
        for k in range(n + left if n else 0):
            power = taken[2 * k] * taken[2 * k] + taken[2 * k + 1] * taken[2 * k + 1]
            short[k] = one - top / np.sqrt(power) if power > limit else zero
        while left:  # maxima of 2, 4, 8 ... in a row, then of two stretches that overlap
            step = min(width, left)
            left -= step
            here, ahead, there = room[which], room[which, step:], room[1 - which]
            for k in range(n + left):
                there[k] = max(here[k], ahead[k])
            which, width = 1 - which, 2 * width
        found = room[which]
        for k in range(n):
            row[2 * k] = found[k]
        for k in range(n, n_fft):
            row[2 * k] = zero


def _lower(out: Rails, source: Rails, rows: Rails, grid: tuple[int, int], gain: np.float32) -> None:
    half, hop = grid
    for part in range(2 * rows.shape[0]):
        lack = rows[part // 2, 2 * half + part % 2 :]
        made, x = out[2 * part * hop :], source[2 * part * hop :]
        for k in range(min(made.size // 2, hop)):
            factor = (np.float32(1) - lack[2 * k]) * gain
            made[2 * k], made[2 * k + 1] = x[2 * k] * factor, x[2 * k + 1] * factor
