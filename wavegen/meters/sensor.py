"""What a power sensor of limited bandwidth reads of a signal.

A sensor detects the envelope's power and passes it through its *video bandwidth*; what it
samples of that is what its statistics are about. Everything here is a signal again, ``y`` with
``|y|^2`` the filtered power, so that every meter works on it. The mean stays; the peaks go.
"""

from __future__ import annotations

import math
from concurrent.futures import Executor
from dataclasses import dataclass, replace
from fractions import Fraction
from typing import Literal, Self

import numpy as np
import scipy.fft
from numpy.typing import NDArray

from wavegen.core.errors import ArgumentsError, SignalError
from wavegen.core.excerpt import excerpt
from wavegen.core.progress import Progress, silent
from wavegen.core.render import Tap, render
from wavegen.core.signal import Range, Samples, Signal
from wavegen.core.units import format_hz
from wavegen.dsp.overlap_save import Filtered
from wavegen.dsp.windows import design_lowpass
from wavegen.meters.power import PowerMeter
from wavegen.meters.power_statistics import PowerStatistics

Shape = Literal["brick_wall", "one_pole"]
EDGE = 0.05
"""Width of the brick wall's edge over its cutoff: half the power is lost in the middle of it."""
STOPBAND_DB = 80.0
_NARROWEST = 2e-5
"""Cutoff in cycles a sample under which filters grow past 2^19 taps."""
_SETTLED = 17.0
"""Time constants until one pole has settled to 4e-8."""
_FINE = 16
_FINER = 64
_WIDE = 0.02
"""Cutoffs from here on, in cycles a sample, are designed on the finer grid."""


@dataclass(frozen=True, eq=False, kw_only=True)
class InstantaneousPower(Signal):
    """``|x|^2`` of its input, as the real part."""

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Square."""
        (x,) = arrays
        out = np.zeros(stop - start, np.complex64)
        np.multiply(x.real, x.real, out=out.real)
        out.real += x.imag * x.imag
        return out


@dataclass(frozen=True, eq=False, kw_only=True)
class RootOfPower(Signal):
    """The root of its input's real part; what a filter left below zero reads as zero."""

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Take the root."""
        out = np.zeros(stop - start, np.complex64)
        out.real = np.sqrt(np.maximum(arrays[0].real, 0))
        return out


@dataclass(frozen=True, eq=False, kw_only=True)
class Picked(Signal):
    """The samples of its input that lie nearest before the instants of a lower rate.

    Notes
    -----
    Instant ``k`` lies at ``k r`` input samples, ``r`` the ratio of the rates; its value is that
    of sample ``floor(k r)``. Values are real ones of the filtered power: only their place is off,
    by less than one input sample.
    """

    @classmethod
    def of(cls, source: Signal, rate_hz: Fraction) -> Self:
        """Sample a signal at a lower rate.

        Parameters
        ----------
        source : Signal
            What is sampled; one period of it, from its first sample on.
        rate_hz : Fraction
            Up to the source's own rate.
        """
        ratio = source.sample_rate_hz / rate_hz
        return cls(
            sample_rate_hz=rate_hz,
            n_samples=max(math.ceil(source.n_samples / ratio), 1),
            inputs=(source,),
            mean_power=None,
        )

    def _place(self, number: int) -> int:
        ratio = self.inputs[0].sample_rate_hz / self.sample_rate_hz
        return number * ratio.numerator // ratio.denominator

    def needs(self, start: int, stop: int) -> tuple[Range, ...]:
        """Return the range of the input that holds these instants."""
        return ((self._place(start), self._place(stop - 1) + 1),)

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Pick samples."""
        ratio = self.inputs[0].sample_rate_hz / self.sample_rate_hz
        a, b = ratio.numerator, ratio.denominator
        # start a mod b keeps the products small: exact for any length.
        whole, rest = divmod(start * a, b)
        ahead = np.arange(stop - start, dtype=np.int64)
        step, part = divmod(a, b)
        place = ahead * step + (ahead * part + rest) // b
        return np.asarray(arrays[0][place + whole - self._place(start)])


def sensor_view(
    signal: Signal,
    *,
    video_bandwidth_hz: float | None = None,
    sensor_rate_hz: Fraction | None = None,
    shape: Shape = "one_pole",
    loops: bool,
) -> Signal:
    """Return what a sensor of limited bandwidth sees of a signal.

    Parameters
    ----------
    signal : Signal
        The signal at the sensor.
    video_bandwidth_hz : float or None
        Where the detected power is filtered: half of it in dB (-3 dB) for one pole, the end of
        the flat part's edge for a brick wall, Hz. None: not filtered.
    sensor_rate_hz : Fraction or None
        At which the sensor samples, Hz; None: the signal's own rate.
    shape : {"one_pole", "brick_wall"}
        Of the filter.
    loops : bool
        Whether the signal repeats. If not, what the filter would need from beyond the ends is
        cut off.

    Returns
    -------
    Signal
        ``|y|^2`` is the power that the sensor reads.

    Raises
    ------
    ArgumentsError
        A bandwidth or a rate that is not above 0, or out of the signal's reach.
    SignalError
        The record is shorter than the filter.

    Notes
    -----
    Filters are finite and run in float32: what reads as more than 60 dB below the peak is not
    to be relied on.
    """
    seen = signal
    if video_bandwidth_hz is not None:
        taps, lag = _taps(video_bandwidth_hz, signal.sample_rate_hz, shape)
        power = InstantaneousPower(
            sample_rate_hz=signal.sample_rate_hz,
            n_samples=signal.n_samples,
            inputs=(signal,),
            mean_power=None,
        )
        seen = RootOfPower(
            sample_rate_hz=signal.sample_rate_hz,
            n_samples=signal.n_samples,
            inputs=(Filtered.of(power, taps, lag=lag),),
            mean_power=signal.mean_power,
        )
        if not loops:
            half = taps.size // 2
            first, last = half + lag, signal.n_samples - (half - lag)
            if first >= last:
                raise SignalError(
                    where="video bandwidth",
                    problem=f"{format_hz(video_bandwidth_hz)} needs {taps.size} samples to "
                    f"settle, the record has {signal.n_samples}",
                    allowed="records longer than the filter",
                    remedy="Widen the video bandwidth, or take a longer record.",
                )
            seen = excerpt(seen, first, last)
    if sensor_rate_hz is None or sensor_rate_hz == signal.sample_rate_hz:
        return seen
    if not 0 < sensor_rate_hz < signal.sample_rate_hz:
        raise ArgumentsError(
            where="sensor rate",
            problem=f"is {format_hz(sensor_rate_hz)}",
            allowed=f"above 0 Hz, up to the sample rate, {format_hz(signal.sample_rate_hz)}",
            remedy="Lower the sensor rate, or leave it out.",
        )
    return Picked.of(seen, sensor_rate_hz)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class SensorReading:
    """What a sensor reads beside what is there.

    Parameters
    ----------
    sensor : PowerStatistics
        Of the sensor's samples; levels are over the true mean, which a filter keeps.
    signal : PowerStatistics
        Of the signal itself.
    """

    sensor: PowerStatistics
    signal: PowerStatistics

    def shortfall_db(self, probability: float) -> float:
        """Return by how much the sensor reads low at a probability, dB."""
        return float(self.signal.level_db(probability) - self.sensor.level_db(probability))

    @property
    def peak_shortfall_db(self) -> float:
        """How much lower the sensor's highest reading is than the highest sample, dB."""
        return self.signal.papr_db - self.sensor.papr_db


def measure_by_sensor(
    signal: Signal,
    *,
    video_bandwidth_hz: float | None = None,
    sensor_rate_hz: Fraction | None = None,
    shape: Shape = "one_pole",
    loops: bool,
    where: str = "signal",
    workers: int = 1,
    executor: Executor | None = None,
    progress: Progress = silent,
) -> SensorReading:
    """Measure a signal as a sensor would, and as it is.

    Parameters
    ----------
    signal, video_bandwidth_hz, sensor_rate_hz, shape, loops
        As in :func:`sensor_view`.
    where : str
        What it is called in messages.
    workers, executor, progress
        As in :func:`wavegen.core.render.render`.

    Returns
    -------
    SensorReading

    Raises
    ------
    ArgumentsError, SignalError
        As :func:`sensor_view`; or the signal cannot be measured.

    Notes
    -----
    A brick wall rings: it shows power below zero now and then, which a meter of ``|y|^2`` counts
    as zero. The sensor's mean is therefore taken from the signal (a filter of gain 1 at 0 Hz keeps
    it), or it would read up to 0.03 dB high.
    """
    view = sensor_view(
        signal,
        video_bandwidth_hz=video_bandwidth_hz,
        sensor_rate_hz=sensor_rate_hz,
        shape=shape,
        loops=loops,
    )
    meter = PowerMeter(where=where)
    found = [
        render(
            item,
            taps=(Tap(name="power", signal=item, meter=meter),),
            workers=workers,
            executor=executor,
            progress=progress,
            task=task,
        )["power"]
        for item, task in ((signal, f"measuring {where}"), (view, "as the sensor sees it"))
    ]
    return SensorReading(sensor=replace(found[1], mean=found[0].mean), signal=found[0])


def _taps(bandwidth_hz: float, rate_hz: Fraction, shape: Shape) -> tuple[NDArray[np.float64], int]:
    """Return the filter's taps and the delay of the middle one, samples."""
    cutoff = bandwidth_hz / float(rate_hz)
    highest = 0.5 / (1 + EDGE / 2) if shape == "brick_wall" else 0.5
    if not _NARROWEST <= cutoff <= highest:
        raise ArgumentsError(
            where="video bandwidth",
            problem=f"is {format_hz(bandwidth_hz)}",
            allowed=f"{format_hz(_NARROWEST * float(rate_hz))} to "
            f"{format_hz(highest * float(rate_hz))} at {format_hz(rate_hz)}",
            remedy="Change the bandwidth, or the sample rate of the record.",
        )
    if shape == "brick_wall":
        taps = design_lowpass(
            passband_edge=cutoff * (1 - EDGE / 2),
            stopband_edge=cutoff * (1 + EDGE / 2),
            stopband_db=STOPBAND_DB,
        )
        return taps, 0
    return one_pole_taps(cutoff)


def one_pole_taps(cutoff: float) -> tuple[NDArray[np.float64], int]:
    """Return a single pole's response, ``1 / (1 + j f / cutoff)``, as taps.

    Parameters
    ----------
    cutoff : float
        Where half of the power is left, cycles per sample.

    Returns
    -------
    taps : float64 array, shape (2 h + 1,)
        Sum 1.
    lag : int
        Delay of the middle tap, samples.

    Notes
    -----
    The decay ``exp(-2 pi cutoff t)`` is sampled 16 or 64 times as finely, band-limited to the
    sample rate and thinned out, so that the response is that of the pole up to 0.45 of the rate,
    and not of its aliases (to 2e-4).
    """
    times = _FINER if cutoff >= _WIDE else _FINE
    decay = 2 * np.pi * cutoff / times
    fine = np.exp(-decay * np.arange(math.ceil(_SETTLED / decay) + 1))
    fine[0] /= 2  # the trapezoid rule, where the decay begins
    limit = design_lowpass(passband_edge=0.45 / times, stopband_edge=0.55 / times, stopband_db=80)
    before = limit.size // 2 // times + 1
    after = math.ceil((fine.size + limit.size // 2) / times)
    n_fft = scipy.fft.next_fast_len(fine.size + limit.size)
    joined = scipy.fft.irfft(scipy.fft.rfft(fine, n_fft) * scipy.fft.rfft(limit, n_fft), n_fft)
    place = np.arange(-before, after + 1) * times + limit.size // 2
    taps = np.where((place >= 0) & (place < n_fft), joined[np.clip(place, 0, n_fft - 1)], 0.0)
    if taps.size % 2 == 0:
        taps = np.append(taps, 0.0)
    return taps / taps.sum(), taps.size // 2 - before


def variance_left(fraction: float) -> float:
    """Return what a brick wall leaves of the variance of band-limited noise's power.

    Parameters
    ----------
    fraction : float
        Video bandwidth over the signal's (full) bandwidth, 0 to 1.

    Returns
    -------
    float
        ``2 f - f^2``: the power of flat noise of width B has a triangular spectrum from -B to B.
        Derivation.

    Examples
    --------
    >>> variance_left(0.5)
    0.75
    """
    inside = min(max(fraction, 0.0), 1.0)
    return 2 * inside - inside**2
