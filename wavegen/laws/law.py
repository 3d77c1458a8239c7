"""What mathematics says of the distribution of a signal's envelope power."""

from __future__ import annotations

from typing import Literal, Protocol

import numpy as np
from numpy.typing import ArrayLike, NDArray

from wavegen.core.errors import SignalError

Holds = Literal["every loop", "over seeds"]
"""Whether a law is the exact curve of any one loop, or that of the process behind it."""


class Law(Protocol):
    """The distribution of ``p = |x|^2`` over its mean."""

    @property
    def name(self) -> str:
        """What the law is called in results."""

    @property
    def holds(self) -> Holds:
        """Whether one loop follows it exactly, or only the average over seeds."""

    @property
    def peak_db(self) -> float:
        """Highest level that can occur, dB over the mean; ``inf`` if there is none."""

    def ccdf(self, level_db: ArrayLike) -> NDArray[np.float64]:
        """Return the probability that the power is above a level.

        Parameters
        ----------
        level_db : array_like
            Levels, dB over the mean power.

        Returns
        -------
        float64 array of the same shape
            ``P(p > L)``.
        """

    def level_db(self, probability: ArrayLike) -> NDArray[np.float64]:
        """Return the smallest level whose CCDF is at or below a probability.

        Parameters
        ----------
        probability : array_like
            0 to 1.

        Returns
        -------
        float64 array of the same shape
            Levels, dB over the mean power.

        Raises
        ------
        SignalError
            A probability outside 0 to 1.
        """


def checked_probability(probability: ArrayLike) -> NDArray[np.float64]:
    """Return probabilities as an array.

    Parameters
    ----------
    probability : array_like
        0 to 1.

    Returns
    -------
    float64 array

    Raises
    ------
    SignalError
        A probability outside 0 to 1, or not a number.
    """
    asked = np.asarray(probability, dtype=np.float64)
    wrong = ~((asked >= 0) & (asked <= 1))
    if wrong.any():
        raise SignalError(
            where="probability",
            problem=f"{asked[wrong].flat[0]:g} is not a probability",
            allowed="0 to 1",
            remedy="Write 0.01 for 1 %.",
        )
    return asked


def to_db(power: ArrayLike) -> NDArray[np.float64]:
    """Return relative powers in dB; zero gives ``-inf``."""
    with np.errstate(divide="ignore"):
        return np.asarray(10 * np.log10(np.asarray(power, dtype=np.float64)))


def from_db(level_db: ArrayLike) -> NDArray[np.float64]:
    """Return levels in dB as relative powers."""
    return np.asarray(10 ** (np.asarray(level_db, dtype=np.float64) / 10))
