"""Solid-state amplifier after Rapp: soft limiting, no turn of the phase."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Annotated

import numpy as np
from annotated_types import Ge, Le

from wavegen.core.signal import Signal
from wavegen.core.site import Site
from wavegen.laws.law import Law
from wavegen.laws.term import NoLaw, Term
from wavegen.stages.amplifier import Amplifier, BackOffFrom, Complexes, Reals
from wavegen.stages.drive import BackedOff


@dataclass(frozen=True, eq=False, kw_only=True)
class RappCurve(Amplifier):
    """The curve with unit small-signal gain and unit asymptote.

    Parameters
    ----------
    smoothness : float
        Exponent ``p``.
    """

    smoothness: float

    def gain(self, amplitude: Reals) -> Complexes:
        """Return ``(1 + r^2p)^(-1/2p)``, written so that no amplitude overflows."""
        p = self.smoothness
        large: Reals = np.maximum(amplitude, 1.0)
        ratio: Reals = np.minimum(amplitude, 1.0) / large
        return ((1 + ratio ** (2 * p)) ** (-0.5 / p) / large).astype(np.complex128)

    @property
    def highest_output(self) -> float:
        """The asymptote."""
        return 1.0


@dataclass(frozen=True, slots=True, kw_only=True)
class Rapp:
    """Settings of a Rapp amplifier.

    Parameters
    ----------
    smoothness : float
        Exponent ``p``, 0.2 to 100: the higher, the harder the limit; 2 to 3 are common for
        solid-state amplifiers.
    input_back_off_db : float
        How far the mean input power (of a gated signal: of its on-time) stands below the
        reference, dB.
    back_off_from : {"saturation", "compression"}
        The reference at the input: where the small-signal line meets the highest output, or the
        1 dB compression point.

    Notes
    -----
    ``g(r) = r / (1 + r^(2p))^(1/2p)`` with ``r`` over the saturation amplitude: C. Rapp,
    "Effects of HPA-nonlinearity on a 4-DPSK/OFDM-signal for a digital sound broadcasting
    system", Proc. 2nd European Conference on Satellite Communications, 1991. The output has the
    mean power of the input; the gain that was undone is told.
    """

    smoothness: Annotated[float, Ge(0.2), Le(100)] = 2.0
    input_back_off_db: Annotated[float, Ge(-20), Le(200)]
    back_off_from: BackOffFrom = "saturation"

    def amplifier(self) -> Amplifier:
        """Return the model."""
        return RappCurve(
            name=f"Rapp, p = {self.smoothness:g}", saturation=1.0, smoothness=self.smoothness
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
