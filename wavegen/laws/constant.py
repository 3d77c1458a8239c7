"""The law of a constant envelope."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from wavegen.laws.law import Holds, checked_probability


@dataclass(frozen=True, slots=True, kw_only=True)
class ConstantLaw:
    """A constant envelope: all power at 0 dB over the mean.

    Notes
    -----
    Derivation: ``p = 1`` at all times, so ``P(p > L)`` is 1 below 0 dB and 0 from there on.

    Examples
    --------
    >>> ConstantLaw().ccdf([-1.0, 0.0]).tolist()
    [1.0, 0.0]
    """

    name: str = "constant envelope"
    holds: Holds = "every loop"
    peak_db: float = 0.0

    def ccdf(self, level_db: ArrayLike) -> NDArray[np.float64]:
        """Return 1 below 0 dB, 0 from 0 dB on."""
        return np.where(np.asarray(level_db, dtype=np.float64) < 0, 1.0, 0.0)

    def level_db(self, probability: ArrayLike) -> NDArray[np.float64]:
        """Return 0 dB; at probability 1 every level will do: ``-inf``."""
        return np.where(checked_probability(probability) < 1, 0.0, -np.inf)
