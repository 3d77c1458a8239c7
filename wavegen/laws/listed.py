"""The law of a loop that is known sample by sample."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Self

import numpy as np
from numpy.typing import ArrayLike, NDArray

from wavegen.core.signal import Samples
from wavegen.laws.law import Holds, checked_probability, from_db, to_db


@dataclass(frozen=True, eq=False, kw_only=True)
class ListedLaw:
    """The exact curve of the samples of a loop. Use :meth:`of`.

    Parameters
    ----------
    powers : float64 array, shape (n_samples,)
        Power of each sample over the mean, rising.
    name, holds
        As in :class:`wavegen.laws.law.Law`.

    Examples
    --------
    >>> law = ListedLaw.of(np.array([1, 1, 0, 2j], np.complex64), name="four samples")
    >>> law.ccdf([0.0]).tolist(), law.peak_db.__round__(3)
    ([0.25], 4.26)
    """

    powers: NDArray[np.float64]
    name: str
    holds: Holds = "every loop"

    @classmethod
    def of(cls, samples: Samples, *, name: str) -> Self:
        """Return the law of samples, not all zero."""
        wide = samples.astype(np.complex128)
        powers = wide.real**2 + wide.imag**2
        return cls(powers=np.sort(powers / powers.mean()), name=name)

    @property
    def peak_db(self) -> float:
        """Highest level that occurs, dB over the mean."""
        return float(to_db(self.powers[-1]))

    def ccdf(self, level_db: ArrayLike) -> NDArray[np.float64]:
        """Return the share of the samples above a level; within 1e-12 of it is not above."""
        level = from_db(level_db) * (1 + 1e-12)
        above = self.powers.size - np.searchsorted(self.powers, level, side="right")
        return np.asarray(above / self.powers.size)

    def level_db(self, probability: ArrayLike) -> NDArray[np.float64]:
        """Return the smallest level whose CCDF is at or below a probability."""
        asked = checked_probability(probability)
        n = self.powers.size
        allowed = np.floor(asked * n * (1 + 1e-12)).astype(np.int64)
        levels = to_db(self.powers.take(np.maximum(n - 1 - allowed, 0)))
        return np.where(allowed >= n, -np.inf, levels)
