"""What was written against what mathematics says of the recipe."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any, Literal

import numpy as np
from numpy.typing import NDArray

from wavegen.files.datatypes import Datatype
from wavegen.laws.law import Law
from wavegen.laws.term import NoLaw
from wavegen.meters.power import PowerStatistics
from wavegen.production.export import ExportedFile
from wavegen.production.prepare import Prepared

Verdict = Literal["agrees", "differs", "undecided"]

TOLERANCE_DB = 0.01
"""A bin of the histogram (0.0085 dB) and the arithmetic's own error."""
ROUNDOFF = 1e-9
"""Of probabilities, which are sums of 1/n."""
_FAR_DB = 400.0
DEEPEST_DB = -20.0
"""Levels below this are not compared: there a code is a large part of the envelope."""


def law_of(prepared: Prepared) -> Law | None:
    """Return the exact law of a recipe's loop, None where there is none yet.

    Parameters
    ----------
    prepared : Prepared
        A recipe of one source without stages has the source's law.

    Returns
    -------
    Law or None
        Only laws that hold for every loop: what holds over seeds needs an interval to judge.
    """
    recipe = prepared.loaded.recipe
    law_method: Any = getattr(recipe.signal, "law", None)
    if recipe.stages or law_method is None:
        return None
    law: Law | NoLaw | None = law_method(prepared.site)
    if law is None or isinstance(law, NoLaw):
        return None
    return law if law.holds == "every loop" else None


def compare_with_law(law: Law | None, file: ExportedFile, channel: int = 0) -> Verdict:
    """Return whether a file's codes follow a law that holds for every loop.

    Parameters
    ----------
    law : Law or None
        None gives ``undecided``.
    file : ExportedFile
        What was written.
    channel : int
        Which of its channels.

    Returns
    -------
    {"agrees", "differs", "undecided"}

    Notes
    -----
    At every level the file's CCDF must lie between the law's a little above and a little below
    it (:func:`law_levels`), widened by what a loop of few samples can differ from the continuous
    curve (``sampling_slack`` of the law). No sample may stand over the law's peak by more.
    """
    if law is None:
        return "undecided"
    statistics = file.channels[channel].statistics
    top = max(law.peak_db, statistics.papr_db) + 1.0
    level = np.arange(DEEPEST_DB, top, 0.05)
    below, above = law_levels(file.datatype, statistics, level)
    measured = statistics.ccdf(level)
    fewest = law.ccdf(above) - sampling_slack(law, above) - ROUNDOFF
    most = law.ccdf(below) + sampling_slack(law, below) + ROUNDOFF
    is_inside = bool(np.all((measured >= fewest) & (measured <= most)))
    lowest_peak, _ = law_levels(file.datatype, statistics, np.array([statistics.papr_db]))
    return "agrees" if is_inside and lowest_peak[0] <= law.peak_db else "differs"


def sampling_slack(law: Law, level_db: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return how far samples of a loop may stand from a law, 0 where it does not say."""
    slack_of: Any = getattr(law, "sampling_slack", None)
    if slack_of is None:
        return np.zeros(level_db.size)
    slack: NDArray[np.float64] = slack_of(level_db)
    return slack


def worst_verdict(law: Law | None, files: Sequence[ExportedFile], channel: int = 0) -> Verdict:
    """Return ``differs`` if one of the files differs, else how the first compares.

    Parameters
    ----------
    law : Law or None
        None gives ``undecided``.
    files : sequence of ExportedFile
        At least one.
    channel : int
        Which of their channels the law is of.
    """
    verdicts = [compare_with_law(law, file, channel) for file in files]
    return "differs" if "differs" in verdicts else verdicts[0]


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
    Rounding moves an envelope by half a code on each rail, 0.71 codes, at most. It moves the RMS
    value by no more (triangle inequality), and so the mean that levels are over. To this come
    0.01 dB for the histogram's bins and the arithmetic.

    Of real samples the envelope moves by half a code in phase and, in quadrature, by what the
    quadrature filter makes of uniform errors of the samples around: a sum of many, with a
    standard deviation of ``1 / sqrt(12)`` of a code, taken at six times that.
    """
    code = 1 / datatype.full_scale if datatype.is_integer else 0.0
    reach = code * (np.sqrt(0.25 + 36 / 12) if datatype.is_real else np.sqrt(0.5))
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
