"""A look at a signal before it is rendered: its mean spectrum, from the same places every time."""

from __future__ import annotations

import numpy as np
import scipy.fft
from numpy.typing import NDArray

from wavegen.core.evaluate import evaluate
from wavegen.core.signal import Signal

WHOLE_SAMPLES = 1 << 16
"""Loops up to this length are transformed whole: their spectrum is exact."""
STRETCH_SAMPLES = 1 << 12
N_STRETCHES = 64
KAISER_BETA = 14.0
"""Side lobes at -136 dB (J. F. Kaiser: beta = 0.1102 (A - 8.7))."""
_GOLDEN = 0.6180339887498949
"""Places follow the multiples of the golden section: no period of a gate keeps step with them."""


def is_whole(signal: Signal) -> bool:
    """Return whether :func:`pilot_spectrum` sees the whole loop."""
    return signal.n_samples <= WHOLE_SAMPLES


def pilot_spectrum(signal: Signal) -> NDArray[np.float64]:
    """Return the mean power spectrum of a signal.

    Parameters
    ----------
    signal : Signal
        Some of it is computed: all of a loop up to 2^16 samples, else 64 stretches of 2^12
        spread over the loop.

    Returns
    -------
    float64 array, shape (n_bins,)
        Power in each bin, in the order of the FFT, on any scale. All zero for a signal that is.
    """
    if is_whole(signal):
        samples = evaluate({signal: (0, signal.n_samples)})[signal]
        return np.asarray(np.abs(scipy.fft.fft(samples.astype(np.complex128))) ** 2)
    window = np.kaiser(STRETCH_SAMPLES + 1, KAISER_BETA)[:-1]
    total = np.zeros(STRETCH_SAMPLES)
    for number in range(N_STRETCHES):
        start = int(number * _GOLDEN % 1.0 * signal.n_samples)
        samples = evaluate({signal: (start, start + STRETCH_SAMPLES)})[signal]
        total += np.abs(scipy.fft.fft(samples * window)) ** 2
    return total


def power_beyond(signal: Signal, edge: float) -> float:
    """Return the share of a signal's power that lies outside a band about zero.

    Parameters
    ----------
    signal : Signal
        Looked at by :func:`pilot_spectrum`.
    edge : float
        Half width of the band, cycles per sample.

    Returns
    -------
    float
        0 to 1; 0 for a signal without power.
    """
    spectrum = pilot_spectrum(signal)
    total = float(spectrum.sum())
    far = np.abs(scipy.fft.fftfreq(spectrum.size)) > edge
    return float(spectrum[far].sum()) / total if total else 0.0


def power_gain(signal: Signal, taps: NDArray[np.float64] | NDArray[np.complex128]) -> float | None:
    """Return what a filter leaves of a signal's mean power.

    Parameters
    ----------
    signal : Signal
        Looked at by :func:`pilot_spectrum`.
    taps : float64 or complex128 array, shape (n_taps,)
        The filter; a delay changes nothing.

    Returns
    -------
    float or None
        Output over input, a power ratio: exact for a loop that is seen whole. None for a signal
        without power.
    """
    spectrum = pilot_spectrum(signal)
    total = float(spectrum.sum())
    if not total:
        return None
    size = spectrum.size * -(-taps.size // spectrum.size)
    response = scipy.fft.fft(taps, size)[:: size // spectrum.size]
    return float(np.sum(spectrum * np.abs(response) ** 2)) / total
