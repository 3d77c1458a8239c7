"""Cyclic phase noise of a given spectrum: lines near the carrier, filtered noise far off."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from functools import cached_property

import numpy as np
import scipy.fft
from numpy.typing import NDArray

from wavegen.core.rng import random_words, stream_key
from wavegen.core.signal import Samples, Signal
from wavegen.dsp.overlap_save import Filtered
from wavegen.dsp.white_noise import WhiteNoise, gaussian_of
from wavegen.dsp.windows import kaiser_beta, kaiser_window

Reals = NDArray[np.float64]
Density = Callable[[Reals], Reals]
"""Two-sided density of the phase, rad^2/Hz, at offsets above 0 in Hz: ``10^(L/10)``."""

WHOLE_SAMPLES = 1 << 20
"""Loops up to this length are made of lines alone."""
LEAST_POINTS = 1 << 18
POINTS_PER_LINE = 8
"""Points of the table of slow phase over its lines; between points it is interpolated."""
COARSEST = 256
"""Samples of the loop for each point of that table, at most: the filter is then short enough."""
HALF_LENGTH = 1 << 14
FLOOR_DB = 100.0
BLOCK_SAMPLES = 1 << 13
_LAGS = np.arange(-2, 4)


@dataclass(frozen=True, eq=False, kw_only=True)
class SlowPhase(Signal):
    """Phase noise made of lines on the loop's grid; radians, in the real part.

    Parameters
    ----------
    density : callable
        Of the phase.
    key : uint64 array, shape (2,)
        Stream of the lines.
    n_points : int
        Of the table from which it is interpolated; as many as samples if it holds all lines.
    n_lines : int
        Lines, from the first of the loop's grid on.
    """

    density: Density
    key: NDArray[np.uint64]
    n_points: int
    n_lines: int

    @cached_property
    def table(self) -> Reals:
        """One period of the phase, shape (n_points,)."""
        spacing = float(self.sample_rate_hz) / self.n_samples
        offset: Reals = spacing * np.arange(1, self.n_lines + 1, dtype=np.float64)
        words = random_words(self.key, 0, self.n_lines, period=self.n_lines, width_bytes=8)
        lines = np.empty(self.n_lines, np.complex64)
        gaussian_of(words, lines)
        power = 2 * spacing * self.density(offset)  # of both sides
        if self.n_points < self.n_samples:
            power *= fade(offset, spacing * self.n_lines) ** 2
        spectrum = np.zeros(self.n_points // 2 + 1, np.complex128)
        spectrum[1 : self.n_lines + 1] = lines * np.sqrt(power) * (self.n_points / math.sqrt(2))
        return np.asarray(scipy.fft.irfft(spectrum, self.n_points))

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Interpolate the table at exact places, by polynomials through six points."""
        out = np.zeros(stop - start, np.complex64)
        if self.n_points == self.n_samples:
            out.real = self.table[start:stop]
            return out
        for low in range(start, stop, BLOCK_SAMPLES):
            index = np.arange(low, min(low + BLOCK_SAMPLES, stop), dtype=np.int64)
            whole, rest = np.divmod(index * self.n_points, self.n_samples)
            place = rest / self.n_samples
            value = np.zeros(index.size)
            for lag in _LAGS.tolist():
                value += _weight(place, lag) * self.table.take((whole + lag) % self.n_points)
            out.real[low - start : low - start + index.size] = value
        return out


def _weight(place: Reals, lag: int) -> Reals:
    """Return Lagrange's polynomial of one of six points, between the third and the fourth."""
    value = np.ones(place.size)
    for other in _LAGS.tolist():
        if other != lag:
            value *= (place - other) / (lag - other)
    return value


def fade(offset: Reals, top: float) -> Reals:
    """Return the amplitude of the slow part: 1 to half the top, 0 beyond it, even in octaves.

    Parameters
    ----------
    offset : float64 array
        Offset from the carrier, Hz; 0 is allowed.
    top : float
        Where the slow part ends, Hz.
    """
    octave = np.log2(np.maximum(2 * np.abs(offset) / top, 1.0))
    return np.asarray(np.cos(0.5 * np.pi * np.minimum(octave, 1.0)))


def phase_noise(
    density: Density, *, like: Signal, seed: int, label: str
) -> tuple[Signal, Signal | None]:
    """Return phase noise on the loop of a signal, as one or two signals to be added.

    Parameters
    ----------
    density : callable
        Of the phase, held constant below and beyond where it is known.
    like : Signal
        Whose rate and loop it has.
    seed : int
        Of the recipe.
    label : str
        Names its random lines.

    Returns
    -------
    slow, fast : Signal
        Radians, in the real parts. ``fast`` is None where lines alone do: loops up to 2^20
        samples.

    Notes
    -----
    Line ``k`` of the loop's grid has the variance ``2 L(f_k) / T``, so that the phase has the
    density asked for and closes at the seam. Of long loops lines are drawn up to an offset, and
    beyond it, crossing over within an octave, white noise is filtered; the sum of both has the
    density at every offset (derivation).
    """
    rate, n = like.sample_rate_hz, like.n_samples
    is_whole = n <= WHOLE_SAMPLES
    n_points = n if is_whole else max(LEAST_POINTS, 1 << (n // COARSEST - 1).bit_length())
    slow = SlowPhase(
        sample_rate_hz=rate,
        n_samples=n,
        mean_power=None,
        density=density,
        key=stream_key(seed, f"{label}, slow"),
        n_points=n_points,
        n_lines=(n - 1) // 2 if is_whole else n_points // POINTS_PER_LINE,
    )
    if is_whole:
        return slow, None
    top = float(rate) / n * slow.n_lines
    white = WhiteNoise(sample_rate_hz=rate, n_samples=n, key=stream_key(seed, f"{label}, fast"))
    return slow, Filtered.of(white, _taps(density, float(rate), top))


def _taps(density: Density, rate: float, top: float) -> Reals:
    """Return the filter from complex noise of unit power, whose real part is used."""
    offset = np.abs(scipy.fft.fftfreq(8 * HALF_LENGTH, 1 / rate))
    rest = np.sqrt(1 - fade(offset, top) ** 2)
    lines = rest * np.sqrt(2 * rate * density(np.maximum(offset, top / 4)))
    impulse = scipy.fft.ifft(lines).real
    taps = impulse[np.arange(-HALF_LENGTH, HALF_LENGTH + 1)]
    return np.asarray(taps * kaiser_window(HALF_LENGTH, kaiser_beta(FLOOR_DB)))
