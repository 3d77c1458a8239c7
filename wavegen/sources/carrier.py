"""An unmodulated carrier."""

from __future__ import annotations

import cmath
import math
from dataclasses import dataclass
from fractions import Fraction

import numpy as np

from wavegen.core.signal import Samples, Signal
from wavegen.core.site import Cycle, Site
from wavegen.laws.composite import LineTerm
from wavegen.laws.constant import ConstantLaw
from wavegen.laws.law import Law
from wavegen.laws.term import Term


@dataclass(frozen=True, eq=False, kw_only=True)
class ConstantSignal(Signal):
    """The same value at all times.

    Parameters
    ----------
    value : complex
        Sample value.
    """

    value: complex

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Return the value, repeated."""
        return np.full(stop - start, self.value, np.complex64)


@dataclass(frozen=True, slots=True, kw_only=True)
class Carrier:
    """Settings of an unmodulated carrier at zero frequency.

    Parameters
    ----------
    phase_deg : float
        Phase of the constant sample value, degrees.
    """

    phase_deg: float = 0.0

    def cycle(self, sample_rate_hz: Fraction, path: str) -> Cycle:
        """Return one sample: any loop will do."""
        return Cycle(n_samples=1)

    def build(self, site: Site) -> Signal:
        """Return the signal, of unit power."""
        return ConstantSignal(
            sample_rate_hz=site.sample_rate_hz,
            n_samples=site.n_samples,
            value=cmath.exp(1j * math.radians(self.phase_deg)),
        )

    def law(self, site: Site) -> Law:
        """Return the law of a constant envelope."""
        return ConstantLaw()

    def term(self, site: Site) -> Term:
        """Return what the carrier is to a composite: known at all times."""
        return LineTerm.of(cmath.exp(1j * math.radians(self.phase_deg)))
