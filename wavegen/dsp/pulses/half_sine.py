"""Half sine: offset QPSK with it is minimum-shift keying."""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction

import numpy as np
from numpy.typing import NDArray

from wavegen.dsp.pulse import Pulse


@dataclass(frozen=True, slots=True, kw_only=True)
class HalfSine:
    """Settings of a half-sine pulse: it has none."""

    def design(self, samples_per_symbol: Fraction) -> Pulse:
        """Return the pulse."""
        return HalfPeriod(span_symbols=1, is_matched=True, is_smooth=False)


@dataclass(frozen=True, kw_only=True)
class HalfPeriod(Pulse):
    """``sin(pi t)`` from a symbol's instant until the next, 0 elsewhere.

    Notes
    -----
    Two rails shaped by it, one late by half a symbol, are ``sin`` and ``cos`` of one angle: the
    envelope is constant. Symbols do not overlap, so a matched filter leaves no interference.
    Source: IEEE 802.15.4-2006, cl. 6.5.2.4 (there the pulse of a chip lasts two chips, one symbol
    of its rail).
    """

    def values(self, t: NDArray[np.float64]) -> NDArray[np.float64]:
        """Return the pulse at times in symbols."""
        return np.where((t >= 0) & (t < 1), np.sin(np.pi * t), 0.0)
