"""The search of one method: its ceiling for each set of the other settings, step by step."""

from __future__ import annotations

import math
from dataclasses import dataclass

from wavegen.tuning.evaluation import Evaluation
from wavegen.tuning.search import (
    HOPELESS_DB,
    INFEASIBLE,
    Goal,
    Index,
    Outcome,
    descend,
    least_cost,
    lowest_ceiling,
)
from wavegen.tuning.space import CEILING, Space
from wavegen.tuning.trials import Trials


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class MethodSearch:
    """How one method is searched.

    Parameters
    ----------
    trials : Trials
        Where its points are tried.
    space : Space
        What may be set.
    goal : Goal
        When it is content.
    start_db : float
        Ceiling to begin with, dB.
    is_monotone : bool
        Whether cost and margin both rise with the ceiling; else the cost has a valley.
    """

    trials: Trials
    space: Space
    goal: Goal
    start_db: float
    is_monotone: bool = True

    def first(self) -> float:
        """Search the ceiling alone, other settings as they stand; return the cost.

        Raises
        ------
        OutOfTime
            What was found until then is among the trials.
        """
        return self.cost(self.space.start, math.inf)

    def all(self) -> None:
        """Search every setting from where they stand.

        Raises
        ------
        OutOfTime
            What was found until then is among the trials.
        """
        descend(
            self.cost,
            start=self.space.start,
            sizes=[len(axis.values) for axis in self.space.axes],
            is_ordered=[axis.is_ordered for axis in self.space.axes],
            gain=self.goal.gain,
        )

    def cost(self, index: Index, beat: float) -> float:
        """Return the cost at the best ceiling for a set of the other settings.

        Parameters
        ----------
        index : tuple of int
            The other settings.
        beat : float
            A cost to be beaten.
        """
        tried: list[Outcome] = []

        def trial(ceiling_db: float | None) -> Outcome:
            got = self.trials.outcome(self.trials.evaluate(self.space, index, ceiling_db))
            tried.append(got)
            return got

        low, high = self.space.low_db, self.space.high_db
        if low is None or high is None:
            best = trial(None)
            found = best if best.margin_db >= 0 else None
        elif self.is_monotone:
            found = lowest_ceiling(
                trial, low=low, high=high, start=self._start(), goal=self.goal, beat=beat
            )
        else:
            found = least_cost(trial, low=low, high=high, start=self._start(), goal=self.goal)
        if found is not None:
            return found.cost
        return INFEASIBLE - max((item.margin_db for item in tried), default=HOPELESS_DB)

    def _start(self) -> float:
        """Return the ceiling of the best so far, else the one told."""
        best: Evaluation | None = self.trials.best(self.space.kind)
        return self.start_db if best is None else float(best.settings.get(CEILING, self.start_db))
