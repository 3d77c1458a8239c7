"""Several methods against each other in the time there is."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from contextlib import suppress
from dataclasses import dataclass

from wavegen.core.errors import ArgumentsError
from wavegen.core.registry import nearest
from wavegen.core.site import StageSettings
from wavegen.tuning.evaluation import Evaluation
from wavegen.tuning.method_search import MethodSearch
from wavegen.tuning.results import MethodResult
from wavegen.tuning.search import Goal, lowest_ceiling
from wavegen.tuning.space import CEILING, REFERENCE, Space, searchable_kinds
from wavegen.tuning.trials import OutOfTime, Trials

START_BELOW_DB = 3.0
"""A first ceiling stands so far under the level of the untouched signal; half as far where an
amplifier adds its own distortion."""


def chosen_kinds(asked: Sequence[str]) -> tuple[str, ...]:
    """Return the methods to be searched: those asked for, else all but the reference.

    Raises
    ------
    ArgumentsError
        No such method.
    """
    known = searchable_kinds()
    for kind in asked:
        if kind not in known:
            guess = nearest(kind, list(known))
            raise ArgumentsError(
                where="--method",
                problem=f"{kind!r} is no method whose settings can be searched",
                allowed=", ".join(known),
                remedy=f"Did you mean {guess}?" if guess else "Choose one of these.",
            )
    return tuple(dict.fromkeys(asked)) or tuple(kind for kind in known if kind != REFERENCE)


def refuse_unsuited(spaces: Mapping[str, Space | str]) -> None:
    """Refuse a search of methods of which none can be tried.

    Raises
    ------
    ArgumentsError
        With why the first is unsuited.
    """
    if any(isinstance(space, Space) for space in spaces.values()):
        return
    kind, why = next(iter(spaces.items()))
    raise ArgumentsError(
        where="--method",
        problem=f"{kind} cannot be searched on this recipe: {why}",
        allowed="methods that the recipe has room for",
        remedy="Change the recipe so, or choose another method.",
    )


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Contest:
    """All methods of one tune.

    Parameters
    ----------
    trials : Trials
        Where they are tried.
    spaces : dict of str to Space or str
        What may be set of each method, or why it is unsuited.
    goal : Goal
        When a search is content.
    is_monotone : bool
        Whether cost and margin both rise with a ceiling.
    """

    trials: Trials
    spaces: dict[str, Space | str]
    goal: Goal
    is_monotone: bool = True

    def run(self, before: Evaluation, *, share: float) -> list[MethodResult]:
        """Search the ceiling of every method, then all settings of each, the best first.

        Where the signal misses the limits as it is, and every method with it, no more is tried.

        Parameters
        ----------
        before : Evaluation
            Without a method.
        share : float
            Of the time of the tune, when this ends.

        Returns
        -------
        list of MethodResult
            The best first.
        """
        trials = self.trials
        start_db = before.level_db - START_BELOW_DB * (1.0 if self.is_monotone else 0.5)
        cost: dict[str, float] = {}
        unfinished: set[str] = set()
        usable = {kind: space for kind, space in self.spaces.items() if isinstance(space, Space)}
        trials.allow(trials.left(share))
        for kind, space in usable.items():
            try:
                cost[kind] = self._search(space, start_db).first()
            except OutOfTime:
                unfinished.add(kind)
            best = trials.best(kind)
            if best is not None and CEILING in best.settings:
                start_db = float(best.settings[CEILING])
        is_hopeless = trials.limits.margin_db(before) < 0 and not any(map(trials.best, usable))
        order = [] if is_hopeless else sorted(cost, key=cost.__getitem__)
        for number, kind in enumerate(order):
            trials.allow(trials.left(share) / (len(order) - number))
            try:
                self._search(usable[kind], start_db).all()
            except OutOfTime:
                unfinished.add(kind)
        if is_hopeless and cost:
            unfinished = set()
        made = [self._result(kind, is_cut=kind in unfinished) for kind in self.spaces]
        return sorted(made, key=_rank)

    def stage_of(self, best: Evaluation) -> StageSettings:
        """Return the settings of an evaluation of this tune."""
        space = self.spaces[best.method]
        assert isinstance(space, Space)  # noqa: S101 - it was tried
        return space.stage(self.trials.place_of(best), best.settings.get(CEILING))

    def tighten(self, best: Evaluation, *, guard_db: float, seconds: float) -> Evaluation | None:
        """Search the ceiling of the best again with more margin in hand.

        Parameters
        ----------
        best : Evaluation
            Its method and other settings are kept.
        guard_db : float
            The margin.
        seconds : float
            For searching.

        Returns
        -------
        Evaluation or None
            None where there is none, or no time.
        """
        space = self.spaces[best.method]
        if not isinstance(space, Space) or space.low_db is None or space.high_db is None:
            return None
        index, trials = self.trials.place_of(best), self.trials
        goal = Goal(guard_db=guard_db, width_db=self.goal.width_db, gain=self.goal.gain)
        trials.allow(seconds)
        with suppress(OutOfTime):
            lowest_ceiling(
                lambda at: trials.outcome(trials.evaluate(space, index, at)),
                low=space.low_db,
                high=space.high_db,
                start=float(best.settings[CEILING]) + guard_db / 10,
                goal=goal,
            )
        return trials.best(best.method, guard_db=guard_db)

    def _search(self, space: Space, start_db: float) -> MethodSearch:
        return MethodSearch(
            trials=self.trials,
            space=space,
            goal=self.goal,
            start_db=start_db,
            is_monotone=self.is_monotone,
        )

    def _result(self, kind: str, *, is_cut: bool) -> MethodResult:
        space = self.spaces[kind]
        if isinstance(space, str):
            return MethodResult(kind=kind, state="unsuited", reason=space)
        best = self.trials.best(kind, guard_db=self.goal.guard_db) or self.trials.best(kind)
        if best is not None:
            return MethodResult(kind=kind, state="kept", best=best, is_cut=is_cut)
        tried = self.trials.of(kind)
        made = [item for item in tried if not item.fault]
        if tried and not made:
            return MethodResult(kind=kind, state="unsuited", reason=tried[-1].fault)
        return MethodResult(
            kind=kind,
            state="unfinished" if is_cut else "missed",
            best=min(made, key=self.trials.limits.shortage_db, default=None),
            is_cut=is_cut,
        )


def _rank(item: MethodResult) -> tuple[int, float]:
    order = ("kept", "missed", "unfinished", "unsuited").index(item.state)
    return order, item.best.cost if item.best is not None else 0.0
