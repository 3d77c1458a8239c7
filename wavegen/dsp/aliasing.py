"""How much of what a nonlinear step makes lies beyond half the sample rate, and folds back."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import scipy.fft
from numpy.typing import NDArray

from wavegen.core.evaluate import evaluate
from wavegen.core.signal import Signal
from wavegen.dsp.interpolation import delay_taps

FACTOR = 4
"""The step is tried at so many times the sample rate."""
STRETCH_SAMPLES = 1 << 11
N_STRETCHES = 32
KAISER_BETA = 14.0
"""Side lobes at -136 dB (J. F. Kaiser, 1974)."""
_GOLDEN = 0.6180339887498949
"""Places follow the multiples of the golden section: no period of a gate keeps step with them."""

Process = Callable[[NDArray[np.complex128]], NDArray[np.complex128]]


def folded_share(signal: Signal, process: Process, *, halo: int = 0) -> float:
    """Return the power that a step puts beyond half the sample rate, over all that it puts out.

    Parameters
    ----------
    signal : Signal
        What the step is given; 32 stretches of 2048 samples are computed.
    process : callable
        The step at 4 times the sample rate: takes ``4 (n + 2 halo)`` samples, returns the ``4 n``
        in the middle.
    halo : int
        Samples that the step reads beyond what it makes, at the sample rate.

    Returns
    -------
    float
        0 to 1; computed at the sample rate itself, so much folds back into the band.

    Notes
    -----
    The signal is taken as band-limited to 0.9 of half its rate; what the step puts beyond twice
    the sample rate is counted where it folds to at 4 times that rate.
    """
    bank = [delay_taps(-k / FACTOR) for k in range(1, FACTOR)]
    reach = bank[0].size // 2
    length = STRETCH_SAMPLES + 2 * halo
    window = np.kaiser(FACTOR * STRETCH_SAMPLES + 1, KAISER_BETA)[:-1]
    spectrum = np.zeros(window.size)
    for number in range(N_STRETCHES):
        start = int(number * _GOLDEN % 1.0 * signal.n_samples) - halo
        wide = evaluate({signal: (start - reach, start + length + reach)})[signal]
        wide = wide.astype(np.complex128)
        fine = np.empty((length, FACTOR), np.complex128)
        fine[:, 0] = wide[reach : reach + length]
        for column, taps in enumerate(bank, 1):
            fine[:, column] = np.convolve(wide, taps, "valid")
        spectrum += np.abs(scipy.fft.fft(process(fine.ravel()) * window)) ** 2
    total = float(spectrum.sum())
    far = np.abs(scipy.fft.fftfreq(window.size, 1 / FACTOR)) > 0.5
    return float(spectrum[far].sum()) / total if total else 0.0
