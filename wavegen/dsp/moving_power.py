"""Power averaged over a short window that moves along: what a burst is found by."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Self

import numpy as np
from numpy.typing import NDArray

from wavegen.core.signal import Range, Samples, Signal

_BLOCK = 1 << 14


@dataclass(frozen=True, eq=False, kw_only=True)
class MovingPower(Signal):
    """A signal whose ``|y|^2`` is the mean power of its input over a window about each sample.

    Parameters
    ----------
    window_samples : int
        Length of the window: half of it, rounded down, lies before the sample.
    loops : bool
        Whether the window goes on past the ends. If not, it is cut there and the mean taken
        over what is left.

    Notes
    -----
    The sum is built by doubling (1, 2, 4 ... samples, elementwise): nothing is ever subtracted,
    so that silence after a burst reads as silence at any ratio, and no figure depends on how
    the range was cut.
    """

    window_samples: int
    loops: bool

    @classmethod
    def of(cls, source: Signal, window_samples: int, *, loops: bool) -> Self:
        """Return the moving power of a signal, on its own axis.

        Parameters
        ----------
        source : Signal
            What is averaged.
        window_samples : int
            From 1 on.
        loops : bool
            Whether its last sample is followed by its first.
        """
        return cls(
            sample_rate_hz=source.sample_rate_hz,
            n_samples=source.n_samples,
            inputs=(source,),
            mean_power=source.mean_power if loops else None,
            window_samples=window_samples,
            loops=loops,
        )

    @property
    def before(self) -> int:
        """Samples of the window before its own."""
        return self.window_samples // 2

    @property
    def after(self) -> int:
        """Samples of the window after its own."""
        return (self.window_samples - 1) // 2

    def needs(self, start: int, stop: int) -> tuple[Range, ...]:
        """Return the range with the window's halo, cut at the ends of a record."""
        low, high = start - self.before, stop + self.after
        if not self.loops:
            low, high = max(low, 0), min(high, self.n_samples)
        return ((low, high),)

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Average the power, block by block."""
        (samples,) = arrays
        ((first, last),) = self.needs(start, stop)
        out = np.zeros(stop - start, np.complex64)
        for begin in range(start, stop, _BLOCK):
            end = min(begin + _BLOCK, stop)
            low, high = begin - self.before, end + self.after
            inside = slice(max(low, first) - first, min(high, last) - first)
            power = np.zeros(high - low)
            place = slice(max(first - low, 0), power.size - max(high - last, 0))
            part = samples[inside]
            with np.errstate(invalid="ignore"):  # what is not finite is the meter's to tell
                power[place] = part.real.astype(np.float64) ** 2
                power[place] += part.imag.astype(np.float64) ** 2
                mean = _moving_sum(power, self.window_samples) / self._count(begin, end)
                out.real[begin - start : end - start] = np.sqrt(mean)
        return out

    def _count(self, start: int, stop: int) -> NDArray[np.float64] | int:
        """Return how many samples lie in the window about each index."""
        if self.loops or (start >= self.before and stop + self.after <= self.n_samples):
            return self.window_samples
        index = np.arange(start, stop)
        low = np.maximum(index - self.before, 0)
        high = np.minimum(index + self.after + 1, self.n_samples)
        return np.asarray(high - low, np.float64)


def _moving_sum(values: NDArray[np.float64], window: int) -> NDArray[np.float64]:
    """Return sums over ``window`` values in a row, shape (n - window + 1,)."""
    n = values.size - window + 1
    total = np.zeros(n)
    offset, width = 0, 1
    while True:
        if window & width:
            total += values[offset : offset + n]
            offset += width
        if 2 * width > window:
            return total
        values = values[:-width] + values[width:]
        width *= 2
