"""The places of the largest values of a long array, without sorting all of it."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

_CHUNK = 1 << 16


def highest(values: NDArray[np.float64], count: int) -> NDArray[np.intp]:
    """Return where the largest values stand, the largest first; of equal ones the earlier first.

    Parameters
    ----------
    values : float64 array, shape (n,)
        No NaN.
    count : int
        How many; all of them if there are fewer.

    Returns
    -------
    intp array, shape (min(count, n),)

    Examples
    --------
    >>> highest(np.array([1.0, 5.0, 3.0, 5.0]), 3).tolist()
    [1, 3, 2]
    """
    found = np.zeros(0, np.intp)
    for start in range(0, values.size, _CHUNK):
        part = np.argsort(-values[start : start + _CHUNK], kind="stable")[:count] + start
        both = np.concatenate([found, part])
        found = both[np.argsort(-values[both], kind="stable")[:count]]
    return found
