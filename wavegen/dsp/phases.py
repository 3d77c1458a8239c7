"""Phase laws for multitones: radians by tone number, tones in the order of frequency."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from wavegen.core.rng import random_words


def equal_phases(count: int) -> NDArray[np.float64]:
    """Return zeros: all tones peak together, ``10 log10(count)`` dB over the mean.

    Parameters
    ----------
    count : int
        Tones.

    Returns
    -------
    float64 array, shape (count,)
        Radians.
    """
    return np.zeros(count)


def random_phases(key: NDArray[np.uint64], count: int) -> NDArray[np.float64]:
    """Return independent phases, uniform over the circle.

    Parameters
    ----------
    key : uint64 array, shape (2,)
        Stream, from :func:`wavegen.core.rng.stream_key`.
    count : int
        Tones.

    Returns
    -------
    float64 array, shape (count,)
        Radians, 0 to 2 pi.
    """
    words = random_words(key, 0, count, period=count, width_bytes=8)
    return words.astype(np.float64) * (2 * np.pi * 2.0**-64)


def newman_phases(count: int) -> NDArray[np.float64]:
    """Return Newman's quadratic phases ``pi (k - 1)^2 / N``, for equal, evenly spaced tones.

    Parameters
    ----------
    count : int
        Tones.

    Returns
    -------
    float64 array, shape (count,)
        Radians.

    Notes
    -----
    D. J. Newman, 1965; S. Boyd, "Multitone signals with low crest factor", IEEE Trans.
    Circuits and Systems 33(10), 1986. About 2.6 dB over the mean from 16 tones on.
    """
    number = np.arange(count, dtype=np.int64)
    return np.pi * (number * number % (2 * count)) / count


def schroeder_phases(powers: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return Schroeder's phases for evenly spaced tones of any power.

    Parameters
    ----------
    powers : float64 array, shape (count,)
        Powers on any scale, not all zero.

    Returns
    -------
    float64 array, shape (count,)
        Radians; ``phi_n = phi_1 - 2 pi sum_{l < n} (n - l) p_l`` with the powers adding to 1.

    Notes
    -----
    M. R. Schroeder, "Synthesis of low-peak-factor signals and binary sequences with low
    autocorrelation", IEEE Trans. Information Theory 16, 1970: the instantaneous frequency
    dwells at each tone for a time in proportion to its power.
    """
    share = powers / powers.sum()
    before = np.concatenate(([0.0], np.cumsum(share)[:-1]))
    return np.asarray(-2 * np.pi * np.cumsum(before))


def rudin_shapiro_phases(count: int) -> NDArray[np.float64]:
    """Return phases 0 or pi by the Rudin-Shapiro sequence.

    Parameters
    ----------
    count : int
        Tones; the bound below holds for powers of two.

    Returns
    -------
    float64 array, shape (count,)
        Radians.

    Notes
    -----
    Tone ``k`` (from 0) is turned round where the binary digits of ``k`` hold an odd number of
    neighbouring ones. H. S. Shapiro, 1951; W. Rudin, 1959: for ``count`` a power of two the
    peak is at most twice the mean, 3.01 dB.

    Examples
    --------
    >>> [int(phase > 0) for phase in rudin_shapiro_phases(8)]
    [0, 0, 0, 1, 0, 0, 1, 0]
    """
    number = np.arange(count, dtype=np.int64)
    pairs = number & (number >> 1)
    for shift in (32, 16, 8, 4, 2, 1):
        pairs ^= pairs >> shift
    return np.asarray(np.pi * (pairs & 1), dtype=np.float64)
