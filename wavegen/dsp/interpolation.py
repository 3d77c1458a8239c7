"""Values between samples: a windowed sinc, flat to 0.9 of half the lower rate."""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction

import numpy as np
from numpy.typing import NDArray
from scipy import special

from wavegen.dsp.pulse import Pulse
from wavegen.dsp.windows import kaiser_beta, kaiser_half_length

PASSBAND = 0.9
"""Flat up to this share of half the lower of two rates; images of what lies there are rejected."""
STOPBAND_DB = 127.0
"""What the design aims at, so that 120 dB (an EVM of 1e-4 %) are kept where the ripples of two band
edges meet: 6 dB, and 1 dB of margin."""


def interpolation_span(lower: float) -> int:
    """Return the half-length of the kernel, input samples.

    Parameters
    ----------
    lower : float
        Lower of the two rates over the input's: 1 where nothing is decimated.

    Examples
    --------
    >>> interpolation_span(1.0), interpolation_span(0.5)
    (42, 83)
    """
    transition = (1 - PASSBAND) * lower
    return kaiser_half_length(transition=transition, stopband_db=STOPBAND_DB)


def interpolation_kernel(t: NDArray[np.float64], *, lower: float) -> NDArray[np.float64]:
    """Return what a sample contributes at a distance in time.

    Parameters
    ----------
    t : float64 array
        Distance, input samples.
    lower : float
        Lower of the two rates over the input's, up to 1.

    Returns
    -------
    float64 array, same shape
        A sinc of bandwidth ``lower`` under a Kaiser window; half amplitude at half the lower
        rate, flat to 0.9 of that, rejected from 1.1 of it on.
    """
    span = interpolation_span(lower)
    place = np.abs(t) / span
    inside = place < 1
    root = np.sqrt(1 - np.where(inside, place, 0.0) ** 2)
    beta = kaiser_beta(STOPBAND_DB)
    window = np.where(inside, special.i0(beta * root) / special.i0(beta), 0.0)
    return np.asarray(lower * np.sinc(lower * t) * window)


def delay_taps(fraction: float) -> NDArray[np.float64]:
    """Design a delay by part of a sample.

    Parameters
    ----------
    fraction : float
        Delay, -0.5 to 0.5 samples.

    Returns
    -------
    float64 array, shape (2 h + 1,)
        The middle tap belongs to lag zero; sum 1.
    """
    half = interpolation_span(1.0)
    lags = np.arange(-half, half + 1, dtype=np.float64)
    taps = interpolation_kernel(lags - np.float64(fraction), lower=1.0)
    return np.asarray(taps / taps.sum())


@dataclass(frozen=True, kw_only=True)
class Interpolator(Pulse):
    """The kernel as the pulse of each input sample, for shaping at another rate.

    Parameters
    ----------
    lower : float
        Lower of the two rates over the input's.
    """

    lower: float

    @classmethod
    def between(cls, ratio: Fraction) -> Interpolator:
        """Return the kernel for an output rate over the input rate.

        Parameters
        ----------
        ratio : Fraction
            Output over input, above 0.
        """
        lower = float(min(ratio, Fraction(1)))
        return cls(
            span_symbols=interpolation_span(lower),
            half_band=lower * (2 - PASSBAND) / 2,
            lower=lower,
        )

    def values(self, t: NDArray[np.float64]) -> NDArray[np.float64]:
        """Return the kernel at times in input samples."""
        return interpolation_kernel(t, lower=self.lower)
