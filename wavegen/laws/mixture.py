"""Laws that are mixtures: of what different moments of a signal follow."""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from functools import lru_cache
from typing import Protocol

import numpy as np
import scipy.special
from numpy.typing import ArrayLike, NDArray

from wavegen.laws.law import Holds, from_db, to_db
from wavegen.laws.level_search import level_by_halving

Reals = NDArray[np.float64]

LEAST_PROBABILITY = 1e-13
"""Probabilities below this are lost in the rounding of an inversion, and read 0."""
MOST_ZEROS = 1 << 15
_FIRST_ZEROS = 1 << 8
_NEGLIGIBLE = 1e-17
_BLOCK = 1 << 20


@lru_cache(maxsize=8)
def bessel_zeros(count: int) -> Reals:
    """Return the first positive zeros of J0, to double precision; read-only.

    Notes
    -----
    J. McMahon's expansion (Abramowitz and Stegun 9.5.12), then two of Newton's steps.

    Examples
    --------
    >>> bessel_zeros(2).round(6).tolist()
    [2.404826, 5.520078]
    """
    b = (np.arange(1, count + 1) - 0.25) * np.pi
    zeros = b + 1 / (8 * b) - 124 / (3 * (8 * b) ** 3)
    for _ in range(2):
        zeros += scipy.special.j0(zeros) / scipy.special.j1(zeros)
    zeros.setflags(write=False)
    return np.asarray(zeros)


class Part(Protocol):
    """The distribution of the power at some of the moments."""

    def above(self, power: Reals) -> Reals:
        """Return ``P(p > power)`` for an array of any shape."""


@dataclass(frozen=True, eq=False, kw_only=True)
class RadialPart:
    """The envelope of a complex variable by its characteristic function. Use :meth:`of`.

    Parameters
    ----------
    reach : float
        Amplitude that is passed with a probability under 1e-14.
    coefficients : float64 array, shape (n_zeros,)
        Of the Fourier-Bessel series.

    Notes
    -----
    With ``Phi(t) = E[J0(t R)]`` and ``a_n`` the zeros of J0,
    ``P(R > r) = 1 - (2 r / L) sum_n Phi(a_n / L) J1(a_n r / L) / (a_n J1(a_n)^2)`` where
    ``R`` does not pass ``L`` (Fourier-Bessel expansion of the density; derivation). Positive and
    negative terms of the order of 1 leave about 1e-15: a relative error of 1e-6 at 1e-9.
    """

    reach: float
    coefficients: Reals

    @classmethod
    def of(cls, characteristic: Callable[[Reals], Reals], *, reach: float) -> RadialPart | None:
        """Expand ``Phi``, or return None where 2^15 terms do not exhaust it.

        Parameters
        ----------
        characteristic : callable
            ``Phi(t)`` for an array ``t``, in units of 1 over amplitude.
        reach : float
            See the class.
        """
        count = _FIRST_ZEROS
        while count <= MOST_ZEROS:
            zeros = bessel_zeros(count)
            phi = np.asarray(characteristic(zeros / reach))
            if float(np.max(np.abs(phi[-count // 8 :]))) < _NEGLIGIBLE:
                kept = int(np.flatnonzero(np.abs(phi) >= _NEGLIGIBLE)[-1]) + 1
                zeros, phi = zeros[:kept], phi[:kept]
                made = phi / (zeros * scipy.special.j1(zeros) ** 2)
                return cls(reach=reach, coefficients=made)
            count *= 2
        return None

    def above(self, power: Reals) -> Reals:
        """Return ``P(p > power)``; below 1e-13 it reads 0."""
        radius = np.sqrt(np.ravel(power)) / self.reach
        found = np.zeros(radius.size)
        zeros = bessel_zeros(self.coefficients.size)
        inside = np.flatnonzero(radius < 1)
        step = max(_BLOCK // zeros.size, 1)
        for low in range(0, inside.size, step):
            some = inside[low : low + step]
            waves = scipy.special.j1(np.multiply.outer(radius[some], zeros))
            found[some] = 1 - 2 * radius[some] * (waves @ self.coefficients)
        found = np.where(found < LEAST_PROBABILITY, 0.0, np.minimum(found, 1.0))
        return np.asarray(found.reshape(np.shape(power)))


@dataclass(frozen=True, eq=False, kw_only=True)
class StepsPart:
    """Powers that are known one by one.

    Parameters
    ----------
    powers : float64 array, shape (n,)
        Rising, each as likely as the next.
    """

    powers: Reals

    def above(self, power: Reals) -> Reals:
        """Return the share of the powers above."""
        return 1 - np.searchsorted(self.powers, power, side="right") / self.powers.size


@dataclass(frozen=True, eq=False, kw_only=True)
class MixtureLaw:
    """A law that is a weighted sum of parts; what the weights leave is exactly zero power.

    Parameters
    ----------
    name : str
        What it is called in results.
    weights : tuple of float
        Share of time of each part; together at most 1.
    parts : tuple of Part
        Powers on a scale of their own.
    mean : float
        Mean power of the whole on that scale.
    peak_power : float
        Highest power on that scale; ``inf`` if there is none.
    reach_power : float
        Power that is passed with a probability under 1e-13; on that scale, finite.
    holds : {"every loop", "over seeds"}
    """

    name: str
    weights: tuple[float, ...]
    parts: tuple[Part, ...]
    mean: float
    peak_power: float
    reach_power: float
    holds: Holds = "over seeds"

    @property
    def peak_db(self) -> float:
        """Highest level that can occur, dB over the mean."""
        return float(to_db(self.peak_power / self.mean))

    def ccdf(self, level_db: ArrayLike) -> Reals:
        """Return the probability that the power is above a level (dB over the mean)."""
        power = from_db(level_db) * self.mean
        total = np.zeros(power.shape)
        for weight, part in zip(self.weights, self.parts, strict=True):
            total += weight * part.above(power)
        return total

    def level_db(self, probability: ArrayLike) -> Reals:
        """Return the smallest level whose CCDF is at or below a probability.

        Below about 1e-12 it is the level at that probability; at 0 the peak.
        """
        most_db = float(to_db(self.reach_power / self.mean)) + 1e-9
        found = level_by_halving(self.ccdf, probability, most_db=most_db)
        return np.where(np.asarray(probability) > 0, found, self.peak_db)


def spread_average(amplitudes: Reals, t: Reals, *, n_bins: int = 4096) -> Reals:
    """Return the mean of ``J0(t s)`` over known amplitudes ``s``.

    Parameters
    ----------
    amplitudes : float64 array, shape (n,)
        Not negative. More than ``n_bins`` are put into bins of equal width, each at the RMS value
        of its own.
    t : float64 array, shape (m,)
    n_bins : int

    Returns
    -------
    float64 array, shape (m,)

    Notes
    -----
    Within a bin of width ``d`` the mean of ``J0`` differs by ``(t d)^4 / 5000`` at most from that
    at the RMS value (derivation: two terms of the series); ``t`` matters up to about 12 over the
    RMS amplitude of what is random.
    """
    if amplitudes.size > n_bins:
        top = float(amplitudes.max()) or 1.0
        place = np.minimum((amplitudes * (n_bins / top)).astype(np.int64), n_bins - 1)
        counts = np.bincount(place, minlength=n_bins)
        squares = np.bincount(place, weights=amplitudes**2, minlength=n_bins)
        used = counts > 0
        weights = counts[used] / amplitudes.size
        amplitudes = np.sqrt(squares[used] / counts[used])
    else:
        amplitudes, again = np.unique(amplitudes, return_counts=True)
        weights = again / again.sum()
    total = np.empty(t.size)
    step = max(_BLOCK // amplitudes.size, 1)
    for low in range(0, t.size, step):
        waves = scipy.special.j0(np.multiply.outer(t[low : low + step], amplitudes))
        total[low : low + step] = waves @ weights
    return total


def chernoff_reach(
    radii: Sequence[Reals], counts: Sequence[int], *, probability: float = 1e-14
) -> float:
    """Return an amplitude that a sum of independent turned points passes hardly ever.

    Parameters
    ----------
    radii : sequence of float64 array
        Magnitudes of the points, for each kind of summand; equally likely, at any angle.
    counts : sequence of int
        Summands of each kind.
    probability : float
        Bound on the probability of passing the amplitude.

    Returns
    -------
    float
        Never more than the sum of the largest magnitudes.

    Notes
    -----
    Chernoff's bound for isotropic sums: ``P(R > r) <= prod E[I0(u |a|)] / I0(u r)`` for any
    ``u`` (derivation: ``I0`` is the mean of ``exp(u R cos)``, and rises).
    """
    most = math.fsum(n * float(r.max()) for r, n in zip(radii, counts, strict=True))
    variance = math.fsum(n * float(np.mean(r**2)) for r, n in zip(radii, counts, strict=True))
    best = most
    for u in np.geomspace(0.5, 200, 120) / math.sqrt(variance):
        growth = 0.0
        for r, n in zip(radii, counts, strict=True):
            top = float(r.max())
            scaled = np.mean(scipy.special.i0e(u * r) * np.exp(u * (r - top)))
            growth += n * (u * top + math.log(float(scaled)))
        target = growth - math.log(probability)  # log I0(u r) must reach this

        def short_of(r: float, u: float = u, target: float = target) -> float:
            return u * r + math.log(float(scipy.special.i0e(u * r))) - target

        if short_of(best) <= 0:
            continue
        low, high = 0.0, best
        for _ in range(40):
            middle = 0.5 * (low + high)
            low, high = (middle, high) if short_of(middle) <= 0 else (low, middle)
        best = high
    return best
