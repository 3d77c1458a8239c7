"""Phase pulses of continuous phase modulation: how far one symbol has turned the phase.

A symbol of level ``v`` with modulation index ``h`` turns the carrier by ``2 pi h v q(t)``; the
phase pulse ``q`` rises from 0 to 1/2 and is the integral of the frequency pulse ``g`` (J. B.
Anderson, T. Aulin, C.-E. Sundberg, "Digital Phase Modulation", Plenum, 1986, ch. 2). Times are in
symbols from the symbol's own instant, at which its frequency pulse has its centre unless said
otherwise.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from functools import cached_property

import numpy as np
import scipy.special
from numpy.typing import NDArray

from wavegen.dsp.pulse import end_taper

Density = Callable[[NDArray[np.float64]], NDArray[np.float64]]

FOUR_LEVEL_ROLL_OFF = 0.2
"""1920 Hz to 2880 Hz at 4800 symbols a second (TIA-102.BAAA)."""
FOUR_LEVEL_SPAN = 24
"""Half-length of the four-level pulse: see :func:`four_level_phase`."""
SOQPSK_RHO, SOQPSK_B, SOQPSK_T1, SOQPSK_T2 = 0.70, 1.25, 1.5, 0.5
"""SOQPSK-TG, IRIG 106 chapter 2, clause 2.4.3.2 (numbering of 106-15)."""
_GAUSS_TAIL = 4.0
"""``erfc(4) = 1.5e-8``: what is cut of a Gaussian phase pulse is below 1e-9."""
_DEGREE = 24
"""Of the polynomials on each symbol; the pulses hold less than two cycles a symbol: 1e-14."""


@dataclass(frozen=True, kw_only=True)
class PhasePulse:
    """Base of every phase pulse: 0 before its support, 1/2 after it.

    Parameters
    ----------
    first_symbols, last_symbols : int
        Support of the frequency pulse, in whole symbols from the symbol's instant.
    """

    first_symbols: int
    last_symbols: int

    @property
    def n_near(self) -> int:
        """Symbols that are turning the phase at any one time."""
        return self.last_symbols - self.first_symbols

    def values(self, t: NDArray[np.float64]) -> NDArray[np.float64]:
        """Return ``q`` at times in symbols.

        Parameters
        ----------
        t : float64 array
            Any shape.

        Returns
        -------
        float64 array, same shape
            0 to 1/2; beyond these for a moment where the frequency pulse has lobes.
        """
        inside = np.clip(t, self.first_symbols, self.last_symbols)
        ends = np.where(t >= self.last_symbols, 0.5, 0.0)
        is_inside = (t > self.first_symbols) & (t < self.last_symbols)
        return np.where(is_inside, self._rise(inside), ends)

    def _rise(self, t: NDArray[np.float64]) -> NDArray[np.float64]:
        raise TypeError(type(self).__name__)  # the base only describes


@dataclass(frozen=True, kw_only=True)
class RectangularPhase(PhasePulse):
    """A straight rise over one symbol (1REC): MSK and CPFSK.

    Parameters
    ----------
    centre_symbols : float
        Middle of the rise, a whole number of half symbols.
    """

    centre_symbols: float

    def _rise(self, t: NDArray[np.float64]) -> NDArray[np.float64]:
        return np.clip((t - self.centre_symbols + 0.5) / 2, 0.0, 0.5)


def rectangular_phase(centre_symbols: float = 0.0) -> RectangularPhase:
    """Return the phase pulse of a constant frequency over one symbol.

    Parameters
    ----------
    centre_symbols : float
        Middle of that symbol, a whole number of half symbols from the symbol's instant.
    """
    return RectangularPhase(
        first_symbols=math.floor(centre_symbols - 0.5),
        last_symbols=math.ceil(centre_symbols + 0.5),
        centre_symbols=centre_symbols,
    )


@dataclass(frozen=True, kw_only=True)
class GaussianPhase(PhasePulse):
    """The rise behind a Gaussian filter: GMSK and GFSK.

    Parameters
    ----------
    bt : float
        Bandwidth of the filter at -3 dB times the duration of a symbol.
    """

    bt: float

    def _rise(self, t: NDArray[np.float64]) -> NDArray[np.float64]:
        rate = _erf_rate(self.bt)
        return 0.25 * (1.0 + _erf_integral(t + 0.5, rate) - _erf_integral(t - 0.5, rate))


def gaussian_phase(bt: float) -> GaussianPhase:
    """Return the phase pulse of a rectangular symbol behind a Gaussian filter.

    Parameters
    ----------
    bt : float
        Bandwidth at -3 dB times the duration of a symbol, above 0.

    Notes
    -----
    It is cut where less than 1e-9 is left: at 3 symbols to each side for BT 0.3, at 2 for 0.5.
    """
    half = math.ceil(0.5 + _GAUSS_TAIL / _erf_rate(bt))
    return GaussianPhase(first_symbols=-half, last_symbols=half, bt=bt)


def gaussian_frequency_pulse(t: NDArray[np.float64], bt: float) -> NDArray[np.float64]:
    """Return the frequency pulse ``g`` of GMSK and GFSK, of area 1/2.

    Parameters
    ----------
    t : float64 array
        Times in symbols from the pulse's centre.
    bt : float
        Bandwidth at -3 dB times the duration of a symbol.

    Notes
    -----
    A rectangle of one symbol convolved with a Gaussian of ``sigma = sqrt(ln 2) / (2 pi BT)``
    symbols (3GPP TS 45.004 cl. 2; K. Murota, K. Hirade, IEEE Trans. Commun. 29(7), 1981).

    Examples
    --------
    >>> round(float(gaussian_frequency_pulse(np.array(0.0), 0.3)), 5)
    0.37119
    """
    rate = _erf_rate(bt)
    rise, fall = scipy.special.erf(rate * (t + 0.5)), scipy.special.erf(rate * (t - 0.5))
    return np.asarray(0.25 * (rise - fall))


def _erf_rate(bt: float) -> float:
    """Return ``1 / (sqrt(2) sigma)``, per symbol."""
    return math.pi * bt * math.sqrt(2.0 / math.log(2.0))


def _erf_integral(x: NDArray[np.float64], rate: float) -> NDArray[np.float64]:
    scaled = rate * x
    bend = np.exp(-(scaled**2)) / (rate * math.sqrt(math.pi))
    return np.asarray(x * scipy.special.erf(scaled) + bend)


@dataclass(frozen=True, kw_only=True)
class IntegratedPhase(PhasePulse):
    """A rise integrated from a frequency pulse of any scale, scaled to end at 1/2.

    Parameters
    ----------
    density : callable
        The frequency pulse at times in symbols; smooth between whole symbols.
    """

    density: Density

    @cached_property
    def series(self) -> NDArray[np.float64]:
        """Chebyshev coefficients of the rise on each symbol, shape (degree + 2, n_symbols)."""
        nodes = np.polynomial.chebyshev.chebpts1(_DEGREE + 1)
        starts = np.arange(self.first_symbols, self.last_symbols)
        values = self.density(starts[:, None] + (nodes + 1) / 2)
        fitted = np.polynomial.chebyshev.chebfit(nodes, values.T, _DEGREE)
        made = np.polynomial.chebyshev.chebint(fitted, lbnd=-1, scl=0.5)
        rises = np.polynomial.chebyshev.chebval(1.0, made)
        made[0] += np.cumsum(rises) - rises
        return np.asarray(made * (0.5 / rises.sum()))

    def _rise(self, t: NDArray[np.float64]) -> NDArray[np.float64]:
        place = t - self.first_symbols
        number = np.minimum(place.astype(np.int64), self.n_near - 1)
        u = 2.0 * (place - number) - 1.0
        return np.asarray(np.polynomial.chebyshev.chebval(u, self.series[:, number], tensor=False))


def soqpsk_tg_phase() -> IntegratedPhase:
    """Return the phase pulse of SOQPSK-TG, eight bits long."""
    return IntegratedPhase(first_symbols=-4, last_symbols=4, density=soqpsk_tg_frequency_pulse)


def soqpsk_tg_frequency_pulse(t: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return the frequency pulse of SOQPSK-TG with ``A = 1``; its area is then 1.60687 bits.

    Parameters
    ----------
    t : float64 array
        Times in bits from the pulse's centre.

    Notes
    -----
    ``cos(pi x) / (1 - 4 x^2) sin(y) / y w(t)`` with ``x = rho B t / Ts``, ``y = pi B t / Ts``,
    ``Ts`` two bits, ``w`` 1 up to ``T1 Ts`` and half a raised cosine over ``T2 Ts`` beyond.
    Source: IRIG 106 chapter 2, cl. 2.4.3.2 (numbering of 106-15).
    """
    time = np.abs(np.asarray(t, np.float64)) / 2.0
    x = SOQPSK_RHO * SOQPSK_B * time
    beside = 1.0 - 4.0 * x * x
    is_pole = np.abs(beside) < 1e-9
    shape = np.where(is_pole, np.pi / 4, np.cos(np.pi * x) / np.where(is_pole, 1.0, beside))
    edge = np.clip((time - SOQPSK_T1) / SOQPSK_T2, 0.0, 1.0)
    window = 0.5 + 0.5 * np.cos(np.pi * edge)
    return np.asarray(shape * np.sinc(SOQPSK_B * time) * window)


def four_level_phase() -> IntegratedPhase:
    """Return the phase pulse of four-level FM with Nyquist filtering of the frequency.

    Notes
    -----
    The pulse of :func:`four_level_frequency_pulse` cut at 24 symbols to each side, its outer half
    tapered: behind the receive filter the deviation at the centres of symbols errs by 0.03 % of
    the largest at most.
    """
    return IntegratedPhase(
        first_symbols=-FOUR_LEVEL_SPAN, last_symbols=FOUR_LEVEL_SPAN, density=_cut_four_level
    )


def four_level_frequency_pulse(t: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return the frequency pulse of four-level FM, uncut, of area 1.

    Parameters
    ----------
    t : float64 array
        Times in symbols from the pulse's centre.

    Notes
    -----
    Spectrum ``H(f) P(f)``: ``H`` a raised cosine of roll-off 0.2, ``P = (pi f) / sin(pi f)`` the
    inverse of the receiver's integration over a symbol, ``f`` in symbol rates. Source:
    TIA-102.BAAA (C4FM). Gauss-Legendre rules on both smooth stretches, good to 1e-12 for 60
    symbols to each side.
    """
    edge = (1 - FOUR_LEVEL_ROLL_OFF) / 2
    nodes, weights = np.polynomial.legendre.leggauss(96)
    total = np.zeros(np.shape(t))
    for low, high in ((0.0, edge), (edge, 1 - edge)):
        for node, weight in zip(nodes, weights, strict=True):
            f = low + (high - low) * (node + 1) / 2
            roll = 0.5 + 0.5 * math.cos(math.pi * (f - edge) / FOUR_LEVEL_ROLL_OFF)
            height = (roll if f > edge else 1.0) / float(np.sinc(f))
            total += weight * (high - low) * height * np.cos(2 * np.pi * f * t)
    return total


def _cut_four_level(t: NDArray[np.float64]) -> NDArray[np.float64]:
    return four_level_frequency_pulse(t) * end_taper(t, FOUR_LEVEL_SPAN)
