"""Laws that are mixtures: of what different moments of a signal follow."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Protocol

import numpy as np
import scipy.special
from numpy.typing import ArrayLike, NDArray

from wavegen.laws.law import Holds, from_db, to_db
from wavegen.laws.level_search import level_by_halving

Reals = NDArray[np.float64]

MOST_AMPLITUDES = 4096
_BLOCK = 1 << 20


class Part(Protocol):
    """The distribution of the envelope at some of the moments."""

    def above(self, radius: Reals) -> Reals:
        """Return ``P(R > r)`` for an array of any shape."""


@dataclass(frozen=True, eq=False, kw_only=True)
class KnownAmplitudes:
    """Amplitudes that are known one by one.

    Parameters
    ----------
    amplitudes : float64 array, shape (n,)
        Rising, each as likely as the next.
    """

    amplitudes: Reals

    def above(self, radius: Reals) -> Reals:
        """Return the share of the amplitudes above."""
        below = np.searchsorted(self.amplitudes, radius, side="right")
        return np.asarray(1 - below / self.amplitudes.size)


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
        Amplitudes on one scale.
    mean_power : float
        Mean of ``R^2`` of the whole on that scale.
    peak : float
        Highest amplitude, finite; a bound will do.
    holds : {"every loop", "over seeds"}
    lowest_probability : float
        See :class:`wavegen.laws.term.Term`.
    """

    name: str
    weights: tuple[float, ...]
    parts: tuple[Part, ...]
    mean_power: float
    peak: float
    holds: Holds = "over seeds"
    lowest_probability: float = 0.0

    @property
    def peak_db(self) -> float:
        """Highest level that can occur, dB over the mean."""
        return float(to_db(self.peak**2 / self.mean_power))

    def ccdf(self, level_db: ArrayLike) -> NDArray[np.float64]:
        """Return the probability that the power is above a level (dB over the mean)."""
        radius = np.sqrt(from_db(level_db) * self.mean_power)
        total = np.zeros(radius.shape)
        for weight, part in zip(self.weights, self.parts, strict=True):
            total += weight * part.above(radius)
        return total

    def level_db(self, probability: ArrayLike) -> NDArray[np.float64]:
        """Return the smallest level whose CCDF is at or below a probability."""
        found = level_by_halving(self.ccdf, probability, most_db=self.peak_db + 1e-9)
        return np.where(np.asarray(probability) > 0, found, self.peak_db)


def mean_bessel(amplitudes: Reals, t: Reals) -> Reals:
    """Return the mean of ``J0(t s)`` over known amplitudes ``s``.

    Parameters
    ----------
    amplitudes : float64 array, shape (n,)
        Not negative. More than 4096 are put into bins of equal width, each at the RMS value of
        its own.
    t : float64 array, shape (m,)
        In units of 1 over amplitude.

    Returns
    -------
    float64 array, shape (m,)

    Notes
    -----
    In a bin of width ``d`` that lies at ``s`` the second moment is right, so that the mean of
    ``J0`` is wrong by about ``(t d)^2 / (24 s t)`` at most, far less in the sum over bins
    (derivation: two terms of the series about ``s``).
    """
    if amplitudes.size > MOST_AMPLITUDES:
        top = float(amplitudes.max()) or 1.0
        place = (amplitudes * (MOST_AMPLITUDES / top)).astype(np.int64)
        np.minimum(place, MOST_AMPLITUDES - 1, out=place)
        counts = np.bincount(place)
        squares = np.bincount(place, weights=amplitudes**2)
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
