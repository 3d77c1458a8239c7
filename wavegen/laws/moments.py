"""Moments of the power of a law."""

from __future__ import annotations

import math
from typing import Any, Protocol

import numpy as np
from numpy.typing import ArrayLike, NDArray

_STEP_DB = 0.005
_LOWEST_DB = -60.0
_RAREST = 1e-13
_LN_PER_DB = math.log(10) / 10


class Curve(Protocol):
    """What is needed of a law; see :class:`wavegen.laws.law.Law`."""

    @property
    def peak_db(self) -> float:
        """Highest level that can occur, dB over the mean."""

    def ccdf(self, level_db: ArrayLike) -> NDArray[np.float64]:
        """Return ``P(p > level)``."""

    def level_db(self, probability: ArrayLike) -> NDArray[np.float64]:
        """Return the level at a probability, dB over the mean."""


def moment_of(law: Curve, order: int) -> tuple[float, float]:
    """Return ``E[p^k] / E[p]^k`` of a law, and its relative error.

    Parameters
    ----------
    law : Curve
        If it has a method ``moment(order)``, that is asked, and is taken as exact.
    order : int
        k.

    Returns
    -------
    value : float
    error : float
        0 if exact; else that of a level that is good to 0.001 dB.

    Notes
    -----
    ``E[x^k] = k integral of x^(k-1) P(p > x) dx``, by the trapezoidal rule over levels.
    """
    method: Any = getattr(law, "moment", None)
    if method is not None:
        return float(method(order)), 0.0
    top = min(float(law.peak_db), float(law.level_db(_RAREST))) + _STEP_DB
    level = np.linspace(_LOWEST_DB, top, math.ceil((top - _LOWEST_DB) / _STEP_DB) + 1)
    value = moment_of_tail(level, law.ccdf(level), order)
    return value, order * 0.001 * _LN_PER_DB


def moment_of_tail(level_db: NDArray[np.float64], above: NDArray[np.float64], order: int) -> float:
    """Return ``E[p^k] / E[p]^k`` from the CCDF on a fine grid of levels.

    Parameters
    ----------
    level_db : float64 array, shape (n,)
        Rising, dB. Below the first, every power counts as that; above the last there is none.
    above : float64 array, shape (n,)
        ``P(p > level)``.
    order : int
        k.
    """
    log_power = level_db * _LN_PER_DB

    def mean_of(k: int) -> float:
        power = np.exp(k * log_power)
        return float(power[0] + np.trapezoid(k * power * above, log_power))

    return mean_of(order) / mean_of(1) ** order
