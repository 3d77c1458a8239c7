"""What a curve looks like: the nearest of the familiar laws, with recipes to start from."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import scipy.optimize
from numpy.typing import NDArray

from wavegen.comparison.curves import Curve
from wavegen.comparison.difference import CONFIDENCE, probabilities
from wavegen.comparison.familiar import FAMILIES, Family

Reals = NDArray[np.float64]
LISTED = 5
NEAR_DB = 0.3
"""A law this close to the intervals of all levels is said to be what the curve looks like."""
FORGIVEN_DB = 0.5
"""No interval counts as wider: a record too short to tell anything looks like what it is."""
FITTED_DB = 0.1
"""What a fitted number must gain over a law without one to be listed before it."""
REFINED_DB = 1.5
"""A family further off than this is not fitted more finely."""
PLATEAU_DB = 8.0
"""Between on and off nothing happens over a range of levels at least this wide; the power of no
familiar law has so wide a gap above its rarest 5 %."""
_PLATEAU_FALL = 0.03
_LONGEST_DUTY = 0.9
_SHORTEST_DUTY = 0.002
_GRID_DB = 0.25
_LOWEST_DB, _HIGHEST_DB = -40.0, 15.0


@dataclass(frozen=True, slots=True, kw_only=True)
class LookAlike:
    """A familiar law near a curve.

    Parameters
    ----------
    family : Family
        Its kind.
    value : float
        The fitted number; means nothing for a family without one.
    duty : float
        Share of time that it is on; 1 if always.
    largest_deviation_db : float
        Curve less law, where that is largest.
    at_probability : float
        Where.
    excess_db : float
        Largest distance of the law from the interval of 95 % about the curve; 0 if it is in all.
    """

    family: Family
    value: float
    duty: float
    largest_deviation_db: float
    at_probability: float
    excess_db: float

    @property
    def rank(self) -> tuple[float, float]:
        """Largest excess, then deviation; a law with a number to fit counts as further off."""
        fitted_db = FITTED_DB * bool(self.family.parameter)
        return self.excess_db + fitted_db, abs(self.largest_deviation_db)

    @property
    def is_near(self) -> bool:
        """Whether the curve may be said to look like it."""
        return self.excess_db <= NEAR_DB


def look_alikes(curve: Curve, *, lowest: float) -> tuple[LookAlike, ...]:
    """Return the nearest laws to a curve, one a family, nearest first.

    Parameters
    ----------
    curve : Curve
        Levels over the mean.
    lowest : float
        Least probability that the curve resolves.

    Returns
    -------
    tuple of LookAlike
        Up to five; none where the curve does not reach 10 %. Levels from 50 % of the on-time
        down are compared, and each law's number makes its largest deviation least.
    """
    found = []
    duty = plateau_duty(curve)
    for on in (1.0,) if duty is None else (duty, 1.0):
        if lowest / on > 0.1:
            continue
        asked = probabilities(lowest / on)
        shift_db = 10 * np.log10(on)
        level = curve.level_db(asked * on) + shift_db
        if not np.isfinite(level).all():
            continue
        low, high = curve.level_interval(asked * on, confidence=CONFIDENCE)
        reach = (
            np.minimum(level - low - shift_db, FORGIVEN_DB),
            np.minimum(high + shift_db - level, FORGIVEN_DB),
        )
        found += [_nearest(family, level, reach, asked, on) for family in FAMILIES]
    best: dict[str, LookAlike] = {}
    for item in sorted(found, key=lambda one: one.rank):
        best.setdefault(item.family.name, item)
    return tuple(best.values())[:LISTED]


def plateau_duty(curve: Curve) -> float | None:
    """Return the share of time that a signal is on, None where its curve shows no off-time.

    Notes
    -----
    A signal that is switched on and off has hardly any power between the two: its CCDF stays at
    the duty over a wide range of levels. The widest range in which it falls by less than 3 % of
    itself is taken, if it is 8 dB wide.
    """
    level = np.arange(_LOWEST_DB, _HIGHEST_DB, _GRID_DB)
    share = curve.ccdf(level)
    # The last level at which the share is still within 3 % of that at each one.
    last = np.searchsorted(-share, -share * (1 - _PLATEAU_FALL), side="right") - 1
    width = level[last] - level
    is_fit = (share < _LONGEST_DUTY) & (share > _SHORTEST_DUTY) & (width >= PLATEAU_DB)
    if not is_fit.any():
        return None
    place = int(np.argmax(np.where(is_fit, width, 0.0)))
    return float(share[(place + last[place]) // 2])


def _nearest(
    family: Family, level: Reals, reach: tuple[Reals, Reals], asked: Reals, duty: float
) -> LookAlike:
    def worst(value: float) -> float:
        return float(np.max(np.abs(level - family.levels(value, asked))))

    value = min(family.values, key=worst)
    if family.is_continuous and worst(value) < REFINED_DB:
        place = family.values.index(value)
        ends = (
            family.values[max(place - 1, 0)],
            family.values[min(place + 1, len(family.values) - 1)],
        )
        refined = scipy.optimize.minimize_scalar(
            worst, bounds=ends, method="bounded", options={"xatol": 5e-3, "maxiter": 20}
        )
        if refined.fun < worst(value):
            value = round(float(refined.x), 2)
    deviation = level - family.levels(value, asked)
    at = int(np.argmax(np.abs(deviation)))
    return LookAlike(
        family=family,
        value=value,
        duty=duty,
        largest_deviation_db=float(deviation[at]),
        at_probability=float(asked[at] * duty),
        excess_db=float(np.maximum(deviation - reach[0], -deviation - reach[1]).max(initial=0.0)),
    )
