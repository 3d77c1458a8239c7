"""Finite filters that follow a frequency response inside a band."""

from __future__ import annotations

from collections.abc import Callable
from typing import NamedTuple

import numpy as np
import scipy.fft
from numpy.typing import NDArray

from wavegen.dsp.occupied_bands import Band

Reals = NDArray[np.float64]
Complexes = NDArray[np.complex128]
Taps = NDArray[np.float64] | NDArray[np.complex128]
LogResponse = Callable[[Reals], Complexes]
"""Natural logarithm of the response, with the phase as imaginary part, at frequencies in cycles per
sample; defined somewhat beyond the band too."""

SHORTEST = 16
FINER = 8
"""Points of the grid on which a filter is designed, over its half length."""


class Fit(NamedTuple):
    """A filter and how far it is from what was wanted.

    Parameters
    ----------
    taps : array, shape (2 h + 1,)
        The middle tap belongs to lag zero.
    error : float
        Largest ``|filter / response - 1|`` inside the band.
    """

    taps: Taps
    error: float


def smooth_step(place: Reals) -> Reals:
    """Return a step from 0 at 0 to 1 at 1 all of whose slopes are continuous.

    Examples
    --------
    >>> smooth_step(np.array([-1.0, 0.0, 0.5, 1.0])).tolist()
    [0.0, 0.0, 0.5, 1.0]
    """
    rising, falling = _flat(place), _flat(1 - place)
    return np.asarray(rising / (rising + falling))


def _flat(place: Reals) -> Reals:
    """Return ``exp(-1/x)`` above zero, 0 below."""
    inside = place > 0
    return np.where(inside, np.exp(-1 / np.where(inside, place, 1.0)), 0.0)


def fit_response(response: LogResponse, band: Band, *, tolerance: float, longest: int) -> Fit:
    """Design the shortest filter that follows a response inside a band well enough.

    Parameters
    ----------
    response : callable
        What is wanted.
    band : Band
        Where, cycles per sample; narrower than 1.
    tolerance : float
        Largest relative error inside the band.
    longest : int
        Most taps on each side of the middle one.

    Returns
    -------
    Fit
        The longest filter where none is good enough: see its error.

    Notes
    -----
    Between the upper end of the band and the lower one, round half the sample rate, the response
    goes over smoothly from one continuation to the other, so that the impulse response of a
    smooth one falls faster than any power and may be cut without a window.
    """
    half = SHORTEST
    while True:
        taps = _taps(_closed(response, band, FINER * half), half)
        error = _error(taps, response, band)
        if error <= tolerance or half >= longest:
            return Fit(taps, error)
        half *= 2


def _closed(response: LogResponse, band: Band, n: int) -> Complexes:
    """Return the response on ``n`` points of the whole circle, in the order of the FFT."""
    place = (scipy.fft.fftfreq(n) - band.low) % 1.0 + band.low
    share = smooth_step((place - band.high) / (1 - band.width))
    before = np.where(share < 1, response(np.where(share < 1, place, band.high)), 0.0)
    after = np.where(share > 0, response(np.where(share > 0, place - 1, band.low)), 0.0)
    return np.asarray(np.exp((1 - share) * before + share * after))


def _taps(lines: Complexes, half: int) -> Taps:
    impulse = scipy.fft.ifft(lines)
    taps = impulse[np.arange(-half, half + 1)]
    is_real = bool(np.abs(taps.imag).max() < 1e-13 * np.abs(taps).max())
    return np.ascontiguousarray(taps.real) if is_real else taps


def _error(taps: Taps, response: LogResponse, band: Band) -> float:
    half = taps.size // 2
    n = 2 * FINER * half
    placed = np.zeros(n, np.complex128)
    placed[np.arange(-half, half + 1)] = taps
    place = (scipy.fft.fftfreq(n) - band.low) % 1.0 + band.low
    inside = place <= band.high
    got = np.asarray(scipy.fft.fft(placed))[inside]
    return float(np.abs(got / np.exp(response(place[inside])) - 1).max())


def derivative_taps(order: int, half_length: int, *, passband: float) -> NDArray[np.float64]:
    """Design a filter that differentiates with respect to the sample index.

    Parameters
    ----------
    order : {1, 2}
        First or second derivative.
    half_length : int
        Taps on each side of the middle one.
    passband : float
        Frequency up to which it does, cycles per sample, below 0.5; it falls smoothly to zero
        from there to 0.5.

    Returns
    -------
    float64 array, shape (2 half_length + 1,)
        Odd about the middle for the first, even for the second.
    """
    place = scipy.fft.fftfreq(FINER * half_length)
    fall = 1 - smooth_step((np.abs(place) - passband) / (0.5 - passband))
    impulse = scipy.fft.ifft((2j * np.pi * place) ** order * fall).real
    return np.asarray(impulse[np.arange(-half_length, half_length + 1)])
