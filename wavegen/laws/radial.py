"""A law known through the probability that the envelope stands above a radius."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import Protocol

import numpy as np
from numpy.typing import ArrayLike, NDArray

from wavegen.laws.law import Holds, checked_probability, from_db, to_db

Reals = NDArray[np.float64]

TABLE = 128
"""Radii at which a probability is first looked for."""
_STEPS = 80
_TINY = 1e-300


class Tail(Protocol):
    """``P(R > r)`` of an envelope."""

    def above(self, radius: Reals) -> Reals:
        """Return the probability above each radius of a flat array, not negative."""


@dataclass(frozen=True, eq=False, kw_only=True)
class RadialLaw:
    """A law of the envelope from its tail.

    Parameters
    ----------
    name, holds
        As in :class:`wavegen.laws.law.Law`.
    mean_power : float
        Mean of ``R^2``.
    peak : float
        Highest ``R``, or a bound; ``inf`` if there is none.
    radius : float
        Above it there is no more than 1e-13 of the time.
    tail : Tail
        ``P(R > r)``.
    lowest_probability : float
        See :class:`wavegen.laws.term.Term`.
    """

    name: str
    holds: Holds
    mean_power: float
    peak: float
    radius: float
    tail: Tail
    lowest_probability: float = 0.0

    @property
    def peak_db(self) -> float:
        """Highest level that can occur, dB over the mean; ``inf`` if there is none."""
        return float(to_db(self.peak**2 / self.mean_power))

    def ccdf(self, level_db: ArrayLike) -> NDArray[np.float64]:
        """Return the probability that the power is above a level (dB over the mean)."""
        radius = np.sqrt(self.mean_power * from_db(level_db))
        return self._above(radius.ravel()).reshape(radius.shape)

    def level_db(self, probability: ArrayLike) -> NDArray[np.float64]:
        """Return the smallest level whose CCDF is at or below a probability."""
        asked = checked_probability(probability)
        radii = self._solve(asked.ravel()).reshape(asked.shape)
        return to_db(radii**2 / self.mean_power)

    def _above(self, radius: Reals) -> Reals:
        out = np.zeros(radius.size)
        inside = radius < min(self.radius, self.peak)
        out[inside] = np.clip(self.tail.above(radius[inside]), 0.0, 1.0)
        return out

    @cached_property
    def _table(self) -> tuple[Reals, Reals]:
        radii = np.linspace(0.0, min(self.radius, self.peak), TABLE)
        return radii, np.minimum.accumulate(self._above(radii))

    def _solve(self, probability: Reals) -> Reals:
        """Return the smallest radii with no more than a probability above them."""
        radii, values = self._table
        upper = np.searchsorted(-values, -probability, side="left")
        upper = np.clip(upper, 1, radii.size - 1)
        low, high = radii[upper - 1], radii[upper]
        p_low, p_high = values[upper - 1], values[upper]
        is_open = (probability > 0) & (probability < 1)
        for step in range(_STEPS):
            todo = np.flatnonzero(is_open & (high - low > 1e-12 * high))
            if not todo.size:
                break
            a, b, asked = low[todo], high[todo], probability[todo]
            # Straight in the logarithm of the probability; every third step by halves.
            with np.errstate(divide="ignore", invalid="ignore"):
                top, bottom = np.log(p_low[todo] + _TINY), np.log(p_high[todo] + _TINY)
                share = (top - np.log(asked)) / (top - bottom)
            share = np.where(np.isfinite(share), np.clip(share, 1e-3, 1 - 1e-3), 0.5)
            guess = 0.5 * (a + b) if step % 3 == 2 else a + share * (b - a)
            value = self._above(guess)
            is_below = value <= asked
            high[todo], p_high[todo] = (
                np.where(is_below, guess, b),
                np.where(is_below, value, p_high[todo]),
            )
            low[todo], p_low[todo] = (
                np.where(is_below, a, guess),
                np.where(is_below, p_low[todo], value),
            )
        answer = np.where(is_open, high, 0.0)
        answer[probability <= 0] = self.peak
        return answer
