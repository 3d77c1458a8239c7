"""On-times that repeat, by index: which samples are on, fully on, or in a ramp.

A record's own bursts, at places that follow no rule, are the runs of one period as long as the
record.
"""

from __future__ import annotations

import math
from bisect import bisect_right
from collections.abc import Iterator
from dataclasses import dataclass
from fractions import Fraction
from functools import lru_cache
from operator import itemgetter
from typing import Self

import numpy as np
from numpy.typing import NDArray

from wavegen.core.evaluate import repeat
from wavegen.core.signal import Range, Samples

LONGEST_TABLE = 1 << 18
"""Periods up to this are looked up in a table; longer ones are gone through run by run."""
SHORTEST_TABLE = 1 << 14
"""Short periods are repeated up to this, so that work goes on in blocks that fill a cache."""


def raised_cosine_ramp(n_samples: int) -> NDArray[np.float64]:
    """Return the amplitude of a signal that is switched on.

    Parameters
    ----------
    n_samples : int
        Length of the ramp.

    Returns
    -------
    float64 array, shape (n_samples,)
        ``sin^2(pi (i + 1/2) / 2 n)``: a raised cosine, sampled between its ends; reversed it
        switches off. The mean of its square is exactly 3/8 from two samples on.
    """
    place = (np.arange(n_samples) + 0.5) / max(n_samples, 1)
    return np.asarray(0.5 - 0.5 * np.cos(np.pi * place))


@dataclass(frozen=True, slots=True, kw_only=True)
class Bursts:
    """When a gate is on: periodically, or at any places of a record that is one period.

    Parameters
    ----------
    period_samples : int
        After so many samples it repeats, on the absolute index axis.
    runs : tuple of (int, int)
        First sample of each on-time within the period, and one past its last; rising, apart
        from each other. The last may pass the end of the period by less than the first's start.
    ramp_samples : int
        Ramp at each end of an on-time, inside it; less than half of the shortest.
    """

    period_samples: int
    runs: tuple[Range, ...]
    ramp_samples: int = 0

    @classmethod
    def of_slots(cls, slots: tuple[bool, ...], slot_samples: int, ramp_samples: int = 0) -> Self:
        """Make bursts from slots that are on or off; slots in a row make one burst.

        Parameters
        ----------
        slots : tuple of bool
            One period; not all alike. What is on at its end goes on into the next period.
        slot_samples : int
            Length of each.
        ramp_samples : int
            Ramp at each end of a burst.

        Returns
        -------
        Bursts

        Examples
        --------
        >>> Bursts.of_slots((True, True, False, True), 10).runs
        ((30, 60),)
        """
        count = len(slots)
        starts = [k for k in range(count) if slots[k] and not slots[k - 1]]
        runs = []
        for start in starts:
            length = next(k for k in range(1, count) if not slots[(start + k) % count])
            runs.append((start * slot_samples, (start + length) * slot_samples))
        return cls(period_samples=count * slot_samples, runs=tuple(runs), ramp_samples=ramp_samples)

    @property
    def shortest_samples(self) -> int:
        """Length of the shortest on-time, ramps included."""
        return min(stop - start for start, stop in self.runs)

    @property
    def duty(self) -> Fraction:
        """On-time over the period, ramps included."""
        return Fraction(sum(stop - start for start, stop in self.runs), self.period_samples)

    @property
    def duty_fully_on(self) -> Fraction:
        """On-time over the period, ramps excluded."""
        lost = 2 * self.ramp_samples * len(self.runs)
        return self.duty - Fraction(lost, self.period_samples)

    @property
    def mean_gain(self) -> float:
        """Mean of the squared amplitude over the period: what is left of the mean power.

        Each ramp sample counts as it is; in the sum a ramp of ``n`` samples is worth ``3 n / 8``
        full ones (a quarter if ``n`` is 1).
        """
        ramp = math.fsum(raised_cosine_ramp(self.ramp_samples) ** 2)
        return float(self.duty_fully_on) + 2 * len(self.runs) * ramp / self.period_samples

    def within(self, start: int, stop: int, *, inset: int = 0) -> Iterator[Range]:
        """Yield the on-times inside ``[start, stop)``, cut at its ends.

        Parameters
        ----------
        start, stop : int
            Any range of indices; the bursts go on for ever both ways.
        inset : int
            Taken away at both ends of each on-time before it is cut.
        """
        first = start // self.period_samples - 1
        for base in range(first * self.period_samples, stop, self.period_samples):
            number = bisect_right(self.runs, start - base + inset, key=itemgetter(1))
            while number < len(self.runs) and base + self.runs[number][0] + inset < stop:
                begin, end = self.runs[number]
                low, high = max(base + begin + inset, start), min(base + end - inset, stop)
                if low < high:
                    yield low, high
                number += 1

    def over(self, n_samples: int) -> Self:
        """Return the bursts of a stretch from index 0, each by itself.

        Parameters
        ----------
        n_samples : int
            Length of the stretch; as a period it need not be a multiple of this one's.

        Returns
        -------
        Bursts
            Of period ``n_samples``: where that is a multiple of the own period they repeat as
            before, else what is on at either end is cut there.

        Examples
        --------
        >>> Bursts(period_samples=10, runs=((2, 5),)).over(24).runs
        ((2, 5), (12, 15), (22, 24))
        """
        if n_samples % self.period_samples == 0:
            runs = [(begin, begin + size) for begin, size in self.starts(n_samples)]
        else:
            runs = list(self.within(0, n_samples))
        return type(self)(
            period_samples=n_samples, runs=tuple(runs), ramp_samples=self.ramp_samples
        )

    def starts(self, n_samples: int) -> list[tuple[int, int]]:
        """Return the bursts that begin in ``[0, n_samples)``.

        Parameters
        ----------
        n_samples : int
            Length of the loop.

        Returns
        -------
        list of (int, int)
            First sample and length, ramps included, in order. The last may go on past the end
            of the loop, into its start.

        Examples
        --------
        >>> Bursts.of_slots((True, False, True), 10).starts(60)
        [(20, 20), (50, 20)]
        """
        found = [
            (base + begin, end - begin)
            for base in range(0, n_samples, self.period_samples)
            for begin, end in self.runs
        ]
        return [burst for burst in found if burst[0] < n_samples]

    def is_on(self, start: int, stop: int) -> NDArray[np.bool_]:
        """Return which samples are fully on: ramps are excluded.

        Parameters
        ----------
        start, stop : int
            Any range of indices.

        Returns
        -------
        bool array, shape (stop - start,)
        """
        if self.period_samples <= LONGEST_TABLE:
            return repeat(_fully_on(self), start, stop)
        found = np.zeros(stop - start, np.bool_)
        for low, high in self.within(start, stop, inset=self.ramp_samples):
            found[low - start : high - start] = True
        return found

    def apply(self, samples: Samples, start: int) -> Samples:
        """Return samples while on, exact zeros while off, and ramps between.

        Parameters
        ----------
        samples : complex64 array, shape (n,)
            Not changed.
        start : int
            Index of the first.

        Returns
        -------
        complex64 array, shape (n,)
            Owned by the caller. The same bits as ``samples`` where fully on.
        """
        out = np.zeros(samples.size, np.complex64)
        source, into = samples.view(np.float32), out.view(np.float32)
        if self.period_samples <= LONGEST_TABLE:
            gain, is_on = _gains(self)
            place = 2 * start % gain.size
            done = 0
            while done < into.size:
                count = min(gain.size - place, into.size - done)
                np.multiply(
                    source[done : done + count],
                    gain[place : place + count],
                    out=into[done : done + count],
                    where=is_on[place : place + count],
                )
                done += count
                place = 0
            return out
        stop = start + samples.size
        for low, high in self.within(start, stop, inset=self.ramp_samples):
            out[low - start : high - start] = samples[low - start : high - start]
        if self.ramp_samples:
            self._add_ramps(source, into, start, stop)
        return out

    def _add_ramps(
        self, source: NDArray[np.float32], into: NDArray[np.float32], start: int, stop: int
    ) -> None:
        """Fill in the two ramps of each on-time; both rails, two numbers a sample."""
        size = self.ramp_samples
        rising = np.repeat(raised_cosine_ramp(size), 2).astype(np.float32)
        falling = rising[::-1]
        first = start // self.period_samples - 1
        for base in range(first * self.period_samples, stop, self.period_samples):
            for begin, end in self.runs:
                for at, ramp in ((base + begin, rising), (base + end - size, falling)):
                    low, high = max(at, start), min(at + size, stop)
                    if low < high:
                        here = slice(2 * (low - start), 2 * (high - start))
                        part = ramp[2 * (low - at) : 2 * (high - at)]
                        np.multiply(source[here], part, out=into[here])

    def delayed(self, delay_samples: Fraction) -> Self:
        """Return the bursts after a delay; a fraction of a sample goes to the ramps.

        Parameters
        ----------
        delay_samples : Fraction
            Any sign.
        """
        whole = math.floor(delay_samples)
        extra = int(delay_samples != whole)
        return self._of(
            [(start + whole, stop + whole + extra) for start, stop in self.runs],
            self.period_samples,
            self.ramp_samples + extra,
        )

    def resampled(self, ratio: Fraction) -> Self:
        """Return the bursts at another rate; fractions of a sample go to the ramps.

        Parameters
        ----------
        ratio : Fraction
            New rate over old.
        """
        times = (self.period_samples * ratio).denominator
        runs = [
            (math.floor(ratio * (base + start)), math.ceil(ratio * (base + stop)))
            for base in range(0, times * self.period_samples, self.period_samples)
            for start, stop in self.runs
        ]
        ramp = math.ceil(ratio * self.ramp_samples) + math.ceil(ratio)
        return self._of(runs, int(times * self.period_samples * ratio), ramp)

    def _of(self, runs: list[Range], period: int, ramp: int) -> Self:
        moved = sorted((start % period, start % period + stop - start) for start, stop in runs)
        return type(self)(period_samples=period, runs=tuple(moved), ramp_samples=ramp)


@lru_cache(maxsize=4)
def _fully_on(bursts: Bursts) -> NDArray[np.bool_]:
    """Return one period of :meth:`Bursts.is_on`."""
    period = bursts.period_samples
    found = np.zeros(period, np.bool_)
    for low, high in bursts.within(0, period, inset=bursts.ramp_samples):
        found[low:high] = True
    return found


@lru_cache(maxsize=4)
def _gains(bursts: Bursts) -> tuple[NDArray[np.float32], NDArray[np.bool_]]:
    """Return amplitude and whether it is on, both rails, over whole periods."""
    period, size = bursts.period_samples, bursts.ramp_samples
    gain = np.zeros(period)
    rising = raised_cosine_ramp(size)
    for begin, end in bursts.runs:
        shape = np.ones(end - begin)
        if size:
            shape[:size] = rising
            shape[-size:] = rising[::-1]
        gain[np.arange(begin, end) % period] = shape
    times = -(-SHORTEST_TABLE // period)
    both = np.tile(np.repeat(gain, 2), times).astype(np.float32)
    return both, both > 0
