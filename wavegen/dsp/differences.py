"""The fourth difference of a signal: where a waveform breaks, it stands out."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Self

import numpy as np

from wavegen.core.signal import Range, Samples, Signal


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
        out = np.zeros(stop - start, np.complex64)
        first, last = max(start, low + 2), min(stop, high - 2)
        if first >= last:
            return out
        a, b = first - low, last - low
        with np.errstate(invalid="ignore", over="ignore"):
            found = x[a - 2 : b - 2] + x[a + 2 : b + 2]
            found -= np.float32(4) * (x[a - 1 : b - 1] + x[a + 1 : b + 1])
            found += np.float32(6) * x[a:b]
        if not np.isfinite(found).all():
            found[~np.isfinite(found)] = 0
        out[first - start : last - start] = found
        return out
