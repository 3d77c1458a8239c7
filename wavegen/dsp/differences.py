"""The fourth difference of a signal: where a waveform breaks, it stands out."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Self

import numpy as np
from numpy.typing import NDArray

from wavegen.core.signal import Range, Samples, Signal
from wavegen.dsp.cell_sums import CELL
from wavegen.dsp.record_kernel import difference_maxima, fourth_difference


@dataclass(frozen=True, eq=False, kw_only=True)
class FourthDifference(Signal):
    """``x[n-2] - 4 x[n-1] + 6 x[n] - 4 x[n+1] + x[n+2]``; zero near the ends of a record.

    Parameters
    ----------
    loops : bool
        Whether the last sample is followed by the first.

    Notes
    -----
    Its gain is ``(2 sin(pi f))^4``: 16 at half the rate, 0.34 at an eighth of it. A waveform
    that fills a quarter of its rate nearly vanishes; a step of height 1 gives 3. What is not
    finite gives 0.
    """

    loops: bool

    @classmethod
    def of(cls, source: Signal, *, loops: bool) -> Self:
        """Return the fourth difference of a signal, on its own axis."""
        return cls(
            sample_rate_hz=source.sample_rate_hz,
            n_samples=source.n_samples,
            inputs=(source,),
            mean_power=None,
            loops=loops,
        )

    def needs(self, start: int, stop: int) -> tuple[Range, ...]:
        """Return the range with two samples more on each side."""
        low, high = start - 2, stop + 2
        if not self.loops:
            low, high = max(low, 0), min(high, self.n_samples)
        return ((low, high),)

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Difference, sample by sample."""
        ((low, high),) = self.needs(start, stop)
        (x,) = arrays
        first, last = max(start, low + 2), min(stop, high - 2)
        if first >= last:
            return np.zeros(stop - start, np.complex64)
        a, b = first - low, last - low
        found = fourth_difference(x[a - 2 : b + 2])
        found[~np.isfinite(found)] = 0
        if (first, last) == (start, stop):
            return found
        out = np.zeros(stop - start, np.complex64)
        out[first - start : last - start] = found
        return out


@dataclass(frozen=True, eq=False, kw_only=True)
class DifferenceHeights(Signal):
    """How high the fourth difference of a signal stands, on an axis of cells of 1024 samples.

    Parameters
    ----------
    loops : bool
        Whether the last sample is followed by the first.

    Notes
    -----
    Value ``k`` is the largest power of the difference in ``[1024 k, 1024 (k + 1))``, in the real
    part: float32 holds it as it is.
    """

    loops: bool

    @classmethod
    def of(cls, source: Signal, *, loops: bool) -> Self:
        """Return the heights over one period of a signal."""
        return cls(
            sample_rate_hz=source.sample_rate_hz / CELL,
            n_samples=-(-source.n_samples // CELL),
            inputs=(source,),
            mean_power=None,
            loops=loops,
        )

    def needs(self, start: int, stop: int) -> tuple[Range, ...]:
        """Return the cells with two samples more on each side."""
        n = self.inputs[0].n_samples
        low, high = start * CELL - 2, min(stop * CELL, n) + 2
        if not self.loops:
            low, high = max(low, 0), min(high, n)
        return ((low, high),)

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Take the largest of each cell."""
        ((low, high),) = self.needs(start, stop)
        n = self.inputs[0].n_samples
        first, last = start * CELL, min(stop * CELL, n)
        samples = arrays[0]
        before, after = 2 - (first - low), 2 - (high - last)
        if before or after:  # beyond the ends of a record the difference is nothing
            none = np.full(2, np.nan, np.complex64)
            samples = np.concatenate([none[:before], samples, none[:after]])
        found: NDArray[np.float32] = difference_maxima(samples)
        return found.astype(np.complex64)
