"""The law of a loop that is known sample by sample."""

from __future__ import annotations

from collections.abc import Callable
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
    in_order : float64 array, shape (n_samples,)
        The same, from index 0 of the loop on: whole periods of what repeats.
    is_on : bool array, shape (n_samples,), or None
        Where a gate is fully open; None where there is none.

    Examples
    --------
    >>> law = ListedLaw.of(np.array([1, 1, 0, 2j], np.complex64), name="four samples")
    >>> law.ccdf([0.0]).tolist(), law.peak_db.__round__(3)
    ([0.25], 4.26)
    """

    powers: NDArray[np.float64]
    name: str
    in_order: NDArray[np.float64]
    is_on: NDArray[np.bool_] | None = None
    holds: Holds = "every loop"

    @classmethod
    def of(cls, samples: Samples, *, name: str) -> Self:
        """Return the law of samples, not all zero."""
        wide = samples.astype(np.complex128)
        return cls.of_powers(wide.real**2 + wide.imag**2, name=name)

    @classmethod
    def of_powers(
        cls,
        powers: NDArray[np.float64],
        *,
        name: str,
        is_on: NDArray[np.bool_] | None = None,
    ) -> Self:
        """Return the law of samples of these powers, on any scale, not all zero."""
        over_mean = powers / powers.mean()
        return cls(powers=np.sort(over_mean), name=name, in_order=over_mean, is_on=is_on)

    @property
    def on_powers(self) -> NDArray[np.float64]:
        """Powers over the mean of the time that a gate is fully open, in order."""
        return self.in_order if self.is_on is None else self.in_order[self.is_on]

    def through(
        self, change: Callable[[NDArray[np.float64]], NDArray[np.float64]], *, name: str
    ) -> Self:
        """Return the law of what a change makes of each power, over the new mean."""
        return self.of_powers(change(self.in_order), name=name, is_on=self.is_on)

    def delayed(self, lag: int) -> Self:
        """Return the law of the loop some whole samples later."""
        is_on = None if self.is_on is None else np.roll(self.is_on, lag)
        return self.of_powers(np.roll(self.in_order, lag), name=self.name, is_on=is_on)

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
