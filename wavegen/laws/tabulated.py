"""A continuous law on a table: what is slow to compute at one level is looked up at thousands."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import ArrayLike, NDArray

from wavegen.laws.law import Holds, Law, checked_probability
from wavegen.laws.moments import moment_of_tail

Reals = NDArray[np.float64]

TOLERANCE_DB = 2e-4
"""How far a level of the table may lie from the law's own, dB."""
LOWEST_PROBABILITY = 1e-10
HIGHEST_PROBABILITY = 1 - 1e-6
LOWEST_DB = -60.0
"""The table starts at the highest probability, or here; beyond its ends the law itself is asked."""
MOST_KNOTS = 3000
_FIRST_STEP_DB = 0.5
_LEAST_STEP_DB = 1e-3
_ROUNDOFF = 3e-12
"""Of probabilities of laws that are inverted; no finer table makes up for it."""
_FLAT = 1e-7
_HALVINGS = 60
_MOMENT_STEP_DB = 0.01


@dataclass(frozen=True, eq=False, kw_only=True)
class TabulatedLaw:
    """A law between knots. Use :func:`tabulated`.

    Parameters
    ----------
    source : Law
        The law itself, for what lies outside the table.
    level : float64 array, shape (n_knots,)
        Levels, rising, dB over the mean.
    logit : float64 array, shape (n_knots,)
        ``ln(P / (1 - P))`` at them, falling.

    Notes
    -----
    The logit of the CCDF is nearly straight at low levels (the power is even near zero) and bends
    gently at high ones. Between knots runs a cubic through both ends with slopes that keep it
    falling: parabolas through three knots, limited as F. N. Fritsch and R. E. Carlson, SIAM J.
    Numer. Anal. 17 (1980) 238-246, say (from memory: at most three times the smaller secant).
    """

    source: Law
    level: Reals
    logit: Reals

    @property
    def name(self) -> str:
        """What it is called in results."""
        return self.source.name

    @property
    def holds(self) -> Holds:
        """Whether one loop follows it exactly, or only the average over seeds."""
        return self.source.holds

    @property
    def peak_db(self) -> float:
        """Highest level that can occur, dB over the mean; ``inf`` if there is none."""
        return self.source.peak_db

    @property
    def lowest_probability(self) -> float:
        """Lowest probability at which the law speaks for the data; 0 if at every one."""
        return float(getattr(self.source, "lowest_probability", 0.0))

    @cached_property
    def _slopes(self) -> Reals:
        return falling_slopes(self.level, self.logit)

    def ccdf(self, level_db: ArrayLike) -> Reals:
        """Return the probability that the power is above a level (dB over the mean)."""
        asked = np.asarray(level_db, np.float64)
        flat = asked.ravel()
        out = np.empty(flat.size)
        inside = (flat >= self.level[0]) & (flat <= self.level[-1])
        out[inside] = _probability(self._at(flat[inside]))
        if not inside.all():
            out[~inside] = self.source.ccdf(flat[~inside])
        return out.reshape(asked.shape)

    def level_db(self, probability: ArrayLike) -> Reals:
        """Return the smallest level whose CCDF is at or below a probability."""
        asked = checked_probability(probability)
        flat = asked.ravel()
        ends = _probability(self.logit[[0, -1]])
        inside = (flat < ends[0]) & (flat > ends[1])
        out = np.empty(flat.size)
        out[inside] = self._solved(np.log(flat[inside]) - np.log1p(-flat[inside]))
        if not inside.all():
            out[~inside] = self.source.level_db(flat[~inside])
        return out.reshape(asked.shape)

    def moment(self, order: int) -> float:
        """Return ``E[p^k] / E[p]^k``, as good as the levels."""
        count = int(np.ceil((self.level[-1] - self.level[0]) / _MOMENT_STEP_DB)) + 1
        level = np.linspace(self.level[0], self.level[-1], count)
        return moment_of_tail(level, _probability(self._at(level)), order)

    def _at(self, level: Reals) -> Reals:
        return _cubic(self.level, self.logit, self._slopes, level)

    def _solved(self, logit: Reals) -> Reals:
        """Return the lowest levels at which the cubic is no higher than asked."""
        upper = np.clip(np.searchsorted(-self.logit, -logit, side="left"), 1, self.level.size - 1)
        low, high = self.level[upper - 1], self.level[upper]
        for _ in range(_HALVINGS):
            middle = 0.5 * (low + high)
            is_enough = self._at(middle) <= logit
            high = np.where(is_enough, middle, high)
            low = np.where(is_enough, low, middle)
        return high


def tabulated(law: Law) -> Law:
    """Return a law that looks its levels up, or the law itself where it is not continuous.

    Parameters
    ----------
    law : Law
        Any. Each level of the table costs one evaluation of it: a few hundred.

    Returns
    -------
    Law
        Its levels are those of ``law`` to 0.001 dB down to 1e-9: every interval of the table is
        tried in its middle, and halved until it is right there to :data:`TOLERANCE_DB`.
    """
    ends = law.level_db([HIGHEST_PROBABILITY, LOWEST_PROBABILITY])
    low, high = max(float(ends[0]), LOWEST_DB), float(ends[1])
    if not low < high < np.inf:
        return law
    level = np.linspace(low, high, max(int(np.ceil((high - low) / _FIRST_STEP_DB)), 4) + 1)
    logit = _logit(law.ccdf(level))
    is_open = np.ones(level.size - 1, np.bool_)
    while is_open.any():
        if level.size > MOST_KNOTS:
            return law
        left = np.flatnonzero(is_open)
        middle = 0.5 * (level[left] + level[left + 1])
        true = _logit(law.ccdf(middle))
        made = _cubic(level, logit, falling_slopes(level, logit), middle)
        secant = (logit[left] - logit[left + 1]) / (level[left + 1] - level[left])
        is_wrong = np.abs(made - true) > np.maximum(TOLERANCE_DB * secant, _unsure(true))
        if np.any(is_wrong & (level[left + 1] - level[left] < _LEAST_STEP_DB)):
            return law
        level = np.insert(level, left + 1, middle)
        logit = np.minimum.accumulate(np.insert(logit, left + 1, true))
        is_open = np.zeros(level.size - 1, np.bool_)
        place = left + np.arange(left.size)
        is_open[place] = is_open[place + 1] = is_wrong
    return TabulatedLaw(source=law, level=level, logit=logit)


def falling_slopes(x: Reals, y: Reals) -> Reals:
    """Return slopes at knots with which cubics between them never rise.

    Parameters
    ----------
    x, y : float64 array, shape (n,)
        Rising and falling (not rising) knots, at least 3.
    """
    width, secant = np.diff(x), np.diff(y) / np.diff(x)
    slopes = np.empty(x.size)
    slopes[1:-1] = (width[1:] * secant[:-1] + width[:-1] * secant[1:]) / (width[1:] + width[:-1])
    slopes[0] = secant[0] + (secant[0] - secant[1]) * width[0] / (width[0] + width[1])
    slopes[-1] = secant[-1] + (secant[-1] - secant[-2]) * width[-1] / (width[-1] + width[-2])
    steepest = np.empty(x.size)
    steepest[1:-1] = 3 * np.maximum(secant[:-1], secant[1:])
    steepest[[0, -1]] = 3 * secant[[0, -1]]
    return np.asarray(np.clip(slopes, steepest, 0.0))


def _cubic(x: Reals, y: Reals, slopes: Reals, at: Reals) -> Reals:
    """Return the cubics through knots, at places between the first and the last."""
    left = np.clip(np.searchsorted(x, at, side="right") - 1, 0, x.size - 2)
    width = x[left + 1] - x[left]
    u = (at - x[left]) / width
    rise = y[left + 1] - y[left]
    s0, s1 = slopes[left] * width, slopes[left + 1] * width
    return np.asarray(y[left] + u * (s0 + u * (3 * rise - 2 * s0 - s1 + u * (s0 + s1 - 2 * rise))))


def _logit(probability: Reals) -> Reals:
    inside = np.clip(probability, 1e-300, 1 - 1e-16)
    return np.asarray(np.log(inside) - np.log1p(-inside))


def _probability(logit: Reals) -> Reals:
    return np.asarray(1 / (1 + np.exp(-logit)))


def _unsure(logit: Reals) -> Reals:
    """Return by how much the law's own roundoff moves a logit."""
    return np.asarray(_FLAT + _ROUNDOFF * (2 + np.exp(np.abs(np.clip(logit, -50.0, 50.0)))))
