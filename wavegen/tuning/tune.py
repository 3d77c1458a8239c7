"""Walk 3: recipe and limits -> common data -> search -> confirmation -> tuned recipe."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import AbstractContextManager, contextmanager
from dataclasses import dataclass, replace
from fractions import Fraction
from pathlib import Path

from wavegen.core.allocation import keep_large_blocks
from wavegen.core.errors import FileError, RecipeError
from wavegen.core.progress import Progress, silent
from wavegen.core.site import Note, StageSettings
from wavegen.core.units import format_s
from wavegen.files.atomic import Drafts
from wavegen.files.faults import told
from wavegen.production.chain_cut import crest_place
from wavegen.production.prepare import find_loop
from wavegen.recipe.load import LoadedRecipe
from wavegen.recipe.settings import Duration, Extent
from wavegen.stages.amplifier import Amplifier
from wavegen.stages.device.measured_amplifier import read_amplifier
from wavegen.tuning.amplified_rig import AmplifiedRig
from wavegen.tuning.confirm import Confirmation, confirm
from wavegen.tuning.contest import Contest, chosen_kinds, refuse_unsuited
from wavegen.tuning.evaluation import Evaluation
from wavegen.tuning.journal import Journal, key_of
from wavegen.tuning.reference import Reference, find_reference
from wavegen.tuning.request import TuneRequest
from wavegen.tuning.results import Tuned
from wavegen.tuning.rig import Rig, set_up
from wavegen.tuning.search import Goal
from wavegen.tuning.space import REFERENCE, Space, space_of
from wavegen.tuning.trials import Trials
from wavegen.tuning.written import tuned_text

LONGEST_SAMPLES = 1 << 22
"""A loop longer than this is searched on a shorter one of the same recipe."""
SEARCH_SHARE = 0.7
"""Of the time there is; the rest is for the reference."""
MOST_CONFIRMATIONS = 4
GUARD_STEP_DB = 0.02
"""Margin taken in hand beyond what was missing on other data."""

Place = tuple[int, bool]
AnyRig = Rig | AmplifiedRig


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Workshop:
    """What a tune works with.

    Parameters
    ----------
    loaded : LoadedRecipe
        The recipe, shortened where it is long.
    request : TuneRequest
        What was asked for.
    place : (int, bool)
        Where the method stands, and whether one stands there already.
    amplifier : Amplifier or None
        At the end of the chain.
    goal : Goal
        When a search is content.
    folder : Path
        For files and scratch.
    workers : int
        Threads.
    """

    loaded: LoadedRecipe
    request: TuneRequest
    place: Place
    amplifier: Amplifier | None
    goal: Goal
    folder: Path
    workers: int

    @contextmanager
    def rigs(self, seed: int, progress: Progress = silent) -> Iterator[tuple[Rig, AnyRig]]:
        """Set up a rig on the data of a seed, and what stands behind it: itself or an amplifier."""
        recipe = replace(self.loaded.recipe, seed=seed)
        with set_up(
            replace(self.loaded, recipe=recipe),
            self.request.fidelity,
            place=self.place,
            probability=self.request.probability,
            folder=self.folder,
            workers=self.workers,
            progress=progress,
        ) as rig:
            if self.amplifier is None:
                yield rig, rig
                return
            yield (
                rig,
                AmplifiedRig(
                    rig=rig,
                    amplifier=self.amplifier,
                    limits=self.request.limits,
                    goal=self.goal,
                    folder=self.folder,
                ),
            )

    @contextmanager
    def _bench(self, seed: int) -> Iterator[AnyRig]:
        with self.rigs(seed) as (_, bench):
            yield bench

    def fresh(self, seed: int) -> AbstractContextManager[AnyRig]:
        """Return a bench on the data of a seed."""
        return self._bench(seed)

    def confirm(self, best: Evaluation, stage: StageSettings) -> Confirmation:
        """Try settings on other data."""
        return confirm(
            best,
            stage,
            fresh=self.fresh,
            limits=self.request.limits,
            seed=self.loaded.recipe.seed,
            probability=self.request.probability,
        )


def tune(
    loaded: LoadedRecipe,
    request: TuneRequest,
    *,
    out: Path,
    overwrite: bool = False,
    workers: int = 1,
    progress: Progress = silent,
) -> Tuned:
    """Search the settings of crest-factor reduction that serve best within limits.

    Parameters
    ----------
    loaded : LoadedRecipe
        A checked recipe; of two channels the first is tuned.
    request : TuneRequest
        Limits, methods, time.
    out : Path
        Files go to ``out/NAME/``: ``NAME-tuned.yaml`` and ``NAME.tuning.json``.
    overwrite : bool
        Whether files that exist are replaced. The record of the same recipe and data is gone on
        with in any case.
    workers : int
        Threads.
    progress : Progress
        Told after each trial, in milliseconds of the time there is.

    Returns
    -------
    Tuned
        ``best`` is None where no method keeps the limits; there is no tuned recipe then.

    Raises
    ------
    RecipeError
        What cannot be honoured, at ``file:line:column``.
    ArgumentsError
        No such method or channels; no limit for the constellations in use.
    FileError
        An output exists, the disk refuses, or the amplifier's points cannot be read.
    SignalError
        The sample rate does not hold the channels or the mask.
    """
    keep_large_blocks()
    kinds = chosen_kinds(request.methods)
    amplifier = None if request.device is None else read_amplifier(request.device)
    folder = out / loaded.name
    target = folder / f"{loaded.name}-tuned.yaml"
    refuse_existing(target, overwrite=overwrite)
    with Drafts(folder):
        pass  # makes the folder
    try:
        short, notes = shortened(loaded)
        shop = Workshop(
            loaded=short,
            request=request,
            place=crest_place(loaded.recipe.stages),
            amplifier=amplifier,
            goal=Goal(),
            folder=folder,
            workers=workers,
        )
        journal = Journal(
            folder / f"{loaded.name}.tuning.json", key_of(short, request), overwrite=overwrite
        )
        tuned, stage = _search(shop, journal, kinds, notes, progress)
    except RecipeError as error:
        raise loaded.resolve(error) from error
    if stage is not None:
        text = tuned_text(loaded, stage, shop.place, folder=folder)
        _write(text, target, overwrite=overwrite)
        tuned = replace(tuned, files=(target.name, *tuned.files))
    tuned = replace(tuned, loaded=loaded)
    journal.write(tuned.document())
    return tuned


def _search(
    shop: Workshop,
    journal: Journal,
    kinds: tuple[str, ...],
    notes: list[Note],
    progress: Progress,
) -> tuple[Tuned, StageSettings | None]:
    """Search, confirm, and find the reference; return the best settings too."""
    request = shop.request
    present = shop.loaded.recipe.stages[shop.place[0]] if shop.place[1] else None
    with shop.rigs(shop.loaded.recipe.seed, progress) as (rig, bench):
        before = bench.untouched()
        request.limits.margins(before)  # refuses limits that nothing of this signal has
        trials = Trials(bench=bench, journal=journal, limits=request.limits, progress=progress)
        trials.begin(request.seconds)

        def space(kind: str) -> Space | str:
            return space_of(
                kind, present, band_hz=rig.plan.band.width_hz, highest_db=before.peak_db
            )

        spaces = {kind: space(kind) for kind in kinds}
        refuse_unsuited(spaces)
        contest = Contest(
            trials=trials,
            spaces=spaces,
            goal=shop.goal,
            is_monotone=shop.amplifier is None,
        )
        methods = contest.run(before, share=SEARCH_SHARE)
        best = methods[0].best if methods[0].state == "kept" else None
        confirmation = None
        if best is not None:
            best, confirmation = confirmed(shop, bench, contest, best)
            methods[0] = replace(methods[0], best=best)
        reference = None
        if best is not None and shop.amplifier is None:
            trials.allow(max(trials.left(), (1 - SEARCH_SHARE) * request.seconds))
            reference = _reference(trials, space(REFERENCE), best)
        channels = "" if rig.plan.channels is None else rig.plan.channels.name
        notes += rig.plan.notes
        stage = None if best is None else contest.stage_of(best)
        if stage is not None:
            path = f"stages[{shop.place[0]}]"
            notes += [note for note in rig.cut.build(stage)[1] if note.where.startswith(path)]
    tuned = Tuned(
        loaded=shop.loaded,
        request=request,
        before=before,
        methods=tuple(methods),
        best=best,
        confirmation=confirmation,
        reference=reference,
        evaluations=journal.evaluations,
        n_resumed=journal.n_resumed,
        notes=tuple(notes),
        channels=channels,
        folder=shop.folder,
        files=(journal.path.name,),
    )
    return tuned, stage


def _reference(trials: Trials, space: Space | str, best: Evaluation) -> Reference | None:
    if isinstance(space, str) or best.evm_percent <= 0:
        return None
    return find_reference(
        trials, space, evm_percent=best.evm_percent, start_db=max(best.level_db - 0.1, 0.5)
    )


def confirmed(
    shop: Workshop, bench: AnyRig, contest: Contest, best: Evaluation
) -> tuple[Evaluation, Confirmation]:
    """Try the best on other data, and with more margin in hand while it does not hold there.

    Parameters
    ----------
    shop : Workshop
        Sets up other data.
    bench : Rig or AmplifiedRig
        On the data of the search.
    contest : Contest
        Its methods.
    best : Evaluation
        What was found.

    Returns
    -------
    best : Evaluation
        What was tried last.
    confirmation : Confirmation
        Of that.
    """
    limits = shop.request.limits
    found = shop.confirm(best, contest.stage_of(best))
    for _ in range(MOST_CONFIRMATIONS - 1):
        if found.verdict in {"confirmed", "no_other_data"}:
            break
        missing = found.shortage_db + GUARD_STEP_DB
        following: Evaluation | None
        if best.input_dbm is not None:  # less drive: a dB of it gives two of margin, or more
            lower = replace(best, input_dbm=best.input_dbm - missing / 2)
            following = bench.repeat(lower, contest.stage_of(best))[0]
        else:
            guard = limits.margin_db(best) + missing
            following = contest.tighten(best, guard_db=guard, seconds=shop.request.seconds)
        if following is None:
            break
        best = following
        found = shop.confirm(best, contest.stage_of(best))
    return best, found


def _write(text: str, target: Path, *, overwrite: bool) -> None:
    with Drafts(target.parent, overwrite=overwrite) as drafts:
        draft = drafts.add(target.name)
        with told(draft):
            draft.write_text(text, encoding="utf-8")


def refuse_existing(path: Path, *, overwrite: bool) -> None:
    """Refuse an output that exists, before anything is searched.

    Raises
    ------
    FileError
        It exists and may not be replaced.
    """
    if path.exists() and not overwrite:
        raise FileError(
            where=str(path),
            problem="exists already",
            allowed="new names; a file that exists is kept",
            remedy="Give --overwrite to replace it, or choose another output folder.",
        )


def shortened(loaded: LoadedRecipe) -> tuple[LoadedRecipe, list[Note]]:
    """Return a recipe with a loop short enough to be searched on.

    Parameters
    ----------
    loaded : LoadedRecipe
        Of any length.

    Returns
    -------
    loaded : LoadedRecipe
        Itself where its loop has 2^22 samples or fewer, or cannot be shorter.
    notes : list of Note
        One where it is shorter.
    """
    cycle, sites = find_loop(loaded)
    site = sites[0][1]
    if site.n_samples <= LONGEST_SAMPLES or cycle.n_samples > LONGEST_SAMPLES:
        return loaded, []
    n_samples = LONGEST_SAMPLES // cycle.n_samples * cycle.n_samples
    extent = Extent(value=Fraction(n_samples), unit="samples")
    recipe = replace(loaded.recipe, duration=Duration(at=extent))
    text = (
        f"searched on a loop of {format_s(float(n_samples / recipe.sample_rate_hz))} instead of "
        f"{format_s(float(site.n_samples / recipe.sample_rate_hz))}: the tuned recipe keeps its "
        "duration"
    )
    return replace(loaded, recipe=recipe), [Note(kind="info", where="duration", text=text)]
