"""The law of complex Gaussian noise: exponential power."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from wavegen.laws.law import Holds, checked_probability, from_db, to_db


@dataclass(frozen=True, slots=True, kw_only=True)
class GaussianLaw:
    """Complex Gaussian noise: ``P(p > x) = exp(-x)``.

    Notes
    -----
    S. O. Rice, "Mathematical analysis of random noise", Bell System Technical Journal 23 and
    24, 1944/45: the envelope of Gaussian noise is Rayleigh, its power exponential.

    Examples
    --------
    >>> GaussianLaw().level_db([0.1, 0.01, 0.001, 0.0001]).round(3).tolist()
    [3.622, 6.632, 8.393, 9.643]
    """

    name: str = "complex Gaussian"
    holds: Holds = "over seeds"
    peak_db: float = math.inf

    def ccdf(self, level_db: ArrayLike) -> NDArray[np.float64]:
        """Return the probability that the power is above a level (dB over the mean)."""
        return np.asarray(np.exp(-from_db(level_db)))

    def level_db(self, probability: ArrayLike) -> NDArray[np.float64]:
        """Return the level at a probability, dB over the mean; ``inf`` at 0, ``-inf`` at 1."""
        asked = checked_probability(probability)
        with np.errstate(divide="ignore"):
            return to_db(np.abs(np.log(asked)))

    def moment(self, order: int) -> float:
        """Return ``E[p^k] / E[p]^k``: ``k!``."""
        return float(math.factorial(order))
