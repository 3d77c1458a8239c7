"""Envelopes that follow different laws at different moments."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
import scipy.special
from numpy.typing import NDArray

from wavegen.laws.radial import Tail

Reals = NDArray[np.float64]

MOST_AMPLITUDES = 4096
_BLOCK = 1 << 20


@dataclass(frozen=True, eq=False, kw_only=True)
class KnownAmplitudes:
    """Amplitudes that are known one by one: a tail in steps.

    Parameters
    ----------
    amplitudes : float64 array, shape (n,)
        Rising.
    shares : float64 array, shape (n,), optional
        Share of each, together 1; each as likely as the next unless given.
    """

    amplitudes: Reals
    shares: Reals | None = None

    @cached_property
    def _beyond(self) -> Reals:
        """What lies from each amplitude on, and 0."""
        count = self.amplitudes.size
        if self.shares is None:
            return np.arange(count, -1, -1) / count
        return np.concatenate((np.cumsum(self.shares[::-1])[::-1], [0.0]))

    def above(self, radius: Reals) -> Reals:
        """Return the share of the amplitudes above each radius."""
        below = np.searchsorted(self.amplitudes, radius, side="right")
        return np.asarray(self._beyond[below])


@dataclass(frozen=True, eq=False, kw_only=True)
class MixedTail:
    """A weighted sum of tails; what the weights leave is exactly zero amplitude.

    Parameters
    ----------
    weights : tuple of float
        Share of time of each tail; together at most 1.
    tails : tuple of Tail
        ``P(R > r)`` of each, on one scale.
    radii : tuple of float
        Radius beyond which each tail is 0.
    """

    weights: tuple[float, ...]
    tails: tuple[Tail, ...]
    radii: tuple[float, ...]

    def above(self, radius: Reals) -> Reals:
        """Return the probability above each radius of a flat array."""
        total = np.zeros(radius.size)
        for weight, tail, end in zip(self.weights, self.tails, self.radii, strict=True):
            inside = radius < end
            total[inside] += weight * np.clip(tail.above(radius[inside]), 0.0, 1.0)
        return total


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
    In a bin of width ``d`` the second moment is right, so that the mean of ``J0`` is wrong by
    about ``t d^2 / (24 s)`` at most (derivation: two terms of the series about ``s``).
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
