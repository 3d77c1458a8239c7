"""What was written against a law that holds for every loop."""

from __future__ import annotations

from typing import Any, Literal

import numpy as np
from numpy.typing import NDArray

from wavegen.files.datatypes import Datatype
from wavegen.laws.law import Law
from wavegen.meters.power import PowerStatistics

Verdict = Literal["agrees", "differs", "undecided"]

TOLERANCE_DB = 0.01
"""A bin of the histogram (0.0085 dB) and the arithmetic's own error."""
ROUNDOFF = 1e-9
"""Of probabilities, which are sums of 1/n."""
_FAR_DB = 400.0
DEEPEST_DB = -20.0
"""Levels below this are not compared: there a code is a large part of the envelope."""


def compare_with_loop(
    law: Law, statistics: PowerStatistics, datatype: Datatype
) -> tuple[Verdict, str]:
    """Return whether codes follow a law that holds for every loop.

    Parameters
    ----------
    law : Law
        Of the loop itself.
    statistics : PowerStatistics
        Of the codes of all of it.
    datatype : Datatype
        How they were rounded.

    Returns
    -------
    verdict : {"agrees", "differs"}
    deviation : str
        What gives a difference away; empty if there is none.

    Notes
    -----
    At every level the file's CCDF must lie between the law's a little above and a little below
    it (:func:`law_levels`), widened by what a loop of few samples can differ from the continuous
    curve (``sampling_slack`` of the law). No sample may stand over the law's peak by more.
    """
    lowest_peak, _ = law_levels(datatype, statistics, np.array([statistics.papr_db]))
    if lowest_peak[0] > law.peak_db:
        over_db = statistics.papr_db - law.peak_db
        return "differs", f"its peak stands {over_db:+.3f} dB over the highest that the law allows"
    top = max(law.peak_db, statistics.papr_db) + 1.0
    level = np.arange(DEEPEST_DB, top, 0.05)
    below, above = law_levels(datatype, statistics, level)
    measured = statistics.ccdf(level)
    fewest = law.ccdf(above) - sampling_slack(law, above) - ROUNDOFF
    most = law.ccdf(below) + sampling_slack(law, below) + ROUNDOFF
    beyond = np.maximum(fewest - measured, measured - most)
    worst = int(np.argmax(beyond))
    if beyond[worst] <= 0:
        return "agrees", ""
    exact = float(law.ccdf(level[worst]))
    return "differs", (
        f"{100 * measured[worst]:.4g} % of it stand over {level[worst]:.2f} dB, "
        f"the law says {100 * exact:.4g} %"
    )


def sampling_slack(law: Law, level_db: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return how far samples of a loop may stand from a law, 0 where it does not say."""
    slack_of: Any = getattr(law, "sampling_slack", None)
    if slack_of is None:
        return np.zeros(level_db.size)
    slack: NDArray[np.float64] = slack_of(level_db)
    return slack


def rounding_reach(datatype: Datatype) -> float:
    """Return how far rounding to codes can move an envelope, full scale 1.

    Parameters
    ----------
    datatype : Datatype
        Of the codes.

    Returns
    -------
    float
        0 of floats.

    Notes
    -----
    Half a code on each rail is 0.71 codes at most. Of real samples the envelope moves by half a
    code in phase and, in quadrature, by what the quadrature filter makes of uniform errors of the
    samples around: a sum of many, with a standard deviation of ``1 / sqrt(12)`` of a code, taken
    at six times that.
    """
    if not datatype.is_integer:
        return 0.0
    return float(np.sqrt(0.25 + 36 / 12 if datatype.is_real else 0.5)) / datatype.full_scale


def law_levels(
    datatype: Datatype, statistics: PowerStatistics, level_db: NDArray[np.float64]
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Return between which levels of the law a level of a file lies.

    Parameters
    ----------
    datatype : Datatype
        Of the codes.
    statistics : PowerStatistics
        Their mean.
    level_db : float64 array
        Levels, dB over the mean of the codes.

    Returns
    -------
    below, above : float64 array
        Levels, dB over the mean before rounding.

    Notes
    -----
    Rounding moves an envelope by :func:`rounding_reach` at most. It moves the RMS value by no
    more (triangle inequality), and so the mean that levels are over. To this come 0.01 dB for the
    histogram's bins and the arithmetic.
    """
    reach = rounding_reach(datatype)
    envelope = 10 ** ((statistics.mean_db + level_db) / 20)
    rms = 10 ** (statistics.mean_db / 20)
    below = _db_amplitude((envelope - reach) / (rms + reach)) - TOLERANCE_DB
    above = (
        _db_amplitude((envelope + reach) / (rms - reach)) + TOLERANCE_DB
        if rms > reach
        else np.full(level_db.size, _FAR_DB)
    )
    return below, above


def _db_amplitude(ratio: NDArray[np.float64]) -> NDArray[np.float64]:
    level: NDArray[np.float64] = 20 * np.log10(np.maximum(ratio, 10 ** (-_FAR_DB / 20)))
    return level
