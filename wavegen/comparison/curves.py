"""A side of a comparison as a curve: levels at probabilities, and how sure they are.

Whatever a side was (a loop, a recording, a law, an instrument's export), the rest of this room
sees one of these. Levels are in dB over the side's own mean power unless said otherwise.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import Protocol

import numpy as np
import scipy.special
from numpy.typing import ArrayLike, NDArray

from wavegen.dsp.monotone_cubic import MonotoneCubic
from wavegen.meters.intervals import RESOLVING_RUNS, SampledStatistics

Reals = NDArray[np.float64]


class Curve(Protocol):
    """The distribution of a power as far as it is known."""

    @property
    def is_exact(self) -> bool:
        """Whether it has no sampling error."""

    @property
    def n_samples(self) -> int | None:
        """How many samples it rests on; None where that is not known or means nothing."""

    def ccdf(self, level_db: ArrayLike) -> Reals:
        """Return the probability of being above a level."""

    def level_db(self, probability: ArrayLike) -> Reals:
        """Return the level at a probability."""

    def level_interval(self, probability: ArrayLike, *, confidence: float) -> tuple[Reals, Reals]:
        """Return between which levels that of the process lies, two arrays of shape (n,)."""

    def is_resolved(self, probability: ArrayLike) -> NDArray[np.bool_]:
        """Return where there are at least ten independent events beyond the level, shape (n,)."""

    def event_samples(self, probability: ArrayLike) -> Reals:
        """Return for how many samples beyond the level one event counts, shape (n,); 0 if exact.

        The variance of a share q of n samples is ``q event_samples / n``.
        """


class HasLevels(Protocol):
    """What is needed of a law, or of the statistics of a loop."""

    def ccdf(self, level_db: ArrayLike) -> Reals:
        """Return the probability of being above a level."""

    def level_db(self, probability: ArrayLike) -> Reals:
        """Return the level at a probability."""


@dataclass(frozen=True, eq=False, kw_only=True)
class ExactCurve:
    """A curve without sampling error: a law's, or that of one loop.

    Parameters
    ----------
    source : HasLevels
        Law or statistics, dB over the mean.
    shift_db : float
        Added to every level: the mean, where levels are wanted on an absolute scale.
    """

    source: HasLevels
    shift_db: float = 0.0
    is_exact: bool = True
    n_samples: int | None = None

    def ccdf(self, level_db: ArrayLike) -> Reals:
        """Return the probability of being above a level."""
        return np.asarray(self.source.ccdf(np.asarray(level_db, np.float64) - self.shift_db))

    def level_db(self, probability: ArrayLike) -> Reals:
        """Return the level at a probability."""
        return np.asarray(self.source.level_db(probability)) + self.shift_db

    def level_interval(self, probability: ArrayLike, *, confidence: float) -> tuple[Reals, Reals]:
        """Return the level twice: nothing is uncertain."""
        level = np.atleast_1d(self.level_db(probability))
        return level, level.copy()

    def is_resolved(self, probability: ArrayLike) -> NDArray[np.bool_]:
        """Return True everywhere."""
        return np.ones(np.atleast_1d(probability).shape, np.bool_)

    def event_samples(self, probability: ArrayLike) -> Reals:
        """Return 0: no event weighs anything."""
        return np.zeros(np.atleast_1d(probability).shape)


class ScaleStatistics(SampledStatistics):
    """Intervals of levels on the scale of the samples, not over the record's own mean.

    What the mean of a batch does to a level over the mean then does not count.
    """

    @cached_property
    def _relative_excess(self) -> Reals:
        return np.zeros(self.batches.n_measured.shape)


@dataclass(frozen=True, eq=False, kw_only=True)
class SampledCurve:
    """The curve of a recording: a sample of its process.

    Parameters
    ----------
    sampled : SampledStatistics
        Its figures with their intervals.
    shift_db : float
        Added to every level.
    """

    sampled: SampledStatistics
    shift_db: float = 0.0
    is_exact: bool = False

    @property
    def n_samples(self) -> int:
        """How many samples it rests on."""
        return int(self.sampled.statistics.n_samples)

    def ccdf(self, level_db: ArrayLike) -> Reals:
        """Return the share of the record above a level."""
        return self.sampled.statistics.ccdf(np.asarray(level_db, np.float64) - self.shift_db)

    def level_db(self, probability: ArrayLike) -> Reals:
        """Return the record's own level at a probability."""
        return self.sampled.statistics.level_db(probability) + self.shift_db

    def level_interval(self, probability: ArrayLike, *, confidence: float) -> tuple[Reals, Reals]:
        """Return between which levels that of the process lies."""
        level = np.atleast_1d(self.sampled.statistics.level_db(probability))
        low, high = self.sampled.level_interval(probability, confidence=confidence)
        return np.minimum(low, level) + self.shift_db, np.maximum(high, level) + self.shift_db

    def is_resolved(self, probability: ArrayLike) -> NDArray[np.bool_]:
        """Return where at least ten runs lie beyond the level."""
        return self.sampled.levels_resolved(probability)

    def event_samples(self, probability: ArrayLike) -> Reals:
        """Return for how many samples beyond the level one event counts."""
        level = np.atleast_1d(self.sampled.statistics.level_db(probability))
        return self.sampled.event_samples(np.maximum(level, -300.0))


@dataclass(frozen=True, eq=False, kw_only=True)
class PointsCurve:
    """A curve by its points, as an instrument or a figure gives it.

    Parameters
    ----------
    levels : float64 array, shape (n_points,)
        Rising, dB over the mean.
    probabilities : float64 array, shape (n_points,)
        Falling, of being above them.
    n_samples : int or None
        Samples it was measured on, taken as independent; None if not stated: then it is not
        known how sure the points are.
    reading_db : float
        Half-width of what each level may be off by reading or rounding, dB.
    is_exact : bool
        Whether they are of one loop: then nothing but what lies between them is unsure.

    Notes
    -----
    Between points runs a monotone cubic of the level over the logarithm of the probability. What
    it may be off there counts as its distance from the straight line between the points.
    """

    levels: Reals
    probabilities: Reals
    n_samples: int | None = None
    reading_db: float = 0.0
    is_exact: bool = False

    @cached_property
    def _knots(self) -> tuple[Reals, Reals]:
        """Return ``ln q`` rising and the level at it, points of equal probability made one.

        Of several levels at one probability the lowest is that of the definition.
        """
        used = self.probabilities > 0
        log_q, first = np.unique(np.log(self.probabilities[used]), return_index=True)
        return log_q, self.levels[used][first]

    @cached_property
    def _cubic(self) -> MonotoneCubic:
        log_q, level = self._knots
        return MonotoneCubic(x=log_q, y=level)

    def _log(self, probability: ArrayLike) -> Reals:
        with np.errstate(divide="ignore"):
            asked = np.log(np.atleast_1d(np.asarray(probability, np.float64)))
        ends = self._knots[0]
        return np.clip(asked, ends[0], ends[-1])

    def ccdf(self, level_db: ArrayLike) -> Reals:
        """Return the probability of being above a level; straight lines in its logarithm."""
        log_q, level = self._knots
        asked = np.asarray(level_db, np.float64)
        found = np.exp(np.interp(asked, level[::-1], log_q[::-1]))
        return np.where(asked >= self.levels[-1], self.probabilities[-1], found)

    def level_db(self, probability: ArrayLike) -> Reals:
        """Return the level at a probability; beyond the ends that of the end."""
        shape = np.shape(probability)
        return np.asarray(self._cubic(self._log(probability))).reshape(shape)

    def level_interval(self, probability: ArrayLike, *, confidence: float) -> tuple[Reals, Reals]:
        """Return the level less and plus what it may be off; beyond the points nothing is known."""
        asked = np.atleast_1d(np.asarray(probability, np.float64))
        below, above = asked, asked
        if self.n_samples is not None and not self.is_exact:
            tail, events = (1 - confidence) / 2, asked * self.n_samples
            below = scipy.special.gammaincinv(np.maximum(events, 1e-9), tail) / self.n_samples
            above = scipy.special.gammainccinv(events + 1, tail) / self.n_samples
        least, most = self.reach
        low = np.where(
            asked > most * (1 + 1e-9), -np.inf, self._bounded(np.minimum(above, 1.0), -1)
        )
        high = self._bounded(below, 1)
        if not self.is_exact:
            high = np.where(asked < least * (1 - 1e-9), np.inf, high)
        return low, high

    def _bounded(self, probability: Reals, sign: int) -> Reals:
        place = self._log(probability)
        log_q, level = self._knots
        curved = np.asarray(self._cubic(place))
        bend = np.abs(curved - np.interp(place, log_q, level))
        return curved + sign * (bend + self.reading_db)

    @property
    def reach(self) -> tuple[float, float]:
        """Least and most probability that the points hold."""
        log_q = self._knots[0]
        return float(np.exp(log_q[0])), float(np.exp(log_q[-1]))

    def is_resolved(self, probability: ArrayLike) -> NDArray[np.bool_]:
        """Return where ten samples lie beyond; without their number, ten times the last point.

        A curve that ends at a probability rests on at least one sample there.
        """
        asked = np.atleast_1d(np.asarray(probability, np.float64))
        least, most = self.reach
        if self.is_exact:
            return asked <= most * (1 + 1e-9)
        enough = RESOLVING_RUNS / self.n_samples if self.n_samples else RESOLVING_RUNS * least
        slack = 1 - 1e-9
        return (asked >= enough * slack) & (asked <= most / slack) & (asked >= least * slack)

    def event_samples(self, probability: ArrayLike) -> Reals:
        """Return 1: the samples are taken as independent; 0 where their number is not stated."""
        is_told = self.n_samples is not None and not self.is_exact
        return np.full(np.atleast_1d(probability).shape, 1.0 if is_told else 0.0)
