"""What a waveform's envelope power says about it: mean, peak, PAPR, CCDF, CDF and PDF.

Conventions. Power is instantaneous envelope power ``p = |x|^2``. Levels in dB are over the mean of
everything that was measured (0 dB is the mean). Figures called ``_db`` without "over the mean" are
over full scale: power 1, an envelope equal to one component's full scale (0 dBFS). The CCDF at
level L is ``P(p > L)``; the level at probability q is the smallest L with ``CCDF(L) <= q``, so
that a clipped signal shows its wall and a constant envelope reads 0 dB everywhere. Exact zeros
have a bin of their own, at minus infinity dB. This is the CCDF of *instantaneous power*, not that
of the PAPR of each symbol.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import ArrayLike, NDArray

from wavegen.core.errors import ArgumentsError

PROBABILITIES = (1e-1, 1e-2, 1e-3, 1e-4, 1e-5, 1e-6)
"""Rows of a table of levels unless others are asked for."""
RESOLVING_SAMPLES = 10
"""A level counts as resolved with at least so many samples beyond it (common practice: at 10
samples the relative standard error of an independent count is 1/sqrt(10) = 32 %)."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Level:
    """One row of a table of levels.

    Parameters
    ----------
    probability : float
        Of being exceeded.
    level_db : float
        Over the mean, dB.
    resolved : bool
        Whether at least 10 samples lie beyond.
    """

    probability: float
    level_db: float
    resolved: bool


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Curve:
    """A CCDF on a grid.

    Parameters
    ----------
    level_db : float64 array, shape (n,)
        Rising, over the mean, dB; the last is the first grid level at or above the peak.
    probability : float64 array, shape (n,)
        ``P(p > level)``; 0 at the last level.
    """

    level_db: NDArray[np.float64]
    probability: NDArray[np.float64]


@dataclass(frozen=True, kw_only=True, eq=False)
class PowerStatistics:
    """Everything a waveform's envelope power says about it; of *this* record, exactly.

    Parameters
    ----------
    n_samples : int
        Samples measured, zeros included.
    n_zeros : int
        Of these, exactly zero.
    mean : float
        Mean power over all samples; full scale is 1.
    peak : float
        Largest power of a sample.
    peak_index : int
        First sample with it, on the axis of the signal.
    least : float
        Smallest power that is not zero.
    counts : int64 array, shape (n_bins,)
        Samples in each bin from that of ``least`` to that of ``peak``.
    edges : float64 array, shape (n_bins + 1,)
        Powers: bin ``k`` holds ``edges[k] <= p < edges[k + 1]``; 512 an octave, round
        powers such as 1 in the middle of theirs.
    top_powers : float64 array, shape (n,)
        Every power that occurs in the highest bin, rising: a clipped signal's wall stands here
        as what it is, not spread over a bin.
    top_counts : int64 array, shape (n,)
        How often each of them occurs.
    start : int
        Index of the first sample measured.
    cell_maxima : float64 array, shape (n_cells,)
        Largest power in each cell of 1024 samples of the absolute grid, the first being the
        cell that holds ``start``: where to look for the peak between samples.

    Notes
    -----
    Inside a bin the samples are taken as spread evenly over power, from ``least`` in the lowest
    bin; a level is off by less than the bin's width, 0.0085 dB, and exact at bin edges and in
    the highest bin.
    """

    n_samples: int
    n_zeros: int
    mean: float
    peak: float
    peak_index: int
    least: float
    counts: NDArray[np.int64]
    edges: NDArray[np.float64]
    top_powers: NDArray[np.float64]
    top_counts: NDArray[np.int64]
    start: int
    cell_maxima: NDArray[np.float64]

    @property
    def mean_db(self) -> float:
        """Mean power, dB over full scale."""
        return _db(self.mean)

    @property
    def peak_db(self) -> float:
        """Power of the largest sample, dB over full scale."""
        return _db(self.peak)

    @property
    def papr_db(self) -> float:
        """Peak over mean of the complex envelope at the samples, dB; 0 for a carrier."""
        return _db(self.peak / self.mean)

    @cached_property
    def _knots(self) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
        """Powers, rising, and how many samples lie above each; linear between them."""
        below_top = self.counts[:-1]
        if not below_top.size:
            return np.zeros(0), np.zeros(0)
        powers = self.edges[:-1].copy()
        powers[0] = self.least
        n_top = int(self.counts[-1])
        above = n_top + np.concatenate([np.cumsum(below_top[::-1])[::-1], [0]])
        return powers, above.astype(np.float64)

    def exceedances_of_power(self, power: ArrayLike) -> NDArray[np.float64]:
        """Return how many samples have more than a power.

        Parameters
        ----------
        power : float or array
            On the scale of the samples (not over the mean).

        Returns
        -------
        float64 array, same shape
            Whole numbers at bin edges and in the highest bin, interpolated between.
        """
        asked = np.asarray(power, np.float64)
        n_nonzero = float(self.n_samples - self.n_zeros)
        powers, above = self._knots
        if powers.size:
            found = np.interp(asked, powers, above, left=n_nonzero)
        else:
            found = np.full(asked.shape, n_nonzero)
        beyond = np.concatenate([np.cumsum(self.top_counts[::-1])[::-1], [0]])
        in_top = beyond[np.searchsorted(self.top_powers, asked, side="right")]
        top = asked >= (self.edges[-2] if powers.size else self.least)
        found = np.where(top, in_top, found)
        return np.where(asked < 0, float(self.n_samples), found)

    def exceedances(self, level_db: ArrayLike) -> NDArray[np.float64]:
        """Return how many samples lie above a level.

        Parameters
        ----------
        level_db : float or array
            Over the mean, dB.

        Returns
        -------
        float64 array, same shape
        """
        return self.exceedances_of_power(self.mean * _ratio(level_db))

    def ccdf(self, level_db: ArrayLike) -> NDArray[np.float64]:
        """Return ``P(p > L mean)``.

        Parameters
        ----------
        level_db : float or array
            L, over the mean, dB.

        Returns
        -------
        float64 array, same shape
            Falls monotonically; 0 from the peak on, ``1 - n_zeros / n_samples`` under ``least``.
        """
        return self.exceedances(level_db) / self.n_samples

    def cdf(self, level_db: ArrayLike) -> NDArray[np.float64]:
        """Return ``P(p <= L mean)``, one minus the CCDF."""
        return 1.0 - self.ccdf(level_db)

    def pdf(self, level_db: ArrayLike) -> NDArray[np.float64]:
        """Return the density of the level between grid points.

        Parameters
        ----------
        level_db : array, shape (n,)
            Rising grid, over the mean, dB.

        Returns
        -------
        float64 array, shape (n - 1,)
            Probability per dB, averaged over each interval of the grid.
        """
        grid = np.asarray(level_db, np.float64)
        return -np.diff(self.ccdf(grid)) / np.diff(grid)

    def level_power(self, probability: ArrayLike) -> NDArray[np.float64]:
        """Return the smallest power that is exceeded with at most a probability.

        Parameters
        ----------
        probability : float or array
            From 0 to 1.

        Returns
        -------
        float64 array, same shape
            On the scale of the samples; 0 where the zeros alone satisfy it. Probability 0 gives
            the peak.

        Raises
        ------
        ArgumentsError
            A probability outside [0, 1].
        """
        asked = np.asarray(probability, np.float64)
        if not np.all((asked >= 0) & (asked <= 1)):
            raise ArgumentsError(
                where="probability",
                problem=f"{asked} is no probability",
                allowed="0 to 1",
                remedy="Give the fraction of the time: 0.0001 for 0.01 %.",
            )
        # A hair of slack: 0.1 * 30 is 3.0000000000000004, and 3 samples beyond must satisfy it.
        wanted = asked * self.n_samples * (1 + 1e-12)
        beyond = np.concatenate([np.cumsum(self.top_counts[::-1])[::-1][1:], [0]])
        place = np.searchsorted(-beyond, -wanted)
        found = self.top_powers[np.minimum(place, beyond.size - 1)]
        powers, above = self._knots
        if powers.size:
            first = np.searchsorted(-above, -wanted)  # the first knot with so few above it
            right = np.clip(first, 1, above.size - 1)
            left = right - 1
            fall = np.maximum(above[left] - above[right], 1.0)
            part = np.clip((above[left] - wanted) / fall, 0.0, 1.0)
            inner = powers[left] + part * (powers[right] - powers[left])
            found = np.where(wanted >= self.counts[-1], inner, found)
        if self.n_zeros:
            found = np.where(wanted >= self.n_samples - self.n_zeros, 0.0, found)
        return found

    def level_db(self, probability: ArrayLike) -> NDArray[np.float64]:
        """Return the smallest level L with ``CCDF(L) <= q``.

        Parameters
        ----------
        probability : float or array
            q, from 0 to 1.

        Returns
        -------
        float64 array, same shape
            Over the mean, dB; minus infinity where the zeros alone satisfy it.

        Raises
        ------
        ArgumentsError
            A probability outside [0, 1].
        """
        with np.errstate(divide="ignore"):
            level: NDArray[np.float64] = 10.0 * np.log10(self.level_power(probability) / self.mean)
        return level

    def levels(self, probabilities: Iterable[float] = PROBABILITIES) -> tuple[Level, ...]:
        """Return a table of levels.

        Parameters
        ----------
        probabilities : iterable of float
            10 % to 0.0001 % unless given.

        Returns
        -------
        tuple of Level
        """
        return tuple(
            Level(
                probability=float(probability),
                level_db=float(self.level_db(probability)),
                resolved=probability * self.n_samples * (1 + 1e-12) >= RESOLVING_SAMPLES,
            )
            for probability in probabilities
        )

    def curve(self, *, step_db: float = 0.05, lowest_db: float = -30.0) -> Curve:
        """Return the CCDF on a grid, down to the last sample.

        Parameters
        ----------
        step_db : float
            Grid step, dB; levels are whole multiples of it.
        lowest_db : float
            Where the grid begins, dB over the mean; later if no sample lies that low.

        Returns
        -------
        Curve
        """
        least_db = _db(self.least / self.mean)
        first = int(np.floor(max(lowest_db, least_db) / step_db))
        last = int(np.ceil(self.papr_db / step_db))
        level_db = np.arange(min(first, last), last + 1, dtype=np.float64) * step_db
        probability = self.ccdf(level_db)
        probability[-1] = 0.0  # at or above the peak, but for the rounding of dB and back
        return Curve(level_db=level_db, probability=probability)


def _db(ratio: float) -> float:
    return 10.0 * float(np.log10(ratio))


def _ratio(level_db: ArrayLike) -> NDArray[np.float64]:
    return np.power(10.0, np.asarray(level_db, np.float64) / 10.0)
