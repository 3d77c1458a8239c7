"""Root raised cosine: half of a Nyquist pulse at each end of a link."""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction
from typing import Annotated

import numpy as np
from annotated_types import Ge, Le
from numpy.typing import NDArray

from wavegen.dsp.pulse import Pulse, default_span, end_taper


@dataclass(frozen=True, slots=True, kw_only=True)
class RootRaisedCosine:
    """Settings of a root raised cosine pulse.

    Parameters
    ----------
    roll_off : float
        Excess bandwidth, 0 to 1: the pulse occupies ``(1 + roll_off)`` symbol rates.
    span_symbols : int, optional
        Length to each side, symbols; by default long enough for an EVM below 0.01 % behind the
        same filter (64 at roll-off 0.22, see :func:`wavegen.dsp.pulse.default_span`).
    """

    roll_off: Annotated[float, Ge(0), Le(1)]
    span_symbols: Annotated[int, Ge(1), Le(1024)] | None = None

    def design(self, samples_per_symbol: Fraction) -> Pulse:
        """Return the pulse, cut to its span with smooth ends."""
        return CutRootRaisedCosine(
            span_symbols=self.span_symbols or default_span(self.roll_off),
            half_band=(1.0 + self.roll_off) / 2,
            is_matched=True,
            roll_off=self.roll_off,
        )


@dataclass(frozen=True, kw_only=True)
class CutRootRaisedCosine(Pulse):
    """A root raised cosine brought to zero over the outer half of its span.

    Parameters
    ----------
    roll_off : float
        0 to 1.
    """

    roll_off: float

    def values(self, t: NDArray[np.float64]) -> NDArray[np.float64]:
        """Return the tapered pulse at times in symbols."""
        return root_raised_cosine(t, self.roll_off) * end_taper(t, self.span_symbols)


def root_raised_cosine(t: NDArray[np.float64], roll_off: float) -> NDArray[np.float64]:
    """Return the uncut root raised cosine of unit energy.

    Parameters
    ----------
    t : float64 array
        Times in symbols.
    roll_off : float
        0 to 1; 0 is the sinc.

    Returns
    -------
    float64 array, same shape

    Notes
    -----
    ``[sin(pi t (1 - a)) + 4 a t cos(pi t (1 + a))] / [pi t (1 - (4 a t)^2)]``, which is
    ``1 - a + 4 a/pi`` at 0 and ``a/sqrt(2) [(1 + 2/pi) sin(pi/(4a)) + (1 - 2/pi) cos(pi/(4a))]``
    at ``1/(4a)``. Two forms of it without a quotient of small numbers are used: for ``4 a t``
    below 1/2 ``[(1 - a) sinc((1 - a) t) + (4a/pi) cos(pi (1 + a) t)] / [1 - (4 a t)^2]``, above,
    with ``d = 4 a t - 1``, ``[(pi/2) sinc(d/4) sin(pi t + pi/4) - cos(pi (1 + a) t)] /
    [pi t (2 + d)]``.
    Source: inverse transform of the square root of the raised-cosine spectrum; derivation,
    tested in ``tests/truth/test_pulses.py``.

    Examples
    --------
    >>> root_raised_cosine(np.array([0.0, 1 / 0.88]), 0.22).round(7).tolist()
    [1.0601127, -0.1571843]
    """
    a = roll_off
    late = np.abs(t)
    is_late = 4 * a * late > 0.5
    early = np.where(is_late, 0.0, late)
    near_zero = (1 - a) * np.sinc((1 - a) * early)
    near_zero += (4 * a / np.pi) * np.cos(np.pi * (1 + a) * early)
    near_zero /= 1 - (4 * a * early) ** 2
    late = np.where(is_late, late, 1.0)
    d = 4 * a * late - 1
    beyond = (np.pi / 2) * np.sinc(d / 4) * np.sin(np.pi * late + np.pi / 4)
    beyond -= np.cos(np.pi * (1 + a) * late)
    beyond /= np.pi * late * (2 + d)
    return np.where(is_late, beyond, near_zero)
