"""Whether a record agrees with a law: yes, no, or not enough data to tell.

A record is a sample of its process, so each of its figures has an interval (see
:mod:`wavegen.meters.intervals`), and several are looked at: together they may raise a false alarm
in 2 records of 10 000. It *differs* where even so wide an interval leaves out the law; it
*agrees* where all intervals of a joint 95 % lie within the tolerance about the law, so that a
larger fault would have shown; else it is *undecided*.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Literal

import numpy as np
import scipy.special
from numpy.typing import NDArray

from wavegen.core.errors import ArgumentsError
from wavegen.laws.moments import Curve, moment_of
from wavegen.meters.intervals import SampledStatistics

Verdict = Literal["agrees", "differs", "undecided"]

TOLERANCE_DB = 0.2
DOWN_TO = 1e-4
FALSE_ALARM = 2e-4
"""Of all tests of one comparison together."""
AGREEMENT = 0.95
"""Joint confidence of the intervals that must lie within the tolerance."""
SLACK_DB = 0.0015
"""Error of a law (0.001 dB) and of reading a level between two bins of the histogram."""
DECADES_SHARE = 0.9
"""Of the false alarm, for the levels at whole decades; the rest is for what lies between them
and for the moments, so that these cost the decades next to nothing."""
FOUND = 0.8
"""How often a fault of the size called detectable is found."""
MOMENT_EVENTS = 4000
"""Moments are judged from a relative standard error of 1/sqrt(4000) down. In shorter records they
rest on a few peaks, and a record without these underrates the error as well: with 2044 samples 13
of 6000 raised a false alarm."""
STEEP = 1.5
"""Where the uncertainty of the mean changes the law's probability by more than this factor, its
effect is no longer proportional."""
_MEAN_STEPS = 41
_LEAST_CONFIDENCE = 1e-6
_SLOPE_STEP_DB = 0.05
_DB = 10 / math.log(10)


@dataclass(frozen=True, slots=True, kw_only=True)
class Difference:
    """What gives a difference away most clearly.

    Parameters
    ----------
    kind : {"level", "moment", "peak"}
        What was looked at.
    deviation_db : float
        Record over law, dB: of the level; of ``E[p^k] / E[p]^k``; of the peak.
    probability : float or None
        Of the level.
    order : int or None
        k of the moment.
    """

    kind: Literal["level", "moment", "peak"]
    deviation_db: float
    probability: float | None = None
    order: int | None = None

    def __str__(self) -> str:
        """Return it in words."""
        size = f"{self.deviation_db:+.3f} dB"
        if self.kind == "level":
            return f"level at {100 * (self.probability or 0):.3g} %: {size} against the law"
        if self.kind == "moment":
            return f"mean of the power to the {self.order}: {size} against the law"
        return f"peak: {size} over the highest that the law allows"


@dataclass(frozen=True, slots=True, kw_only=True)
class LevelRow:
    """A level of the record and of the law.

    Parameters
    ----------
    probability : float
        Of being exceeded.
    law_level_db, level_db : float
        Over the mean, dB.
    low_db, high_db : float
        Interval of the process; all rows hold jointly with 95 %.
    is_within : bool
        Whether it lies within the tolerance about the law.
    detectable_db : float
        A deviation that would be found in 80 % of such records; inf if none would.
    """

    probability: float
    law_level_db: float
    level_db: float
    low_db: float
    high_db: float
    is_within: bool
    detectable_db: float


@dataclass(frozen=True, slots=True, kw_only=True)
class MomentRow:
    """A moment ``E[p^k] / E[p]^k`` of the record and of the law.

    Parameters
    ----------
    order : int
        k.
    law_value, value : float
        Of the law and of the record.
    low, high : float
        95 % interval of the process.
    detectable_percent : float
        A change that would be found in 80 % of such records, percent of the law's; inf if the
        record is too short to judge the moment. What moves it less is out of reach.
    """

    order: int
    law_value: float
    value: float
    low: float
    high: float
    detectable_percent: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Comparison:
    """How a record compares with a law.

    Parameters
    ----------
    verdict : {"agrees", "differs", "undecided"}
        About the process that the record samples.
    difference : Difference or None
        Where it differs most clearly.
    tolerance_db, down_to : float
        What *agrees* means: within it at every level down to this probability.
    levels : tuple of LevelRow
        Whole and half decades from 10 % on.
    moments : tuple of MomentRow
        Second and third.
    widest_at : float or None
        Probability of the level that is furthest from being within the tolerance, if the
        verdict is *undecided*.
    needed_samples : int or None
        About how long a record would have to be to decide; None where it cannot be foreseen.
    """

    verdict: Verdict
    difference: Difference | None
    tolerance_db: float
    down_to: float
    levels: tuple[LevelRow, ...]
    moments: tuple[MomentRow, ...]
    widest_at: float | None
    needed_samples: int | None

    @property
    def statement(self) -> str:
        """The verdict as a sentence."""
        reach = f"within {self.tolerance_db:g} dB down to {100 * self.down_to:.3g} %"
        if self.difference is not None:
            return f"differs: {self.difference}"
        if self.verdict == "agrees":
            return f"agrees {reach}"
        if self.needed_samples is None:
            return f"undecided: too little data to tell whether it agrees {reach}"
        return (
            f"undecided: to tell whether it agrees {reach} would take about "
            f"{float(f'{self.needed_samples:.2g}'):.0f} samples"
        )


def probabilities_of(down_to: float) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Return the decades and the half decades looked at.

    Parameters
    ----------
    down_to : float
        The last; a decade is counted from 10 %, and it is one of them whatever it is.

    Returns
    -------
    decades, between : float64 arrays

    Raises
    ------
    ArgumentsError
        Not above 0, or above 10 %.
    """
    if not 0 < down_to <= 0.1:
        raise ArgumentsError(
            where="down-to",
            problem=f"{down_to:g} is no probability to compare down to",
            allowed="above 0, at most 0.1",
            remedy="Write 0.0001 for 0.01 %.",
        )
    n = math.ceil(-math.log10(down_to) - 1e-9)
    decades = np.power(10.0, -np.arange(1.0, n + 1))
    decades[-1] = max(float(decades[-1]), down_to)
    between = np.power(10.0, -np.arange(1.5, n))
    return decades, between[between > down_to * (1 + 1e-9)]


def check_tolerance(tolerance_db: float) -> None:
    """Refuse a tolerance that is none.

    Raises
    ------
    ArgumentsError
        Not above 0 dB.
    """
    if not tolerance_db > 0:
        raise ArgumentsError(
            where="tolerance",
            problem=f"{tolerance_db:g} dB is no tolerance",
            allowed="above 0 dB",
            remedy="Ask for 0.2 dB, or for less from a long record.",
        )


def alarm_of_a_decade(down_to: float = DOWN_TO, false_alarm: float = FALSE_ALARM) -> float:
    """Return what each decade may contribute to the false alarm: for planning a record.

    Parameters
    ----------
    down_to : float
        Least probability compared.
    false_alarm : float
        Of the whole comparison.

    Returns
    -------
    float
        Two-sided.
    """
    decades, _ = probabilities_of(down_to)
    return false_alarm * DECADES_SHARE / decades.size


def _tests(down_to: float, false_alarm: float) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Return probabilities tested and what each may contribute to the false alarm."""
    decades, between = probabilities_of(down_to)
    rest = false_alarm * (1 - DECADES_SHARE) / (between.size + 2)
    each = np.full(decades.size, alarm_of_a_decade(down_to, false_alarm))
    return np.concatenate([decades, between]), np.concatenate([each, np.full(between.size, rest)])


def _finite(
    law: Curve, down_to: float, false_alarm: float
) -> tuple[NDArray[np.float64], NDArray[np.float64], NDArray[np.float64]]:
    """Return probabilities, shares and levels, but for those at which the law is switched off.

    A signal that is on for 5 % of the time has no level at 10 %: zeros are no level.
    """
    asked, share = _tests(down_to, false_alarm)
    level = np.asarray(law.level_db(asked), np.float64)
    used = np.isfinite(level)
    return asked[used], share[used], level[used]


def _moment_share(down_to: float, false_alarm: float) -> float:
    _, between = probabilities_of(down_to)
    return false_alarm * (1 - DECADES_SHARE) / (between.size + 2)


def find_difference(
    sampled: SampledStatistics,
    law: Curve,
    *,
    down_to: float = DOWN_TO,
    slack_db: float = SLACK_DB,
    false_alarm: float = FALSE_ALARM,
) -> Difference | None:
    """Return what shows that a record does not come from a process with this law.

    Parameters
    ----------
    sampled : SampledStatistics
        The record.
    law : Curve
        Of the process.
    down_to : float
        Least probability looked at.
    slack_db : float
        A deviation that does not count: of the law itself, of rounding to codes.
    false_alarm : float
        How often a record of the very process may be found to differ.

    Returns
    -------
    Difference or None
        The clearest; None where nothing is certain.

    Raises
    ------
    ArgumentsError
        ``down_to`` above 10 %.
    """
    if sampled.says_nothing:
        return None
    found: list[tuple[float, Difference]] = []
    asked, share, level = _finite(law, down_to, false_alarm)
    for alarm in np.unique(share):
        here = np.flatnonzero(share == alarm)
        low, _ = sampled.ccdf_interval(level[here] + slack_db, confidence=1 - alarm)
        _, high = sampled.ccdf_interval(level[here] - slack_db, confidence=1 - alarm)
        for k, least, most in zip(here, low, high, strict=True):
            q = float(asked[k])
            if (least > q or most < q) and not _is_of_the_mean(
                sampled, law, float(level[k]), q=q, alarm=float(alarm), slack_db=slack_db
            ):
                own = float(sampled.statistics.level_db(q))
                clear = math.log(least / q if least > q else q / max(most, 1e-300))
                found.append(
                    (
                        clear,
                        Difference(kind="level", deviation_db=own - float(level[k]), probability=q),
                    )
                )
    found += _moment_differences(sampled, law, _moment_share(down_to, false_alarm), slack_db)
    found += _peak_difference(sampled, law, slack_db, _moment_share(down_to, false_alarm))
    return max(found, key=lambda item: item[0])[1] if found else None


def _is_of_the_mean(
    sampled: SampledStatistics,
    law: Curve,
    level_db: float,
    *,
    q: float,
    alarm: float,
    slack_db: float,
) -> bool:
    """Return whether the record's own mean explains a level that seems to differ.

    Notes
    -----
    Intervals take what the mean does to a share of samples as proportional to it. Near a wall of
    the law it is not: 0.1 dB may be all of the way from 1 % to nothing. There the mean is moved
    by ``d`` of its standard errors, up to the ``z`` of the alarm, and the share at the moved level
    is judged with what is left, ``sqrt(z^2 - d^2)`` (profile of two nearly independent errors;
    the interval still counts the mean's part, so that this errs towards fewer alarms).
    """
    _, most_db = sampled.mean_interval_db(confidence=1 - alarm)
    reach_db = most_db - sampled.statistics.mean_db
    near = law.ccdf(np.array([level_db - reach_db, level_db, level_db + reach_db]))
    if near[0] <= STEEP * near[1] and near[1] <= STEEP * near[2]:
        return False
    z = -float(scipy.special.ndtri(alarm / 2))
    for part in np.linspace(-1, 1, _MEAN_STEPS):
        confidence = 1 - 2 * float(scipy.special.ndtr(-z * math.sqrt(1 - part**2)))
        moved = level_db + part * reach_db + np.array([slack_db, -slack_db])
        low, high = sampled.ccdf_interval(moved, confidence=max(confidence, _LEAST_CONFIDENCE))
        if low[0] <= q <= high[1]:
            return True
    return False


def _moment_differences(
    sampled: SampledStatistics, law: Curve, alarm: float, slack_db: float
) -> list[tuple[float, Difference]]:
    found = []
    for order in (2, 3):
        wanted, own_slack = moment_of(law, order)
        slack = max(own_slack, order * (slack_db - SLACK_DB) / _DB) * wanted
        seen = sampled.moment(order, confidence=1 - alarm)
        if seen.standard_error**2 * MOMENT_EVENTS > wanted**2:
            continue
        if seen.low > wanted + slack or seen.high < wanted - slack:
            deviation = _DB * math.log(seen.value / wanted)
            difference = Difference(kind="moment", deviation_db=deviation, order=order)
            found.append((0.0, difference))  # a level, where one differs, says more
    return found


def _peak_difference(
    sampled: SampledStatistics, law: Curve, slack_db: float, alarm: float
) -> list[tuple[float, Difference]]:
    """Return a peak over the law's by more than the record's mean may lie low."""
    statistics = sampled.statistics
    _, most_db = sampled.mean_interval_db(confidence=1 - alarm)
    excess = statistics.papr_db - float(law.peak_db)
    if excess > slack_db + (most_db - statistics.mean_db):
        return [(math.inf, Difference(kind="peak", deviation_db=excess))]
    return []


def compare_with_law(
    sampled: SampledStatistics,
    law: Curve,
    *,
    tolerance_db: float = TOLERANCE_DB,
    down_to: float = DOWN_TO,
    slack_db: float = SLACK_DB,
    false_alarm: float = FALSE_ALARM,
) -> Comparison:
    """Return whether a record agrees with the law of the process that it samples.

    Parameters
    ----------
    sampled : SampledStatistics
        The record. A loop is a record of the data in it: where they repeat within it, measure
        one period of them.
    law : Curve
        Of the process ("over seeds"). A law that holds for every loop needs no interval.
    tolerance_db : float
        *agrees*: every interval lies within so much of the law.
    down_to : float
        Least probability compared.
    slack_db : float
        A deviation that does not count as a difference.
    false_alarm : float
        How often a record of the very process may be found to differ.

    Returns
    -------
    Comparison

    Raises
    ------
    ArgumentsError
        ``down_to`` above 10 %, or a tolerance that is not positive.
    """
    check_tolerance(tolerance_db)
    difference = find_difference(
        sampled, law, down_to=down_to, slack_db=slack_db, false_alarm=false_alarm
    )
    levels = _level_rows(
        sampled,
        law,
        tolerance_db=tolerance_db,
        down_to=down_to,
        slack_db=slack_db,
        false_alarm=false_alarm,
    )
    widths = [_overshoot(row, tolerance_db) for row in levels]
    verdict: Verdict = "differs" if difference else "undecided"
    if difference is None and levels and all(row.is_within for row in levels):
        verdict = "agrees"
    is_open = verdict == "undecided" and bool(levels)
    widest = int(np.argmax(widths)) if widths else 0
    return Comparison(
        verdict=verdict,
        difference=difference,
        tolerance_db=tolerance_db,
        down_to=down_to,
        levels=levels,
        moments=_moment_rows(sampled, law, down_to, false_alarm),
        widest_at=levels[widest].probability if is_open else None,
        needed_samples=(
            _needed(sampled, law, levels[widest], tolerance_db, _joint(len(levels)))
            if is_open
            else None
        ),
    )


def _level_rows(
    sampled: SampledStatistics,
    law: Curve,
    *,
    tolerance_db: float,
    down_to: float,
    slack_db: float,
    false_alarm: float,
) -> tuple[LevelRow, ...]:
    asked, share, wanted = _finite(law, down_to, false_alarm)
    place = np.argsort(-asked)
    asked, share, wanted = asked[place], share[place], wanted[place]
    joint = _joint(asked.size)
    seen = sampled.levels(asked, confidence=joint)
    _, most = sampled.ccdf_interval(wanted + tolerance_db, confidence=joint)
    least, _ = sampled.ccdf_interval(wanted - tolerance_db, confidence=joint)
    # What the interval spans, over what a normal one of this confidence spans in sigmas.
    sigmas = -2 * scipy.special.ndtri((1 - joint) / 2)
    return tuple(
        LevelRow(
            probability=row.probability,
            law_level_db=float(wanted[k]),
            level_db=row.level_db,
            low_db=row.low_db,
            high_db=row.high_db,
            is_within=bool(most[k] < asked[k] < least[k]),
            detectable_db=slack_db
            + _sigmas_to_find(float(share[k])) * (row.high_db - row.low_db) / sigmas,
        )
        for k, row in enumerate(seen)
    )


def _joint(n_levels: int) -> float:
    """Return the confidence of each of so many intervals that hold together."""
    return 1 - (1 - AGREEMENT) / max(n_levels, 1)


def _sigmas_to_find(alarm: float) -> float:
    """Return how many standard errors a deviation must have to be found in 80 % of records."""
    return float(scipy.special.ndtri(FOUND) - scipy.special.ndtri(alarm / 2))


def _moment_rows(
    sampled: SampledStatistics, law: Curve, down_to: float, false_alarm: float
) -> tuple[MomentRow, ...]:
    rows = []
    factor = _sigmas_to_find(_moment_share(down_to, false_alarm))
    for seen in sampled.moments():
        wanted, slack = moment_of(law, seen.order)
        error = seen.standard_error / wanted
        is_judged = error**2 * MOMENT_EVENTS <= 1 and not sampled.says_nothing
        rows.append(
            MomentRow(
                order=seen.order,
                law_value=wanted,
                value=seen.value,
                low=seen.low,
                high=seen.high,
                detectable_percent=100 * (slack + factor * error) if is_judged else math.inf,
            )
        )
    return tuple(rows)


def _overshoot(row: LevelRow, tolerance_db: float) -> float:
    """Return how many times too far the worse end of an interval lies from the law."""
    return max(row.high_db - row.law_level_db, row.law_level_db - row.low_db) / tolerance_db


def _needed(
    sampled: SampledStatistics, law: Curve, row: LevelRow, tolerance_db: float, joint: float
) -> int | None:
    """Return about how many samples it takes for one level; twice as many at least.

    From what one event counts for and the law's own slope: how many events this record happened
    to have beyond the level matters less to that than to its interval.
    """
    if sampled.says_nothing:
        return None
    level = row.law_level_db + np.array([-_SLOPE_STEP_DB, _SLOPE_STEP_DB])
    below, above = (float(x) for x in law.ccdf(level))
    slope = (below - above) / (2 * _SLOPE_STEP_DB)
    sigmas = float(scipy.special.ndtri((1 - joint) / 2))
    weight = float(sampled.event_samples(row.law_level_db)[0])
    found = 0.0
    if slope > 0:
        found = row.probability * weight * (sigmas / (slope * tolerance_db)) ** 2
    return math.ceil(max(found, 2.0 * sampled.statistics.n_samples))
