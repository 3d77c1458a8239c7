"""The law of a periodic signal: the exact curve of its own period."""

from __future__ import annotations

from dataclasses import dataclass, replace
from functools import cached_property
from typing import Self

import numpy as np
import scipy.fft
from numpy.typing import ArrayLike, NDArray

from wavegen.laws.law import Holds, checked_probability, from_db, to_db

LARGEST_SPAN = 1 << 16
"""Widest span of harmonics taken on: 64 points each then make 2^22."""
POINTS_PER_HARMONIC = 256
FEWEST_POINTS = 1 << 18
MOST_POINTS = 1 << 22
_PEAKS_REFINED = 16
_NEWTON_STEPS = 4


@dataclass(frozen=True, eq=False, kw_only=True)
class PeriodicLaw:
    """Time average over one period of the continuous waveform.

    Parameters
    ----------
    low, high : float64 array, shape (n_points,)
        Ends of the power (over its mean) on each interval of a dense, even grid over the
        period, sorted by ``low``. Between the grid's points the power runs straight.
    peak_power : float
        Highest power in the period, over the mean.
    n_instants : int or None
        Different instants of the period that the samples of a loop fall on, evenly spaced;
        None if not known.
    name : str
        What the law is called.
    lines : (int64 array, complex128 array) or None
        Harmonics from 0 on, and their amplitudes at unit mean power.
    stride : int
        Sample ``n`` of a loop falls on instant ``n stride`` modulo ``n_instants``.

    Notes
    -----
    Use :meth:`of_harmonics`. Straight lines between ``n`` points overstate the power by
    ``p'' / 12 n^2`` on average (derivation: mean of the parabola over an interval); the points
    are lowered by as much, so that the time at which a level is crossed is right on average.
    Compared with grids of 2^24 points, for 2 to 16384 tones: levels good to 0.0001 dB from 1e-9
    to 90 %, 0.0003 dB at 99 %, 0.002 dB at 99.9 % (30 dB below the mean).
    """

    low: NDArray[np.float64]
    high: NDArray[np.float64]
    peak_power: float
    n_instants: int | None = None
    name: str = "its own period"
    lines: tuple[NDArray[np.int64], NDArray[np.complex128]] | None = None
    stride: int = 1
    holds: Holds = "every loop"

    @classmethod
    def of_harmonics(
        cls,
        harmonics: NDArray[np.int64],
        amplitudes: NDArray[np.complex128],
        *,
        n_instants: int | None = None,
        stride: int = 1,
        name: str = "its own period",
    ) -> Self:
        """Make the law of ``x(t) = sum_k a_k exp(2j pi h_k t)``, ``0 <= t < 1``.

        Parameters
        ----------
        harmonics : int64 array, shape (n_tones,)
            Frequencies, cycles per period; each once. A common offset does not matter.
        amplitudes : complex128 array, shape (n_tones,)
            On any scale, not all zero.
        n_instants, stride : int, optional
            See the class.
        name : str
            What the law is called.

        Returns
        -------
        PeriodicLaw
        """
        place = harmonics - harmonics.min()
        span = int(place.max())
        scaled = amplitudes / np.sqrt(np.sum(np.abs(amplitudes) ** 2))
        wanted = min(max(POINTS_PER_HARMONIC * span, FEWEST_POINTS), MOST_POINTS)
        n_points = 1 << (wanted - 1).bit_length()
        spectrum = np.zeros(n_points, np.complex128)
        spectrum[place] = scaled
        wave = scipy.fft.ifft(spectrum, norm="forward", overwrite_x=True)
        power = wave.real**2 + wave.imag**2
        peak = _refined_peak(power, place, scaled)
        top = int(np.argmax(power))
        # Second differences: the lines' mean excess, see the class.
        bend = np.roll(power, 1) + np.roll(power, -1) - 2 * power
        power = np.clip(power - bend / 12, 0.0, peak)
        power[top] = peak
        after = np.roll(power, -1)
        low = np.minimum(power, after)
        order = np.argsort(low)
        return cls(
            low=low[order],
            high=np.maximum(power, after)[order],
            peak_power=peak,
            n_instants=n_instants,
            name=name,
            lines=(place, scaled),
            stride=stride,
        )

    def delayed(self, lag: int) -> Self:
        """Return the law of the loop some whole samples later."""
        if self.lines is None or not self.n_instants:
            return self
        place, amplitudes = self.lines
        turns = place * (self.stride * lag % self.n_instants) % self.n_instants / self.n_instants
        return replace(self, lines=(place, amplitudes * np.exp(-2j * np.pi * turns)))

    def powers_at_instants(self) -> NDArray[np.float64] | None:
        """Return the power over the mean at each index of a loop's period, None if not known."""
        if self.lines is None or not self.n_instants:
            return None
        place, amplitudes = self.lines
        spectrum = np.zeros(self.n_instants, np.complex128)
        np.add.at(spectrum, place * (self.stride % self.n_instants) % self.n_instants, amplitudes)
        wave = scipy.fft.ifft(spectrum, norm="forward", overwrite_x=True)
        return np.asarray(wave.real**2 + wave.imag**2)

    @property
    def peak_db(self) -> float:
        """Highest level in the period, dB over the mean."""
        return float(to_db(self.peak_power))

    def ccdf(self, level_db: ArrayLike) -> NDArray[np.float64]:
        """Return the share of the period above a level (dB over the mean)."""
        level = from_db(level_db)
        flat = [self._above(float(one)) for one in level.ravel()]
        return np.array(flat).reshape(level.shape)

    def level_db(self, probability: ArrayLike) -> NDArray[np.float64]:
        """Return the smallest level whose CCDF is at or below a probability."""
        asked = checked_probability(probability)
        flat = [self._power_at(float(one)) for one in asked.ravel()]
        return to_db(np.array(flat).reshape(asked.shape))

    def sampling_slack(self, level_db: ArrayLike) -> NDArray[np.float64]:
        """Return how far the CCDF of the samples of a loop may stand from this curve.

        Parameters
        ----------
        level_db : array_like
            Levels, dB over the mean.

        Returns
        -------
        float64 array of the same shape
            Bound on the difference in probability; 0 where ``n_instants`` is not known.

        Notes
        -----
        Derivation: on an arc of the period, ``n`` even instants count at most one more or less
        than ``n`` times its length; the power is above a level on as many arcs as it has
        up-crossings there. A loop of few instants is a staircase, this curve is not.
        """
        level = from_db(level_db)
        if not self.n_instants:
            return np.zeros(level.shape)
        arcs = [self._crossing(float(one)).size // 2 for one in level.ravel()]
        return np.minimum(np.array(arcs).reshape(level.shape) / self.n_instants, 1.0)

    def _crossing(self, level: float) -> NDArray[np.intp]:
        """Return the intervals with ``low <= level < high``."""
        first = int(np.searchsorted(self.low, level - self._widest, side="left"))
        last = int(np.searchsorted(self.low, level, side="right"))
        return first + np.flatnonzero(self.high[first:last] > level)

    @cached_property
    def _widest(self) -> float:
        """Return the longest interval of power between two points of the grid."""
        return float(np.max(self.high - self.low))

    @cached_property
    def _knots(self) -> NDArray[np.float64]:
        """Return the powers at the grid's points, sorted: the curve bends there."""
        return np.sort(np.concatenate((self.low, self.high)))

    def _above(self, level: float) -> float:
        """Return the share of the period with a power above a level."""
        crossing = self._crossing(level)
        high = self.high[crossing]
        parts = (high - level) / (high - self.low[crossing])
        whole = self.low.size - int(np.searchsorted(self.low, level, side="right"))
        return (whole + float(parts.sum())) / self.low.size

    def _power_at(self, probability: float) -> float:
        """Invert: the curve is straight between neighbouring knots."""
        if probability >= 1.0:
            return 0.0
        knots = self._knots
        below, reached = -1, knots.size - 1
        while reached - below > 1:
            middle = (below + reached) // 2
            if self._above(float(knots[middle])) <= probability:
                reached = middle
            else:
                below = middle
        if below < 0:
            return float(knots[0])
        left, right = float(knots[below]), float(knots[reached])
        more = self._above(left)
        less = self._above(right)
        if more <= less:
            return right
        return left + (right - left) * (more - probability) / (more - less)


def _refined_peak(
    power: NDArray[np.float64], harmonics: NDArray[np.int64], amplitudes: NDArray[np.complex128]
) -> float:
    """Return the highest power between the points of a grid, by Newton's method."""
    is_top = (power >= np.roll(power, 1)) & (power >= np.roll(power, -1))
    tops = np.flatnonzero(is_top)
    tops = tops[np.argsort(power[tops])[-_PEAKS_REFINED:]]
    best = float(power.max())
    spacing = 1.0 / power.size
    turn = 2j * np.pi * (harmonics - harmonics.max() / 2)
    for top in tops:
        start = time = float(top) * spacing
        for _ in range(_NEWTON_STEPS):
            terms = amplitudes * np.exp(turn * time)
            wave, slope, bend = terms.sum(), (turn * terms).sum(), (turn**2 * terms).sum()
            best = max(best, float(abs(wave) ** 2))
            first = 2 * (wave.conjugate() * slope).real
            second = 2 * (abs(slope) ** 2 + (wave.conjugate() * bend).real)
            if second >= 0:
                break
            time = min(max(time - first / second, start - spacing), start + spacing)
    return best
