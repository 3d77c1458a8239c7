"""How sure a figure is of the process that a record samples.

Of the record itself every figure is exact. A record is a sample of its process, though; its
samples are correlated, and levels are over the record's own mean, which moves too. What is stated
here are intervals about the process that hold with a given confidence all the same.

*Batches*, where there is much to count. The record is cut in 64 to 128 batches; for the share p
of samples above x times the mean, batch b has the influence ``e_b - p - g (m_b - 1)``: its own
share, and what its mean does to the level, with ``g = x f(x)``, f the density of the power over
the mean. The scatter of the influences gives the variance of p.

*Runs*, where there is little. Samples above a high level come in runs (clusters), and these come
almost independently (M. R. Leadbetter, Z. Wahrsch. verw. Geb. 65, 1983), so that their number is
nearly a Poisson number. What one run counts for, its variance over the square of its mean
size, is taken from the batches at the highest level with 200 runs.

Both give an effective number of independent events, ``p^2 / variance``, and the interval is the
one for the mean of a Poisson number by the gamma distribution (F. Garwood, Biometrika 28, 1936),
which goes over into the normal one for large numbers; that the variance is itself estimated is
allowed for by Student's quantile. Above a share of one half the samples at and below the level
are counted instead.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from functools import cached_property

import numpy as np
import scipy.special
from numpy.typing import ArrayLike, NDArray

from wavegen.core.errors import ArgumentsError
from wavegen.meters.batches import FEWEST_BATCHES, BatchedStatistics, Batches
from wavegen.meters.power_statistics import PROBABILITIES, PowerStatistics

CONFIDENCE = 0.95
RESOLVING_RUNS = 10
"""A level counts as resolved with so many runs beyond it."""
MANY_RUNS = 200
"""From so many on the batches themselves tell the variance; fewer than 2 to 3 runs a batch would
scatter it too much."""
_SLOPE_STEP = 0.05
"""Half the step of ln x over which the density is taken: 0.2 dB."""
_DRIFT_SIGMAS = 3.0
LONG_BATCH = 1024
"""Samples from which a batch counts as longer than the memory of a signal, unless its neighbours
clearly say otherwise; of shorter batches any likeness of neighbours is believed."""
_GRID_STEP_DB = 0.02
_ROOM_DB = 0.1


@dataclass(frozen=True, slots=True, kw_only=True)
class LevelInterval:
    """The level at a probability: of this record, and what is known of the process.

    Parameters
    ----------
    probability : float
        Of being exceeded.
    level_db : float
        Of this record, over its mean, dB: exact.
    low_db, high_db : float
        Between these, over its mean, lies the level of the process, with the confidence
        asked for, dB. ``-inf`` and ``inf`` where the record is too short to tell.
    n_runs : float
        Runs of this record above the level.
    resolved : bool
        Whether they are at least 10.
    """

    probability: float
    level_db: float
    low_db: float
    high_db: float
    n_runs: float
    resolved: bool


@dataclass(frozen=True, slots=True, kw_only=True)
class MomentInterval:
    """A mean of a power of the power, over that power of the mean.

    Parameters
    ----------
    order : int
        k in ``E[p^k] / E[p]^k``: 2 or 3.
    value : float
        Of this record: exact.
    low, high : float
        Of the process.
    standard_error : float
        Of the value, about the process.
    """

    order: int
    value: float
    low: float
    high: float
    standard_error: float


@dataclass(frozen=True, slots=True, kw_only=True)
class NeededLength:
    """How long a record would have to be for the next decade of probability.

    Parameters
    ----------
    probability : float
        A tenth of the last decade that is resolved.
    n_samples : int
        Length at which 10 runs beyond that level are to be expected.
    times : float
        The same as a multiple of this record.
    """

    probability: float
    n_samples: int
    times: float


@dataclass(frozen=True, kw_only=True, eq=False)
class SampledStatistics:
    """Intervals about the process that a record samples.

    Parameters
    ----------
    statistics : PowerStatistics
        Of the record, exact.
    batches : Batches
        Of the same record.

    Notes
    -----
    A record of fewer than 64 samples says nothing: all its intervals are open.
    """

    statistics: PowerStatistics
    batches: Batches

    @classmethod
    def of(cls, measured: BatchedStatistics) -> SampledStatistics:
        """Return the intervals of what the batched power meter measured."""
        return cls(statistics=measured.statistics, batches=measured.batches)

    @property
    def degrees(self) -> int:
        """Degrees of freedom of a variance over batches."""
        return int(np.count_nonzero(self.batches.n_measured)) - 1

    @property
    def says_nothing(self) -> bool:
        """Whether there are too few batches."""
        return self.degrees < FEWEST_BATCHES - 1

    @cached_property
    def _relative_excess(self) -> NDArray[np.float64]:
        """Return the power of each batch over the mean, less its number of samples."""
        batches = self.batches
        excess: NDArray[np.float64] = batches.sums[:, 0] / self.statistics.mean - batches.n_measured
        return excess

    @cached_property
    def drift(self) -> float:
        """Correlation of the mean powers of neighbouring batches, 0 if it is not significant.

        About 0 for a stationary record much longer than its memory; towards 1 where the level
        drifts over the record, or the batches are shorter than the memory.
        """
        return float(_neighbours(self._relative_excess[np.newaxis], _DRIFT_SIGMAS)[0])

    @property
    def _doubt(self) -> float:
        """How many standard errors a correlation of neighbours must have to be believed."""
        return 0.0 if self.batches.batch_samples < LONG_BATCH else _DRIFT_SIGMAS

    def _variance(self, influence: NDArray[np.float64]) -> NDArray[np.float64]:
        """Return the variance of means over the record, shape (n,).

        Parameters
        ----------
        influence : float64 array, shape (n, n_batches)
            Sum over the samples of each batch.
        """
        n_samples, n_batches = self.statistics.n_samples, self.degrees + 1
        sums = np.sum(influence * influence, axis=1)
        plain = sums * n_batches / max(n_batches - 1, 1) / float(n_samples) ** 2
        memory = _neighbours(influence, self._doubt)
        return np.asarray(plain * (1 + memory) / (1 - memory))

    def _shares(self, power: NDArray[np.float64]) -> NDArray[np.float64]:
        """Return the variance of the share above powers, shape (n_powers,), from the batches."""
        batches, n_samples = self.batches, self.statistics.n_samples
        above = batches.above(power)
        share = above.sum(axis=1) / n_samples
        slope = (
            batches.above(power * np.exp(-_SLOPE_STEP)).sum(axis=1)
            - batches.above(power * np.exp(_SLOPE_STEP)).sum(axis=1)
        ) / (2 * _SLOPE_STEP * n_samples)
        influence = above - share[:, np.newaxis] * batches.n_measured
        influence -= slope[:, np.newaxis] * self._relative_excess
        return self._variance(influence)

    @cached_property
    def _edge_runs(self) -> NDArray[np.float64]:
        return self.batches.runs(self.batches.edges)

    @cached_property
    def _worth_of_a_run(self) -> tuple[float, float]:
        """Return what a run counts for where runs are few: above high levels, below low ones.

        Variance of the number of samples over (number of runs times the square of their mean
        size): 1 if all runs are alike, 4/pi if they last as Rayleigh's law says.
        """
        runs = self._edge_runs
        many = np.flatnonzero(runs >= min(MANY_RUNS, runs.max()))
        ends = np.array([many[-1], many[0]])
        power = self.batches.edges[ends]
        above = self.batches.above(power).sum(axis=1)
        n_samples = self.statistics.n_samples
        sizes = np.array([above[0], n_samples - above[1]]) / np.maximum(runs[ends], 1)
        variance = self._shares(power) * float(n_samples) ** 2
        worth = variance / (np.maximum(runs[ends], 1) * np.maximum(sizes, 1) ** 2)
        return max(float(worth[0]), 1.0), max(float(worth[1]), 1.0)

    def _run_sizes(
        self, power: NDArray[np.float64], *, fewest: int = 1
    ) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
        """Return the mean size of runs above and below powers, two arrays of shape (n_powers,).

        Read at the edges of bins that have the fewest runs wanted, and interpolated; beyond
        them, where the sizes shrink slowly, it is that of the last.
        """
        runs, edges = self._edge_runs, self.batches.edges
        above = self.batches.above(edges).sum(axis=1)
        used = runs >= min(fewest, runs.max())
        if not runs.max() >= 1:
            whole = np.full(power.shape, float(self.statistics.n_samples))
            return whole, whole
        over = np.interp(power, edges[used], (above / np.maximum(runs, 1))[used])
        rest = self.statistics.n_samples - above
        under = np.interp(power, edges[used], (rest / np.maximum(runs, 1))[used])
        return np.maximum(over, 1.0), np.maximum(under, 1.0)

    def n_runs(self, level_db: ArrayLike) -> NDArray[np.float64]:
        """Return the number of runs of this record above a level (dB over the mean)."""
        power = self._power(level_db)
        sizes, _ = self._run_sizes(power)
        return np.asarray(self.statistics.exceedances_of_power(power) / sizes)

    def _power(self, level_db: ArrayLike) -> NDArray[np.float64]:
        level = np.atleast_1d(np.asarray(level_db, np.float64))
        return np.asarray(self.statistics.mean * 10 ** (level / 10))

    def ccdf_interval(
        self, level_db: ArrayLike, *, confidence: float = CONFIDENCE
    ) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
        """Return between which probabilities that of the process lies.

        Parameters
        ----------
        level_db : float or array, shape (n_levels,)
            Over the mean, dB.
        confidence : float
            Of each interval, two-sided.

        Returns
        -------
        low, high : float64 arrays, shape (n_levels,)

        Raises
        ------
        ArgumentsError
            A confidence outside 0 to 1.
        """
        events = self._events(level_db)
        tail = self._tail(confidence)
        if self.says_nothing:
            return np.zeros(events.share.shape), np.ones(events.share.shape)
        low = events.scale * scipy.special.gammaincinv(events.number, tail)
        high = events.scale * scipy.special.gammainccinv(events.number + 1, tail)
        exact = events.scale == 0
        low = np.where(exact | (events.number == 0), np.where(exact, events.share, 0.0), low)
        high = np.minimum(np.where(exact, events.share, high), 1.0)
        flipped = events.is_below
        return np.where(flipped, 1 - high, low), np.where(flipped, 1 - low, high)

    def _tail(self, confidence: float) -> float:
        """Return the one-sided error, smaller as the variance is only estimated."""
        if not 0 < confidence < 1:
            raise ArgumentsError(
                where="confidence",
                problem=f"{confidence:g} is no confidence",
                allowed="above 0 and below 1",
                remedy="Write 0.95 for 95 %.",
            )
        quantile = scipy.special.stdtrit(max(self.degrees, 1), (1 - confidence) / 2)
        return float(scipy.special.ndtr(quantile))

    def _events(self, level_db: ArrayLike) -> _Events:
        """Return the effective number of independent events beyond levels, and their weight."""
        power = self._power(level_db)
        n_samples = float(self.statistics.n_samples)
        above = self.statistics.exceedances_of_power(power)
        is_below = above > n_samples / 2
        share = np.where(is_below, n_samples - above, above) / n_samples
        if self.says_nothing:
            return _Events(share=share, number=share, scale=share, is_below=is_below)
        # The last few runs tell their size no better than their number.
        over, under = self._run_sizes(power, fewest=RESOLVING_RUNS)
        size = np.where(is_below, under, over)
        high_worth, low_worth = self._worth_of_a_run
        worth = np.where(is_below, low_worth, high_worth)
        n_runs = share * n_samples / size
        scale = size * worth / n_samples
        number = n_runs / worth
        is_many = n_runs >= min(MANY_RUNS, float(self._edge_runs.max()))
        many = np.flatnonzero(is_many & (share > 0))  # a constant envelope has no run at all
        if many.size:
            variance = self._shares(power[many])
            scale[many] = variance / share[many]
            with np.errstate(divide="ignore"):
                number[many] = share[many] ** 2 / variance
        number[~np.isfinite(number)] = 0.0
        return _Events(share=share, number=number, scale=scale, is_below=is_below)

    def event_samples(self, level_db: ArrayLike) -> NDArray[np.float64]:
        """Return for how many samples beyond a level one independent event counts, shape (n,).

        The variance of a share q of ``n_samples`` is ``q * event_samples / n_samples``.
        """
        return np.asarray(self._events(level_db).scale * self.statistics.n_samples)

    def level_interval(
        self, probability: ArrayLike, *, confidence: float = CONFIDENCE
    ) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
        """Return between which levels the one at a probability lies in the process.

        Parameters
        ----------
        probability : float or array, shape (n,)
            Of being exceeded.
        confidence : float
            Of each interval, two-sided.

        Returns
        -------
        low_db, high_db : float64 arrays, shape (n,)
            Over the mean, dB; those levels at which the interval of the CCDF holds the
            probability. ``-inf``, ``inf`` where none is too low or too high.

        Raises
        ------
        ArgumentsError
            A confidence outside 0 to 1.
        """
        asked = np.atleast_1d(np.asarray(probability, np.float64))
        grid = self._grid
        low, high = self.ccdf_interval(grid, confidence=confidence)
        # Rising towards lower levels, as the CCDF itself: what holds above holds below.
        low = np.maximum.accumulate(low[::-1])[::-1]
        high = np.maximum.accumulate(high[::-1])[::-1]
        low_db = np.empty(asked.shape)
        high_db = np.empty(asked.shape)
        for at, q in enumerate(asked):
            low_db[at] = _crossing(grid, low, float(q), open_end=-np.inf)
            high_db[at] = _crossing(grid, high, float(q), open_end=np.inf)
        return low_db, high_db

    @cached_property
    def _grid(self) -> NDArray[np.float64]:
        top = self.statistics.papr_db + _ROOM_DB
        low = min(-30.0, top - 1.0)
        return np.arange(np.floor(low / _GRID_STEP_DB), np.ceil(top / _GRID_STEP_DB) + 1) * (
            _GRID_STEP_DB
        )

    def levels(
        self, probabilities: Iterable[float] = PROBABILITIES, *, confidence: float = CONFIDENCE
    ) -> tuple[LevelInterval, ...]:
        """Return a table of levels with their intervals.

        Parameters
        ----------
        probabilities : iterable of float
            10 % to 0.0001 % unless given.
        confidence : float
            Of each interval.

        Returns
        -------
        tuple of LevelInterval
        """
        asked = np.array([*probabilities], np.float64)
        level = self.statistics.level_db(asked)
        runs = self.statistics.n_samples * asked / self._run_sizes(self._power(level))[0]
        low, high = self.level_interval(asked, confidence=confidence)
        return tuple(
            LevelInterval(
                probability=float(asked[k]),
                level_db=float(level[k]),
                low_db=float(min(low[k], level[k])),
                high_db=float(max(high[k], level[k])),
                n_runs=float(runs[k]),
                resolved=bool(runs[k] >= RESOLVING_RUNS * (1 - 1e-9)),
            )
            for k in range(asked.size)
        )

    def next_decade(self) -> NeededLength | None:
        """Return how long a record would have to be to resolve one decade more.

        Returns
        -------
        NeededLength or None
            None if not even 10 % is resolved, so that nothing can be foreseen. The size of
            runs is taken as that at the last resolved decade; it shrinks slowly, so that
            somewhat fewer samples will do.
        """
        decades = 10.0 ** -np.arange(1, 16)
        rows = self.levels_resolved(decades)
        if not rows[0]:
            return None
        n_resolved = int(np.argmin(rows)) if not rows.all() else rows.size
        last = decades[n_resolved - 1]
        size = float(self._run_sizes(self._power(self.statistics.level_db(last)))[0][0])
        wanted = last / 10
        n_samples = int(np.ceil(RESOLVING_RUNS * size / wanted * (1 - 1e-12)))
        return NeededLength(
            probability=float(wanted),
            n_samples=n_samples,
            times=n_samples / self.statistics.n_samples,
        )

    def levels_resolved(self, probability: ArrayLike) -> NDArray[np.bool_]:
        """Return at which probabilities there are at least 10 runs, shape (n,)."""
        asked = np.atleast_1d(np.asarray(probability, np.float64))
        sizes, _ = self._run_sizes(self._power(self.statistics.level_db(asked)))
        runs = self.statistics.n_samples * asked / sizes
        return np.asarray(runs >= RESOLVING_RUNS * (1 - 1e-9))

    def moment(self, order: int, *, confidence: float = CONFIDENCE) -> MomentInterval:
        """Return ``E[p^k] / E[p]^k`` with its interval.

        Parameters
        ----------
        order : {2, 3}
            k.
        confidence : float
            Two-sided.

        Returns
        -------
        MomentInterval

        Raises
        ------
        ArgumentsError
            A confidence outside 0 to 1.

        Notes
        -----
        By batches, with the influence ``q_b - M - k M (m_b - 1)``, ``q_b`` the batch's own mean
        of ``(p / mean)^k``, and the same gamma interval: the sum of so skew a figure is skew.
        """
        tail = self._tail(confidence)
        batches, mean, n_samples = self.batches, self.statistics.mean, self.statistics.n_samples
        own = batches.sums[:, order - 1] / mean**order
        value = float(np.sum(own)) / n_samples
        influence = own - value * batches.n_measured - order * value * self._relative_excess
        variance = float(self._variance(influence[np.newaxis])[0])
        low, high = (0.0, np.inf) if self.says_nothing else (value, value)
        if variance > 0 and not self.says_nothing:
            number = value * value / variance
            scale = variance / value
            low = float(scale * scipy.special.gammaincinv(number, tail))
            high = float(scale * scipy.special.gammainccinv(number, tail))
        return MomentInterval(
            order=order, value=value, low=low, high=high, standard_error=variance**0.5
        )

    def moments(self, *, confidence: float = CONFIDENCE) -> tuple[MomentInterval, ...]:
        """Return the second and the third moment of the power over its mean."""
        return tuple(self.moment(order, confidence=confidence) for order in (2, 3))

    def mean_interval_db(self, *, confidence: float = CONFIDENCE) -> tuple[float, float]:
        """Return between which levels the mean of the process lies, dB over full scale."""
        tail = self._tail(confidence)
        variance = float(self._variance(self._relative_excess[np.newaxis])[0])
        if self.says_nothing:
            return -np.inf, np.inf
        reach = -float(scipy.special.ndtri(tail)) * variance**0.5
        low = 10 * np.log10(1 - reach) if reach < 1 else -np.inf
        return self.statistics.mean_db + low, self.statistics.mean_db + 10 * np.log10(1 + reach)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class _Events:
    """What lies beyond levels, as so many independent events of equal weight.

    ``share`` is ``number * scale``; ``is_below`` where the samples at and below are counted.
    """

    share: NDArray[np.float64]
    number: NDArray[np.float64]
    scale: NDArray[np.float64]
    is_below: NDArray[np.bool_]


def _neighbours(influence: NDArray[np.float64], sigmas: float) -> NDArray[np.float64]:
    """Return the correlation of neighbouring batches, shape (n,); 0 unless it is certain."""
    n_batches = influence.shape[1]
    sums = np.sum(influence * influence, axis=1)
    products = np.sum(influence[:, 1:] * influence[:, :-1], axis=1)
    found = products / np.where(sums > 0, sums, 1.0)
    is_certain = found > sigmas / max(n_batches, 1) ** 0.5
    return np.asarray(np.where(is_certain, np.minimum(found, 0.98), 0.0))


def _crossing(
    grid: NDArray[np.float64], bound: NDArray[np.float64], q: float, *, open_end: float
) -> float:
    """Return the level at which a falling bound passes a probability."""
    under = bound < q if open_end > 0 else bound <= q
    first = int(np.argmax(under))
    if not under[first]:
        return float(open_end) if open_end > 0 else float(grid[-1])
    if first == 0:
        return float(open_end) if open_end < 0 else float(grid[0])
    before, after = bound[first - 1], bound[first]
    if after <= 0:  # a step down to nothing: no line can be drawn through it
        return float(grid[first])
    part = np.log(before / q) / np.log(before / after)
    return float(grid[first - 1] + np.clip(part, 0.0, 1.0) * (grid[first] - grid[first - 1]))
