"""How far samples stand over an amplitude: the piece of them that a limiter would cut off.

All functions are local and elementwise, so that no answer depends on how a range is cut. A compiled
loop finds the peaks of rows where numba is installed; plain NumPy gives the same bits otherwise and
is its referee.
"""

from __future__ import annotations

from collections.abc import Callable
from functools import cache

import numpy as np
from numpy.typing import NDArray

from wavegen.core.signal import Samples
from wavegen.dsp.compiled import compiled, numba_types

BLOCK_SAMPLES = 1 << 14
"""Samples worked on at once: 128 kB in, 128 kB out, 64 kB of power."""


def power_of(samples: Samples, *, out: NDArray[np.float32] | None = None) -> NDArray[np.float32]:
    """Return ``|x|^2``.

    Parameters
    ----------
    samples : complex64 array, shape (n,)
        Any.
    out : float32 array, shape (n,), optional
        Where it goes.

    Returns
    -------
    float32 array, shape (n,)
    """
    power = np.empty(samples.size, np.float32) if out is None else out
    squared = np.empty((2, min(BLOCK_SAMPLES, samples.size)), np.float32)
    for low in range(0, samples.size, BLOCK_SAMPLES):
        block = samples[low : low + BLOCK_SAMPLES]
        real, imag = squared[0, : block.size], squared[1, : block.size]
        np.multiply(block.real, block.real, out=real)
        np.multiply(block.imag, block.imag, out=imag)
        np.add(real, imag, out=power[low : low + BLOCK_SAMPLES])
    return power


def row_peaks(rows: Samples) -> NDArray[np.float32]:
    """Return the highest ``|x|^2`` of each row.

    Parameters
    ----------
    rows : complex64 array, shape (n_rows, n)
        Contiguous; not changed.

    Returns
    -------
    float32 array, shape (n_rows,)
    """
    kernel = _compile()
    if kernel is None:
        return row_peaks_by_numpy(rows)
    out = np.empty(rows.shape[0], np.float32)
    kernel(rows.view(np.float32), out)
    return out


def row_peaks_by_numpy(rows: Samples) -> NDArray[np.float32]:
    """Do what :func:`row_peaks` does, without a compiler; same parameters, same bits."""
    power = power_of(rows.reshape(-1)).reshape(rows.shape)
    return np.asarray(np.max(power, axis=1))


def clip_share(power: NDArray[np.float32], amplitude: float) -> NDArray[np.float32]:
    """Return ``1 - A / |x|`` where ``|x|^2 > A^2``, else zero: the share that a clip takes.

    Parameters
    ----------
    power : float32 array
        ``|x|^2``; not changed.
    amplitude : float
        Largest envelope let through, ``A``.

    Returns
    -------
    float32 array, same shape
        0 to 1.
    """
    with np.errstate(divide="ignore"):
        share = np.float32(1) - np.float32(amplitude) / np.sqrt(power)
    return np.where(power > np.float32(amplitude * amplitude), share, np.float32(0))


def excess_over(samples: Samples, amplitude: float) -> Samples:
    """Return what a polar clip takes away: ``x (1 - A / |x|)`` where ``|x| > A``, else zero.

    Parameters
    ----------
    samples : complex64 array, shape (n,)
        Not changed.
    amplitude : float
        Largest envelope let through, ``A``.

    Returns
    -------
    complex64 array, shape (n,)
        Owned by the caller.

    Examples
    --------
    >>> excess_over(np.array([3 + 4j, 1j], np.complex64), 2.5).tolist()
    [(1.5+2j), 0j]
    """
    share = clip_share(power_of(samples), amplitude)
    made = np.empty(samples.size, np.complex64)
    np.multiply(samples.real, share, out=made.real)
    np.multiply(samples.imag, share, out=made.imag)
    return made


@cache
def _compile() -> Callable[..., None] | None:
    """Return the compiled loop, or None where numba is missing or switched off."""
    kinds = numba_types()
    if kinds is None:
        return None
    f32 = kinds.float32
    held = kinds.Array(f32, 2, "C", readonly=True)
    signature = kinds.void(held, kinds.Array(f32, 1, "C"))
    return compiled(signature, _peaks)


def _peaks(rows: NDArray[np.float32], out: NDArray[np.float32]) -> None:
    lanes = np.empty(8, np.float32)  # eight maxima at once: one alone waits for itself
    for row in range(rows.shape[0]):
        lanes[:] = 0
        n = rows.shape[1] // 2
        for k in range(0, n - n % 8, 8):
            for lane in range(8):
                real, imag = rows[row, 2 * (k + lane)], rows[row, 2 * (k + lane) + 1]
                lanes[lane] = max(lanes[lane], real * real + imag * imag)
        for k in range(n - n % 8, n):
            real, imag = rows[row, 2 * k], rows[row, 2 * k + 1]
            lanes[0] = max(lanes[0], real * real + imag * imag)
        out[row] = lanes.max()


def shortfall_of(samples: Samples, amplitude: float) -> NDArray[np.float32]:
    """Return ``1 - A / |x|`` where ``|x| > A``, else zero: the gain that a clip lacks.

    Parameters
    ----------
    samples : complex64 array, shape (n,)
        Not changed.
    amplitude : float
        Largest envelope let through, ``A``.

    Returns
    -------
    float32 array, shape (n,)
        0 to 1.
    """
    return clip_share(power_of(samples), amplitude)


def local_peaks(values: NDArray[np.float32], *, over: float, reach: int) -> NDArray[np.intp]:
    """Return where values pass a threshold and no neighbour within reach stands higher.

    Parameters
    ----------
    values : float32 array, shape (n,)
        At least ``2 reach`` of them.
    over : float
        Threshold, itself excluded.
    reach : int
        Neighbours compared on each side; of equals the first counts. Places nearer than this
        to an end are never returned.

    Returns
    -------
    int array
        Rising indices.

    Examples
    --------
    >>> local_peaks(np.array([0, 2, 5, 5, 1, 0, 3, 0, 0], np.float32), over=1, reach=2).tolist()
    [2, 6]
    """
    places = np.flatnonzero(values[reach : values.size - reach] > np.float32(over)) + reach
    for step in range(1, reach + 1):
        here = values[places]
        places = places[(here > values[places - step]) & (here >= values[places + step])]
    return places


def dilate(values: NDArray[np.float32], reach: int) -> NDArray[np.float32]:
    """Return the largest value within reach of each place that has all its neighbours.

    Parameters
    ----------
    values : float32 array, shape (n,)
        Not changed.
    reach : int
        Neighbours on each side.

    Returns
    -------
    float32 array, shape (n - 2 reach,)

    Notes
    -----
    Maxima over 2, 4, 8, ... values in a row, then of two overlapping stretches (M. van Herk, 1992,
    has a faster form; this one is elementwise).

    Examples
    --------
    >>> dilate(np.array([0, 1, 0, 0, 3, 0, 0], np.float32), 1).tolist()
    [1.0, 1.0, 3.0, 3.0, 3.0]
    """
    length = 2 * reach + 1
    wide, width = values, 1
    while 2 * width <= length:
        wide = np.maximum(wide[: wide.size - width], wide[width:])
        width *= 2
    rest = length - width
    if not rest:
        return wide.copy() if wide is values else wide
    return np.maximum(wide[: wide.size - rest], wide[rest:])
