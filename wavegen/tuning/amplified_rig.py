"""A rig with an amplifier at its end: every signal is driven as hard as the limits allow."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from pathlib import Path

from wavegen.core.errors import RecipeError
from wavegen.core.signal import Signal
from wavegen.core.site import StageSettings
from wavegen.production.figures import Figures
from wavegen.recipe.dump import stage_text
from wavegen.stages.amplifier import Amplifier
from wavegen.stages.drive import Amplified
from wavegen.tuning.evaluation import Evaluation
from wavegen.tuning.held import held
from wavegen.tuning.limits import Limits
from wavegen.tuning.rig import DIGITS, Rig, with_figures
from wavegen.tuning.search import Goal, Outcome, lowest_ceiling
from wavegen.tuning.space import Space

WHERE = "--device"
SPAN_DB = 60.0
"""How far below the hardest drive is looked."""
LEAST_ROOM_DB = 0.3
"""What is left between the highest sample and the end of the amplifier's table: other data peak a
little higher."""
DRIVE_DIGITS = 3


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class AmplifiedRig:
    """Where settings are tried behind an amplifier.

    Parameters
    ----------
    rig : Rig
        Before it.
    amplifier : Amplifier
        Amplitudes in roots of a milliwatt.
    limits : Limits
        What is kept behind the amplifier.
    goal : Goal
        The margin that is kept in hand.
    folder : Path
        For a scratch file.
    """

    rig: Rig
    amplifier: Amplifier
    limits: Limits
    goal: Goal
    folder: Path

    def untouched(self) -> Evaluation:
        """Return the figures without a method, at its hardest drive within the limits."""
        return self._driven(self.rig.clean, Evaluation(method="", text="", settings={}))

    def try_out(self, space: Space, stage: StageSettings) -> Evaluation:
        """Return the figures with a method, at its hardest drive within the limits.

        Parameters
        ----------
        space : Space
            Of the method.
        stage : stage settings
            A point of it.
        """
        head = Evaluation(
            method=space.kind,
            text=stage_text(stage),
            settings=space.told(stage),
            pairs=space.pairs_of(stage),
        )
        try:
            signal, _ = self.rig.cut.build(stage)
        except RecipeError as error:
            return replace(head, fault=f"{error.problem}; allowed: {error.allowed}")
        return self._driven(signal, head)

    def repeat(self, found: Evaluation, stage: StageSettings) -> tuple[Evaluation, Figures]:
        """Return the figures of settings and a drive found on other data.

        Parameters
        ----------
        found : Evaluation
            Of these settings.
        stage : stage settings
            The same settings.
        """
        signal, _ = self.rig.cut.build(stage)
        with held(signal, folder=self.folder, workers=self.rig.workers) as stimulus:
            figures = self.rig.measure(stimulus)
            drive_dbm = min(found.input_dbm or 0.0, self._highest_dbm(figures))
            return self._behind(stimulus, figures, found, drive_dbm), figures

    def _highest_dbm(self, figures: Figures) -> float:
        """Return the mean input power at which the peak meets the end of the table, dBm."""
        return 20 * math.log10(self.amplifier.largest) - figures.peak_db - 1e-6

    def _driven(self, signal: Signal, head: Evaluation) -> Evaluation:
        """Return the evaluation at the hardest drive within the limits, or nearest to them."""
        with held(signal, folder=self.folder, workers=self.rig.workers) as stimulus:
            figures = self.rig.measure(stimulus)
            highest = self._highest_dbm(figures)
            tried: list[Evaluation] = []

            def trial(back_off_db: float) -> Outcome:
                drive_dbm = round(highest - back_off_db, DRIVE_DIGITS)
                got = self._behind(stimulus, figures, head, drive_dbm)
                tried.append(got)
                return Outcome(cost=got.cost, margin_db=self.limits.margin_db(got))

            lowest_ceiling(trial, low=LEAST_ROOM_DB, high=SPAN_DB, start=1.0, goal=self.goal)
        kept = [item for item in tried if self.limits.margin_db(item) >= self.goal.guard_db]
        if kept:
            return min(kept, key=lambda item: item.cost)
        return min(tried, key=self.limits.shortage_db)

    def _behind(
        self, stimulus: Signal, figures: Figures, head: Evaluation, input_dbm: float
    ) -> Evaluation:
        """Return what a stimulus measures behind the amplifier at a mean input power."""
        mean = figures.power.statistics.mean
        signal = Amplified(
            sample_rate_hz=stimulus.sample_rate_hz,
            n_samples=stimulus.n_samples,
            inputs=(stimulus,),
            mean_power=None,
            amplifier=self.amplifier,
            drive=10 ** (input_dbm / 20) / math.sqrt(mean),
            scale=10 ** (input_dbm / 20) / math.sqrt(mean),
            where=WHERE,
        )
        behind = self.rig.measure(signal)
        made = with_figures(head, figures, behind, self.rig.probability)
        output = 10 * math.log10(behind.power.statistics.mean)
        return replace(made, input_dbm=round(input_dbm, DIGITS), output_dbm=round(output, DIGITS))
