"""The least-distortion projection at the EVM of what was found: what it is measured against."""

from __future__ import annotations

import math
from contextlib import suppress
from dataclasses import dataclass, replace
from typing import Any

from wavegen.tuning.evaluation import Evaluation
from wavegen.tuning.limits import Limits
from wavegen.tuning.search import SLOPE, Goal, Index, Outcome, lowest_ceiling
from wavegen.tuning.space import Space
from wavegen.tuning.trials import OutOfTime, Trials

FARTHEST_DB = 1.0
"""EVM this far from that of the reference has no bound."""
GOAL = Goal(guard_db=-0.05, width_db=0.1)
"""The EVM is met within 0.05 dB, which is 0.01 dB of level, and that is corrected."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Reference:
    """The level of the projection over its EVM, near one point.

    Parameters
    ----------
    evaluation : Evaluation
        At that point.
    slope : float
        Change of EVM over change of level there, both in dB; positive.
    """

    evaluation: Evaluation
    slope: float = SLOPE

    def level_db(self, evm_percent: float) -> float | None:
        """Return the level of the projection at an EVM; None far from the point."""
        if evm_percent <= 0:
            return None
        apart = 20 * math.log10(evm_percent / self.evaluation.evm_percent)
        if abs(apart) > FARTHEST_DB:
            return None
        return self.evaluation.level_db - apart / self.slope

    def row(self) -> dict[str, Any]:
        """Return it as JSON values."""
        return self.evaluation.row()


def find_reference(
    trials: Trials, space: Space, *, evm_percent: float, start_db: float
) -> Reference | None:
    """Search the ceiling at which the projection has an EVM.

    Parameters
    ----------
    trials : Trials
        Where it is tried.
    space : Space
        Of the projection. Its rounds begin as few as they stand and are raised while there is
        time.
    evm_percent : float
        What is wanted.
    start_db : float
        Ceiling to begin with, dB.

    Returns
    -------
    Reference or None
        Of the most rounds for which there was time; None where there was none.
    """
    limits = Limits(evm_percent=evm_percent)
    axis = next(number for number, item in enumerate(space.axes) if item.field == space.pairs)
    found: Reference | None = None
    for place in range(space.start[axis], len(space.axes[axis].values)):
        index = (*space.start[:axis], place, *space.start[axis + 1 :])
        start = start_db if found is None else found.evaluation.peak_db
        made = _tried(trials, space, index, limits=limits, start_db=start)
        if not made:
            break
        found = _nearest(made, evm_percent)
    return found


def _tried(
    trials: Trials, space: Space, index: Index, *, limits: Limits, start_db: float
) -> list[Evaluation]:
    """Return the evaluations of a search for an EVM, as far as there was time."""
    tried: list[Evaluation] = []

    def trial(ceiling_db: float) -> Outcome:
        got = trials.evaluate(space, index, ceiling_db)
        tried.append(got)
        return Outcome(cost=got.level_db, margin_db=limits.margin_db(got))

    low, high = space.low_db or 0.0, space.high_db or start_db
    with suppress(OutOfTime):
        lowest_ceiling(trial, low=low, high=high, start=start_db, goal=GOAL)
    return [item for item in tried if not item.fault and item.evm_percent > 0]


def _nearest(made: list[Evaluation], evm_percent: float) -> Reference:
    """Return the evaluation whose EVM is nearest, with the slope to the next one."""

    def apart(item: Evaluation) -> float:
        return abs(math.log(item.evm_percent / evm_percent))

    first, *rest = sorted(made, key=apart)
    found = Reference(evaluation=first)
    for other in rest:
        levels = first.level_db - other.level_db
        if abs(levels) > 0.02:
            evm = 20 * math.log10(other.evm_percent / first.evm_percent)
            return replace(found, slope=min(max(evm / levels, SLOPE / 4), SLOPE * 4))
    return found
