"""What was written against what mathematics says of the recipe."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any, Literal

import numpy as np
from numpy.typing import NDArray

from wavegen.laws.law import Law
from wavegen.production.export import ExportedFile
from wavegen.production.prepare import Prepared

Verdict = Literal["agrees", "differs", "undecided"]

TOLERANCE_DB = 0.01
"""Half a bin of the histogram and the arithmetic's own error, with a margin."""
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
    law: Law | None = law_method(prepared.site)
    return law if law is not None and law.holds == "every loop" else None


def compare_with_law(law: Law | None, file: ExportedFile) -> Verdict:
    """Return whether a file's codes follow a law that holds for every loop.

    Parameters
    ----------
    law : Law or None
        None gives ``undecided``.
    file : ExportedFile
        What was written.

    Returns
    -------
    {"agrees", "differs", "undecided"}

    Notes
    -----
    At every level the file's CCDF must lie between the law's at the level plus and minus a
    tolerance, widened by what a loop of few samples can differ from the continuous curve
    (``sampling_slack`` of the law). The tolerance is 0.01 dB plus the largest change that
    rounding to codes can make to an envelope: half a code on each rail, 0.71 codes.
    """
    if law is None:
        return "undecided"
    statistics = file.statistics
    top = max(law.peak_db, statistics.papr_db) + 1.0
    level = np.arange(DEEPEST_DB, top, 0.05)
    margin = TOLERANCE_DB + rounding_db(file, level)
    slack_of: Any = getattr(law, "sampling_slack", None)
    measured = statistics.ccdf(level)
    low = law.ccdf(level + margin)
    high = law.ccdf(level - margin)
    slack = np.zeros(level.size)
    if slack_of is not None:
        slack = np.maximum(slack_of(level + margin), slack_of(level - margin))
    tiny = 1.0 / statistics.n_samples
    is_inside = (measured >= low - slack - tiny) & (measured <= high + slack + tiny)
    return "agrees" if bool(is_inside.all()) else "differs"


def worst_verdict(law: Law | None, files: Sequence[ExportedFile]) -> Verdict:
    """Return ``differs`` if one of the files differs, else how the first compares.

    Parameters
    ----------
    law : Law or None
        None gives ``undecided``.
    files : sequence of ExportedFile
        At least one.
    """
    verdicts = [compare_with_law(law, file) for file in files]
    return "differs" if "differs" in verdicts else verdicts[0]


def rounding_db(file: ExportedFile, level_db: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return the largest change of an envelope by rounding to codes, dB, at each level.

    Parameters
    ----------
    file : ExportedFile
        Its datatype and mean.
    level_db : float64 array
        Levels, dB over the mean.
    """
    if not file.datatype.is_integer:
        return np.zeros(level_db.size)
    codes = file.datatype.full_scale * 10 ** ((file.statistics.mean_db + level_db) / 20)
    change: NDArray[np.float64] = 20 * np.log10(1 + np.sqrt(0.5) / codes)
    return change
