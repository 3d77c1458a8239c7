"""Raised cosine: a whole Nyquist pulse, no interference without a receive filter."""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction
from typing import Annotated

import numpy as np
from annotated_types import Ge, Le
from numpy.typing import NDArray

from wavegen.dsp.pulse import Pulse, default_span, end_taper


@dataclass(frozen=True, slots=True, kw_only=True)
class RaisedCosine:
    """Settings of a raised cosine pulse.

    Parameters
    ----------
    roll_off : float
        Excess bandwidth, 0 to 1: the pulse occupies ``(1 + roll_off)`` symbol rates.
    span_symbols : int, optional
        Length to each side, symbols; by default that of the root raised cosine.
    """

    roll_off: Annotated[float, Ge(0), Le(1)]
    span_symbols: Annotated[int, Ge(1), Le(1024)] | None = None

    def design(self, samples_per_symbol: Fraction) -> Pulse:
        """Return the pulse, cut to its span with smooth ends."""
        return CutRaisedCosine(
            span_symbols=self.span_symbols or default_span(self.roll_off),
            half_band=(1.0 + self.roll_off) / 2,
            roll_off=self.roll_off,
        )


@dataclass(frozen=True, kw_only=True)
class CutRaisedCosine(Pulse):
    """A raised cosine brought to zero over the outer half of its span.

    Parameters
    ----------
    roll_off : float
        0 to 1.
    """

    roll_off: float

    def values(self, t: NDArray[np.float64]) -> NDArray[np.float64]:
        """Return the tapered pulse at times in symbols."""
        return raised_cosine(t, self.roll_off) * end_taper(t, self.span_symbols)


def raised_cosine(t: NDArray[np.float64], roll_off: float) -> NDArray[np.float64]:
    """Return the uncut raised cosine: 1 at its own symbol's instant, 0 at all others.

    Parameters
    ----------
    t : float64 array
        Times in symbols.
    roll_off : float
        0 to 1; 0 is the sinc.

    Returns
    -------
    float64 array, same shape
        Energy ``1 - roll_off / 4``.

    Notes
    -----
    ``sinc(t) cos(pi a t) / (1 - (2 a t)^2)``, ``(pi/4) sinc(1/(2a))`` at ``1/(2a)``. With
    ``x = |2 a t|`` the second factor is ``(pi/2) sinc((1 - x)/2) / (1 + x)``, which has no
    singular point.
    Source: inverse transform of the raised-cosine spectrum; derivation, tested in
    ``tests/truth/test_pulses.py``.

    Examples
    --------
    >>> raised_cosine(np.array([0.0, 1.0, 1.25]), 0.4).round(6).tolist()
    [1.0, 0.0, -0.141421]
    """
    x = np.abs(2 * roll_off * t)
    shape: NDArray[np.float64] = np.sinc(t) * (np.pi / 2) * np.sinc((1 - x) / 2) / (1 + x)
    return shape
