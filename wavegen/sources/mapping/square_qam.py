"""Square quadrature amplitude modulation, Gray labels on each axis."""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

from wavegen.sources.mapping.constellation import Constellation


def axis_levels(bits: NDArray[np.int64]) -> NDArray[np.float64]:
    """Return odd-integer levels from the bits of one axis.

    Parameters
    ----------
    bits : int array, shape (..., m)
        Zeros and ones, the bit that chooses the sign first.

    Returns
    -------
    float64 array, shape (...)
        ``s0 (2^(m-1) - s1 (2^(m-2) - ... - s(m-1)))`` with ``s = 1 - 2 b``: the odd numbers
        from ``1 - 2^m`` to ``2^m - 1``, neighbours one bit apart.

    Notes
    -----
    Source: 3GPP TS 38.211 v19, cl. 5.1.4 to 5.1.7.

    Examples
    --------
    >>> axis_levels(np.array([[1, 1], [1, 0], [0, 0], [0, 1]])).tolist()
    [-3.0, -1.0, 1.0, 3.0]
    """
    signs: NDArray[np.float64] = 1.0 - 2.0 * bits.astype(np.float64)
    level: NDArray[np.float64] = signs[..., -1]
    for place in range(1, bits.shape[-1]):
        level = signs[..., -1 - place] * (float(1 << place) - level)
    return level


def split_bits(n_bits: int) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """Return the bits of every symbol number, dealt in turn to the two axes.

    Parameters
    ----------
    n_bits : int
        Bits a symbol; the first bit is the most significant of the symbol number.

    Returns
    -------
    in_phase, quadrature : int array, shape (2**n_bits, ceil and floor of n_bits / 2)
        Even-indexed bits (the first, third ...) on I, odd-indexed on Q.
    """
    numbers = np.arange(1 << n_bits)[:, None]
    bits = (numbers >> np.arange(n_bits - 1, -1, -1)) & 1
    return bits[:, 0::2], bits[:, 1::2]


def square_points(n_bits: int) -> NDArray[np.complex128]:
    """Return the points of square QAM by symbol number.

    Parameters
    ----------
    n_bits : int
        Bits a symbol, even: 2 (QPSK), 4, 6 ...

    Returns
    -------
    complex128 array, shape (2**n_bits,)
        Unit mean power: odd integers on both axes over ``sqrt(2 (M - 1) / 3)``.
    """
    in_phase, quadrature = split_bits(n_bits)
    points: NDArray[np.complex128] = axis_levels(in_phase) + 1j * axis_levels(quadrature)
    return points / math.sqrt(2.0 * ((1 << n_bits) - 1) / 3.0)


def square_qam(n_bits: int) -> Constellation:
    """Return a square QAM with the bit mapping of TS 38.211.

    Parameters
    ----------
    n_bits : int
        Bits a symbol, even.

    Returns
    -------
    Constellation
        Peak over mean power ``3 (sqrt(M) - 1) / (sqrt(M) + 1)``.

    Notes
    -----
    Source: 3GPP TS 38.211 v19, cl. 5.1.4 to 5.1.7. 4096QAM is not in that standard: the same
    nesting is continued; its divisor ``sqrt(2730)`` is that of IEEE 802.11be.

    Examples
    --------
    >>> (square_qam(4).points[[0, 15]] * np.sqrt(10)).round(9)
    array([ 1.+1.j, -3.-3.j])
    """
    return Constellation(f"{1 << n_bits}qam", square_points(n_bits))


def qam16() -> Constellation:
    """Return 16QAM (TS 38.211 cl. 5.1.4)."""
    return square_qam(4)


def qam64() -> Constellation:
    """Return 64QAM (TS 38.211 cl. 5.1.5)."""
    return square_qam(6)


def qam256() -> Constellation:
    """Return 256QAM (TS 38.211 cl. 5.1.6)."""
    return square_qam(8)


def qam1024() -> Constellation:
    """Return 1024QAM (TS 38.211 cl. 5.1.7)."""
    return square_qam(10)


def qam4096() -> Constellation:
    """Return 4096QAM: the nesting of TS 38.211 continued by one bit an axis."""
    return square_qam(12)
