"""Trials on a rig: each made once, kept in the journal, refused when the time is over."""

from __future__ import annotations

import time
from collections.abc import Callable
from dataclasses import dataclass, field
from typing import Protocol

from wavegen.core.progress import Progress, silent
from wavegen.core.site import StageSettings
from wavegen.core.units import QuantityError
from wavegen.recipe.dump import stage_text
from wavegen.tuning.evaluation import Evaluation
from wavegen.tuning.journal import Journal
from wavegen.tuning.limits import Limits
from wavegen.tuning.search import HOPELESS_DB, INFEASIBLE, Index, Outcome
from wavegen.tuning.space import Space


class OutOfTime(Exception):
    """The time for a search is over: it ends where it stands."""


class Bench(Protocol):
    """Where settings are tried."""

    def try_out(self, space: Space, stage: StageSettings) -> Evaluation:
        """Return what a stage measures."""


@dataclass(slots=True, eq=False, kw_only=True)
class Trials:
    """The trials of one tune.

    Parameters
    ----------
    bench : Bench
        Where they are made.
    journal : Journal
        Where they are kept.
    limits : Limits
        By which they are judged.
    progress : Progress
        Told after each, in milliseconds of the time there is.
    now : callable
        The time, s.
    """

    bench: Bench
    journal: Journal
    limits: Limits
    progress: Progress = silent
    now: Callable[[], float] = time.monotonic
    seconds: float = 0.0
    n_made: int = 0
    _begun: float = 0.0
    _ends: float = 0.0
    _seen: dict[str, Evaluation] = field(default_factory=dict)
    _places: dict[str, Index] = field(default_factory=dict)

    def begin(self, seconds: float) -> None:
        """Start the clock of the whole tune."""
        self.seconds, self._begun = seconds, self.now()
        self._ends = self._begun + seconds

    def left(self, share: float = 1.0) -> float:
        """Return the time that is left until a share of the whole has gone, s."""
        return max(self._begun + share * self.seconds - self.now(), 0.0)

    def allow(self, seconds: float) -> None:
        """Let trials begin for so long from now on."""
        self._ends = self.now() + seconds

    def evaluate(self, space: Space, index: Index, ceiling_db: float | None) -> Evaluation:
        """Return what a point measures: from the journal, else by a trial.

        Raises
        ------
        OutOfTime
            It would have to be made, and the time is over.
        """
        try:
            stage = space.stage(index, ceiling_db)
        except QuantityError as error:
            return Evaluation(method=space.kind, text="", settings={}, fault=error.problem)
        text = stage_text(stage)
        found = self.journal.find(text)
        if found is None:
            if self.now() >= self._ends:
                raise OutOfTime
            found = self.bench.try_out(space, stage)
            self.n_made += 1
            self.journal.add(found)
        self._seen[text], self._places[text] = found, index
        self._tell(space.kind)
        return found

    def outcome(self, found: Evaluation) -> Outcome:
        """Return cost and margin of an evaluation."""
        if found.fault:
            return Outcome(cost=INFEASIBLE, margin_db=HOPELESS_DB)
        return Outcome(cost=found.cost, margin_db=self.limits.margin_db(found))

    def place_of(self, found: Evaluation) -> Index:
        """Return where an evaluation of this tune stands on the axes of its method."""
        return self._places[found.text]

    def of(self, kind: str) -> tuple[Evaluation, ...]:
        """Return every evaluation of a method in this tune."""
        return tuple(item for item in self._seen.values() if item.method == kind)

    def best(self, kind: str, *, guard_db: float = 0.0, worth: float = 0.01) -> Evaluation | None:
        """Return the evaluation of least cost that keeps the limits with a margin in hand.

        Parameters
        ----------
        kind : str
            The method.
        guard_db : float
            The margin.
        worth : float
            Of those that cost no more than this above the least, the one of fewest transforms.

        Returns
        -------
        Evaluation or None
            None where none keeps them.
        """
        kept = [
            item
            for item in self.of(kind)
            if not item.fault and self.limits.margin_db(item) >= guard_db
        ]
        if not kept:
            return None
        least = min(item.cost for item in kept)
        near = [item for item in kept if item.cost <= least + worth]
        return min(near, key=lambda item: (item.pairs, item.cost))

    def _tell(self, kind: str) -> None:
        best = self.best(kind)
        told = "" if best is None else f", {abs(best.cost):.2f} {unit_of(best)} so far"
        done = min(self.now() - self._begun, self.seconds)
        task = f"searching: {kind}, trial {self.n_made}{told}"
        self.progress(task, round(1000 * done), max(round(1000 * self.seconds), 1))


def unit_of(evaluation: Evaluation) -> str:
    """Return the unit of what is made small, or large."""
    return "dB" if evaluation.output_dbm is None else "dBm"
