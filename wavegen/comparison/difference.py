"""Whether two curves are the same within a tolerance: match, differ, or undecided.

At each probability the levels of both sides are compared: the horizontal distance of the curves,
in dB. Each side's level has an interval; that of the difference follows from both by the method of
variance estimates recovery (G. Y. Zou, A. Donner, Statistics in Medicine 27, 2008): each limit is
the difference less or plus the root of the sum of the squared distances of the limits that pull it
that way. It keeps what is skew skew, and is exact where one side has no error.

*match* needs the interval of 95 % within the tolerance at **every** probability. That is an
intersection of tests, each of which must be passed: two curves that are further apart than the
tolerance at any one probability pass that one test in at most 2.5 % of the cases (the other limit
does not matter), so no more than that pass all of them.

*differ* needs an interval wholly outside at **any** of K probabilities. That is a union of tests:
each interval is widened so that it errs on one side in 5 % / K of the cases (C. E. Bonferroni),
and curves that are within the tolerance are called different in at most 5 % of the cases; less,
since neighbouring levels move together.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from wavegen.comparison.curves import Curve, ExactCurve, SampledCurve
from wavegen.core.errors import ArgumentsError

Verdict = Literal["match", "differ", "undecided"]
Reals = NDArray[np.float64]

TOLERANCE_DB = 0.2
DOWN_TO = 1e-4
HIGHEST = 0.5
CONFIDENCE = 0.95
ERROR = 0.05
"""Of either wrong verdict, over all probabilities together."""
QUIET_DB = -20.0
"""Levels so far below the mean count as quiet: they stress nothing, and how quiet an off-time is
does not make two signals different."""
SERIES = (5.0, 2.0, 1.0)
FINE_PER_DECADE = 40


@dataclass(frozen=True, slots=True, kw_only=True)
class DifferenceRow:
    """Both curves at one probability.

    Parameters
    ----------
    probability : float
        Of being exceeded.
    first_db, second_db : float
        Levels of both sides, dB; ``-inf`` where a side is switched off.
    difference_db : float
        First less second, levels below -20 dB counted as -20 dB.
    low_db, high_db : float
        Between these it lies with 95 %; infinite where a side says nothing.
    widest_low_db, widest_high_db : float
        The same with a confidence that holds for all probabilities together.
    is_resolved : bool
        Whether ten independent events lie beyond the level on both sides.
    verdict : {"match", "differ", "undecided"}
        Of this probability alone.
    """

    probability: float
    first_db: float
    second_db: float
    difference_db: float
    low_db: float
    high_db: float
    widest_low_db: float
    widest_high_db: float
    is_resolved: bool
    verdict: Verdict


@dataclass(frozen=True, slots=True, kw_only=True)
class Difference:
    """How two curves compare.

    Parameters
    ----------
    verdict : {"match", "differ", "undecided"}
        Of all probabilities together.
    tolerance_db, down_to : float
        What it means.
    rows : tuple of DifferenceRow
        50 %, 20 %, 10 % ... to ``down_to``.
    decisive : DifferenceRow or None
        Where they differ most clearly; of a match the row nearest to the tolerance; of an
        undecided one that which is furthest from a decision.
    largest_db : float or None
        Largest difference of the whole curve, first less second, down to the last level that
        both sides resolve.
    largest_at : float or None
        Its probability.
    resolved_to : float or None
        Least probability of a row that both sides resolve.
    """

    verdict: Verdict
    tolerance_db: float
    down_to: float
    rows: tuple[DifferenceRow, ...]
    decisive: DifferenceRow | None
    largest_db: float | None
    largest_at: float | None
    resolved_to: float | None


def probabilities(down_to: float = DOWN_TO) -> Reals:
    """Return the probabilities compared: 50 %, 20 %, 10 %, 5 % ... and the last one.

    Parameters
    ----------
    down_to : float
        The last, whatever it is.

    Raises
    ------
    ArgumentsError
        Not above 0, or above 50 %.

    Examples
    --------
    >>> probabilities(0.004).tolist()
    [0.5, 0.2, 0.1, 0.05, 0.02, 0.01, 0.005, 0.004]
    """
    if not 0 < down_to <= HIGHEST:
        raise ArgumentsError(
            where="--down-to",
            problem=f"{100 * down_to:g} % is no probability to compare down to",
            allowed="above 0 %, at most 50 %",
            remedy="Write it like --down-to 0.01%.",
        )
    decades = range(1, math.ceil(-math.log10(down_to)) + 2)
    series = [digit * 10.0**-k for k in decades for digit in SERIES]
    kept = [q for q in series if down_to * (1 + 1e-9) < q <= HIGHEST]
    return np.array([float(f"{q:.3g}") for q in kept] + [down_to])


def compare(
    first: Curve, second: Curve, *, tolerance_db: float = TOLERANCE_DB, down_to: float = DOWN_TO
) -> Difference:
    """Compare two curves.

    Parameters
    ----------
    first, second : Curve
        The two sides; differences are first less second.
    tolerance_db : float
        What still is a match, dB.
    down_to : float
        Least probability compared.

    Returns
    -------
    Difference

    Raises
    ------
    ArgumentsError
        A tolerance that is not positive, or a probability that is none.
    """
    if not tolerance_db > 0:
        raise ArgumentsError(
            where="--tolerance",
            problem=f"{tolerance_db:g} dB is no tolerance",
            allowed="above 0 dB",
            remedy="Write it like 0.2dB.",
        )
    asked = probabilities(down_to)
    rows = _rows(first, second, asked, tolerance_db)
    verdict = _verdict(rows)
    largest_db, largest_at = _largest(first, second, rows)
    resolved = [row.probability for row in rows if row.is_resolved]
    return Difference(
        verdict=verdict,
        tolerance_db=tolerance_db,
        down_to=down_to,
        rows=rows,
        decisive=_decisive(rows, verdict, tolerance_db),
        largest_db=largest_db,
        largest_at=largest_at,
        resolved_to=min(resolved, default=None),
    )


def as_recorded(curve: Curve) -> Curve:
    """Return a recording's curve as that of these samples alone, which is exact."""
    if not isinstance(curve, SampledCurve):
        return curve
    return ExactCurve(source=curve.sampled.statistics)


def combined(
    levels: tuple[Reals, Reals], first: tuple[Reals, Reals], second: tuple[Reals, Reals]
) -> tuple[Reals, Reals]:
    """Return the interval of a difference from those of its two sides.

    Parameters
    ----------
    levels : (array, array)
        Of both sides, finite.
    first, second : (array, array)
        Low and high of each side.

    Returns
    -------
    low, high : float64 arrays
    """
    difference = levels[0] - levels[1]
    down = np.hypot(levels[0] - first[0], second[1] - levels[1])
    up = np.hypot(first[1] - levels[0], levels[1] - second[0])
    return difference - down, difference + up


def _rows(
    first: Curve, second: Curve, asked: Reals, tolerance_db: float
) -> tuple[DifferenceRow, ...]:
    own = [np.atleast_1d(side.level_db(asked)) for side in (first, second)]
    levels = (np.maximum(own[0], QUIET_DB), np.maximum(own[1], QUIET_DB))
    resolved = first.is_resolved(asked) & second.is_resolved(asked)

    def interval(confidence: float) -> tuple[Reals, Reals]:
        sides = []
        for side, level in zip((first, second), levels, strict=True):
            low, high = side.level_interval(asked, confidence=confidence)
            low = np.maximum(low, QUIET_DB)  # as the level itself
            sides.append((np.minimum(low, level), np.maximum(high, level)))
        return combined(levels, sides[0], sides[1])

    low, high = interval(CONFIDENCE)
    least, most = interval(1 - 2 * ERROR / asked.size)
    return tuple(
        DifferenceRow(
            probability=float(asked[k]),
            first_db=float(own[0][k]),
            second_db=float(own[1][k]),
            difference_db=float(levels[0][k] - levels[1][k]),
            low_db=float(low[k]),
            high_db=float(high[k]),
            widest_low_db=float(least[k]),
            widest_high_db=float(most[k]),
            is_resolved=bool(resolved[k]),
            verdict=_row_verdict(
                (low[k], high[k]) if resolved[k] else (-math.inf, math.inf),
                (least[k], most[k]),
                tolerance_db,
            ),
        )
        for k in range(asked.size)
    )


def _row_verdict(
    interval: tuple[float, float],
    widest: tuple[float, float],
    tolerance_db: float,
) -> Verdict:
    if widest[0] > tolerance_db or widest[1] < -tolerance_db:
        return "differ"
    if -tolerance_db <= interval[0] and interval[1] <= tolerance_db:
        return "match"
    return "undecided"


def _verdict(rows: tuple[DifferenceRow, ...]) -> Verdict:
    found = {row.verdict for row in rows}
    if "differ" in found:
        return "differ"
    return "match" if found == {"match"} else "undecided"


def _decisive(
    rows: tuple[DifferenceRow, ...], verdict: Verdict, tolerance_db: float
) -> DifferenceRow | None:
    def beyond(row: DifferenceRow) -> float:
        """Return by how much the widened interval is outside the tolerance."""
        return max(row.widest_low_db, -row.widest_high_db) - tolerance_db

    def reach(row: DifferenceRow) -> float:
        return max(row.high_db, -row.low_db)

    used = [row for row in rows if row.verdict == verdict]
    return max(used, key=beyond if verdict == "differ" else reach, default=None)


def _largest(
    first: Curve, second: Curve, rows: tuple[DifferenceRow, ...]
) -> tuple[float | None, float | None]:
    """Return the largest difference of the curves and where, between resolved rows."""
    resolved = [row.probability for row in rows if row.is_resolved]
    if not resolved:
        return None, None
    ends = np.log10([max(resolved), min(resolved)])
    count = max(math.ceil((ends[0] - ends[1]) * FINE_PER_DECADE), 1) + 1
    asked = np.unique([*np.logspace(ends[0], ends[1], count), *resolved])
    asked = asked[(asked >= min(resolved)) & (asked <= max(resolved))]
    levels = [np.maximum(side.level_db(asked), QUIET_DB) for side in (first, second)]
    difference = levels[0] - levels[1]
    place = int(np.argmax(np.abs(difference)))
    return float(difference[place]), float(asked[place])
