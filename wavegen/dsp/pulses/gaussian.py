"""Gaussian pulse: no overshoot, some interference between symbols."""

from __future__ import annotations

import math
from dataclasses import dataclass
from fractions import Fraction
from typing import Annotated, Literal

import numpy as np
import scipy.special
from annotated_types import Ge, Le
from numpy.typing import NDArray

from wavegen.dsp.pulse import Pulse

_CUT = 6.5
"""Standard deviations after which the tail is left out: 3e-10 of the peak or less."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Gaussian:
    """Settings of a Gaussian pulse.

    Parameters
    ----------
    bt : float
        Bandwidth of the Gaussian low-pass at -3 dB over the symbol rate, 0.1 to 1.
    symbols : {"held", "impulses"}
        What the low-pass is fed with: each symbol held for its duration (NRZ), or impulses, which
        makes the pulse the Gaussian itself.
    """

    bt: Annotated[float, Ge(0.1), Le(1)]
    symbols: Literal["held", "impulses"] = "held"

    def design(self, samples_per_symbol: Fraction) -> Pulse:
        """Return the pulse."""
        deviation = gaussian_deviation(self.bt)
        half = 0.5 if self.symbols == "held" else 0.0
        return GaussianFiltered(
            span_symbols=math.ceil(half + _CUT * deviation),
            deviation=deviation,
            half_width=half,
        )


@dataclass(frozen=True, kw_only=True)
class GaussianFiltered(Pulse):
    """A Gaussian, or a rectangle through a Gaussian low-pass; symmetrical about its symbol.

    Parameters
    ----------
    deviation : float
        Standard deviation of the Gaussian, symbols.
    half_width : float
        Half the width of the rectangle, symbols; 0 for the Gaussian alone.
    """

    deviation: float
    half_width: float

    def values(self, t: NDArray[np.float64]) -> NDArray[np.float64]:
        """Return the pulse at times in symbols."""
        u = np.abs(t) / self.deviation
        if not self.half_width:
            shape = np.exp(-(u**2) / 2)
        else:
            half = self.half_width / self.deviation
            shape = scipy.special.ndtr(half - u) - scipy.special.ndtr(-half - u)
        return np.where(np.abs(t) < self.span_symbols, shape, 0.0)


def gaussian_deviation(bt: float) -> float:
    """Return the standard deviation of a Gaussian low-pass's impulse response, symbols.

    Parameters
    ----------
    bt : float
        Bandwidth at -3 dB over the symbol rate.

    Returns
    -------
    float
        ``sqrt(ln 2) / (2 pi BT)``.

    Notes
    -----
    Source: 3GPP TS 45.004, cl. 2.5.

    Examples
    --------
    >>> round(gaussian_deviation(0.3), 10)
    0.4416839392
    """
    return math.sqrt(math.log(2.0)) / (2 * math.pi * bt)
