"""What a polar clip does to complex Gaussian noise, in closed form."""

from __future__ import annotations

import math
from dataclasses import dataclass

from scipy.special import erfc


@dataclass(frozen=True, slots=True, kw_only=True)
class ClippedGaussian:
    """A complex Gaussian signal of unit power, clipped.

    Parameters
    ----------
    gain : float
        Amplitude of the signal in what is left, least squares.
    power : float
        Mean power of what is left.
    """

    gain: float
    power: float

    @property
    def fitted_error(self) -> float:
        """RMS error of the whole waveform with the gain fitted, over RMS of the signal."""
        return math.sqrt(max(self.power - self.gain**2, 0.0)) / self.gain

    @property
    def unfitted_error(self) -> float:
        """RMS error against the signal as it was, over its RMS."""
        return math.sqrt(max(1 + self.power - 2 * self.gain, 0.0))


def clip_gaussian(ratio: float) -> ClippedGaussian:
    """Return the figures of a clip.

    Parameters
    ----------
    ratio : float
        Clip amplitude squared over the mean power before it, above 0.

    Notes
    -----
    With ``g`` the ratio: gain ``1 - exp(-g) + sqrt(pi g) / 2 erfc(sqrt g)``, power
    ``1 - exp(-g)``. J. Bussgang, MIT RLE Technical Report 216, 1952; H. Rowe, Bell System Technical
    Journal 61, 1982 (from memory; derived again, tested against samples).

    Examples
    --------
    >>> round(100 * clip_gaussian(2.0**2).fitted_error, 2)
    4.08
    """
    power = -math.expm1(-ratio)
    tail = math.sqrt(math.pi * ratio) / 2 * float(erfc(math.sqrt(ratio)))
    return ClippedGaussian(gain=power + tail, power=power)
