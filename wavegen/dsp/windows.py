"""The Kaiser window and finite filters designed with it; frequencies are per sample."""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray
from scipy import special

STOPBAND_DB = 100.0
"""Default rejection: 4 dB under the steps of a 16-bit converter, relative to full scale."""
_MARGIN_DB = 1.0
"""Kaiser's formulas are a fit, up to 0.6 dB short (measured): designs aim this much deeper."""
_PER_TRANSITION = 2.285 * 4 * math.pi
"""Kaiser 1974, with the half length and cycles per sample in place of length and radians."""


def kaiser_beta(stopband_db: float) -> float:
    """Return the window parameter for a stopband rejection.

    Parameters
    ----------
    stopband_db : float
        Rejection, dB below the passband, above 21.

    Returns
    -------
    float

    Notes
    -----
    J. F. Kaiser, "Nonrecursive digital filter design using the I0-sinh window function",
    Proc. IEEE Int. Symp. Circuits and Systems, 1974.

    Examples
    --------
    >>> round(kaiser_beta(100.0), 4)
    10.0613
    """
    if stopband_db > 50:
        return 0.1102 * (stopband_db - 8.7)
    above = max(stopband_db - 21.0, 0.0)
    return float(0.5842 * above**0.4 + 0.07886 * above)


def kaiser_half_length(*, transition: float, stopband_db: float = STOPBAND_DB) -> int:
    """Return how many taps a filter needs on each side of its middle one.

    Parameters
    ----------
    transition : float
        Width from passband edge to stopband edge, cycles per sample.
    stopband_db : float
        Rejection, dB.

    Returns
    -------
    int

    Notes
    -----
    ``2 h >= (A - 7.95) / (2.285 * 2 pi * transition)``, Kaiser 1974.

    Examples
    --------
    >>> kaiser_half_length(transition=0.01)
    321
    """
    return max(math.ceil((stopband_db - 7.95) / (_PER_TRANSITION * transition)), 1)


def kaiser_transition(*, half_length: int, stopband_db: float = STOPBAND_DB) -> float:
    """Return the steepest transition that a filter of given length reaches, cycles per sample.

    Examples
    --------
    >>> round(kaiser_transition(half_length=321), 5)
    0.00999
    """
    return (stopband_db - 7.95) / (_PER_TRANSITION * half_length)


def kaiser_window(half_length: int, beta: float) -> NDArray[np.float64]:
    """Return the symmetric Kaiser window, 1 in the middle.

    Parameters
    ----------
    half_length : int
        Points on each side of the middle one.
    beta : float
        From :func:`kaiser_beta`.

    Returns
    -------
    float64 array, shape (2 half_length + 1,)
    """
    place = np.arange(-half_length, half_length + 1) / max(half_length, 1)
    return np.asarray(special.i0(beta * np.sqrt(1 - place * place)) / special.i0(beta))


def design_lowpass(
    *, passband_edge: float, stopband_edge: float, stopband_db: float = STOPBAND_DB
) -> NDArray[np.float64]:
    """Design a zero-phase lowpass.

    Parameters
    ----------
    passband_edge, stopband_edge : float
        Cycles per sample, ``0 <= passband_edge < stopband_edge``. Half amplitude lies midway.
    stopband_db : float
        Rejection beyond ``stopband_edge``, dB; the passband ripples by as much.

    Returns
    -------
    float64 array, shape (2 h + 1,)
        Symmetric about the middle tap, which belongs to lag zero; sum 1.
    """
    aim = stopband_db + _MARGIN_DB
    half = kaiser_half_length(transition=stopband_edge - passband_edge, stopband_db=aim)
    cutoff = (passband_edge + stopband_edge) / 2
    lag = np.arange(-half, half + 1)
    taps = np.sinc(2 * cutoff * lag) * kaiser_window(half, kaiser_beta(aim))
    return np.asarray(taps / taps.sum())


def design_bandpass(
    *,
    centre: float,
    passband_width: float,
    stopband_width: float,
    stopband_db: float = STOPBAND_DB,
) -> NDArray[np.complex128]:
    """Design a one-sided bandpass for complex samples: a lowpass moved in frequency.

    Parameters
    ----------
    centre : float
        Middle of the band, cycles per sample; may be negative.
    passband_width, stopband_width : float
        Full widths, cycles per sample: flat inside the first, rejected outside the second.
    stopband_db : float
        Rejection, dB.

    Returns
    -------
    complex128 array, shape (2 h + 1,)
        Conjugate-symmetric about the middle tap (its frequency response is real).
    """
    lowpass = design_lowpass(
        passband_edge=passband_width / 2,
        stopband_edge=stopband_width / 2,
        stopband_db=stopband_db,
    )
    lag = np.arange(lowpass.size) - lowpass.size // 2
    return np.asarray(lowpass * np.exp(2j * np.pi * centre * lag))
