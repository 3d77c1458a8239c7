"""The power meter; its conventions are those of :mod:`wavegen.meters.power_statistics`."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Self

import numpy as np
from numpy.typing import NDArray

from wavegen.core.errors import SignalError
from wavegen.core.signal import Samples, Signal
from wavegen.dsp.cell_sums import CELL, CellSums
from wavegen.dsp.power_bins import bin_edges
from wavegen.dsp.power_kernel import PowerTally, exact_powers, tally
from wavegen.meters.power_statistics import PowerStatistics

__all__ = ["PowerMeter", "PowerReading", "PowerStatistics", "measure_samples"]


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
        samples = np.asarray(samples, np.complex64)
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
        return self.cells.total() / self.n_samples

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
                problem="is exactly zero at its only sample"
                if self.n_samples == 1
                else f"all {self.n_samples} samples are exactly zero",
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
            cell_maxima=self.cells.maxima(),
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
