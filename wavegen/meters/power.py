"""Power statistics of a waveform: mean, peak, PAPR, CCDF, CDF and PDF.

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
from typing import Self

import numpy as np
from numpy.typing import ArrayLike, NDArray

from wavegen.core.errors import ArgumentsError, SignalError
from wavegen.core.signal import Samples, Signal
from wavegen.dsp.power_kernel import (
    CELL,
    PowerTally,
    bin_edges,
    exact_powers,
    sum_cells,
    sum_tree,
    tally,
)

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
            # At an equal count the lowest power is wanted: np.interp needs the counts to rise.
            first = np.concatenate([[True], np.diff(above) < 0])
            inner = np.interp(wanted, above[first][::-1], powers[first][::-1])
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


class CellSums:
    """Sums over cells of the absolute grid, from stretches cut anywhere.

    Parameters
    ----------
    start : int
        Index of the first sample.

    Notes
    -----
    Cells cut by the edge of a stretch are kept as single powers until their other part is
    merged, so that each sum is taken over the same samples in the same order, however the
    samples were cut. Memory: 16 bytes for 1024 samples.
    """

    def __init__(self, start: int) -> None:
        self.start = self.stop = start
        self._head: list[NDArray[np.float64]] = []
        self._tail: list[NDArray[np.float64]] = []
        self._sums: list[NDArray[np.float64]] = []
        self._maxima: list[NDArray[np.float64]] = []

    @property
    def _first_edge(self) -> int:
        return -(-self.start // CELL) * CELL

    def add_powers(self, powers: NDArray[np.float64]) -> None:
        """Append powers that lie inside one cell."""
        if not powers.size:
            return
        if self.stop < self._first_edge:
            self._head.append(powers)
        else:
            self._tail.append(powers)
        self.stop += powers.size
        if self.stop % CELL == 0 and self._tail:
            whole = np.concatenate(self._tail)
            self._tail = []
            self._sums.append(sum_cells(whole))
            self._maxima.append(whole.max(keepdims=True))

    def add_cells(self, sums: NDArray[np.float64], maxima: NDArray[np.float64]) -> None:
        """Append whole cells; this stretch must end on the grid."""
        if sums.size:
            self._sums.append(sums)
            self._maxima.append(maxima)
            self.stop += sums.size * CELL

    def append(self, following: CellSums) -> None:
        """Append the stretch that starts where this one ends."""
        for powers in following._head:
            self.add_powers(powers)
        for sums, maxima in zip(following._sums, following._maxima, strict=True):
            self.add_cells(sums, maxima)
        for powers in following._tail:
            self.add_powers(powers)

    def total(self) -> tuple[float, NDArray[np.float64]]:
        """Return the sum of all by a fixed pairwise tree, and the largest power of each cell."""
        sums, maxima = list(self._sums), list(self._maxima)
        if self._head:
            head = np.concatenate(self._head)
            sums.insert(0, sum_cells(head))
            maxima.insert(0, head.max(keepdims=True))
        if self._tail:
            tail = np.concatenate(self._tail)
            sums.append(sum_cells(tail))
            maxima.append(tail.max(keepdims=True))
        if not sums:
            return 0.0, np.zeros(0)
        return sum_tree(np.concatenate(sums)), np.concatenate(maxima)


class PowerReading:
    """Running power statistics of one stretch.

    Parameters
    ----------
    where : str
        What is measured, for messages.
    """

    def __init__(self, where: str) -> None:
        self.where = where
        self.cells: CellSums | None = None
        self.n_zeros = 0
        self.peak = 0.0
        self.peak_index = -1
        self.least = float(np.inf)
        self._first_bin = 0
        self._counts = np.zeros(0, np.int64)
        self._top: dict[float, int] = {}

    @property
    def n_samples(self) -> int:
        """Samples measured so far."""
        return self.cells.stop - self.cells.start if self.cells else 0

    def feed(self, start: int, samples: Samples) -> None:
        """Take in samples whose first has index ``start``.

        Raises
        ------
        SignalError
            A sample is not finite.
        """
        if not samples.size:
            return
        if self.cells is None:
            self.cells = CellSums(start)
        head = min(-start % CELL, samples.size)
        body = (samples.size - head) // CELL * CELL
        for low, high, whole in (
            (0, head, False),
            (head, head + body, True),
            (head + body, samples.size, False),
        ):
            if low == high:
                continue
            piece = samples[low:high]
            found = tally(piece)
            self._check(found, start + low)
            self._count(found, start + low)
            if whole:
                self.cells.add_cells(found.sums, found.maxima)
            else:
                self.cells.add_powers(exact_powers(piece))

    def _check(self, found: PowerTally, start: int) -> None:
        if found.bad_index >= 0:
            raise SignalError(
                where=self.where,
                problem=f"sample {start + found.bad_index} is not a finite number",
                allowed="finite I and Q in every sample",
                remedy="Find where the samples come from; cut out the part that is not finite.",
            )

    def _count(self, found: PowerTally, start: int) -> None:
        self.n_zeros += found.n_zeros
        if found.peak > 0.0:
            top = dict(zip(found.top_powers.tolist(), found.top_counts.tolist(), strict=True))
            self._add(found.counts, found.first_bin, top)
            self._extremes(found.peak, start + found.peak_index, found.least)

    def _extremes(self, peak: float, peak_index: int, least: float) -> None:
        if peak > self.peak:
            self.peak, self.peak_index = peak, peak_index
        self.least = min(self.least, least)

    def _add(self, counts: NDArray[np.int64], first_bin: int, top: dict[float, int]) -> None:
        """Add counts; the powers in the highest bin stay resolved, those of lower ones drop."""
        mine, its = self._first_bin + self._counts.size, first_bin + counts.size
        if its > mine:
            self._top = dict(top)
        elif its == mine:
            for power, count in top.items():
                self._top[power] = self._top.get(power, 0) + count
        if not self._counts.size:
            self._first_bin, self._counts = first_bin, counts.copy()
            return
        low = min(self._first_bin, first_bin)
        if low < self._first_bin or its > mine:
            wider = np.zeros(max(mine, its) - low, np.int64)
            wider[self._first_bin - low : mine - low] = self._counts
            self._first_bin, self._counts = low, wider
        self._counts[first_bin - low : its - low] += counts

    def merge(self, following: Self) -> None:
        """Append the reading of the stretch that starts where this one ends."""
        if following.cells is None:
            return
        if self.cells is None:
            self.cells = CellSums(following.cells.start)
        self.cells.append(following.cells)
        self.n_zeros += following.n_zeros
        if following.peak > 0.0:
            self._add(following._counts, following._first_bin, following._top)
            self._extremes(following.peak, following.peak_index, following.least)

    def mean(self) -> float:
        """Return the mean power so far; 0 where every sample is zero.

        Raises
        ------
        SignalError
            No samples.
        """
        if self.cells is None:
            raise SignalError(
                where=self.where,
                problem="there are no samples",
                allowed="one sample or more",
                remedy="Check the file, or the part of it that was asked for.",
            )
        return self.cells.total()[0] / self.n_samples

    def result(self) -> PowerStatistics:
        """Return the statistics.

        Raises
        ------
        SignalError
            No samples, or every sample is zero: nothing can be stated over the mean.
        """
        mean = self.mean()
        if self.cells is None or self.peak == 0.0:
            raise SignalError(
                where=self.where,
                problem=f"all {self.n_samples} samples are exactly zero",
                allowed="a mean power above zero, since levels are stated over it",
                remedy="Check the level, the gating, or the part that was asked for.",
            )
        powers = sorted(self._top)
        return PowerStatistics(
            n_samples=self.n_samples,
            n_zeros=self.n_zeros,
            mean=mean,
            peak=self.peak,
            peak_index=self.peak_index,
            least=self.least,
            counts=self._counts.copy(),
            edges=bin_edges(self._first_bin, self._counts.size),
            top_powers=np.array(powers),
            top_counts=np.array([self._top[power] for power in powers], np.int64),
            start=self.cells.start,
            cell_maxima=self.cells.total()[1],
        )


@dataclass(frozen=True, slots=True, kw_only=True)
class PowerMeter:
    """Settings of the power meter: none but what its messages call the signal.

    Parameters
    ----------
    where : str
        What is measured: a file's name, a recipe path.
    """

    where: str = "signal"

    def begin(self, signal: Signal) -> PowerReading:
        """Return an empty reading."""
        return PowerReading(self.where)


def measure_samples(samples: Samples, *, where: str = "samples") -> PowerStatistics:
    """Return the power statistics of an array.

    Parameters
    ----------
    samples : complex64 array, shape (n_samples,)
        On any scale.
    where : str
        What it is called in messages.

    Returns
    -------
    PowerStatistics

    Raises
    ------
    SignalError
        No samples, one that is not finite, or zeros only.

    Examples
    --------
    >>> n = np.arange(1000)
    >>> tones = np.cos(2 * np.pi * 37 * n / 1000).astype(np.complex64)
    >>> round(measure_samples(tones).papr_db, 2)
    3.01
    """
    reading = PowerReading(where)
    reading.feed(0, samples)
    return reading.result()
