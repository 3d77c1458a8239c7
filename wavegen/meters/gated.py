"""Power statistics of the useful part of bursts: ramps and off-times excluded."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Self

import numpy as np

from wavegen.core.signal import Samples, Signal
from wavegen.dsp.bursts import Bursts
from wavegen.meters.power import PowerReading
from wavegen.meters.power_statistics import PowerStatistics


class GatedPowerReading:
    """Running power statistics of the on-time of one stretch.

    Parameters
    ----------
    bursts : Bursts
        When the signal is on.
    where : str
        What is measured, for messages.
    """

    def __init__(self, bursts: Bursts, where: str) -> None:
        self._bursts = bursts
        self._power = PowerReading(where)
        self._n_left_out = 0

    def feed(self, start: int, samples: Samples) -> None:
        """Take in samples whose first has index ``start``.

        Raises
        ------
        SignalError
            A sample of the on-time is not finite.
        """
        is_on = self._bursts.is_on(start, start + samples.size)
        kept = np.zeros(samples.size, np.complex64)
        np.copyto(kept, samples, where=is_on)
        self._n_left_out += samples.size - int(np.count_nonzero(is_on))
        self._power.feed(start, kept)

    def merge(self, following: Self) -> None:
        """Append the reading of the stretch that starts where this one ends."""
        self._power.merge(following._power)
        self._n_left_out += following._n_left_out

    def result(self) -> PowerStatistics:
        """Return the statistics of the samples that are fully on.

        Raises
        ------
        SignalError
            No sample is fully on, or all that are so are zero.
        """
        statistics = self._power.result()
        n_on = statistics.n_samples - self._n_left_out
        cells = self._power.cells
        total = cells.total() if cells else 0.0
        return replace(
            statistics,
            n_samples=n_on,
            n_zeros=statistics.n_zeros - self._n_left_out,
            mean=total / n_on,
        )


@dataclass(frozen=True, slots=True, kw_only=True)
class GatedPowerMeter:
    """Settings of the power meter of the on-time.

    Parameters
    ----------
    bursts : Bursts
        When the signal is on, on its own axis; see
        :func:`wavegen.stages.channel.gate.on_time`.
    where : str
        What is measured: a file's name, a recipe path.

    Notes
    -----
    What is not fully on is fed to the power meter as zeros and taken out of the counts again,
    so that sums run over the same cells of the absolute grid, however the samples are cut, and
    ``peak_index`` and ``cell_maxima`` speak of indices of the signal. ``n_samples`` counts the
    on-time alone.
    """

    bursts: Bursts
    where: str = "signal"

    def begin(self, signal: Signal) -> GatedPowerReading:
        """Return an empty reading."""
        return GatedPowerReading(self.bursts, self.where)
