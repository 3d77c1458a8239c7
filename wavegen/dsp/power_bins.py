"""Bins of power: 512 an octave over every power that float32 samples can have.

Powers are rounded to float32, whose bits without the last 14 number the bins. Half a bin is added
first, so that round powers (1, a half) lie in the middle of a bin, and rounding does not tear in
two what should all be there. Exact zeros have no bin.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

BINS_PER_OCTAVE = 512
"""Linear bins an octave: at most ``10 log10(1 + 1/512)`` = 0.0085 dB wide."""
LOWEST_OCTAVE = -300
"""Power exponent of bin 0: below the square of the least float32 (2^-298)."""
N_OCTAVES = 560
N_BINS = N_OCTAVES * BINS_PER_OCTAVE


def bin_edges(first_bin: int, n_bins: int) -> NDArray[np.float64]:
    """Return the edges of bins, as power.

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
    >>> one = -LOWEST_OCTAVE * BINS_PER_OCTAVE
    >>> bin_edges(one, 2).tolist()
    [0.99951171875, 1.0009765625, 1.0029296875]
    """
    halves = 2 * np.arange(first_bin, first_bin + n_bins + 1) - 1
    octave, place = np.divmod(halves, 2 * BINS_PER_OCTAVE)
    edges: NDArray[np.float64] = np.ldexp(
        1.0 + place / (2 * BINS_PER_OCTAVE), octave + LOWEST_OCTAVE
    )
    return edges


def bin_of(power: float) -> int:
    """Return the number of the bin that holds a positive power that a float32 can state."""
    fraction, exponent = np.frexp(power)
    place = int((2.0 * float(fraction) - 1.0) * 2 * BINS_PER_OCTAVE)
    return (int(exponent) - 1 - LOWEST_OCTAVE) * BINS_PER_OCTAVE + (place + 1) // 2
