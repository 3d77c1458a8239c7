"""Which parts of its sampled band a signal fills, and zero-phase filters of several bands."""

from __future__ import annotations

import math
from collections.abc import Iterable
from typing import NamedTuple

import numpy as np
import scipy.fft
from numpy.typing import NDArray

from wavegen.core.evaluate import evaluate
from wavegen.core.signal import Signal
from wavegen.dsp.windows import STOPBAND_DB, kaiser_beta, kaiser_half_length, kaiser_window

Taps = NDArray[np.float64] | NDArray[np.complex128]

N_BINS = 1 << 12
"""Points of a stretch and of its spectrum."""
N_STRETCHES = 64
KAISER_BETA = 14.0
"""Side lobes at -136 dB; the main lobe is 9 bins wide (J. F. Kaiser, 1974)."""
DEPTH_DB = 20.0
"""A bin this far under the density of the rest is empty: the side lobes of unwindowed OFDM pass
below it five subcarriers from the edge, those of filtered carriers inside their roll-off."""
_GOLDEN = 0.6180339887498949
"""Places follow the multiples of the golden section: no period of a gate keeps step with them."""
_MARGIN_DB = 1.0


class Band(NamedTuple):
    """A stretch of the spectrum, cycles per sample.

    Parameters
    ----------
    low, high : float
        ``-0.5 <= low < 0.5``, ``low < high <= low + 1``: a band over half the rate has ``high``
        above 0.5.
    """

    low: float
    high: float

    @property
    def width(self) -> float:
        """Full width."""
        return self.high - self.low

    @property
    def centre(self) -> float:
        """Middle."""
        return (self.high + self.low) / 2


WHOLE = (Band(-0.5, 0.5),)


def stretch_spectrum(signal: Signal) -> NDArray[np.float64]:
    """Return the mean power spectrum of 64 windowed stretches of a signal.

    Parameters
    ----------
    signal : Signal
        Any length; short loops are repeated.

    Returns
    -------
    float64 array, shape (4096,)
        In the order of the FFT, on any scale.
    """
    window = np.kaiser(N_BINS + 1, KAISER_BETA)[:-1]
    total = np.zeros(N_BINS)
    for number in range(N_STRETCHES):
        start = int(number * _GOLDEN % 1.0 * signal.n_samples)
        samples = evaluate({signal: (start, start + N_BINS)})[signal]
        total += np.abs(scipy.fft.fft(samples * window)) ** 2
    return total


def occupied_bands(
    spectrum: NDArray[np.float64], *, depth_db: float = DEPTH_DB
) -> tuple[Band, ...]:
    """Return the bands whose bins stand no deeper than so much under the signal's density.

    Parameters
    ----------
    spectrum : float64 array, shape (n_bins,)
        Power in each bin, in the order of the FFT.
    depth_db : float
        Depth under the mean density that the signal's power meets, ``sum p^2 / sum p``, dB.

    Returns
    -------
    tuple of Band
        Rising, apart from each other; none for a signal without power. Edges are known to a
        few bins.

    Examples
    --------
    >>> occupied_bands(np.array([1.0, 1.0, 0.0, 0.0, 0.0, 0.0, 0.0, 1.0]))
    (Band(low=-0.1875, high=0.1875),)
    """
    total = float(spectrum.sum())
    if not total:
        return ()
    density = float(np.sum(spectrum * (spectrum / total)))
    filled = np.flatnonzero(scipy.fft.fftshift(spectrum >= density * 10 ** (-depth_db / 10)))
    n = spectrum.size
    first = (filled - n // 2 - 0.5) / n
    return merge_bands([Band(low, low + 1 / n) for low in first.tolist()], gap=0.25 / n)


def merge_bands(bands: Iterable[Band], *, gap: float) -> tuple[Band, ...]:
    """Return bands in order, those joined that touch or stand closer than a gap.

    Parameters
    ----------
    bands : iterable of Band
        In any order; edges may lie anywhere, the spectrum repeats after 1.
    gap : float
        Narrower gaps are filled, cycles per sample.

    Returns
    -------
    tuple of Band
        The whole spectrum where nothing is left between them.

    Examples
    --------
    >>> merge_bands([Band(0.25, 0.375), Band(-0.125, 0.0), Band(0.4375, 0.5)], gap=0.125)
    (Band(low=-0.125, high=0.0), Band(low=0.25, high=0.5))
    """
    turned = [(band.low - math.floor(band.low + 0.5), band.width) for band in bands]
    joined: list[Band] = []
    for low, width in sorted(turned):
        if joined and low - joined[-1].high < gap:
            joined[-1] = Band(joined[-1].low, max(joined[-1].high, low + width))
        else:
            joined.append(Band(low, low + width))
    while len(joined) > 1 and joined[0].low + 1 - joined[-1].high < gap:
        first = joined.pop(0)
        joined[-1] = Band(joined[-1].low, max(joined[-1].high, first.high + 1))
    if len(joined) == 1 and joined[0].low + 1 - joined[0].high < gap:
        return WHOLE
    return tuple(joined)


def narrowest_gap(bands: tuple[Band, ...]) -> float:
    """Return the narrowest empty stretch between bands, round the ends of the spectrum too."""
    following = [band.low for band in bands[1:]] + [bands[0].low + 1]
    return min(low - band.high for band, low in zip(bands, following, strict=True))


def band_span(bands: tuple[Band, ...]) -> float:
    """Return the width of the shortest stretch that holds all bands: one less the widest gap."""
    following = [band.low for band in bands[1:]] + [bands[0].low + 1]
    return 1 - max(low - band.high for band, low in zip(bands, following, strict=True))


def design_bands(
    bands: tuple[Band, ...], *, transition: float, stopband_db: float = STOPBAND_DB
) -> Taps:
    """Design a zero-phase filter that passes several bands.

    Parameters
    ----------
    bands : tuple of Band
        Passed flat; apart from each other by two transitions at least.
    transition : float
        Width of each edge, all of it outside the band, cycles per sample.
    stopband_db : float
        Rejection beyond the edges, dB; the bands ripple by as much.

    Returns
    -------
    float64 or complex128 array, shape (2 h + 1,)
        Conjugate-symmetric about the middle tap: the response is real. The one tap 1 where the
        bands fill the whole spectrum.
    """
    if bands == WHOLE:
        return np.ones(1)
    aim = stopband_db + _MARGIN_DB
    half = kaiser_half_length(transition=transition, stopband_db=aim)
    lag = np.arange(-half, half + 1)
    taps = np.zeros(lag.size, np.complex128)
    for band in bands:
        width = band.width + transition
        taps += width * np.sinc(width * lag) * np.exp(2j * np.pi * band.centre * lag)
    taps *= kaiser_window(half, kaiser_beta(aim))
    is_even = max(abs(band.low + bands[-1 - n].high) for n, band in enumerate(bands)) < 1e-12
    return taps.real.copy() if is_even else taps


def design_pulse(
    spectrum: NDArray[np.float64],
    bands: tuple[Band, ...],
    *,
    half_length: int,
    widened: float = 0.0,
    stopband_db: float = STOPBAND_DB,
) -> Taps:
    """Design a pulse whose power spectrum has the shape of a signal's inside some bands.

    Parameters
    ----------
    spectrum : float64 array, shape (n_bins,)
        Power in each bin, in the order of the FFT.
    bands : tuple of Band
        Where it counts.
    half_length : int
        Taps on each side of the middle one; the longer, the closer the shape is followed.
    widened : float
        By how much it counts beyond each edge of a band too, cycles per sample.
    stopband_db : float
        Side lobes of the Kaiser window over the pulse, dB.

    Returns
    -------
    float64 or complex128 array, shape (2 h + 1,)
        1 in the middle; conjugate-symmetric.
    """
    n = spectrum.size
    place = scipy.fft.fftfreq(n)
    inside = np.zeros(n, np.bool_)
    for band in bands:
        inside |= (place - band.low + widened) % 1.0 < band.width + 2 * widened
    half = min(half_length, n // 2 - 1)
    aim = stopband_db + _MARGIN_DB
    pulse = scipy.fft.ifft(np.where(inside, np.sqrt(spectrum), 0.0))
    taps = pulse[np.arange(-half, half + 1)] * kaiser_window(half, kaiser_beta(aim))
    return np.asarray(taps / taps[half].real)
