"""How sure the readings of a power sensor are of the process behind the signal.

Neighbouring readings are alike within the reach of the video filter; batches of them, and runs
above a level, allow for that as they do for any correlated samples. The levels are over the mean
of the signal, which its own samples tell: where the sensor samples slowly, what a batch's mean
does to them is therefore taken from everything between the readings.
"""

from __future__ import annotations

from concurrent.futures import Executor
from dataclasses import dataclass, replace

import numpy as np

from wavegen.core.excerpt import excerpt
from wavegen.core.progress import Progress, silent
from wavegen.core.render import Tap, render
from wavegen.core.signal import Range, Samples, Signal
from wavegen.meters.batches import BatchedPowerMeter, BatchedStatistics
from wavegen.meters.sensor import Picked


@dataclass(frozen=True, eq=False, kw_only=True)
class MeanBetween(Picked):
    """The root of its input's mean power from each instant of a lower rate to the next."""

    def needs(self, start: int, stop: int) -> tuple[Range, ...]:
        """Return the range of the input from the first instant to the end of the last one."""
        return ((self._place(start), self._end(stop)),)

    def _end(self, number: int) -> int:
        return min(self._place(number), self.inputs[0].n_samples)

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Average the power; each reading's own samples alone, whatever the range."""
        (x,) = arrays
        power = x.real.astype(np.float64) ** 2 + x.imag.astype(np.float64) ** 2
        firsts = np.array([self._place(k) for k in range(start, stop)], np.int64) - self._place(
            start
        )
        lengths = np.diff(firsts, append=x.size)
        out = np.zeros(stop - start, np.complex64)
        out.real = np.sqrt(np.add.reduceat(power, firsts) / lengths)
        return out


def sample_by_sensor(
    view: Signal,
    *,
    n_readings: int,
    loops: bool,
    mean: float,
    where: str = "signal",
    workers: int = 1,
    executor: Executor | None = None,
    progress: Progress = silent,
) -> BatchedStatistics:
    """Return the readings of a sensor, and their batches.

    Parameters
    ----------
    view : Signal
        From :func:`wavegen.meters.sensor.sensor_view`.
    n_readings : int
        How many of it count: all, or those of one data period of a loop.
    loops : bool
        Whether these come round again.
    mean : float
        Mean power of the signal, which levels are over.
    where : str
        What it is called in messages.
    workers, executor, progress
        As in :func:`wavegen.core.render.render`.

    Returns
    -------
    BatchedStatistics
        Its sums of the power are those of the signal between the readings, on the scale of
        ``mean``: a brick wall that rings below zero would leave them 0.7 % too high.

    Raises
    ------
    SignalError
        The signal cannot be measured.
    """
    meter = BatchedPowerMeter(where=where, loops=loops)
    seen = excerpt(view, 0, n_readings)
    taps = [Tap(name="readings", signal=seen, meter=meter)]
    if isinstance(view, Picked):
        between = MeanBetween.of(view.inputs[0], view.sample_rate_hz)
        part = excerpt(between, 0, n_readings)
        taps.append(Tap(name="between", signal=part, meter=meter))
    read = render(
        seen,
        taps=tuple(taps),
        workers=workers,
        executor=executor,
        progress=progress,
        task="as the sensor sees it",
    )
    found: BatchedStatistics = read["readings"]
    drive: BatchedStatistics = read.get("between", found)
    sums = found.batches.sums.copy()
    power = drive.batches.sums[:, 0]
    sums[:, 0] = power * (mean * found.statistics.n_samples / power.sum())
    return BatchedStatistics(
        statistics=replace(found.statistics, mean=mean),
        batches=replace(found.batches, sums=sums),
    )
