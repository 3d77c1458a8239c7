"""What was found on one loop, tried on loops of other data."""

from __future__ import annotations

import math
from collections.abc import Sequence
from contextlib import AbstractContextManager
from dataclasses import dataclass
from typing import Any, Literal, Protocol

import scipy.special

from wavegen.core.site import StageSettings
from wavegen.meters.batches import BatchedStatistics, pooled
from wavegen.meters.intervals import SampledStatistics
from wavegen.meters.population import merged
from wavegen.production.figures import Figures
from wavegen.production.sidecar import rounded
from wavegen.tuning.evaluation import Evaluation
from wavegen.tuning.limits import Limits

CONFIDENCE = 0.95
N_LOOPS = 4
"""Loops of other data: Student's quantile is then 3.2."""

Verdict = Literal["confirmed", "undecided", "missed", "no_other_data"]


class FreshBench(Protocol):
    """A bench on other data."""

    def repeat(self, found: Evaluation, stage: StageSettings) -> tuple[Evaluation, Figures]:
        """Return the figures of settings on this data."""


class Fresh(Protocol):
    """Who sets up a bench on the data of another seed."""

    def __call__(self, seed: int) -> AbstractContextManager[FreshBench]:
        """Return it as a context."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Interval:
    """A figure of the process, from several loops.

    Parameters
    ----------
    mean, low, high : float
        The last two hold it with 95 % confidence.
    """

    mean: float
    low: float
    high: float

    @classmethod
    def of(cls, values: Sequence[float]) -> Interval:
        """Return the interval of a mean by Student's quantile.

        Examples
        --------
        >>> found = Interval.of([1.0, 2.0, 3.0])
        >>> found.mean, round(found.low, 3)
        (2.0, -0.484)
        """
        n = len(values)
        mean = math.fsum(values) / n
        if n < 2:
            return cls(mean=mean, low=-math.inf, high=math.inf)
        deviation = math.sqrt(math.fsum((value - mean) ** 2 for value in values) / (n - 1))
        quantile = float(scipy.special.stdtrit(n - 1, (1 + CONFIDENCE) / 2))
        half = quantile * deviation / math.sqrt(n)
        return cls(mean=mean, low=mean - half, high=mean + half)

    def row(self) -> dict[str, float | None]:
        """Return it as JSON values; an open end is None."""
        return {name: rounded(getattr(self, name), 5) for name in ("mean", "low", "high")}


@dataclass(frozen=True, slots=True, kw_only=True)
class Confirmation:
    """What settings do on other data.

    Parameters
    ----------
    verdict : str
        ``confirmed``: the limits are kept with 95 % confidence; ``missed``: they are not;
        ``undecided``: the loops are too short to tell; ``no_other_data``: the signal does not
        depend on the seed, so that its loop is all there is.
    seeds : tuple of int
        Of the loops.
    level_db : Interval
        At the probability asked for: of all loops together.
    evm_percent, margin_db : Interval
        Over the loops. ``margin_db`` is the least distance from any limit.
    aclr_db : float or None
        Least of all loops.
    output_dbm : float or None
        Mean of all loops, behind an amplifier.
    """

    verdict: Verdict
    seeds: tuple[int, ...]
    level_db: Interval
    evm_percent: Interval
    margin_db: Interval
    aclr_db: float | None
    output_dbm: float | None = None

    @property
    def shortage_db(self) -> float:
        """Margin that is missing for the limits to be kept with confidence, dB."""
        return max(-self.margin_db.low, 0.0)

    def row(self) -> dict[str, Any]:
        """Return it as JSON values."""
        return {
            "verdict": self.verdict,
            "seeds": list(self.seeds),
            "confidence": CONFIDENCE,
            "level_db": self.level_db.row(),
            "evm_percent": self.evm_percent.row(),
            "margin_db": self.margin_db.row(),
            "aclr_db": self.aclr_db,
            "output_dbm": self.output_dbm,
        }


def confirm(
    found: Evaluation,
    stage: StageSettings,
    *,
    fresh: Fresh,
    limits: Limits,
    seed: int,
    probability: float,
    n_loops: int = N_LOOPS,
) -> Confirmation:
    """Try settings on loops of other data.

    Parameters
    ----------
    found : Evaluation
        What they measured on the loop of the search.
    stage : stage settings
        The settings.
    fresh : callable
        Sets up a bench for a seed.
    limits : Limits
        What is to be kept.
    seed : int
        Of the search; the loops have those that follow.
    probability : float
        At which the level is read.
    n_loops : int
        How many loops.

    Returns
    -------
    Confirmation
    """
    seeds = tuple((seed + k) % 2**63 for k in range(1, n_loops + 1))
    tried: list[Evaluation] = []
    powers: list[BatchedStatistics] = []
    for number in seeds:
        with fresh(number) as bench:
            got, figures = bench.repeat(found, stage)
        tried.append(got)
        powers.append(figures.power)
        if got == found:  # every figure to the last digit: the seed does nothing
            break
    margin = Interval.of([limits.margin_db(item) for item in tried])
    verdict: Verdict = "undecided"
    if tried[-1] == found:
        verdict = "no_other_data"
    elif margin.low >= 0:
        verdict = "confirmed"
    elif margin.high < 0:
        verdict = "missed"
    ratios = [item.aclr_db for item in tried if item.aclr_db is not None]
    outputs = [item.output_dbm for item in tried if item.output_dbm is not None]
    return Confirmation(
        verdict=verdict,
        seeds=seeds[: len(tried)],
        level_db=_level(powers, probability),
        evm_percent=Interval.of([item.evm_percent for item in tried]),
        margin_db=margin,
        aclr_db=min(ratios, default=None),
        output_dbm=math.fsum(outputs) / len(outputs) if outputs else None,
    )


def _level(powers: Sequence[BatchedStatistics], probability: float) -> Interval:
    """Return the level of all loops together, with the interval that their batches give."""
    together = SampledStatistics(
        statistics=merged([item.statistics for item in powers]),
        batches=pooled([item.batches for item in powers]),
    )
    (found,) = together.levels([probability], confidence=CONFIDENCE)
    return Interval(mean=found.level_db, low=found.low_db, high=found.high_db)
