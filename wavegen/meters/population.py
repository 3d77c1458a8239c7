"""Several records as one population: counts add, means are weighted by samples."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction

import numpy as np
from numpy.typing import NDArray

from wavegen.core.errors import ArgumentsError
from wavegen.core.units import format_hz
from wavegen.dsp.power_bins import bin_edges, bin_of
from wavegen.meters.power_statistics import PowerStatistics

UNEQUAL_DB = 0.2
"""Means of members further apart than this widen the common curve noticeably."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Member:
    """One record of a population.

    Parameters
    ----------
    name : str
        What it is called.
    n_samples : int
        How many of its samples count.
    mean_dbfs : float
        Its own mean, dB over full scale.
    papr_db : float
        Its own peak over its own mean, dB.
    """

    name: str
    n_samples: int
    mean_dbfs: float
    papr_db: float


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Population:
    """Several records as one.

    Parameters
    ----------
    statistics : PowerStatistics
        Of all samples. Indices count through the records in order; nothing is known between
        the samples where one ends and the next begins.
    members : tuple of Member
        What it is made of.
    """

    statistics: PowerStatistics
    members: tuple[Member, ...]

    @property
    def spread_db(self) -> float:
        """Highest over lowest mean of a member, dB."""
        means = [member.mean_dbfs for member in self.members]
        return max(means) - min(means)

    @property
    def warnings(self) -> tuple[str, ...]:
        """What should be known before the common curve is used."""
        if self.spread_db <= UNEQUAL_DB:
            return ()
        text = (
            f"the files' means differ by {self.spread_db:.2f} dB: their common curve is that of "
            "the mixture, wider than each file's own"
        )
        return (text,)


def check_same_rate(rates_hz: Sequence[Fraction], names: Sequence[str]) -> None:
    """Refuse records of different sample rates.

    Raises
    ------
    ArgumentsError
        Names the first that differs: samples would not count for equal times.
    """
    for rate_hz, name in zip(rates_hz, names, strict=True):
        if rate_hz != rates_hz[0]:
            raise ArgumentsError(
                where=name,
                problem=f"has {format_hz(rate_hz)}, {names[0]} has {format_hz(rates_hz[0])}",
                allowed="files of one sample rate as one population",
                remedy="Measure them one by one, or resample one of them.",
            )


def populate(parts: Sequence[tuple[str, PowerStatistics]]) -> Population:
    """Return several records as one population.

    Parameters
    ----------
    parts : sequence of (str, PowerStatistics)
        Names and statistics, on one scale and of one sample rate; one or more.

    Returns
    -------
    Population
    """
    members = tuple(
        Member(
            name=name,
            n_samples=item.n_samples,
            mean_dbfs=item.mean_db,
            papr_db=item.papr_db,
        )
        for name, item in parts
    )
    return Population(statistics=merged([item for _, item in parts]), members=members)


def merged(parts: Sequence[PowerStatistics]) -> PowerStatistics:
    """Return the statistics of all samples of several records.

    Parameters
    ----------
    parts : sequence of PowerStatistics
        One or more; the order decides only how indices count.

    Returns
    -------
    PowerStatistics
        As if the records had been measured as one: counts are exact, the mean is weighted by
        samples. ``start`` is that of the first record, and ``cell_maxima`` are put end to end.

    Raises
    ------
    ArgumentsError
        No record at all.
    """
    if not parts:
        raise ArgumentsError(
            where="files",
            problem="there are none",
            allowed="one or more",
            remedy="Name the files to measure.",
        )
    if len(parts) == 1:
        return parts[0]
    firsts = [bin_of(float(item.edges[0]) * (1 + 1e-9)) for item in parts]
    lows = min(firsts)
    high = max(first + item.counts.size for first, item in zip(firsts, parts, strict=True))
    counts = np.zeros(high - lows, np.int64)
    for first, item in zip(firsts, parts, strict=True):
        counts[first - lows : first - lows + item.counts.size] += item.counts
    n_samples = sum(item.n_samples for item in parts)
    total = math.fsum(item.mean * item.n_samples for item in parts)
    peak = max(item.peak for item in parts)
    begin, peak_index = parts[0].start, -1
    for item in parts:
        if item.peak == peak and peak_index < 0:
            peak_index = begin + item.peak_index - item.start
        begin += item.n_samples
    top_powers, top_counts = _tops(parts, high, firsts)
    return PowerStatistics(
        n_samples=n_samples,
        n_zeros=sum(item.n_zeros for item in parts),
        mean=total / n_samples,
        peak=peak,
        peak_index=peak_index,
        least=min(item.least for item in parts),
        counts=counts,
        edges=bin_edges(lows, counts.size),
        top_powers=top_powers,
        top_counts=top_counts,
        start=parts[0].start,
        cell_maxima=np.concatenate([item.cell_maxima for item in parts]),
    )


def _tops(
    parts: Sequence[PowerStatistics], high: int, firsts: list[int]
) -> tuple[NDArray[np.float64], NDArray[np.int64]]:
    """Return every power in the highest bin of all, and how often it occurs."""
    mine = [
        item for first, item in zip(firsts, parts, strict=True) if first + item.counts.size == high
    ]
    powers, place = np.unique(
        np.concatenate([item.top_powers for item in mine]), return_inverse=True
    )
    weights = np.concatenate([item.top_counts for item in mine])
    counts = np.zeros(powers.size, np.int64)
    np.add.at(counts, place.ravel(), weights)
    return powers, counts
