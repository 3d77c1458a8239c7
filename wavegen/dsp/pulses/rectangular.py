"""Rectangular pulse: each symbol is held until the next."""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction

import numpy as np
from numpy.typing import NDArray

from wavegen.dsp.pulse import Pulse


@dataclass(frozen=True, slots=True, kw_only=True)
class Rectangular:
    """Settings of a rectangular pulse: it has none."""

    def design(self, samples_per_symbol: Fraction) -> Pulse:
        """Return the pulse."""
        return Hold(span_symbols=1, is_smooth=False)


@dataclass(frozen=True, kw_only=True)
class Hold(Pulse):
    """1 from a symbol's instant until the next, 0 elsewhere.

    Notes
    -----
    Its spectrum falls as ``1/f``: sampled, it folds, and the samples are those of the held
    symbols at their instants, nothing more.
    """

    def values(self, t: NDArray[np.float64]) -> NDArray[np.float64]:
        """Return the pulse at times in symbols."""
        return np.where((t >= 0) & (t < 1), 1.0, 0.0)
