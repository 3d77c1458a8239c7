"""How much longer records would have to be for a verdict, as far as that can be foreseen.

The standard error of a level is ``sqrt(event_samples / (q n)) / slope``: it follows from what one
event counts for and from the slope of the curve, and falls as the root of the length.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Literal

import numpy as np
import scipy.special
from numpy.typing import NDArray

from wavegen.comparison.curves import Curve
from wavegen.comparison.difference import (
    CONFIDENCE,
    ERROR,
    QUIET_DB,
    Difference,
    DifferenceRow,
)
from wavegen.meters.intervals import RESOLVING_RUNS

Reals = NDArray[np.float64]

FOUND = 0.8
"""How often records of the length said to be needed decide one row."""
MOST_TIMES = 1e4
"""A record so many times longer than what there is cannot be foreseen from it."""
LEAST_TIMES = 1.25
_SLOPE_STEP_DB = 0.1


@dataclass(frozen=True, slots=True, kw_only=True)
class Needed:
    """How much longer the sampled sides would have to be for one verdict.

    Parameters
    ----------
    shows : {"match", "differ"}
        The verdict.
    times : float
        As a multiple of what there is.
    at_probability : float
        The level that asks for it; of *differ* the one that shows first.
    difference_db : float
        As seen there.
    first_samples, second_samples : int or None
        How many more of each side; None of a side that more samples would not change.
    """

    shows: Literal["match", "differ"]
    times: float
    at_probability: float
    difference_db: float
    first_samples: int | None
    second_samples: int | None


def needed_samples(first: Curve, second: Curve, found: Difference) -> tuple[Needed, ...]:
    """Return how much more would decide what is undecided, the more likely verdict first.

    Parameters
    ----------
    first, second : Curve
        The two sides.
    found : Difference
        What was found of them.

    Returns
    -------
    tuple of Needed
        Nothing where it is decided, or no length can be foreseen. *differ* holds if a difference
        that is seen is one of the processes, *match* if they are alike where that may be; both are
        told where neither is likely.
    """
    if found.verdict != "undecided":
        return ()
    asked = np.array([row.probability for row in found.rows])
    weights = [
        side.event_samples(asked) / side.n_samples if side.n_samples else np.zeros(asked.shape)
        for side in (first, second)
    ]
    if not (weights[0].any() or weights[1].any()):
        return ()
    with np.errstate(divide="ignore", invalid="ignore"):
        error = np.sqrt((weights[0] + weights[1]) / asked) / _slope(first, second, asked)
    one_event = np.maximum(weights[0], weights[1]) / asked

    def needed(shows: Literal["match", "differ"], k: int, times: float) -> Needed | None:
        if not 0 < times < MOST_TIMES:
            return None
        times = max(times, LEAST_TIMES)
        more = [
            math.ceil((times - 1) * side.n_samples) if weight.any() and side.n_samples else None
            for side, weight in zip((first, second), weights, strict=True)
        ]
        return Needed(
            shows=shows,
            times=times,
            at_probability=found.rows[k].probability,
            difference_db=found.rows[k].difference_db,
            first_samples=more[0],
            second_samples=more[1],
        )

    to_differ = _to_differ(found, error, one_event)
    to_match = _to_match(found, error, one_event)
    plans = [needed("differ", *to_differ)] if to_differ else []
    if not any(_is_surely_out(row, found.tolerance_db) for row in found.rows):
        plans.insert(0, needed("match", *to_match))
    return tuple(plan for plan in plans if plan is not None)


def _is_surely_out(row: DifferenceRow, tolerance_db: float) -> bool:
    """Return whether the row alone differs with 95 %, if not with what holds for all rows."""
    return row.low_db > tolerance_db or row.high_db < -tolerance_db


def _to_differ(found: Difference, error: Reals, one_event: Reals) -> tuple[int, float] | None:
    """Return which row shows a difference first, if what is seen is one of the processes.

    A level's interval is open until the chance of no event at all beyond it, ``exp(-events)``, is
    as small as the error that the row may have.
    """
    tolerance_db, rows = found.tolerance_db, found.rows
    error_of_row = ERROR / len(rows)
    sigmas = scipy.special.ndtri(FOUND) - scipy.special.ndtri(error_of_row)
    closing = -math.log(error_of_row) * one_event
    lengths = {
        k: max(
            float((sigmas * error[k] / (abs(row.difference_db) - tolerance_db)) ** 2),
            float(closing[k]),
        )
        for k, row in enumerate(rows)
        if row.verdict == "undecided" and row.is_resolved and abs(row.difference_db) > tolerance_db
    }
    sure = {k: times for k, times in lengths.items() if _is_surely_out(rows[k], tolerance_db)}
    used = sure or lengths
    if not used:
        return None
    first = min(used, key=lambda k: used[k])
    return first, used[first]


def _to_match(found: Difference, error: Reals, one_event: Reals) -> tuple[int, float]:
    """Return which row is the last to match, if the processes are alike."""
    resolving = RESOLVING_RUNS * one_event
    lengths = {
        k: max(_length_to_match(row, error[k], found.tolerance_db), float(resolving[k]))
        for k, row in enumerate(found.rows)
        if row.verdict == "undecided"
    }
    last = max(lengths, key=lambda k: lengths[k])
    return last, lengths[last]


def _length_to_match(row: DifferenceRow, error_db: float, tolerance_db: float) -> float:
    """Return how many times longer the records must be for one row to match, in 80 %."""
    size = abs(row.difference_db)
    # A difference that may well be none is expected to be less than it looks.
    expected = size if row.low_db > 0 or row.high_db < 0 else min(size, tolerance_db) / 2
    room = max(tolerance_db - expected, tolerance_db / 100)
    sigmas = scipy.special.ndtri(FOUND) - scipy.special.ndtri((1 - CONFIDENCE) / 2)
    return float((sigmas * error_db / room) ** 2)


def _slope(first: Curve, second: Curve, asked: Reals) -> Reals:
    """Return ``-d ln q / d level``, per dB, of the side that rests on more samples."""
    side = max((first, second), key=lambda s: math.inf if s.is_exact else (s.n_samples or 0))
    level = np.maximum(side.level_db(asked), QUIET_DB)
    above, below = side.ccdf(level + _SLOPE_STEP_DB), side.ccdf(level - _SLOPE_STEP_DB)
    fall = (below - above) / (2 * _SLOPE_STEP_DB)
    return np.asarray(np.maximum(fall / asked, 0.02))
