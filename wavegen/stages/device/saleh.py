"""Travelling-wave tube after Saleh: output that falls beyond saturation, and a turn of phase."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Annotated

import numpy as np
from annotated_types import Ge, Le, MaxLen, MinLen

from wavegen.core.signal import Signal
from wavegen.core.site import Site
from wavegen.laws.law import Law
from wavegen.laws.term import NoLaw, Term
from wavegen.stages.amplifier import Amplifier, BackOffFrom, Complexes, Reals
from wavegen.stages.drive import BackedOff

PUBLISHED = ((2.1587, 1.1517), (4.0033, 9.1040))
"""Coefficients of amplitude and phase; the phase in radians."""


@dataclass(frozen=True, eq=False, kw_only=True)
class SalehCurve(Amplifier):
    """The curves.

    Parameters
    ----------
    am_am, am_pm : tuple of float
        ``alpha`` and ``beta`` of each.
    """

    am_am: tuple[float, ...]
    am_pm: tuple[float, ...]

    def gain(self, amplitude: Reals) -> Complexes:
        """Return ``alpha_a / (1 + beta_a r^2)``, turned by ``alpha_p r^2 / (1 + beta_p r^2)``."""
        power = amplitude * amplitude
        size = self.am_am[0] / (1 + self.am_am[1] * power)
        angle = self.am_pm[0] * power / (1 + self.am_pm[1] * power)
        return np.asarray(size * (np.cos(angle) + 1j * np.sin(angle)))


@dataclass(frozen=True, slots=True, kw_only=True)
class Saleh:
    """Settings of a Saleh amplifier.

    Parameters
    ----------
    am_am : tuple of float
        ``alpha`` and ``beta`` of the amplitude: ``alpha r / (1 + beta r^2)``; above 0.
    am_pm : tuple of float
        ``alpha`` and ``beta`` of the phase, radians: ``alpha r^2 / (1 + beta r^2)``.
    input_back_off_db : float
        How far the mean input power (of a gated signal: of its on-time) stands below the
        reference, dB.
    back_off_from : {"saturation", "compression"}
        The reference at the input: that of the highest output, ``r = 1 / sqrt(beta)``, or the
        1 dB compression point.

    Notes
    -----
    A. A. M. Saleh, "Frequency-independent and frequency-dependent nonlinear models of TWT
    amplifiers", IEEE Trans. Commun. 29(11), 1981, whose coefficients are the defaults. The
    output has the mean power of the input; the gain that was undone is told.
    """

    am_am: Annotated[tuple[Annotated[float, Ge(1e-6), Le(1e6)], ...], MinLen(2), MaxLen(2)] = (
        PUBLISHED[0]
    )
    am_pm: Annotated[tuple[Annotated[float, Ge(0), Le(1e6)], ...], MinLen(2), MaxLen(2)] = (
        PUBLISHED[1]
    )
    input_back_off_db: Annotated[float, Ge(-20), Le(200)]
    back_off_from: BackOffFrom = "saturation"

    def amplifier(self) -> Amplifier:
        """Return the model."""
        return SalehCurve(
            name="Saleh", saturation=self.am_am[1] ** -0.5, am_am=self.am_am, am_pm=self.am_pm
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
