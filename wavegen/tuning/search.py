"""The search itself: a root where a margin is monotone, steps from value to value elsewhere.

It knows neither signals nor methods: it asks a function for a cost and a margin.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass, field

Index = tuple[int, ...]
"""Which of its values each setting has."""
SLOPE = 5.0
"""Margin gained for each dB of ceiling before anything is known: that of EVM from 3 to 8 %."""
LONGEST_STEP_DB = 2.0
NARROWEST_DB = 0.004
MOST_TRIALS = 14
HOPELESS_DB = -40.0
"""Margins count down to this: a failure has no size."""
INFEASIBLE = 1e3
"""Cost of what keeps no limit, to which is added what is missing: less of it is better."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Outcome:
    """What a trial gives.

    Parameters
    ----------
    cost : float
        To be made small.
    margin_db : float
        Not negative where every limit is kept.
    """

    cost: float
    margin_db: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Goal:
    """When a search is content.

    Parameters
    ----------
    guard_db : float
        Margin that is kept in hand.
    width_db : float
        How much more than that is as good.
    gain : float
        Cost that a step must save to be worth while.
    """

    guard_db: float = 0.05
    width_db: float = 0.05
    gain: float = 0.01

    @property
    def aim_db(self) -> float:
        """Margin that is aimed at, dB."""
        return self.guard_db + self.width_db / 2


@dataclass(slots=True)
class _Side:
    """The nearest ceiling on one side of the root, and how far it is from it."""

    at: float | None = None
    excess: float = 0.0
    hits: int = 0


@dataclass(slots=True)
class _Bracket:
    """What is known of a root: the nearest ceilings below and above it."""

    low: float
    high: float
    below: _Side = field(default_factory=_Side)
    above: _Side = field(default_factory=_Side)
    slope: float = SLOPE
    step: float = LONGEST_STEP_DB

    def learn(self, at: float, excess: float) -> None:
        """Take in a trial."""
        side, other = (self.below, self.above) if excess < 0 else (self.above, self.below)
        if side.at is not None and side.at != at:
            slope = (excess - side.excess) / (at - side.at)
            self.slope = min(max(slope, SLOPE / 4), SLOPE * 4)
        side.at, side.excess = at, excess
        side.hits, other.hits = side.hits + 1, 0

    def following(self) -> float | None:
        """Return the next ceiling to try; None where there is nothing left to find."""
        below, above = self.below, self.above
        if below.at is not None and above.at is not None:
            width = above.at - below.at
            if width <= NARROWEST_DB:
                return None
            if max(below.hits, above.hits) > 2:
                return (below.at + above.at) / 2
            place = below.at - below.excess * width / (above.excess - below.excess)
            return min(max(place, below.at + width / 10), above.at - width / 10)
        if below.at is not None:
            step = min(max(-below.excess / self.slope * 1.2, 0.02), self.step)
            self.step *= 2
            return None if below.at >= self.high else min(below.at + step, self.high)
        assert above.at is not None  # noqa: S101 - asked after the first trial
        step = min(max(above.excess / self.slope * 1.2, 0.02), self.step)
        self.step *= 2
        return None if above.at <= self.low else max(above.at - step, self.low)


def lowest_ceiling(
    trial: Callable[[float], Outcome],
    *,
    low: float,
    high: float,
    start: float,
    goal: Goal,
    beat: float = math.inf,
) -> Outcome | None:
    """Return the outcome at the lowest ceiling that keeps the limits.

    Parameters
    ----------
    trial : callable
        Cost and margin at a ceiling, dB; both rise with it.
    low, high : float
        Bounds of the ceiling, dB.
    start : float
        Where to begin, dB.
    goal : Goal
        The margin that is aimed at.
    beat : float
        A cost to be beaten: given up as soon as a ceiling too low costs that much already.

    Returns
    -------
    Outcome or None
        Of least cost among those with the margin in hand; None where there is none.

    Notes
    -----
    Regula falsi inside a bracket, halving where one side stays for long; before there is a bracket,
    steps by the slope known so far.
    """
    bracket = _Bracket(low, high)
    best: Outcome | None = None
    at: float | None = min(max(start, low), high)
    for _ in range(MOST_TRIALS):
        if at is None:
            break
        got = trial(at)
        excess = max(got.margin_db, HOPELESS_DB) - goal.aim_db
        if got.margin_db >= goal.guard_db and (best is None or got.cost < best.cost):
            best = got
        if abs(excess) <= goal.width_db / 2:
            break
        if excess < 0 and math.isfinite(got.margin_db) and got.cost >= beat:
            break
        bracket.learn(at, excess)
        at = bracket.following()
    return best


def least_cost(
    trial: Callable[[float], Outcome],
    *,
    low: float,
    high: float,
    start: float,
    goal: Goal,
    step: float = 0.5,
    finest: float = 0.1,
) -> Outcome | None:
    """Return the outcome of least cost along one setting, where the cost has one valley.

    Parameters
    ----------
    trial : callable
        Cost and margin at a ceiling, dB.
    low, high : float
        Bounds, dB.
    start : float
        Where to begin, dB.
    goal : Goal
        What a step must save.
    step, finest : float
        First and last distance of trials, dB.

    Returns
    -------
    Outcome or None
        None where no trial kept its limits.
    """

    def rated(at: float) -> tuple[float, Outcome]:
        got = trial(at)
        return _rating(got), got

    here = min(max(start, low), high)
    rating, best = rated(here)
    while step >= finest:
        for there in (here - step, here + step):
            if not low <= there <= high:
                continue
            other, got = rated(there)
            if other < rating - goal.gain / 4:
                here, rating, best = there, other, got
                break
        else:
            step /= 2
    return best if best.margin_db >= 0 else None


def _rating(got: Outcome) -> float:
    if got.margin_db >= 0:
        return got.cost
    return INFEASIBLE - max(got.margin_db, HOPELESS_DB)


def descend(
    cost: Callable[[Index, float], float],
    *,
    start: Index,
    sizes: Sequence[int],
    is_ordered: Sequence[bool],
    gain: float,
) -> Index:
    """Walk from value to value of several settings while it saves enough.

    Parameters
    ----------
    cost : callable
        Of an index, given the cost to be beaten.
    start : tuple of int
        Where to begin.
    sizes : sequence of int
        How many values each setting has.
    is_ordered : sequence of bool
        Whether its neighbours are alike: then only these are tried, else all.
    gain : float
        What a step must save.

    Returns
    -------
    tuple of int
        No single setting changed to a value tried from there saves more.
    """
    known: dict[Index, float] = {}

    def asked(index: Index, beat: float) -> float:
        if index not in known:
            known[index] = cost(index, beat)
        return known[index]

    here, best = start, asked(start, math.inf)
    is_moving = True
    while is_moving:
        is_moving = False
        for axis in range(len(sizes)):
            for value in _values(here[axis], sizes[axis], is_ordered=is_ordered[axis]):
                there = (*here[:axis], value, *here[axis + 1 :])
                found = asked(there, best - gain)
                if found < best - gain:
                    here, best, is_moving = there, found, True
                    break
    return here


def _values(at: int, size: int, *, is_ordered: bool) -> list[int]:
    if is_ordered:
        return [value for value in (at + 1, at - 1) if 0 <= value < size]
    return [value for value in range(size) if value != at]
