"""Linearised Gaussian: the main pulse of GMSK taken as a linear modulation."""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction

import numpy as np
import scipy.special
from numpy.typing import NDArray

from wavegen.dsp.pulse import Pulse
from wavegen.dsp.pulses.gaussian import gaussian_deviation

LENGTH_SYMBOLS = 5
_BT = 0.3


@dataclass(frozen=True, slots=True, kw_only=True)
class LinearisedGaussian:
    """Settings of the linearised Gaussian pulse, BT 0.3: it has none."""

    def design(self, samples_per_symbol: Fraction) -> Pulse:
        """Return the pulse; its middle, 2.5 symbols from its start, falls on its symbol."""
        return MainPulse(span_symbols=3)


@dataclass(frozen=True, kw_only=True)
class MainPulse(Pulse):
    """The pulse ``c0(t + 2.5)``: its peak falls on its symbol's instant."""

    def values(self, t: NDArray[np.float64]) -> NDArray[np.float64]:
        """Return the pulse at times in symbols."""
        return main_pulse(t + LENGTH_SYMBOLS / 2)


def main_pulse(t: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return ``c0`` of TS 45.004.

    Parameters
    ----------
    t : float64 array
        Times in symbols from the pulse's start.

    Returns
    -------
    float64 array, same shape
        ``S(t) S(t + 1) S(t + 2) S(t + 3)`` from 0 to 5 symbols, 0 elsewhere.

    Notes
    -----
    ``S(t) = sin(pi G(t))`` up to 4 symbols, ``sin(pi/2 - pi G(t - 4))`` from there to 8; ``G`` is
    the integral from 0 of ``g(t) = [Q((t - 5/2)/s) - Q((t - 3/2)/s)] / 2``, ``s`` the deviation
    of a Gaussian of BT 0.3. ``G`` is taken in closed form: ``Q`` integrates to ``x Q(x) -
    phi(x)``.
    Source: 3GPP TS 45.004 v7.2.0, cl. 3.5, as quoted in public code; after P. Laurent, "Exact and
    approximate construction of digital phase modulations by superposition of amplitude modulated
    pulses", IEEE Trans. Commun. 34(2), 1986.

    Examples
    --------
    >>> round(float(main_pulse(np.array(2.5))), 5)
    0.9268
    """
    inside = (t > 0) & (t < LENGTH_SYMBOLS)
    within = np.where(inside, t, 0.0)
    shape = _slope(within)
    for late in (1, 2, 3):
        shape = shape * _slope(within + late)
    return np.where(inside, shape, 0.0)


def _slope(t: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return ``S`` for 0 <= t <= 8."""
    is_early = t <= 4
    phase = np.pi * _phase_integral(np.where(is_early, t, t - 4))
    return np.where(is_early, np.sin(phase), np.cos(phase))


def _phase_integral(t: NDArray[np.float64]) -> NDArray[np.float64]:
    start = _tail_integral(np.array(-2.5)) - _tail_integral(np.array(-1.5))
    return (_tail_integral(t - 2.5) - _tail_integral(t - 1.5) - start) / 2


def _tail_integral(t: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return an integral of ``Q(t / s)``."""
    s = gaussian_deviation(_BT)
    x = t / s
    density = np.exp(-(x**2) / 2) / np.sqrt(2 * np.pi)
    integral: NDArray[np.float64] = s * (x * scipy.special.ndtr(-x) - density)
    return integral
