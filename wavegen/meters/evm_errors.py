"""Error vectors one by one, once the gain is known: peak, percentiles, averages over frames."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from wavegen.core.errors import SignalError
from wavegen.core.evaluate import repeat
from wavegen.core.signal import Samples, Signal
from wavegen.dsp.grid_sums import CellReading, Sums
from wavegen.meters.power_statistics import PowerStatistics
from wavegen.sources.reception import Reception


@dataclass(frozen=True, eq=False, kw_only=True)
class Equalised(Signal):
    """Symbols divided by the gain of their subcarrier.

    Parameters
    ----------
    gains : complex128 array, shape (n_columns,)
        By column; one for all where there is one.
    """

    gains: NDArray[np.complex128]

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Divide."""
        inverse = (1 / self.gains).astype(np.complex64)
        if inverse.size == 1:
            return np.asarray(arrays[0] * inverse[0])
        return np.asarray(arrays[0] * repeat(inverse, start, stop))


@dataclass(frozen=True, eq=False, kw_only=True)
class ErrorVectors(Signal):
    """Differences of what was received (first input) and sent (second), over the RMS sent.

    Parameters
    ----------
    rms : float
        RMS of what was sent in the class.
    kept : bool array, shape (n,), or None
        Places of the class over a repeating frame; the others read 0. None: all.
    """

    rms: float
    kept: NDArray[np.bool_] | None = None

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Subtract and scale."""
        out = arrays[0] - arrays[1]
        out *= np.float32(1 / self.rms)
        if self.kept is not None:
            out *= repeat(self.kept, start, stop)
        return out


def errors_of(reception: Reception, *, rms: float, number: int) -> ErrorVectors:
    """Return the error vectors of one class of a reception.

    Parameters
    ----------
    reception : Reception
        With gains taken out of what was received.
    rms : float
        RMS of what was sent in the class.
    number : int
        Which class.
    """
    labels = reception.labels
    return ErrorVectors(
        sample_rate_hz=reception.ideal.sample_rate_hz,
        n_samples=reception.ideal.n_samples,
        inputs=(reception.received, reception.ideal),
        mean_power=None,
        rms=rms,
        kept=None if labels is None else (labels == number).reshape(-1),
    )


def equalised(signal: Signal, gains: complex | NDArray[np.complex128]) -> Equalised:
    """Return symbols divided by their gains."""
    return Equalised(
        sample_rate_hz=signal.sample_rate_hz,
        n_samples=signal.n_samples,
        step=signal.step,
        inputs=(signal,),
        mean_power=None,
        gains=np.atleast_1d(np.asarray(gains, np.complex128)),
    )


@dataclass(frozen=True, slots=True, kw_only=True)
class ErrorSpread:
    """How the error vectors of a class are distributed.

    Parameters
    ----------
    peak_percent : float
        Longest error vector over the RMS sent, percent.
    peak_index : int
        Where it is on its axis.
    p95_percent : float
        Length that 95 % of the vectors do not pass.
    median_percent : float
        Length that half of them do not pass.
    """

    peak_percent: float
    peak_index: int
    p95_percent: float
    median_percent: float


def spread_of(statistics: PowerStatistics, *, share: float) -> ErrorSpread:
    """Return peak and percentiles from the power statistics of :class:`ErrorVectors`.

    Parameters
    ----------
    statistics : PowerStatistics
        Of the vectors; those of other classes are zeros in it.
    share : float
        Share of the places that are the class's own.
    """
    levels = np.sqrt(statistics.level_power(np.array([0.05, 0.5]) * share)) * 100
    return ErrorSpread(
        peak_percent=100 * statistics.peak**0.5,
        peak_index=statistics.peak_index,
        p95_percent=float(levels[0]),
        median_percent=float(levels[1]),
    )


class FrameErrorReading(CellReading):
    """Running sum over frames of the RMS error in each.

    Parameters
    ----------
    settings : FrameErrorMeter
        Length of a frame.
    """

    def __init__(self, settings: FrameErrorMeter) -> None:
        super().__init__(settings.frame_points)
        self._settings = settings

    def reduce(self, first: int, samples: Samples) -> Sums:
        """Return the root of each frame's energy, shape (n_frames,)."""
        rails = samples.view(np.float32).reshape(-1, 2 * self._settings.frame_points)
        return np.array([np.sqrt(np.sum(np.square(row, dtype=np.float64))) for row in rails])

    def result(self) -> float:
        """Return the mean over frames of the RMS error in a frame.

        Raises
        ------
        SignalError
            No whole number of frames.
        """
        total, points = self.total(), self._settings.frame_points
        if total is None or self.n_samples % points:
            raise SignalError(
                where="frame",
                problem=f"{self.n_samples} places hold no whole number of frames of {points}",
                allowed="whole frames",
                remedy="Choose a frame that divides the loop.",
            )
        frames = self.n_samples // points
        return float(total) / frames / math.sqrt(self._settings.used_points)


@dataclass(frozen=True, slots=True, kw_only=True)
class FrameErrorMeter:
    """Settings of the meter of the error averaged over frames (IEEE 802.11).

    Parameters
    ----------
    frame_points : int
        Places of a frame on the axis of the symbols.
    used_points : float
        How many of them carry something.

    Notes
    -----
    ``Error_RMS = mean over frames of sqrt(sum |e|^2 / (points P0))``, ``P0`` the mean power of
    the constellation: IEEE 802.11-2020 cl. 17.3.9.8 (formula from memory).
    """

    frame_points: int
    used_points: float

    def begin(self, signal: Signal) -> FrameErrorReading:
        """Return an empty reading."""
        return FrameErrorReading(self)
