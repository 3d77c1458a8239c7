"""Products of characteristic functions over many small taps, through their cumulants."""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

ORDER = 20
"""Highest cumulant."""
SMALL = 0.3
"""Arguments below this over the largest level: what is left out is below 1e-14 (measured)."""


def cumulants(values: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return cumulants over factorials of equally likely values.

    Parameters
    ----------
    values : float64 array, shape (n_values, ...)
        The values, along the first axis; magnitudes of 1 and below.

    Returns
    -------
    float64 array, shape (ORDER, ...)
        ``kappa_m / m!`` for ``m`` = 1 ... ORDER: ``log E exp(j s v) = sum_m (j s)^m kappa_m / m!``.

    Notes
    -----
    From moments over factorials ``q_m = E v^m / m!`` by ``k_m = q_m - sum_{i<m} (i / m) k_i
    q_{m-i}`` (derivation: ``Q' = K' Q`` for ``Q = exp K``).
    """
    moments = [np.ones(values.shape[1:])]
    power = np.ones_like(values)
    for order in range(1, ORDER + 1):
        power = power * values
        moments.append(power.mean(axis=0) / math.factorial(order))
    made: list[NDArray[np.float64]] = []
    for order in range(1, ORDER + 1):
        total = moments[order]
        for lower, one in enumerate(made, start=1):
            total = total - (lower / order) * one * moments[order - lower]
        made.append(total)
    return np.stack(made)


def power_sums(taps: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return ``sum_{k >= i} h_k^m``, shape (n_taps + 1, ORDER): of the taps from ``i`` on."""
    powers = taps[:, None] ** np.arange(1, ORDER + 1)
    ahead = np.cumsum(powers[::-1], axis=0)[::-1]
    return np.concatenate([ahead, np.zeros((1, ORDER))])


def count_large(taps: NDArray[np.float64], highest: float) -> int:
    """Return how many taps, sorted by falling magnitude, are not small at an argument."""
    return int(np.count_nonzero(np.abs(taps) * highest > SMALL))
