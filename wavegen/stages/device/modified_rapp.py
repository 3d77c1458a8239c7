"""Modified Rapp amplifier: soft limiting with a turn of the phase."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Annotated

import numpy as np
from annotated_types import Ge, Gt, Le, MaxLen, MinLen

from wavegen.core.signal import Signal
from wavegen.core.site import Site
from wavegen.core.units import QuantityError
from wavegen.laws.law import Law
from wavegen.laws.term import NoLaw, Term
from wavegen.stages.amplifier import Amplifier, BackOffFrom, Complexes, Reals
from wavegen.stages.drive import BackedOff

PUBLISHED_PHASE = (-345.0, 0.17, 4.0, 4.0)
"""``A``, ``B`` and two exponents; the phase in radians."""


@dataclass(frozen=True, eq=False, kw_only=True)
class ModifiedRappCurve(Amplifier):
    """The curves, on an input scale of their own.

    Parameters
    ----------
    small_signal : float
        Gain of small amplitudes.
    asymptote : float
        Highest output.
    smoothness : float
        Exponent ``p``.
    am_pm : tuple of float
        ``A``, ``B``, ``q1``, ``q2``.
    """

    small_signal: float
    asymptote: float
    smoothness: float
    am_pm: tuple[float, ...]

    def gain(self, amplitude: Reals) -> Complexes:
        """Return the gain, turned by ``A r^q1 / (1 + (r/B)^q2)`` radians."""
        p, (a, b, q1, q2) = self.smoothness, self.am_pm
        over = amplitude * (self.small_signal / self.asymptote)
        large: Reals = np.maximum(over, 1.0)
        ratio: Reals = np.minimum(over, 1.0) / large
        size = self.small_signal * (1 + ratio ** (2 * p)) ** (-0.5 / p) / large
        angle = a * amplitude**q1 / (1 + (amplitude / b) ** q2)
        return np.asarray(size * (np.cos(angle) + 1j * np.sin(angle)))

    @property
    def highest_output(self) -> float:
        """The asymptote."""
        return self.asymptote


@dataclass(frozen=True, slots=True, kw_only=True)
class ModifiedRapp:
    """Settings of a modified Rapp amplifier.

    Parameters
    ----------
    small_signal : float
        Gain of small amplitudes ``G``, a ratio of amplitudes.
    asymptote : float
        Highest output amplitude ``V``.
    smoothness : float
        Exponent ``p``.
    am_pm : tuple of float
        ``A``, ``B``, ``q1``, ``q2`` of the phase in radians, ``A r^q1 / (1 + (r/B)^q2)`` for the
        input amplitude ``r``.
    input_back_off_db : float
        How far the mean input power (of a gated signal: of its on-time) stands below the
        reference, dB.
    back_off_from : {"saturation", "compression"}
        The reference at the input: where the small-signal line meets the highest output,
        ``r = V / G``, or the 1 dB compression point.

    Notes
    -----
    ``G r / (1 + (G r / V)^2p)^(1/2p)`` with a turn of the phase. The defaults are the amplifier
    for millimetre waves of 3GPP TR 38.803: G 16, V 1.9, p 1.1, A -345, B 0.17, q 4; from memory.
    Its phase is read in radians here: the limit is then -16.5 degrees, close to the -16.7
    degrees of the other published set of this form (IEEE 802.11-09/1213, degrees), where degrees
    would leave -0.3. The output has the mean power of the input; the gain undone is told.
    """

    small_signal: Annotated[float, Gt(0), Le(1e6)] = 16.0
    asymptote: Annotated[float, Gt(0), Le(1e6)] = 1.9
    smoothness: Annotated[float, Ge(0.2), Le(100)] = 1.1
    am_pm: Annotated[tuple[Annotated[float, Ge(-1e9), Le(1e9)], ...], MinLen(4), MaxLen(4)] = (
        PUBLISHED_PHASE
    )
    input_back_off_db: Annotated[float, Ge(-20), Le(200)]
    back_off_from: BackOffFrom = "saturation"

    def __post_init__(self) -> None:
        """Refuse a phase that is not finite."""
        if len(self.am_pm) == 4 and not all(value > 0 for value in self.am_pm[1:]):
            raise QuantityError(
                problem="B and both exponents of the phase must be above zero",
                allowed="A, B, q1, q2, all but A above 0",
                remedy="Write it like am_pm: [-345, 0.17, 4, 4].",
                key="am_pm",
            )

    def amplifier(self) -> Amplifier:
        """Return the model."""
        return ModifiedRappCurve(
            name=f"modified Rapp, p = {self.smoothness:g}",
            saturation=self.asymptote / self.small_signal,
            small_signal=self.small_signal,
            asymptote=self.asymptote,
            smoothness=self.smoothness,
            am_pm=self.am_pm,
        )

    def build(self, site: Site, source: Signal) -> Signal:
        """Return the signal behind the amplifier at the mean power it had.

        Raises
        ------
        RecipeError
            The signal is zero, or the model has no such reference.
        """
        return self._driven().signal(site, source)

    def law(self, site: Site, source: Law) -> Law | NoLaw:
        """Return the law behind the amplifier."""
        return self._driven().law(site, source)

    def term(self, site: Site, source: Term) -> Term | NoLaw:
        """Return what a part of a composite is behind the amplifier."""
        return self._driven().term(site, source)

    def _driven(self) -> BackedOff:
        return BackedOff(
            amplifier=self.amplifier(),
            back_off_db=self.input_back_off_db,
            back_off_from=self.back_off_from,
        )
