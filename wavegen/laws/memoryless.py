"""Memoryless steps on complex Gaussian signals: EVM, spectrum and mean power before running.

A step multiplies nothing but the envelope and phase it finds: ``y = g(r) exp(j theta)`` for
``x = r exp(j theta)``. The series of Laguerre polynomials says what it does to a Gaussian input.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from wavegen.core.errors import SignalError
from wavegen.laws.law import to_db
from wavegen.laws.panels import nodes_of, panel_edges

Curve = Callable[[NDArray[np.float64]], NDArray[np.float64] | NDArray[np.complex128]]
"""Output ``g(r)`` for the amplitudes ``r`` of the input over its RMS value; complex with AM/PM."""

N_TERMS = 400
_LARGEST_AMPLITUDE = 9.0  # exp(-81): nothing is left beyond
_PANELS = 96
_REST = 0.75
"""Share of the terms left out over that of the last: a kink's terms fall as n^-5/2 and their
shares of a band as n^-1/2, so that the average is 3/4 of the first (derivation)."""


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class MemorylessStep:
    """What a memoryless step does to a complex Gaussian signal of unit power.

    Parameters
    ----------
    terms : complex128 array, shape (n_terms,)
        Coefficients ``c_n``; the first is the gain of the undistorted part.
    output_power : float
        Mean power of the output.
    error_power : float
        Mean of ``|y - x|^2``.

    Notes
    -----
    With ``y = g(r) exp(j theta)``:
    ``c_n = (n + 1)^(-1/2) int g(r) 2 r^2 exp(-r^2) L_n^(1)(r^2) dr``, and the autocorrelation of
    the output is ``R_y = sum |c_n|^2 rho |rho|^(2 n)`` for that of the input ``rho``; ``c_0`` is
    Bussgang's gain, ``sum |c_n|^2`` the output power. For a flat band of unit width term ``n``
    has the spectrum of ``2 n + 1`` rectangles convolved: a B-spline. J. J. Bussgang, MIT RLE
    Technical Report 216, 1952; H. Rowe, Bell System Technical Journal 61, 1982; P. Banelli,
    S. Cacopardi, IEEE Trans. Commun. 48(3), 2000; formulas from memory, derived again, tested
    against closed forms and simulation.
    """

    terms: NDArray[np.complex128]
    output_power: float
    error_power: float

    @classmethod
    def of(
        cls, curve: Curve, *, kinks: tuple[float, ...] = (), n_terms: int = N_TERMS
    ) -> MemorylessStep:
        """Expand a curve.

        Parameters
        ----------
        curve : callable
            ``g(r)``, vectorised, for amplitudes over the RMS value of the input.
        kinks : tuple of float
            Amplitudes at which the curve is not smooth.
        n_terms : int
            Terms of the series.

        Raises
        ------
        SignalError
            The curve gives a value that is not finite, or no output at all.
        """
        edges = panel_edges(0.0, _LARGEST_AMPLITUDE, n_panels=_PANELS, kinks=kinks)
        nodes, weights = (array.ravel() for array in nodes_of(edges))
        output = np.asarray(curve(nodes), np.complex128)
        if not np.isfinite(output).all() or not output.any():
            raise SignalError(
                where="curve",
                problem="its output is not finite, or zero, at some amplitudes"
                if output.any()
                else "its output is zero at every amplitude",
                allowed="finite values, not all zero, from 0 to 9 times the RMS amplitude",
                remedy="Correct the curve.",
            )
        power = nodes**2
        density = 2 * nodes * np.exp(-power) * weights
        terms = np.empty(n_terms, np.complex128)
        root = np.exp(-power / 2)
        weighed = output * 2 * power * root * weights
        before, now = np.zeros(nodes.size), root  # L_n^(1) exp(-x/2) stays small
        for n in range(n_terms):
            terms[n] = math.fsum(weighed.real * now) + 1j * math.fsum(weighed.imag * now)
            terms[n] /= math.sqrt(n + 1)
            before, now = now, ((2 * n + 2 - power) * now - (n + 1) * before) / (n + 1)
        return cls(
            terms=terms,
            output_power=math.fsum(np.abs(output) ** 2 * density),
            error_power=math.fsum(np.abs(output - nodes) ** 2 * density),
        )

    @property
    def gain(self) -> complex:
        """Gain of the undistorted part of the output."""
        return complex(self.terms[0])

    @property
    def distortion_power(self) -> float:
        """Mean power of what is not proportional to the input."""
        return max(self.output_power - abs(self.gain) ** 2, 0.0)

    @property
    def mean_shift_db(self) -> float:
        """Mean power of the output over that of the input, dB."""
        return float(to_db(self.output_power))

    @property
    def evm_percent(self) -> float:
        """RMS error over RMS reference in all bandwidth, the reference fitted, percent."""
        return 100 * math.sqrt(self.distortion_power) / abs(self.gain)

    @property
    def evm_unfitted_percent(self) -> float:
        """RMS of ``y - x`` over that of ``x`` in all bandwidth, nothing fitted, percent."""
        return 100 * math.sqrt(self.error_power)

    @property
    def evm_in_band_percent(self) -> float:
        """EVM of a flat band seen through a filter of its own width, reference fitted, percent."""
        return self.evm_percent * math.sqrt(self.distortion_share(-0.5, 0.5))

    def distortion_share(self, low: float, high: float) -> float:
        """Return the share of the distortion power between two frequencies.

        Parameters
        ----------
        low, high : float
            Over the width of the flat band, from its centre; ``low <= high``.

        Returns
        -------
        float
            0 to 1. The terms left out are counted with 3/4 of the share of the last.
        """
        if not self.distortion_power:
            return 0.0
        powers = np.abs(self.terms[1:]) ** 2
        rest = max(self.distortion_power - math.fsum(powers), 0.0)
        shares = band_shares(low, high, self.terms.size)[1:]
        total = math.fsum(powers * shares) + rest * _REST * float(shares[-1])
        return total / self.distortion_power

    def aclr_db(self, *, offset: float = 1.0, width: float = 1.0) -> float:
        """Return the power in the flat band over that in a channel beside it, dB.

        Parameters
        ----------
        offset : float
            Centre of the channel over the width of the band.
        width : float
            Width of the channel over that of the band.

        Returns
        -------
        float
            ``inf`` where nothing falls into the channel.
        """
        inside = abs(self.gain) ** 2 + self.distortion_power * self.distortion_share(-0.5, 0.5)
        low, high = offset - width / 2, offset + width / 2
        leaked = self.distortion_power * self.distortion_share(low, high)
        leaked += abs(self.gain) ** 2 * max(min(high, 0.5) - max(low, -0.5), 0.0)
        return 10 * math.log10(inside / leaked) if leaked else math.inf


def polar_clip(ratio_db: float) -> tuple[Curve, tuple[float, ...]]:
    """Return the curve of a polar clip and where it has its kink.

    Parameters
    ----------
    ratio_db : float
        Clip amplitude squared over the mean power of the input, dB.

    Examples
    --------
    >>> curve, kinks = polar_clip(6.0)
    >>> step = MemorylessStep.of(curve, kinks=kinks)
    >>> round(step.gain.real, 5), round(step.mean_shift_db, 3)
    (0.98978, -0.082)
    """
    amplitude = 10 ** (ratio_db / 20)
    return lambda r: np.minimum(r, amplitude), (amplitude,)


@lru_cache(maxsize=64)
def band_shares(low: float, high: float, n_terms: int) -> NDArray[np.float64]:
    """Return how much of each term of the series falls between two frequencies.

    Parameters
    ----------
    low, high : float
        Over the width of the flat band, from its centre.
    n_terms : int
        How many.

    Returns
    -------
    float64 array, shape (n_terms,)
        Term ``n`` is spread as the sum of ``2 n + 1`` uniform variables of unit width. Read-only.

    Notes
    -----
    The distribution of such a sum is a B-spline's integral, itself a sum of B-splines of the next
    order at whole distances; their recursion adds positive numbers only, so nothing is lost at
    any order (C. de Boor, "On calculating with B-splines", J. Approx. Theory 6, 1972).

    Examples
    --------
    >>> band_shares(-0.5, 0.5, 4).round(5).tolist()
    [1.0, 0.66667, 0.55, 0.47937]
    """
    made = _below(high, n_terms) - _below(low, n_terms)
    made.setflags(write=False)
    return made


def _below(edge: float, n_terms: int) -> NDArray[np.float64]:
    """Return ``P(sum of 2 n + 1 centred uniforms < edge)`` for each n."""
    found = np.empty(n_terms)
    # All orders share one fractional part: order m is asked at m/2 + edge, m odd.
    whole = math.floor(0.5 + edge)
    part = 0.5 + edge - whole
    size = 2 * n_terms + 2
    points = part + np.arange(size)  # values of the B-spline of the present order here
    spline = np.zeros(size)
    spline[0] = 1.0  # order 1: the rectangle on [0, 1)
    order = 1
    for n in range(n_terms):
        # The integral of order 2 n + 1 up to x is the sum of order 2 n + 2 at x, x - 1, ...
        while order < 2 * n + 2:
            order += 1
            shifted = np.concatenate(([0.0], spline[:-1]))
            spline = (points * spline + (order - points).clip(min=0) * shifted) / (order - 1)
            spline[points >= order] = 0.0
        place = n + whole
        found[n] = math.fsum(spline[: place + 1]) if place >= 0 else 0.0
    return np.minimum(found, 1.0)
