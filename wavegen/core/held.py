"""Samples that are held in memory, as a signal."""

from __future__ import annotations

from dataclasses import dataclass

from wavegen.core.signal import Samples, Signal


@dataclass(frozen=True, eq=False, kw_only=True)
class Held(Signal):
    """A loop of few enough samples to be kept.

    Parameters
    ----------
    samples : complex64 array, shape (n_samples,)
        One period.
    """

    samples: Samples

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Return a copy of samples ``[start, stop)``."""
        return self.samples[start:stop].copy()
