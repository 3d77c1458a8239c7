"""Levels at probabilities where a law knows its CCDF only."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from numpy.typing import ArrayLike, NDArray

from wavegen.laws.law import checked_probability

_HALVINGS = 64
LOWEST_DB = -400.0
"""Levels below this read ``-inf``: amplitudes under 1e-20 of the RMS value are zero."""

Ccdf = Callable[[ArrayLike], NDArray[np.float64]]


def level_by_halving(ccdf: Ccdf, probability: ArrayLike, *, most_db: float) -> NDArray[np.float64]:
    """Return the smallest levels whose CCDF is at or below probabilities.

    Parameters
    ----------
    ccdf : callable
        Non-increasing function of the level, dB over the mean.
    probability : array_like
        0 to 1.
    most_db : float
        A level at which the CCDF is 0, or at or below every probability asked; finite.

    Returns
    -------
    float64 array of the same shape
        dB over the mean, to 1e-12 dB; ``-inf`` where even :data:`LOWEST_DB` will do; ``inf``
        where the CCDF at ``most_db`` is still above the probability.

    Raises
    ------
    SignalError
        A probability outside 0 to 1.

    Examples
    --------
    >>> decay = lambda level_db: np.exp(-(10 ** (np.asarray(level_db) / 10)))
    >>> level_by_halving(decay, [0.1, 0.001], most_db=30.0).round(3).tolist()
    [3.622, 8.393]
    """
    asked = checked_probability(probability)
    flat = np.atleast_1d(asked).ravel()
    low, high = np.full(flat.size, LOWEST_DB), np.full(flat.size, most_db)
    is_lowest = np.asarray(ccdf(low)) <= flat
    is_beyond = np.asarray(ccdf(high)) > flat
    # Most levels lie within 60 dB of the top: one comparison there saves six halvings.
    near = np.full(flat.size, most_db - 60.0)
    is_near = np.asarray(ccdf(near)) > flat
    low = np.where(is_near, near, low)
    high = np.where(is_near, high, near)
    for _ in range(_HALVINGS):
        middle = 0.5 * (low + high)
        is_enough = np.asarray(ccdf(middle)) <= flat
        high = np.where(is_enough, middle, high)
        low = np.where(is_enough, low, middle)
        if np.all(high - low < 1e-12):
            break
    found = np.where(is_lowest, -np.inf, np.where(is_beyond, np.inf, high))
    return np.asarray(found.reshape(asked.shape))
