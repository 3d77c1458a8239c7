"""A signal without its DC offset."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Self

import numpy as np

from wavegen.core.signal import Samples, Signal


@dataclass(frozen=True, eq=False, kw_only=True)
class WithoutOffset(Signal):
    """Its input less a constant.

    Parameters
    ----------
    offset : complex
        What is taken off each sample, full scale 1.
    """

    offset: complex

    @classmethod
    def of(cls, source: Signal, offset: complex) -> Self:
        """Take a constant off a signal.

        Parameters
        ----------
        source : Signal
            Any signal.
        offset : complex
            Full scale 1.
        """
        return cls(
            sample_rate_hz=source.sample_rate_hz,
            n_samples=source.n_samples,
            inputs=(source,),
            mean_power=None,
            offset=offset,
        )

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Subtract."""
        return arrays[0] - np.complex64(self.offset)
