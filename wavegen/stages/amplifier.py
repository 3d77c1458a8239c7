"""A memoryless amplifier: a complex gain that depends on the amplitude alone, and its landmarks."""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cached_property
from typing import Literal

import numpy as np
import scipy.optimize
from numpy.typing import NDArray

from wavegen.core.site import Site

Reals = NDArray[np.float64]
Complexes = NDArray[np.complex128]
BackOffFrom = Literal["saturation", "compression"]

COMPRESSION_DB = 1.0
_SPAN_DB = 100.0
"""How far below 20 dB over saturation, or below the largest input, the gain is looked at."""
_POINTS = 4001


@dataclass(frozen=True, eq=False, kw_only=True)
class Amplifier:
    """What every model states; amplitudes are on the model's own scale.

    Parameters
    ----------
    name : str
        As results call it: ``Rapp, p = 2``.
    saturation : float
        Input amplitude of the highest output, or where the small-signal line meets an asymptote;
        ``inf`` if there is neither.
    largest : float
        Largest input amplitude at which the model is known.
    smallest : float
        Input amplitude below which the gain is held.
    kinks : tuple of float
        Input amplitudes at which the curve is not smooth.
    """

    name: str
    saturation: float = math.inf
    largest: float = math.inf
    smallest: float = 0.0
    kinks: tuple[float, ...] = ()

    def gain(self, amplitude: Reals) -> Complexes:
        """Return output over input.

        Parameters
        ----------
        amplitude : float64 array
            Of the input, not negative.

        Returns
        -------
        complex128 array of the same shape
        """
        raise TypeError(type(self).__name__)  # the base only describes

    def output(self, amplitude: float) -> float:
        """Return the amplitude of the output for one of the input."""
        return amplitude * float(np.abs(self.gain(np.array([amplitude])))[0])

    @property
    def highest_output(self) -> float:
        """Highest amplitude of the output, or its asymptote."""
        return self.output(self.saturation)

    @cached_property
    def compression(self) -> float | None:
        """Input amplitude at which the gain has fallen 1 dB below its highest; None if never.

        A gain that rises at first (expansion) is followed over its highest point.
        """
        top = min(10 * self.saturation, self.largest)
        if not math.isfinite(top):
            top = 1e3
        grid = top * 10 ** (np.linspace(-_SPAN_DB, 0, _POINTS) / 20)
        gain_db = 20 * np.log10(np.maximum(np.abs(self.gain(grid)), 1e-30))
        peak = int(np.argmax(gain_db))
        below = gain_db[peak:] <= gain_db[peak] - COMPRESSION_DB
        if not below.any():
            return None
        after = peak + int(np.argmax(below))
        wanted = 10 ** ((gain_db[peak] - COMPRESSION_DB) / 20)

        def excess(amplitude: float) -> float:
            return float(np.abs(self.gain(np.array([amplitude])))[0] - wanted)

        low, high = grid[after - 1], grid[after]
        return float(scipy.optimize.brentq(excess, low, high, xtol=1e-15, rtol=1e-12))


def rms_amplitude(
    site: Site, amplifier: Amplifier, *, back_off_db: float, back_off_from: BackOffFrom
) -> float:
    """Return the RMS amplitude at the input of a model for a back-off.

    Parameters
    ----------
    site : Site
        For the error.
    amplifier : Amplifier
        The model.
    back_off_db : float
        How far the mean input power stands below the reference, dB.
    back_off_from : {"saturation", "compression"}
        Which reference: the input of the highest output, or the 1 dB compression point.

    Raises
    ------
    RecipeError
        The model has no such point.
    """
    point = amplifier.saturation if back_off_from == "saturation" else amplifier.compression
    if point is None or not math.isfinite(point):
        raise site.error(
            key="back_off_from",
            problem=f"{amplifier.name} has no {WORDS[back_off_from]}",
            allowed="a point that the model reaches",
            remedy="Measure from the other point: "
            + ("compression." if back_off_from == "saturation" else "saturation."),
        )
    return point * 10 ** (-back_off_db / 20)


WORDS: dict[BackOffFrom, str] = {
    "saturation": "saturation",
    "compression": "1 dB compression point",
}
"""What the references are called in results."""
