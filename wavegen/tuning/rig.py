"""The fixed set-up of a tune: one loop of data, the chain around the method, the meters."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass, replace
from pathlib import Path

from wavegen.core.errors import RecipeError
from wavegen.core.progress import Progress, silent
from wavegen.core.signal import Signal
from wavegen.core.site import StageSettings
from wavegen.meters.evm_probe import EvmResult
from wavegen.production.chain_cut import ChainCut, cut_chain
from wavegen.production.fidelity import (
    FidelityPlan,
    FidelityRequest,
    plan_fidelity,
    ratio_db,
    with_mask,
)
from wavegen.production.figures import Figures, measure_figures
from wavegen.recipe.dump import stage_text
from wavegen.recipe.load import LoadedRecipe
from wavegen.tuning.evaluation import OVERALL, AclrEntry, Evaluation, EvmEntry
from wavegen.tuning.held import held
from wavegen.tuning.space import Space

DIGITS = 5
"""Of every figure that is kept: 1e-5 dB or percent."""
WAVEFORM = "waveform"


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Rig:
    """Where every set of settings is tried on the same data.

    Parameters
    ----------
    cut : ChainCut
        The chain around the method; what comes to it lies in scratch.
    clean : Signal
        The whole chain without a method.
    plan : FidelityPlan
        What is measured.
    probability : float
        At which the level is read.
    workers : int
        Threads.
    """

    cut: ChainCut
    clean: Signal
    plan: FidelityPlan
    probability: float
    workers: int = 1

    def measure(self, signal: Signal) -> Figures:
        """Return the figures of a signal made from the data of this rig."""
        has_evm = self.plan.settings.evm is not None
        return measure_figures(
            signal,
            settings=self.plan.settings,
            reference=None if has_evm else self.clean,
            workers=self.workers,
        )

    def untouched(self) -> Evaluation:
        """Return the figures without a method."""
        figures = self.measure(self.clean)
        head = Evaluation(method="", text="", settings={})
        return with_figures(head, figures, figures, self.probability)

    def try_out(self, space: Space, stage: StageSettings) -> Evaluation:
        """Return the figures with a method.

        Parameters
        ----------
        space : Space
            Of the method.
        stage : stage settings
            A point of it.

        Returns
        -------
        Evaluation
            With its fault and no figures where the method cannot be built so.
        """
        head = Evaluation(
            method=space.kind,
            text=stage_text(stage),
            settings=space.told(stage),
            pairs=space.pairs_of(stage),
        )
        try:
            signal, _ = self.cut.build(stage)
        except RecipeError as error:
            return replace(head, fault=f"{error.problem}; allowed: {error.allowed}")
        figures = self.measure(signal)
        return with_figures(head, figures, figures, self.probability)

    def repeat(self, found: Evaluation, stage: StageSettings) -> tuple[Evaluation, Figures]:
        """Return the figures of settings found on other data, and all that was measured of them.

        Parameters
        ----------
        found : Evaluation
            Of these settings, on any data.
        stage : stage settings
            The same settings.
        """
        signal, _ = self.cut.build(stage)
        figures = self.measure(signal)
        return with_figures(found, figures, figures, self.probability), figures


def with_figures(
    head: Evaluation, stimulus: Figures, behind: Figures, probability: float
) -> Evaluation:
    """Return an evaluation with what was measured.

    Parameters
    ----------
    head : Evaluation
        What was set.
    stimulus : Figures
        Of the signal that is tuned: its levels.
    behind : Figures
        Of what must keep the limits: the same signal, or it behind an amplifier.
    probability : float
        At which the level is read.
    """
    fidelity = behind.fidelity
    evm = [entry for result in fidelity.evm for entry in _evm_entries(result)]
    if fidelity.total is not None and not evm:
        percent = round(fidelity.total.fitted_percent, DIGITS)
        evm = [EvmEntry(source=WAVEFORM, name=OVERALL, constellation="", percent=percent)]
    ratios = () if fidelity.aclr is None else fidelity.aclr.ratios
    mask = fidelity.mask
    return replace(
        head,
        level_db=round(stimulus.level_db(probability), DIGITS),
        peak_db=round(stimulus.peak_db, DIGITS),
        evm=tuple(evm),
        aclr=tuple(
            AclrEntry(
                name=item.channel.name,
                offset_hz=item.channel.offset_hz,
                ratio_db=round(ratio_db(item.ratio_db), DIGITS),
                limit_db=item.channel.limit_db,
            )
            for item in ratios
        ),
        mask_margin_db=None if mask is None else round(mask.margin_db, DIGITS),
    )


def _evm_entries(result: EvmResult) -> list[EvmEntry]:
    return [
        EvmEntry(
            source=result.path,
            name=item.name,
            constellation=item.constellation,
            percent=round(item.percent, DIGITS),
        )
        for item in (result.overall, *result.classes)
    ]


@contextmanager
def set_up(
    loaded: LoadedRecipe,
    request: FidelityRequest,
    *,
    place: tuple[int, bool],
    probability: float,
    folder: Path,
    workers: int = 1,
    progress: Progress = silent,
) -> Iterator[Rig]:
    """Render what comes to the method, and fix what is measured.

    Parameters
    ----------
    loaded : LoadedRecipe
        A checked recipe; of two channels the first counts.
    request : FidelityRequest
        What is measured.
    place : (int, bool)
        Where the method stands among the stages, and whether one stands there that is exchanged.
    probability : float
        At which the level is read.
    folder : Path
        For the scratch file, until the context ends.
    workers, progress
        As in :func:`wavegen.core.render.render`.

    Yields
    ------
    Rig

    Raises
    ------
    RecipeError
        What cannot be honoured, at its path in the recipe.
    FileError
        The disk has not enough room.
    """
    cut = cut_chain(loaded, index=place[0], skips=int(place[1]))
    with held(
        cut.source, folder=folder, workers=workers, progress=progress, task="common data"
    ) as source:
        here = replace(cut, source=source)
        clean, _ = here.build(None)
        yield Rig(
            cut=here,
            clean=clean,
            plan=plan_fidelity(here.site, clean, with_mask(request, loaded)),
            probability=probability,
            workers=workers,
        )
