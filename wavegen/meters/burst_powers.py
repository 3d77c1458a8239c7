"""Each burst by itself: its mean, its peak, and the bursts that share a level."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Self

import numpy as np
from numpy.typing import NDArray

from wavegen.core.errors import SignalError
from wavegen.core.signal import Samples, Signal
from wavegen.dsp.bursts import Bursts
from wavegen.dsp.cell_sums import CELL
from wavegen.dsp.power_kernel import exact_powers

Floats = NDArray[np.float64]
Indices = NDArray[np.int64]
LEVEL_GAP_DB = 3.0
"""Bursts whose means stand further apart than this belong to different levels."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class BurstPowers:
    """The power of each burst, guard and ramps left out.

    Parameters
    ----------
    start_sample, stop_sample : int64 array, shape (n_bursts,)
        On-times with their ramps, rising.
    n_samples : int64 array, shape (n_bursts,)
        Samples that are fully on; bursts without any are left out.
    mean, peak : float64 array, shape (n_bursts,)
        Power; full scale is 1.
    """

    start_sample: Indices
    stop_sample: Indices
    n_samples: Indices
    mean: Floats
    peak: Floats

    @property
    def papr_db(self) -> Floats:
        """Peak over mean of each burst, dB; 0 for a silent one."""
        ratio = np.divide(self.peak, self.mean, out=np.ones(self.mean.size), where=self.mean > 0)
        return np.asarray(10 * np.log10(ratio))

    def levels(self, gap_db: float = LEVEL_GAP_DB) -> list[Indices]:
        """Return which bursts share a level, the highest level first.

        Parameters
        ----------
        gap_db : float
            Sorted by mean, neighbours further apart than this belong to different levels.

        Returns
        -------
        list of int64 array
            Numbers of bursts, rising.
        """
        with np.errstate(divide="ignore"):
            mean_db = 10 * np.log10(self.mean)
        order = np.argsort(-mean_db, kind="stable")
        ranked = np.maximum(mean_db[order], -1000.0)
        cuts = np.flatnonzero(ranked[:-1] - ranked[1:] > gap_db) + 1
        return [np.sort(part) for part in np.split(order, cuts)]


class BurstPowerReading:
    """Running sums of the bursts of one stretch.

    Parameters
    ----------
    bursts : Bursts
        When the signal is on; one period, or a part of it, is fed.
    where : str
        What is measured, for messages.

    Notes
    -----
    Sums run over pieces between edges of bursts and multiples of 1024, so that they do not
    depend on strips; pieces cut by the end of a stretch are kept as single powers.
    """

    def __init__(self, bursts: Bursts, where: str) -> None:
        self._bursts = bursts
        self._where = where
        self._start = -1
        self._stop = -1
        self._head: list[Floats] = []
        self._head_is_open = False
        self._tail: list[Floats] = []
        self._tail_start = -1
        self._pieces: list[tuple[Indices, Indices, Floats, Floats]] = []

    def feed(self, start: int, samples: Samples) -> None:
        """Take in samples whose first has index ``start``.

        Raises
        ------
        SignalError
            A sample of the on-time is not finite.
        """
        if not samples.size:
            return
        kept = np.zeros(samples.size, np.complex64)
        for low, high in self._on(start, start + samples.size):
            kept[low - start : high - start] = samples[low - start : high - start]
        bad = np.flatnonzero(~np.isfinite(kept))
        if bad.size:
            raise SignalError(
                where=self._where,
                problem=f"sample {start + int(bad[0])} is not a finite number",
                allowed="finite I and Q in every sample",
                remedy="Find where the samples come from; cut out the part that is not finite.",
            )
        self._append(start, exact_powers(kept))

    def merge(self, following: Self) -> None:
        """Append the reading of the stretch that starts where this one ends."""
        place = following._start
        for powers in following._head:
            self._append(place, powers)
            place += powers.size
        if following._pieces:
            self._pieces.extend(following._pieces)
            self._head_is_open = False
            last = following._pieces[-1]
            self._stop = self._tail_start = int(last[0][-1] + last[1][-1])
        for powers in following._tail:
            self._append(self._stop, powers)

    def result(self) -> BurstPowers:
        """Return the power of each burst.

        Raises
        ------
        SignalError
            No sample is fully on.
        """
        pieces = list(self._pieces)
        for first, rest in ((self._start, self._head), (self._tail_start, self._tail)):
            if rest:
                powers = np.concatenate(rest)
                pieces.append(self._summed(first, powers, np.array([0, powers.size])))
        if not pieces:
            raise SignalError(
                where=self._where,
                problem="there are no samples",
                allowed="one sample or more",
                remedy="Check the file, or the part of it that was asked for.",
            )
        start, size, total, peak = (np.concatenate([item[k] for item in pieces]) for k in range(4))
        runs = np.array(self._bursts.runs, np.int64).reshape(-1, 2)
        inset = self._bursts.ramp_samples
        number = np.searchsorted(runs[:, 0] + inset, start, side="right") - 1
        number[number < 0] = len(runs) - 1  # the last burst goes on past the seam
        is_on = (start + size <= runs[number, 1] - inset) & (start >= runs[number, 0] + inset)
        past = start + self._bursts.period_samples
        is_on |= (past >= runs[number, 0] + inset) & (past + size <= runs[number, 1] - inset)
        counted = np.bincount(number[is_on], weights=size[is_on], minlength=len(runs))
        summed = np.bincount(number[is_on], weights=total[is_on], minlength=len(runs))
        highest = np.zeros(len(runs))
        np.maximum.at(highest, number[is_on], peak[is_on])
        known = np.flatnonzero(counted)
        if not known.size:
            raise SignalError(
                where=self._where,
                problem="no sample is fully on",
                allowed="bursts longer than their ramps or guards",
                remedy="Shorten the guard, or gate by another level.",
            )
        return BurstPowers(
            start_sample=runs[known, 0],
            stop_sample=runs[known, 1],
            n_samples=counted[known].astype(np.int64),
            mean=summed[known] / counted[known],
            peak=highest[known],
        )

    def _on(self, start: int, stop: int) -> list[tuple[int, int]]:
        return list(self._bursts.within(start, stop, inset=self._bursts.ramp_samples))

    def _edges(self, start: int, stop: int) -> Indices:
        """Return where pieces end inside ``[start, stop]``."""
        first = -(-start // CELL) * CELL
        edges = [np.arange(first, stop + 1, CELL)]
        # One sample further out: an edge at the very end of the stretch is one too.
        inside = self._on(start - 1, stop + 1)
        edges.append(np.array(inside, np.int64).reshape(-1))
        found = np.unique(np.concatenate(edges))
        return found[(found >= start) & (found <= stop)]

    def _append(self, start: int, powers: Floats) -> None:
        """Append powers; what lies between edges is summed, the rest is kept."""
        if not powers.size:
            return
        if self._start < 0:
            self._start, self._stop = start, start
            self._head_is_open = True
        stop = start + powers.size
        if self._head_is_open:
            edges = self._edges(start, stop)
            if not edges.size:
                self._head.append(powers)
                self._stop = stop
                return
            cut = int(edges[0])
            if cut > start:
                self._head.append(powers[: cut - start])
            self._head_is_open = False
            self._tail_start = self._stop = cut
            powers = powers[cut - start :]
            if not powers.size:
                return
        data = np.concatenate([*self._tail, powers]) if self._tail else powers
        self._stop = self._tail_start + data.size
        edges = self._edges(self._tail_start, self._stop)
        last = int(edges[-1]) if edges.size else self._tail_start
        if last > self._tail_start:
            bounds = edges - self._tail_start
            if bounds[0] != 0:
                bounds = np.concatenate([[0], bounds])
            self._pieces.append(self._summed(self._tail_start, data, bounds))
        rest = data[last - self._tail_start :]
        self._tail = [rest] if rest.size else []
        self._tail_start = last

    @staticmethod
    def _summed(
        start: int, powers: Floats, bounds: NDArray[np.int64]
    ) -> tuple[Indices, Indices, Floats, Floats]:
        """Return start, length, sum and largest power of the pieces between bounds."""
        first = bounds[:-1]
        inside = powers[: bounds[-1]]
        return (
            start + first,
            np.diff(bounds),
            np.add.reduceat(inside, first),
            np.maximum.reduceat(inside, first),
        )


@dataclass(frozen=True, slots=True, kw_only=True)
class BurstPowerMeter:
    """Settings of the meter of single bursts.

    Parameters
    ----------
    bursts : Bursts
        When the signal is on.
    where : str
        What is measured, for messages.
    """

    bursts: Bursts
    where: str = "signal"

    def begin(self, signal: Signal) -> BurstPowerReading:
        """Return an empty reading; a shorter period is unrolled over the signal."""
        bursts = self.bursts
        if bursts.period_samples != signal.n_samples:
            bursts = bursts.over(signal.n_samples)
        return BurstPowerReading(bursts, self.where)


@dataclass(frozen=True, eq=False, kw_only=True)
class Levelled(Signal):
    """A signal with each burst scaled to a mean power of 1; zeros while off and in ramps.

    Parameters
    ----------
    bursts : Bursts
        When the signal is on; one period is the signal.
    gains : float64 array, shape (n_bursts,)
        Amplitude factor of each run of ``bursts``.
    """

    bursts: Bursts
    gains: Floats = field(repr=False)

    @classmethod
    def of(cls, source: Signal, bursts: Bursts, powers: BurstPowers) -> Self:
        """Return a signal levelled by what was measured of its bursts.

        Parameters
        ----------
        source : Signal
            What was measured.
        bursts : Bursts
            When it is on.
        powers : BurstPowers
            Of that signal and these bursts.
        """
        whole = bursts.over(source.n_samples)
        starts = np.array([start for start, _ in whole.runs], np.int64)
        gains = np.zeros(starts.size)
        place = np.searchsorted(starts, powers.start_sample)
        has_power = powers.mean > 0
        gains[place[has_power]] = powers.mean[has_power] ** -0.5
        return cls(
            sample_rate_hz=source.sample_rate_hz,
            n_samples=source.n_samples,
            inputs=(source,),
            mean_power=None,
            bursts=whole,
            gains=gains,
        )

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Scale each burst by its own gain."""
        out = np.zeros(stop - start, np.complex64)
        starts = [run[0] for run in self.bursts.runs]
        inset = self.bursts.ramp_samples
        for low, high in self.bursts.within(start, stop, inset=inset):
            number = int(np.searchsorted(starts, low, side="right")) - 1
            here = slice(low - start, high - start)
            np.multiply(arrays[0][here], np.float32(self.gains[number]), out=out[here])
        return out
