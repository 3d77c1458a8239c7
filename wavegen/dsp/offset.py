"""A constant taken away from a signal: only when asked for, and stated."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Self

import numpy as np

from wavegen.core.signal import Samples, Signal


@dataclass(frozen=True, eq=False, kw_only=True)
class Offset(Signal):
    """A signal less a stated constant.

    Parameters
    ----------
    offset : complex
        What is subtracted.
    """

    offset: complex

    @classmethod
    def of(cls, source: Signal, offset: complex) -> Self:
        """Return ``x - offset``, on the signal's own axis."""
        return cls(
            sample_rate_hz=source.sample_rate_hz,
            n_samples=source.n_samples,
            inputs=(source,),
            mean_power=None,
            offset=offset,
        )

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Subtract."""
        return np.asarray(arrays[0] - np.complex64(self.offset))
