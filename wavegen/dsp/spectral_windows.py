"""Windows of a spectral estimate, and what they do to noise and to lines."""

from __future__ import annotations

from typing import Literal, get_args

import numpy as np
from numpy.typing import NDArray

WindowName = Literal["kaiser", "blackman_harris", "hann", "rectangular"]
WINDOW_NAMES: tuple[str, ...] = get_args(WindowName)

KAISER_BETA = 16.0
"""Side lobes 122 dB under the main one, which reaches 5.2 bins to either side (computed)."""


def spectral_window(name: WindowName, length: int) -> NDArray[np.float64]:
    """Return a window in its periodic form (one point of the symmetric form left out).

    Parameters
    ----------
    name : str
        ``kaiser`` (beta 16, side lobes -122 dB), ``blackman_harris`` (four terms, -92 dB),
        ``hann`` (-31 dB, falling by 18 dB an octave) or ``rectangular``.
    length : int
        Points.

    Returns
    -------
    float64 array, shape (length,)
        Largest value 1.

    Notes
    -----
    F. J. Harris, "On the use of windows for harmonic analysis with the discrete Fourier
    transform", Proc. IEEE 66(1), 1978; J. F. Kaiser, R. W. Schafer, IEEE Trans. Acoust. Speech
    Signal Process. 28(1), 1980: ``beta = 0.12438 (A + 6.3)`` for side lobes ``A`` dB down.
    """
    turn = 2 * np.pi * np.arange(length) / length
    if name == "hann":
        return np.asarray(0.5 - 0.5 * np.cos(turn))
    if name == "blackman_harris":
        terms = (0.35875, -0.48829, 0.14128, -0.01168)
        return np.asarray(sum(a * np.cos(k * turn) for k, a in enumerate(terms)))
    if name == "kaiser":
        return np.asarray(np.kaiser(length + 1, KAISER_BETA)[:-1])
    return np.ones(length)


def noise_bandwidth_bins(window: NDArray[np.float64]) -> float:
    """Return the width of the ideal filter that passes as much noise as a bin, in bins.

    Examples
    --------
    >>> round(noise_bandwidth_bins(spectral_window("hann", 1024)), 6)
    1.5
    """
    return float(window.size * np.sum(window**2) / np.sum(window) ** 2)
