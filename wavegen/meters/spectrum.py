"""Power spectral density by Welch's method, with segments on a grid of the signal's own."""

from __future__ import annotations

import math
from dataclasses import dataclass
from fractions import Fraction
from functools import cached_property
from typing import Annotated, Any, Self

import numpy as np
import scipy.fft
from annotated_types import Ge, Le, Lt
from numpy.typing import NDArray

from wavegen.core.errors import SignalError
from wavegen.core.evaluate import repeat
from wavegen.core.signal import Samples, Signal
from wavegen.core.table import Table
from wavegen.core.units import format_hz
from wavegen.dsp.grid_sums import GridSums
from wavegen.dsp.spectral_windows import WindowName, noise_bandwidth_bins, spectral_window

BLOCK_SAMPLES = 1 << 16
"""Samples transformed at once: 512 kB, inside the cache."""
ROWS_AT_LEAST = 4
LEAST_DENSITY = 1e-30
"""Density over the total below which a level is not stated: -300 dBc/Hz."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Spectrum:
    """A two-sided power spectral density.

    Parameters
    ----------
    sample_rate_hz : float
        Hz.
    density : float64 array, shape (n_fft,)
        Power per Hz on the scale of the samples squared, from ``-sample_rate / 2`` up; bin ``i``
        stands at ``(i - n_fft // 2) sample_rate / n_fft`` and is half a bin wide to either side.
    window : str
        Name of the window.
    noise_bandwidth_hz : float
        Of the window: the resolution.
    hop_samples : float
        From segment to segment, on the average.
    n_segments : int
        Segments averaged.
    """

    sample_rate_hz: float
    density: NDArray[np.float64]
    window: str
    noise_bandwidth_hz: float
    hop_samples: float
    n_segments: int

    @property
    def bin_hz(self) -> float:
        """Distance of bins, Hz."""
        return self.sample_rate_hz / self.density.size

    @property
    def frequencies_hz(self) -> NDArray[np.float64]:
        """Centres of the bins, shape (n_fft,), ascending."""
        return (np.arange(self.density.size) - self.density.size // 2) * np.float64(self.bin_hz)

    @property
    def total_power(self) -> float:
        """Integral over all frequencies: the mean power of the samples."""
        return math.fsum(self.density) * self.bin_hz

    @property
    def dbc_per_hz(self) -> NDArray[np.float64]:
        """Density over the total power, dB per Hz, shape (n_fft,); -300 at least."""
        share = self.density / self.total_power
        return np.asarray(10 * np.log10(np.maximum(share, LEAST_DENSITY)))

    def power_below(self, frequency_hz: NDArray[np.float64] | float) -> NDArray[np.float64]:
        """Return the integral of the density from half the sample rate below the centre.

        Parameters
        ----------
        frequency_hz : float or float64 array
            Upper limits, Hz, within half the sample rate.

        Returns
        -------
        float64 array, same shape
            The density counts as constant over each bin.
        """
        half = self.sample_rate_hz / 2
        n = self.density.size
        edges = (np.arange(n + 2) - n // 2 - 0.5) * self.bin_hz
        steps = np.append(self.density, self.density[0]) * self.bin_hz  # the lowest bin repeats
        summed = np.concatenate(([0.0], np.cumsum(steps)))
        return np.asarray(np.interp(frequency_hz, edges, summed) - np.interp(-half, edges, summed))

    def power(self, low_hz: float, high_hz: float) -> float:
        """Return the power in a band.

        Parameters
        ----------
        low_hz, high_hz : float
            Its edges, Hz from the centre.

        Returns
        -------
        float
            On the scale of the samples squared.

        Raises
        ------
        SignalError
            The band is empty or reaches beyond half the sample rate.
        """
        self.check_band(low_hz, high_hz)
        low, high = self.power_below(np.array([low_hz, high_hz]))
        return float(high - low)

    def check_band(self, low_hz: float, high_hz: float, *, where: str = "spectrum") -> None:
        """Refuse a band that the sample rate does not hold.

        Raises
        ------
        SignalError
            The band is empty or reaches beyond half the sample rate.
        """
        half = self.sample_rate_hz / 2
        if not low_hz < high_hz or max(-low_hz, high_hz) > half * (1 + 1e-9):
            needed = 2 * max(-low_hz, high_hz)
            raise SignalError(
                where=where,
                problem=f"the band from {format_hz(low_hz)} to {format_hz(high_hz)} is asked of "
                f"samples at {format_hz(self.sample_rate_hz)}",
                allowed=f"bands inside {format_hz(-half)} to {format_hz(half)}",
                remedy=f"Raise the sample rate to {format_hz(needed)} or more."
                if low_hz < high_hz
                else "Exchange its edges.",
            )

    def table(self) -> Table:
        """Return what the estimate is made of, for people."""
        rows = (
            ("sample rate", format_hz(self.sample_rate_hz)),
            ("resolution", f"{format_hz(round(self.noise_bandwidth_hz, 3))} ({self.window})"),
            ("segments", str(self.n_segments)),
            ("mean power", f"{10 * math.log10(max(self.total_power, LEAST_DENSITY)):.3f} dB"),
        )
        return Table(title="Spectrum", headings=("", "value"), rows=rows, right=frozenset({1}))


@dataclass(frozen=True, slots=True)
class _Grid:
    """Where the segments of a signal start: a function of its length alone."""

    n_samples: int
    n_fft: int
    hop: int
    loops: bool

    @property
    def count(self) -> int:
        """Return how many there are."""
        if self.loops:
            return -(-self.n_samples // self.hop)
        return max((self.n_samples - self.n_fft) // self.hop + 1, 0)

    def start(self, number: int) -> int:
        """Return the first sample of a segment; those of a loop are spread evenly over it."""
        return number * self.n_samples // self.count if self.loops else number * self.hop

    def first_from(self, sample: int) -> int:
        """Return the number of the first segment that starts at a sample or after it."""
        if not self.loops:
            return min(-(-sample // self.hop), self.count)
        number = sample * self.count // self.n_samples
        while self.start(number) < sample:
            number += 1
        return number


class SpectrumReading:
    """Running spectrum of one stretch.

    Parameters
    ----------
    settings : SpectrumMeter
        Window and grid.
    signal : Signal
        What is measured.
    """

    def __init__(self, settings: SpectrumMeter, signal: Signal) -> None:
        self._settings = settings
        self._rate = float(signal.sample_rate_hz)
        n_fft = settings.n_fft
        self._grid = _Grid(signal.n_samples, n_fft, settings.hop_samples, settings.loops)
        self._start = self._stop = -1
        self._head = np.empty(0, np.complex64)
        self._kept = np.empty(0, np.complex64)
        self._next = 0
        self._sums = GridSums()

    def __getstate__(self) -> dict[str, Any]:
        """Leave out the window, which is made again."""
        return {name: value for name, value in vars(self).items() if name != "_window"}

    @cached_property
    def _window(self) -> NDArray[np.float32]:
        window = spectral_window(self._settings.window, self._settings.n_fft)
        return np.repeat(window, 2).astype(np.float32)

    def feed(self, start: int, samples: Samples) -> None:
        """Take in samples whose first has index ``start``; stretches come in order.

        Raises
        ------
        SignalError
            A sample is not finite.
        """
        if not samples.size:
            return
        if self._start < 0:
            self._start = self._stop = start
            self._next = self._grid.first_from(start)
        samples = np.asarray(samples, np.complex64)
        missing = self._settings.n_fft - 1 - self._head.size
        if missing > 0:
            self._head = np.concatenate((self._head, samples[:missing]))
        self._stop += samples.size
        self._take(np.concatenate((self._kept, samples)), self._stop)

    def _take(self, samples: Samples, stop: int) -> None:
        """Transform the segments that are complete; keep what later ones need."""
        n_fft, grid = self._settings.n_fft, self._grid
        origin = stop - samples.size
        after = self._next
        while after < grid.count and grid.start(after) + n_fft <= stop:
            after += 1
        starts = [grid.start(number) - origin for number in range(self._next, after)]
        if starts:
            self._transform(samples, starts)
        keep = grid.start(after) - origin if after < grid.count else samples.size
        self._kept = samples[max(min(keep, samples.size), 0) :].copy()

    def _transform(self, samples: Samples, starts: list[int]) -> None:
        n_fft = self._settings.n_fft
        n_rows = max(BLOCK_SAMPLES // n_fft // ROWS_AT_LEAST, 1) * ROWS_AT_LEAST
        work = np.empty(
            (min(n_rows, -(-len(starts) // ROWS_AT_LEAST) * ROWS_AT_LEAST), n_fft), np.complex64
        )
        for low in range(0, len(starts), n_rows):
            some = starts[low : low + n_rows]
            for row, start in zip(work, some, strict=False):
                part = samples[start : start + n_fft]
                np.multiply(part.view(np.float32), self._window, out=row.view(np.float32))
            used = -(-len(some) // ROWS_AT_LEAST) * ROWS_AT_LEAST
            work[len(some) : used] = 0  # every row takes the same path through the transform
            lines = scipy.fft.fft(work[:used], axis=1)[: len(some)]
            parts = lines.view(np.float32)
            with np.errstate(over="ignore"):  # told below
                np.multiply(parts, parts, out=parts)
            powers = parts[:, 0::2].astype(np.float64)
            powers += parts[:, 1::2]
            if not np.isfinite(powers).all():
                raise SignalError(
                    where=self._settings.where,
                    problem="a sample is not a finite number, or too large to square",
                    allowed="finite I and Q in every sample",
                    remedy="Find where the samples come from; cut out the part that is not finite.",
                )
            self._sums.add(self._next, powers)
            self._next += len(some)

    def merge(self, following: Self) -> None:
        """Append the reading of the stretch that starts where this one ends."""
        if following._start < 0:
            return
        if self._start < 0:
            self.__dict__.update(following.__dict__)
            return
        n_fft = self._settings.n_fft
        if following.n_samples < n_fft:  # all of it is in its head
            self.feed(following._start, following._head)
            return
        missing = n_fft - 1 - self._head.size
        if missing > 0:
            self._head = np.concatenate((self._head, following._head[:missing]))
        joined = np.concatenate((self._kept, following._head))
        self._complete(joined, following._start + following._head.size, following._start)
        self._sums.append(following._sums)
        self._next, self._kept = following._next, following._kept
        self._stop = following._stop

    def _complete(self, samples: Samples, stop: int, border: int) -> None:
        """Transform the segments that start before a border and end behind it."""
        origin, starts, number = stop - samples.size, [], self._next
        while number < self._grid.count and self._grid.start(number) < border:
            starts.append(self._grid.start(number) - origin)
            number += 1
        if starts:
            self._transform(samples, starts)

    @property
    def n_samples(self) -> int:
        """Samples taken in."""
        return self._stop - self._start

    def result(self) -> Spectrum:
        """Return the spectrum.

        Raises
        ------
        SignalError
            Not all of a loop was seen, a record is shorter than a segment, or all is zero.
        """
        settings, grid = self._settings, self._grid
        sums = GridSums()
        sums.append(self._sums)
        before = self._sums, self._next
        if settings.loops:
            if self._start != 0 or self.n_samples != grid.n_samples:
                raise self._too_little()
            self._sums = sums
            period = self._head if self._head.size >= grid.n_samples else None
            count = self._kept.size + settings.n_fft
            samples = (
                np.concatenate((self._kept, self._head))
                if period is None
                else repeat(
                    period,
                    grid.n_samples - self._kept.size,
                    grid.n_samples - self._kept.size + count,
                )
            )
            self._complete(samples, grid.n_samples - self._kept.size + samples.size, grid.n_samples)
            self._sums, self._next = before
        total = sums.total()
        if total is None:
            raise self._too_little()
        window = spectral_window(settings.window, settings.n_fft)
        scale = 1 / (self._rate * float(np.sum(window**2)) * grid.count)
        spectrum = Spectrum(
            sample_rate_hz=self._rate,
            density=np.asarray(scipy.fft.fftshift(total) * scale),
            window=settings.window,
            noise_bandwidth_hz=noise_bandwidth_bins(window) * self._rate / settings.n_fft,
            hop_samples=grid.n_samples / grid.count if settings.loops else float(grid.hop),
            n_segments=grid.count,
        )
        if not spectrum.density.any():
            raise SignalError(
                where=settings.where,
                problem="every sample is zero",
                allowed="a mean power above zero, since levels are stated over it",
                remedy="Check the level, the gating, or the part that was asked for.",
            )
        return spectrum

    def _too_little(self) -> SignalError:
        return SignalError(
            where=self._settings.where,
            problem=f"the spectrum has seen {max(self.n_samples, 0)} of "
            f"{self._grid.n_samples} samples",
            allowed="all of a loop, or at least one segment of "
            f"{self._settings.n_fft} samples of a record",
            remedy="Measure all of it, or choose a shorter transform.",
        )


@dataclass(frozen=True, slots=True, kw_only=True)
class SpectrumMeter:
    """Settings of the spectrum meter.

    Parameters
    ----------
    n_fft : int
        Length of a segment: the sample rate over it is the distance of bins.
    window : str
        ``kaiser`` (default: side lobes 122 dB down, resolution 2.3 bins), ``blackman_harris``,
        ``hann`` or ``rectangular``.
    overlap : float
        Share of a segment that the next one covers too; five sixths weigh all samples alike
        within 1 % for the Kaiser window, three quarters within 12 % for Blackman-Harris.
    loops : bool
        Whether the last sample is followed by the first: segments then run over the seam, evenly
        spread, and the figure is exact for the loop.
    where : str
        What is measured, for messages.

    Notes
    -----
    P. D. Welch, "The use of fast Fourier transform for the estimation of power spectra", IEEE
    Trans. Audio Electroacoust. 15(2), 1967. Segments stand at places that depend on the length of
    the signal alone, and are added by a fixed pairwise tree: the bits do not depend on strips.
    """

    n_fft: Annotated[int, Ge(8), Le(1 << 20)] = 4096
    window: WindowName = "kaiser"
    overlap: Annotated[float, Ge(0), Lt(1)] = 5 / 6
    loops: bool = True
    where: str = "signal"

    @property
    def hop_samples(self) -> int:
        """Samples from segment to segment, before a loop spreads them evenly."""
        return max(round(self.n_fft * (1 - self.overlap)), 1)

    def begin(self, signal: Signal) -> SpectrumReading:
        """Return an empty reading."""
        return SpectrumReading(self, signal)


def spectrum_of(samples: Samples, *, sample_rate_hz: float, **settings: Any) -> Spectrum:
    """Return the spectrum of an array.

    Parameters
    ----------
    samples : complex64 array, shape (n_samples,)
        One period of a loop unless ``loops=False``.
    sample_rate_hz : float
        Hz.
    **settings
        Of :class:`SpectrumMeter`.

    Returns
    -------
    Spectrum

    Raises
    ------
    SignalError
        As :meth:`SpectrumReading.result`.

    Examples
    --------
    >>> tone = np.exp(2j * np.pi * np.arange(4096) / 16).astype(np.complex64)
    >>> found = spectrum_of(tone, sample_rate_hz=1600.0, n_fft=1024)
    >>> round(found.power(90, 110), 4)
    1.0
    """
    described = Signal(sample_rate_hz=Fraction(sample_rate_hz), n_samples=samples.size)
    reading = SpectrumMeter(**settings).begin(described)
    reading.feed(0, samples)
    return reading.result()
