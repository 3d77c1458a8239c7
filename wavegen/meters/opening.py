"""What the opening of a loop tells of its process: data that come round again tell it once."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Self

from wavegen.core.signal import Samples, Signal
from wavegen.meters.batches import BatchedPowerMeter, BatchedPowerReading, BatchedStatistics


class OpeningReading:
    """Batches of the samples before a limit.

    Parameters
    ----------
    reading : BatchedPowerReading
        Takes them.
    n_samples : int
        The limit.
    """

    def __init__(self, reading: BatchedPowerReading, n_samples: int) -> None:
        self._reading = reading
        self._n_samples = n_samples

    def feed(self, start: int, samples: Samples) -> None:
        """Take in samples whose first has index ``start``, as far as they lie before the limit.

        Raises
        ------
        SignalError
            A sample before the limit is not finite.
        """
        if start < self._n_samples:
            self._reading.feed(start, samples[: self._n_samples - start])

    def merge(self, following: Self) -> None:
        """Append the reading of the stretch that starts where this one ends."""
        self._reading.merge(following._reading)

    def result(self) -> BatchedStatistics:
        """Return the statistics of the opening with its batches.

        Raises
        ------
        SignalError
            Every sample of it is zero.
        """
        return self._reading.result()


@dataclass(frozen=True, slots=True, kw_only=True)
class OpeningMeter:
    """Settings of a meter of the first samples of a loop: one period of its data.

    Parameters
    ----------
    meter : BatchedPowerMeter
        What it does with them.
    n_samples : int
        How many; 1 or more, up to the loop's length.
    """

    meter: BatchedPowerMeter
    n_samples: int

    def begin(self, signal: Signal) -> OpeningReading:
        """Return an empty reading for a signal."""
        return OpeningReading(BatchedPowerReading(self.meter, self.n_samples), self.n_samples)
