"""The law of Gaussian noise whose rails differ: power and its image's share of it."""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import ArrayLike, NDArray

from wavegen.laws.law import Holds, from_db
from wavegen.laws.level_search import level_by_halving

_FEWEST = 64
_MOST = 1 << 14
_BLOCK = 1 << 20
_TOP_DB = 30.0
"""Above, nothing is left even of one rail alone: ``erfc(sqrt(500))`` is 1e-219."""


@dataclass(frozen=True, eq=False, kw_only=True)
class HoytLaw:
    """Complex Gaussian noise that is not circular: ``E[x^2] = b E[|x|^2]`` with ``0 < b < 1``.

    Parameters
    ----------
    impropriety : float
        ``b``: the difference of the variances along the axes of the ellipse over their sum, 0 for
        circular noise, 1 for noise on one rail.
    name : str
        What it is called in results.

    Notes
    -----
    ``P(p > x) = 1/pi int_0^pi exp(-x / (1 + b cos a)) da``: at an angle of its ellipse the power
    is exponential (derivation, from the density's integral over the radius). The envelope's
    distribution is that of R. S. Hoyt, "Probability functions for the modulus and angle of the
    normal complex variate", Bell System Technical Journal 26(2), 1947, 318-359, also called
    Nakagami-q with ``q^2 = (1 - b) / (1 + b)``. The midpoint rule over a smooth period converges
    faster than any power.

    Examples
    --------
    >>> HoytLaw(impropriety=0.5).level_db([0.1, 0.001]).round(3).tolist()
    [3.748, 9.259]
    """

    impropriety: float
    name: str = "Gaussian of unequal rails"
    holds: Holds = "over seeds"
    peak_db: float = math.inf

    @cached_property
    def _means(self) -> NDArray[np.float64]:
        """Mean powers at the angles of the midpoint rule."""
        b = self.impropriety
        count = min(max(_FEWEST, math.ceil(64 / math.sqrt(max(1 - b, 1e-12)))), _MOST)
        angle = (np.arange(count) + 0.5) * (np.pi / count)
        return np.asarray(1 + b * np.cos(angle))

    def ccdf(self, level_db: ArrayLike) -> NDArray[np.float64]:
        """Return the probability that the power is above a level (dB over the mean)."""
        power = from_db(level_db)
        flat = np.atleast_1d(power).ravel()
        out = np.empty(flat.size)
        rows = max(1, _BLOCK // self._means.size)
        for low in range(0, flat.size, rows):
            part = flat[low : low + rows]
            out[low : low + rows] = np.exp(-part[:, None] / self._means).mean(axis=1)
        return out.reshape(power.shape)

    def level_db(self, probability: ArrayLike) -> NDArray[np.float64]:
        """Return the level at a probability, dB over the mean; ``inf`` at 0, ``-inf`` at 1."""
        found = level_by_halving(self.ccdf, probability, most_db=_TOP_DB)
        return np.where(np.asarray(probability) > 0, found, np.inf)

    def moment(self, order: int) -> float:
        """Return ``E[p^k] / E[p]^k``: ``k!`` times the mean of ``(1 + b cos a)^k``."""
        return math.factorial(order) * float(np.mean(self._means**order))
