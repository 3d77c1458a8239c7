"""Mean power of a waveform alone."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Self

from wavegen.core.signal import Samples, Signal
from wavegen.meters.power import PowerReading


class MeanReading:
    """Running mean power of one stretch.

    Parameters
    ----------
    where : str
        What is measured, for messages.
    """

    def __init__(self, where: str) -> None:
        self._power = PowerReading(where)

    def feed(self, start: int, samples: Samples) -> None:
        """Take in samples whose first has index ``start``.

        Raises
        ------
        SignalError
            A sample is not finite.
        """
        self._power.feed(start, samples)

    def merge(self, following: Self) -> None:
        """Append the reading of the stretch that starts where this one ends."""
        self._power.merge(following._power)

    def result(self) -> float:
        """Return the mean of ``|x|^2``; full scale is 1, and silence gives 0.

        Raises
        ------
        SignalError
            No samples.
        """
        return self._power.mean()


@dataclass(frozen=True, slots=True, kw_only=True)
class MeanMeter:
    """Settings of the meter of mean power.

    Parameters
    ----------
    where : str
        What is measured: a file's name, a recipe path.

    Notes
    -----
    The figure is that of :class:`wavegen.meters.power.PowerMeter`, bit for bit: the same powers
    are added in the same order (cells of 1024 samples, then a fixed pairwise tree).
    """

    where: str = "signal"

    def begin(self, signal: Signal) -> MeanReading:
        """Return an empty reading."""
        return MeanReading(self.where)
