"""How long a loop or a record must be, and how high its peak will stand."""

from __future__ import annotations

import math
from functools import lru_cache

import numpy as np
import scipy.optimize
import scipy.special
from numpy.typing import NDArray

from wavegen.core.errors import SignalError
from wavegen.laws.law import Law
from wavegen.laws.panels import nodes_of, panel_edges

_LAGS = 6
_FAR_LAGS = 60
_STEP = 0.01
FEWEST_CLUSTERS = 20
"""Below so many independent exceedances the half-width is only a guess."""


def variance_inflation(probability: float, *, oversampling: float) -> float:
    """Return by how much correlation raises the variance of a share of samples above a level.

    Parameters
    ----------
    probability : float
        Of standing above the level, between 0 and 1.
    oversampling : float
        Sample rate over the width of the band, 1 or more.

    Returns
    -------
    float
        1 or more: samples over independent samples.

    Raises
    ------
    SignalError
        Probability or oversampling out of bounds.

    Notes
    -----
    ``V = 1 + 2 sum_k (P2(k) - p^2) / (p (1 - p))`` for complex Gaussian noise of a flat band, with
    the joint probability ``P2`` of two samples whose correlation is ``sinc(k / L)`` (derivation):
    ``P2 = int_u^inf e^-x Q1(sqrt(2 rho^2 x / (1 - rho^2)), sqrt(2 u / (1 - rho^2))) dx``,
    Marcum's ``Q1``. Far lags are taken by the first two terms of ``P2 - p^2 = sum_n rho^(2 n)
    e^(-2 u) (L_n(u) - L_(n-1)(u))^2``.

    Examples
    --------
    >>> round(variance_inflation(1e-3, oversampling=4), 3)
    1.987
    """
    if not 0 < probability < 1 or oversampling < 1:
        raise SignalError(
            where="sample size",
            problem=f"a probability of {probability:g} at {oversampling:g}-fold oversampling",
            allowed="a probability between 0 and 1, oversampling from 1 on",
            remedy="Correct the two.",
        )
    return _inflation(float(probability), float(oversampling))


@lru_cache(maxsize=256)
def _inflation(p: float, oversampling: float) -> float:
    u = -math.log(p)
    near = np.arange(1, math.ceil(_LAGS * oversampling) + 1)
    far = np.arange(near[-1] + 1, math.ceil(_FAR_LAGS * oversampling) + 1)
    rho2 = np.sinc(near / oversampling) ** 2
    joint = math.fsum(_joint_tail(u, rho2) - p * p)
    # sum of sinc^2 over all lags: Parseval, (L - 1) / 2 on one side.
    first = (oversampling - 1) / 2 - math.fsum(rho2)
    second = math.fsum(np.sinc(far / oversampling) ** 4)
    joint += p * p * (u**2 * first + (u * u / 2 - u) ** 2 * second)
    return 1 + 2 * joint / (p * (1 - p))


def _joint_tail(u: float, rho2: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return ``P(p1 > u, p2 > u)`` of exponential powers with squared correlations ``rho2``."""
    nodes, weights = nodes_of(panel_edges(0.0, 40.0, n_panels=40))
    x = u + nodes.ravel()
    weighed = weights.ravel() * np.exp(-x)
    rest = 1 - rho2[:, None]
    rest = np.maximum(rest, 1e-15)
    above = 1 - scipy.special.chndtr(2 * u / rest, 2.0, 2 * rho2[:, None] * x / rest)
    return np.asarray(above @ weighed)


def level_slope_db(law: Law, probability: float) -> float:
    """Return by how many dB a level falls where the probability rises by a factor of e.

    Parameters
    ----------
    law : Law
        Of the envelope.
    probability : float
        Where.
    """
    both = law.level_db([probability * math.exp(-_STEP), probability * math.exp(_STEP)])
    return float(both[0] - both[1]) / (2 * _STEP)


def half_width_db(
    n_samples: float, probability: float, *, oversampling: float, law: Law, confidence: float = 0.95
) -> float:
    """Return the half-width of the interval of a level measured on a record.

    Parameters
    ----------
    n_samples : float
        Length of the record.
    probability : float
        At which the level is taken.
    oversampling : float
        Sample rate over the width of the band.
    law : Law
        Sets the slope; the correlation is that of Gaussian noise of a flat band.
    confidence : float
        Of the interval.

    Returns
    -------
    float
        dB. Means little where ``n p / V`` is under :data:`FEWEST_CLUSTERS`.

    Notes
    -----
    A share of ``n`` samples has the variance ``V p (1 - p) / n``; over the slope of the level
    (derivation). The mean of the record is taken as known: it adds to it from about 10 % on.
    """
    inflation = variance_inflation(probability, oversampling=oversampling)
    relative = math.sqrt(inflation * (1 - probability) / (n_samples * probability))
    return _deviate(confidence) * relative * level_slope_db(law, probability)


def samples_for(
    precision_db: float,
    probability: float,
    *,
    oversampling: float,
    law: Law,
    confidence: float = 0.95,
) -> int:
    """Return how many samples give a level to a precision.

    Parameters
    ----------
    precision_db : float
        Half-width of the interval, dB.
    probability, oversampling, law, confidence
        As in :func:`half_width_db`.

    Returns
    -------
    int
        At least so many that :data:`FEWEST_CLUSTERS` independent exceedances are expected.

    Examples
    --------
    >>> from wavegen.laws.gaussian import GaussianLaw
    >>> samples_for(0.1, 1e-4, oversampling=4, law=GaussianLaw())
    1493861
    """
    one = half_width_db(1.0, probability, oversampling=oversampling, law=law, confidence=confidence)
    least = FEWEST_CLUSTERS * variance_inflation(probability, oversampling=oversampling)
    return math.ceil(max((one / precision_db) ** 2, least / probability))


def samples_to_find(
    fault_db: float,
    probability: float,
    *,
    oversampling: float,
    law: Law,
    power: float = 0.8,
    false_alarm: float = 2e-4,
) -> int:
    """Return how many samples show a shift of a level in most runs.

    Parameters
    ----------
    fault_db : float
        Shift of the level, dB.
    probability, oversampling, law
        As in :func:`half_width_db`.
    power : float
        Share of runs in which it shall be found.
    false_alarm : float
        Share of runs without a fault in which one may be claimed, both sides together.

    Returns
    -------
    int

    Notes
    -----
    ``n = ((z_(1 - alpha / 2) + z_power) s / d)^2`` with the standard deviation ``s`` of the level
    from one sample (textbook, normal approximation).
    """
    deviates = float(scipy.special.ndtri(1 - false_alarm / 2) + scipy.special.ndtri(power))
    one = half_width_db(1.0, probability, oversampling=oversampling, law=law)
    one *= deviates / _deviate(0.95)
    least = FEWEST_CLUSTERS * variance_inflation(probability, oversampling=oversampling)
    return math.ceil(max((one / fault_db) ** 2, least / probability))


def record_peak_db(time_bandwidth: float, probability: float = 0.5) -> float:
    """Return the peak of a record of Gaussian noise, dB over the mean of the process.

    Parameters
    ----------
    time_bandwidth : float
        Length of the record times the width of its flat band: samples over oversampling.
    probability : float
        Of the peak staying at or below the value returned: 0.05, 0.5, 0.95.

    Raises
    ------
    SignalError
        A probability outside 0 to 1, or a record too short: under 10.

    Notes
    -----
    Crossings of a high level by a flat band come at the rate ``B sqrt(pi u / 3) e^-u`` and are
    as good as independent: ``P(peak <= u) = exp(-B T sqrt(pi u / 3) e^-u)`` (S. O. Rice,
    1944/45; N. Blachman, G. McAlpine, 1969, from memory; simulated to 0.4 % in rate).

    Examples
    --------
    >>> [round(record_peak_db(1e3, p), 1) for p in (0.05, 0.5, 0.95)]
    [8.3, 9.2, 10.5]
    """
    if not 0 < probability < 1 or time_bandwidth < 10:
        raise SignalError(
            where="record",
            problem=f"a time-bandwidth product of {time_bandwidth:g} at a probability "
            f"of {probability:g}",
            allowed="10 or more, at a probability between 0 and 1",
            remedy="Correct the two.",
        )
    wanted = math.log(-math.log(probability) / time_bandwidth)

    def excess(u: float) -> float:
        return 0.5 * math.log(math.pi * u / 3) - u - wanted

    top = 10 - wanted
    return 10 * math.log10(float(scipy.optimize.brentq(excess, 0.5, top)))


def _deviate(confidence: float) -> float:
    return float(scipy.special.ndtri(0.5 + confidence / 2))
