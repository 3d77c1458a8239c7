"""A stretch of a signal as a signal of its own, and a signal with zeros after its end."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from wavegen.core.signal import Range, Samples, Signal


@dataclass(frozen=True, eq=False, kw_only=True)
class Excerpt(Signal):
    """Samples ``[first, first + n_samples)`` of its input, counted from zero.

    Parameters
    ----------
    first : int
        Index of the first sample in the input.
    """

    first: int

    def needs(self, start: int, stop: int) -> tuple[Range, ...]:
        """Return the shifted range."""
        return ((start + self.first, stop + self.first),)

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Return a copy of the input's samples."""
        return arrays[0].copy()


def excerpt(signal: Signal, first: int, stop: int) -> Signal:
    """Return ``[first, stop)`` of a signal; the signal itself if that is all of it.

    Parameters
    ----------
    signal : Signal
        Any signal.
    first, stop : int
        ``0 <= first < stop``; may reach over several periods.

    Returns
    -------
    Signal
        Its mean power must be measured unless nothing was cut.
    """
    if first == 0 and stop == signal.n_samples:
        return signal
    return Excerpt(
        sample_rate_hz=signal.sample_rate_hz,
        n_samples=stop - first,
        inputs=(signal,),
        mean_power=None,
        first=first,
    )


@dataclass(frozen=True, eq=False, kw_only=True)
class Padded(Signal):
    """A recording with zeros after its end: before its start too, since signals are cyclic."""

    def needs(self, start: int, stop: int) -> tuple[Range, ...]:
        """Return the part of the range that is recorded; one sample where none is."""
        last = self.inputs[0].n_samples
        if start >= last:
            return ((0, 1),)
        return ((start, min(stop, last)),)

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Return what is recorded, then zeros."""
        out = np.zeros(stop - start, np.complex64)
        count = max(min(stop, self.inputs[0].n_samples) - start, 0)
        out[:count] = arrays[0][:count]
        return out


def padded(signal: Signal, n_samples: int) -> Padded:
    """Return a signal with zeros after its end.

    Parameters
    ----------
    signal : Signal
        A recording.
    n_samples : int
        Length with the zeros.
    """
    return Padded(
        sample_rate_hz=signal.sample_rate_hz,
        n_samples=n_samples,
        inputs=(signal,),
        mean_power=None,
    )
