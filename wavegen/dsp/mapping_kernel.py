"""Points of symbol numbers written to their FFT bins, in one pass over memory.

A compiled loop does it where numba is installed; plain NumPy gives the same bits otherwise and is
the referee of the compiled loop. Nothing is computed, values are only looked up and moved.
"""

from __future__ import annotations

from collections.abc import Callable
from functools import cache, lru_cache

import numpy as np
from numpy.typing import NDArray

from wavegen.core.signal import Samples
from wavegen.dsp.compiled import compiled, numba_types

_MOST_SLICES = 40
"""Up to here NumPy fills slice by slice; beyond, one scatter is faster."""


def write_points(
    rows: Samples,
    words: NDArray[np.unsignedinteger],
    *,
    table: Samples,
    bins: NDArray[np.uint32],
    places: NDArray[np.intp] | None = None,
) -> None:
    """Write ``table[words]`` into columns ``bins`` of rows.

    Parameters
    ----------
    rows : complex64 array, shape (n_symbols, n_fft)
        Written to, in columns ``bins`` only; contiguous.
    words : uint8 or uint16 array, shape (n_symbols, n) or (n_places, n)
        Their low bits number the points; contiguous.
    table : complex64 array, shape (order,)
        A power of 2 entries.
    bins : uint32 array, shape (n,)
        Column of each word, below ``n_fft``.
    places : intp array, shape (n_places,), optional
        Row of each row of words; all rows in turn unless given.
    """
    kernel = _compile()
    if kernel is None:
        write_points_by_numpy(rows, words, table=table, bins=bins, places=places)
        return
    where = np.arange(words.shape[0]) if places is None else places
    # one 8-byte move a point, where complex64 would be two of 4
    kernel(rows.view(np.uint64), words, table.view(np.uint64), bins, where)


def write_points_by_numpy(
    rows: Samples,
    words: NDArray[np.unsignedinteger],
    *,
    table: Samples,
    bins: NDArray[np.uint32],
    places: NDArray[np.intp] | None = None,
) -> None:
    """Do what :func:`write_points` does, without a compiler; same parameters."""
    values = table.take(words & words.dtype.type(min(table.size, 1 << 16) - 1))
    write_values(rows, values, bins=bins, places=places)


def write_values(
    rows: Samples,
    values: Samples,
    *,
    bins: NDArray[np.uint32],
    places: NDArray[np.intp] | None = None,
) -> None:
    """Write values into columns ``bins`` of rows.

    Parameters
    ----------
    rows : complex64 array, shape (n_symbols, n_fft)
        Written to, in columns ``bins`` only.
    values : complex64 array, shape (n_symbols, n) or (n_places, n)
        What is written.
    bins : uint32 array, shape (n,)
        Column of each value, below ``n_fft``.
    places : intp array, shape (n_places,), optional
        Row of each row of values; all rows in turn unless given.
    """
    where = slice(None) if places is None else places
    stretches = _slices(bins.tobytes())
    if len(stretches) > _MOST_SLICES:
        rows[where if places is None else places[:, None], bins] = values
    else:
        for columns, stretch in stretches:
            rows[where, stretch] = values[:, columns]


def read_values(rows: Samples, *, bins: NDArray[np.uint32]) -> Samples:
    """Return columns ``bins`` of rows: the reverse of :func:`write_values`.

    Parameters
    ----------
    rows : complex64 array, shape (n_rows, n_fft)
        Not changed.
    bins : uint32 array, shape (n,)
        Columns, below ``n_fft``.

    Returns
    -------
    complex64 array, shape (n_rows, n)
        Owned by the caller.
    """
    stretches = _slices(bins.tobytes())
    if len(stretches) > _MOST_SLICES:
        return np.take(rows, bins, axis=1)
    values = np.empty((rows.shape[0], bins.size), np.complex64)
    for columns, stretch in stretches:
        values[:, columns] = rows[:, stretch]
    return values


@lru_cache(maxsize=64)
def _slices(bins: bytes) -> tuple[tuple[slice, slice], ...]:
    return slices_of(np.frombuffer(bins, np.uint32).tolist())


def slices_of(bins: list[int]) -> tuple[tuple[slice, slice], ...]:
    """Return which stretches of words go to which evenly spaced columns.

    Examples
    --------
    >>> slices_of([7, 8, 9, 2, 4])
    ((slice(0, 3, None), slice(7, 10, 1)), (slice(3, 5, None), slice(2, 5, 2)))
    """
    found: list[tuple[slice, slice]] = []
    n, i = len(bins), 0
    while i < n:
        step = max(bins[i + 1] - bins[i], 1) if i + 1 < n else 1
        j = i + 1
        while j < n and bins[j] - bins[j - 1] == step:
            j += 1
        found.append((slice(i, j), slice(bins[i], bins[j - 1] + 1, step)))
        i = j
    return tuple(found)


@cache
def _compile() -> Callable[..., None] | None:
    kinds = numba_types()
    if kinds is None:
        return None
    signatures = [
        kinds.void(
            kinds.Array(kinds.uint64, 2, "C"),
            kinds.Array(word, 2, "C"),
            kinds.Array(kinds.uint64, 1, "C"),
            kinds.Array(kinds.uint32, 1, "C"),
            kinds.Array(kinds.intp, 1, "C"),
        )
        for word in (kinds.uint8, kinds.uint16)
    ]
    return compiled(signatures, _write)


def _write(
    rows: NDArray[np.uint64],
    words: NDArray[np.unsignedinteger],
    table: NDArray[np.uint64],
    bins: NDArray[np.uint32],
    places: NDArray[np.intp],
) -> None:
    mask = np.uint32(table.size - 1)
    for k in range(places.size):
        row, numbers = rows[places[k]], words[k]
        for i in range(bins.size):
            row[bins[i]] = table[np.uint32(numbers[i]) & mask]
