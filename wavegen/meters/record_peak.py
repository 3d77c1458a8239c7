"""The peak of one record: how high it should be, and why it is no figure of the process."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from scipy import optimize, special

from wavegen.core.errors import ArgumentsError

COVERAGE = 0.95


@dataclass(frozen=True, slots=True, kw_only=True)
class RecordPeak:
    """Where the peak of a record of given length lies, over the mean.

    Parameters
    ----------
    low_db, median_db, high_db : float
        The interval holds the peak in 95 % of records (or as asked), equal shares beyond.
    time_bandwidth : float
        Length of the record times bandwidth of the signal.
    """

    low_db: float
    median_db: float
    high_db: float
    time_bandwidth: float


def crossing_rate(power: float) -> float:
    """Return how often a noise-like envelope rises through a power, per time times bandwidth.

    Parameters
    ----------
    power : float
        Over the mean.

    Notes
    -----
    ``sqrt(pi u / 3) exp(-u)`` for a flat band: S. O. Rice, "Mathematical analysis of random
    noise", Bell System Technical Journal 23/24, 1944-45.

    Examples
    --------
    >>> round(crossing_rate(8.0) * 1e4, 3)
    9.71
    """
    return math.sqrt(math.pi * power / 3) * math.exp(-power)


def record_peak(*, time_bandwidth: float, coverage: float = COVERAGE) -> RecordPeak:
    """Return where the peak of a noise-like record lies.

    Parameters
    ----------
    time_bandwidth : float
        Length of the record (s) times bandwidth (Hz) of the signal, 10 or more.
    coverage : float
        Share of records whose peak lies inside.

    Returns
    -------
    RecordPeak
        Of the envelope's peak, between samples too, dB over the mean of the process.

    Raises
    ------
    ArgumentsError
        A record too short for the law, or a coverage outside (0, 1).

    Notes
    -----
    Crossings of high levels come like events of a Poisson process: P(peak < u) =
    exp(-TB sqrt(pi u / 3) exp(-u)). The median grows from 9.2 to 12.5 dB while the record goes
    from TB = 1e3 to 1e7; a level at a probability does not grow at all.

    Examples
    --------
    >>> [round(record_peak(time_bandwidth=size).median_db, 1) for size in (1e3, 1e7)]
    [9.2, 12.5]
    """
    if not 10 <= time_bandwidth < math.inf:
        raise ArgumentsError(
            where="time times bandwidth",
            problem=f"is {time_bandwidth:g}",
            allowed="10 or more",
            remedy="Take a longer record.",
        )
    if not 0 < coverage < 1:
        raise ArgumentsError(
            where="coverage",
            problem=f"is {coverage:g}",
            allowed="between 0 and 1",
            remedy="Give the share of records, such as 0.95.",
        )

    def level_db(share_below: float) -> float:
        events = -math.log(share_below) / time_bandwidth
        least = 0.5  # where the rate is largest
        if events >= crossing_rate(least):
            return 10 * math.log10(least)
        power = optimize.brentq(
            lambda u: math.log(crossing_rate(u)) - math.log(events), least, 700.0, xtol=1e-12
        )
        return 10 * math.log10(power)

    return RecordPeak(
        low_db=level_db((1 - coverage) / 2),
        median_db=level_db(0.5),
        high_db=level_db((1 + coverage) / 2),
        time_bandwidth=time_bandwidth,
    )


def largest_of_own_mean(power: float, n_values: int) -> float:
    """Return the chance that the largest of Gaussian samples exceeds a power over their own mean.

    Parameters
    ----------
    power : float
        Largest ``|x|^2`` over the mean of the same ``n_values`` ones.
    n_values : int
        Independent complex Gaussian samples, such as the Nyquist samples of one OFDM symbol.

    Returns
    -------
    float

    Notes
    -----
    ``sum over k of (-1)^(k-1) C(n,k) (1 - k z / n)^(n-1)``, as long as ``k z < n``: R. A. Fisher,
    "Tests of significance in harmonic analysis", Proc. Royal Society A 125, 1929. The terms
    alternate; where they would eat the figures the chance is 1 to nine digits.

    Examples
    --------
    >>> round(largest_of_own_mean(6.0, 64), 4), round(largest_over_ensemble(6.0, 64), 4)
    (0.1255, 0.1469)
    """
    if power <= 1:
        return 1.0
    if power >= n_values:
        return 0.0
    if n_values * math.exp(-power) > 20 and (1 - math.exp(-power)) ** n_values < 1e-9:
        return 1.0
    k = np.arange(1, math.ceil(n_values / power))
    log_terms = (
        special.gammaln(n_values + 1)
        - special.gammaln(k + 1)
        - special.gammaln(n_values - k + 1)
        + (n_values - 1) * np.log1p(-k * power / n_values)
    )
    terms = np.exp(log_terms) * np.where(k % 2 == 1, 1.0, -1.0)
    return min(max(math.fsum(terms.tolist()), 0.0), 1.0)


def largest_over_ensemble(power: float, n_values: int) -> float:
    """Return the same chance over the mean of the process: ``1 - (1 - exp(-z))^n``."""
    return -math.expm1(n_values * math.log1p(-math.exp(-power))) if power > 0 else 1.0
