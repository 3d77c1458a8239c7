"""Field-effect transistor amplifier after Ghorbani and Sheikhan."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from typing import Annotated

import numpy as np
import scipy.optimize
from annotated_types import Ge, Le, MaxLen, MinLen

from wavegen.core.signal import Signal
from wavegen.core.site import Site
from wavegen.core.units import QuantityError
from wavegen.laws.law import Law
from wavegen.laws.term import NoLaw, Term
from wavegen.stages.amplifier import Amplifier, BackOffFrom, Complexes, Reals
from wavegen.stages.drive import BackedOff

PUBLISHED = ((8.1081, 1.5413, 6.5202, -0.0718), (4.6645, 2.0965, 10.88, -0.003))
"""Coefficients of amplitude and phase; the phase in radians."""
_REACH = 1e3


@dataclass(frozen=True, eq=False, kw_only=True)
class GhorbaniCurve(Amplifier):
    """The curves.

    Parameters
    ----------
    am_am, am_pm : tuple of float
        Four coefficients each.
    """

    am_am: tuple[float, ...]
    am_pm: tuple[float, ...]

    def gain(self, amplitude: Reals) -> Complexes:
        """Return the gain; that of amplitude zero is its limit."""
        x1, x2, x3, x4 = self.am_am
        y1, y2, y3, y4 = self.am_pm
        size = x1 * amplitude ** (x2 - 1) / (1 + x3 * amplitude**x2) + x4
        rising = amplitude**y2
        angle = y1 * rising / (1 + y3 * rising) + y4 * amplitude
        return np.asarray(size * (np.cos(angle) + 1j * np.sin(angle)))


@dataclass(frozen=True, slots=True, kw_only=True)
class Ghorbani:
    """Settings of a Ghorbani amplifier.

    Parameters
    ----------
    am_am : tuple of float
        ``x1 ... x4`` of the amplitude: ``x1 r^x2 / (1 + x3 r^x2) + x4 r``; ``x2`` at least 1.
    am_pm : tuple of float
        ``y1 ... y4`` of the phase, radians: ``y1 r^y2 / (1 + y3 r^y2) + y4 r``.
    input_back_off_db : float
        How far the mean input power (of a gated signal: of its on-time) stands below the
        reference, dB.
    back_off_from : {"saturation", "compression"}
        The reference at the input: that of the highest output (which only a negative ``x4``
        has), or the 1 dB compression point, below the highest gain.

    Notes
    -----
    A. Ghorbani, M. Sheikhan, "The effect of solid state power amplifiers (SSPAs) nonlinearities
    on MPSK and M-QAM signal transmission", Proc. 6th Int. Conference on Digital Processing of
    Signals in Communications, 1991; coefficients of a GaAs FET amplifier from memory. With them
    the gain falls towards small amplitudes and turns negative at the smallest. The output has
    the mean power of the input; the gain that was undone is told.
    """

    am_am: Annotated[tuple[Annotated[float, Ge(-1e6), Le(1e6)], ...], MinLen(4), MaxLen(4)] = (
        PUBLISHED[0]
    )
    am_pm: Annotated[tuple[Annotated[float, Ge(-1e6), Le(1e6)], ...], MinLen(4), MaxLen(4)] = (
        PUBLISHED[1]
    )
    input_back_off_db: Annotated[float, Ge(-20), Le(200)]
    back_off_from: BackOffFrom = "saturation"

    def __post_init__(self) -> None:
        """Refuse curves that are not finite at some amplitude."""
        for key, values, least in (("am_am", self.am_am, 1.0), ("am_pm", self.am_pm, 0.0)):
            if len(values) == 4 and (values[1] < least or values[2] < 0):
                raise QuantityError(
                    problem=f"an exponent of {values[1]:g} with the divisor {values[2]:g}",
                    allowed=f"a second coefficient from {least:g}, a third from 0",
                    remedy="Check the order of the coefficients.",
                    key=key,
                )

    def amplifier(self) -> Amplifier:
        """Return the model."""
        plain = GhorbaniCurve(name="Ghorbani", am_am=self.am_am, am_pm=self.am_pm)
        return replace(plain, saturation=_highest(plain))

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


def _highest(amplifier: Amplifier) -> float:
    """Return the amplitude of the highest output, ``inf`` where it rises without end."""
    grid = np.geomspace(1e-3, _REACH, 4001)
    output = grid * np.abs(amplifier.gain(grid))
    # A local maximum: far beyond it a negative x4 rises again, with its sign turned.
    tops = 1 + np.flatnonzero((output[1:-1] > output[:-2]) & (output[1:-1] >= output[2:]))
    if not tops.size:
        return math.inf
    place = int(tops[np.argmax(output[tops])])
    found = scipy.optimize.minimize_scalar(
        lambda r: -amplifier.output(float(r)),
        bounds=(grid[place - 1], grid[place + 1]),
        method="bounded",
        options={"xatol": 1e-12},
    )
    return float(found.x)
