"""Walk 1: recipe -> signals -> strips -> meters and scratch -> files, verified."""

from __future__ import annotations

import hashlib
from collections.abc import Collection, Sequence
from concurrent.futures import Executor
from contextlib import ExitStack
from dataclasses import dataclass
from fractions import Fraction
from pathlib import Path
from typing import Any

from wavegen import __version__
from wavegen.core.allocation import keep_large_blocks
from wavegen.core.errors import RecipeError
from wavegen.core.progress import Progress, silent
from wavegen.core.site import Note
from wavegen.core.stored import Scratch
from wavegen.files import FORMATS, markers
from wavegen.files.atomic import Drafts
from wavegen.files.faults import told
from wavegen.files.format import FileFacts, Format, distinct_stems
from wavegen.production.bench import (
    PathLevel,
    check_risks,
    generator_level,
    path_levels,
    refuse_overload,
)
from wavegen.production.best_loop import best_loop
from wavegen.production.doubts import doubts_of_files, doubts_of_mean, refuse_unresolved
from wavegen.production.export import Channel, ExportedFile, export
from wavegen.production.intermediate import (
    folded_db,
    notes_of_folding,
    snapped_centre,
    spectrum_of,
)
from wavegen.production.judgement import (
    DEFAULT,
    Question,
    check_question,
    data_samples_of,
    judge_files,
    law_of,
)
from wavegen.production.marking import markers_of
from wavegen.production.prepare import Prepared, prepare
from wavegen.production.scaling import gain_for
from wavegen.production.short_patterns import short_patterns
from wavegen.production.side_information import choice_taps, side_names, side_rows, side_tables
from wavegen.production.sidecar import as_csv, as_json, describe
from wavegen.production.stimulus_document import MadeChannel, stimulus_document
from wavegen.production.waveform import Waveform, render_loop
from wavegen.recipe.load import LoadedRecipe


@dataclass(frozen=True, slots=True, kw_only=True)
class Made:
    """What `make` left behind.

    Parameters
    ----------
    folder : Path
        Where the files are.
    files : tuple of Path
        Every file, sidecars last.
    document : dict
        The sidecar.
    loaded : LoadedRecipe
        What was made: with the seed that was kept, where several were tried.
    """

    folder: Path
    files: tuple[Path, ...]
    document: dict[str, Any]
    loaded: LoadedRecipe

    @property
    def differs(self) -> bool:
        """Whether a file differs from the law of one of its channels."""
        laws = [self.document["law"], (self.document["second_channel"] or {}).get("law")]
        return any(law is not None and law["verdict"] == "differs" for law in laws)


@dataclass(frozen=True, slots=True)
class Target:
    """One file to write: who writes it, what it says, and where."""

    form: Format
    facts: FileFacts
    names: tuple[str, ...]
    drafts: tuple[Path, ...]
    where: str
    centre_hz: Fraction | None = None


def make(
    loaded: LoadedRecipe,
    *,
    out: Path,
    overwrite: bool = False,
    question: Question = DEFAULT,
    best_of: int = 1,
    accepted_risks: Collection[str] = (),
    workers: int = 1,
    executor: Executor | None = None,
    progress: Progress = silent,
) -> Made:
    """Make the files of a recipe, measured and compared with their law.

    Parameters
    ----------
    loaded : LoadedRecipe
        A checked recipe.
    out : Path
        Files go to ``out/NAME/``, NAME the recipe file's stem.
    overwrite : bool
        Whether files that exist are replaced.
    question : Question
        What *agrees* means, and how far down.
    best_of : int
        Seeds that are tried, from that of the recipe on; the loop nearest the law is made.
    accepted_risks : collection of str
        Ratings of the bench, as ``cable.peak_limit``, that may be exceeded; it is recorded.
    workers : int
        Threads, or strips in flight where ``executor`` is given.
    executor : concurrent.futures.Executor, optional
        Who renders.
    progress : Progress
        Told how far the work has come.

    Returns
    -------
    Made

    Raises
    ------
    ArgumentsError
        A question that means nothing, no law to be near to, or no such rating.
    RecipeError
        What cannot be honoured.
    FileError
        An output exists, or the disk refuses. Nothing half-written is left.
    TargetMissed
        A rating of the bench would be exceeded; nothing is written.
    """
    keep_large_blocks()
    check_question(question)
    check_risks(accepted_risks, loaded.recipe.bench)
    tried = None
    if best_of > 1:
        found = best_loop(
            loaded,
            n_tries=best_of,
            down_to=question.down_to,
            workers=workers,
            executor=executor,
            progress=progress,
        )
        loaded, tried = found.loaded, found.rows
    prepared = prepare(loaded)
    laws = [law_of(channel) for channel in prepared.channels]
    prepared.notes.extend(short_patterns(prepared.channels, laws, down_to=question.down_to))
    with Drafts(out / loaded.name, overwrite=overwrite) as drafts:
        targets = plan_files(prepared, drafts)
        sidecar = drafts.add(f"{loaded.name}.ccdf.json")
        curve = drafts.add(f"{loaded.name}.ccdf.csv")
        marks = drafts.add(f"{loaded.name}{markers.SUFFIX}")
        has_choices = any(choice_taps(channel.built.signal) for channel in prepared.channels)
        beside = {name: drafts.add(name) for name in side_names(loaded.name) if has_choices}
        with ExitStack() as stack:
            waveforms = [
                render_loop(
                    channel.built,
                    stack.enter_context(_scratch(channel, drafts.folder)),
                    cycle_samples=channel.cycle_samples,
                    workers=workers,
                    executor=executor,
                    progress=progress,
                )
                for channel in prepared.channels
            ]
            for channel, waveform in zip(prepared.channels, waveforms, strict=True):
                prepared.notes.extend(doubts_of_mean(channel, waveform))
            gain = gain_for(loaded, waveforms)
            _refuse_unresolved(loaded, waveforms, gain, targets)
            prepared.notes.extend(_doubts_of_folding(loaded, waveforms, targets))
            levels = bench_levels(loaded, waveforms)
            exceeded = refuse_overload(levels, accepted=accepted_risks)
            written = [
                Channel(
                    signal=waveform.signal,
                    bursts=waveform.bursts,
                    data_samples=data_samples_of(law, waveform.signal, workers=workers),
                )
                for waveform, law in zip(waveforms, laws, strict=True)
            ]
            files = [_export(target, written, gain, workers, progress) for target in targets]
        prepared.notes.extend(doubts_of_files(files))
        channels = [
            MadeChannel(
                prepared=channel,
                waveform=waveforms[number],
                law=laws[number],
                judgements=tuple(judge_files(laws[number], files, number, question)),
            )
            for number, channel in enumerate(prepared.channels)
        ]
        choices = [one for waveform in waveforms for one in waveform.choices]
        side_texts = dict(zip(beside, side_tables(choices), strict=False))
        document = stimulus_document(
            channels,
            files=files,
            gain=gain,
            levels=levels,
            exceeded=exceeded,
            best_of=tried,
            side_information=side_rows(side_texts),
        )
        texts = {sidecar: as_json(document), curve: as_csv(document)}
        texts[marks] = markers.markers_text(targets[0].facts.annotations)
        texts |= {beside[name]: text for name, text in side_texts.items()}
        for path, text in texts.items():
            with told(path):
                path.write_text(text, encoding="utf-8", newline="\n")
    names = [name for target in targets for name in target.names]
    names += [f"{loaded.name}{end}" for end in (".ccdf.json", ".ccdf.csv", markers.SUFFIX)]
    names += beside
    folder = out / loaded.name
    return Made(
        folder=folder,
        files=tuple(folder / name for name in names),
        document=document,
        loaded=loaded,
    )


def _scratch(channel: Prepared, folder: Path) -> Scratch:
    return Scratch(
        folder=folder,
        sample_rate_hz=channel.site.sample_rate_hz,
        n_samples=channel.site.n_samples,
    )


def _refuse_unresolved(
    loaded: LoadedRecipe, waveforms: Sequence[Waveform], gain: float, targets: Sequence[Target]
) -> None:
    datatypes = [target.facts.datatype for target in targets]
    for number, waveform in enumerate(waveforms):
        name = f"of channel {number}" if len(waveforms) > 1 else ""
        refuse_unresolved(loaded, waveform, gain, datatypes, name)


def _doubts_of_folding(
    loaded: LoadedRecipe, waveforms: Sequence[Waveform], targets: Sequence[Target]
) -> list[Note]:
    """Return what real files fold back; refuse what they would spoil."""
    asked = [target for target in targets if target.centre_hz is not None]
    if not asked:
        return []
    notes = []
    for waveform in waveforms:
        power = spectrum_of(waveform.signal, waveform.statistics)
        for target in asked:
            assert target.centre_hz is not None  # noqa: S101 - chosen above
            folded = folded_db(
                power,
                centre_hz=target.centre_hz,
                sample_rate_hz=waveform.signal.sample_rate_hz,
            )
            try:
                notes += notes_of_folding(folded, centre_hz=target.centre_hz, where=target.where)
            except RecipeError as error:
                raise loaded.resolve(error) from error
    return notes


def bench_levels(loaded: LoadedRecipe, waveforms: Sequence[Waveform]) -> list[PathLevel]:
    """Return the levels along the bench's path, of every channel; empty without a bench."""
    bench = loaded.recipe.bench
    if bench is None:
        return []
    over = bench.averaged_over
    means = [waveform.mean_over_db(over) for waveform in waveforms]
    found = []
    for number, waveform in enumerate(waveforms):
        levels = path_levels(
            bench,
            waveform.papr_over(over),
            over_first_db=means[number] - means[0],
            channel=number if len(waveforms) > 1 else None,
            burst_s=waveform.longest_burst_s,
            burst_over_average_db=waveform.mean_over_db("burst") - means[number],
        )
        found += [generator_level(bench, levels), *levels]
    return found


def _export(
    target: Target,
    channels: Sequence[Channel],
    gain: float,
    workers: int,
    progress: Progress,
) -> ExportedFile:
    return export(
        channels,
        gain=gain,
        form=target.form,
        facts=target.facts,
        names=target.names,
        drafts=target.drafts,
        centre_hz=target.centre_hz,
        workers=workers,
        progress=progress,
    )


def plan_files(prepared: Prepared, drafts: Drafts) -> list[Target]:
    """Choose formats, names and temporary paths; refuse what a format cannot hold.

    Raises
    ------
    FileError
        An output exists, or a format has no room for the rate, the length or the channels.
    RecipeError
        No file is asked for, or an intermediate frequency leaves no room.
    """
    loaded = prepared.loaded
    rate_hz, n_samples = loaded.recipe.sample_rate_hz, prepared.site.n_samples
    annotations = markers.checked_markers(
        markers_of(prepared), n_samples=n_samples, where=f"{loaded.name}{markers.SUFFIX}"
    )
    requests = loaded.recipe.output.iq
    forms: list[Format] = [FORMATS.load(wanted.format)() for wanted in requests]
    datatypes = [wanted.chosen() for wanted in requests]
    stems = distinct_stems(
        loaded.name, zip(forms, datatypes, (wanted.name for wanted in requests), strict=True)
    )
    targets = []
    for number, (form, wanted) in enumerate(zip(forms, requests, strict=True)):
        where = f"output.iq[{number}]"
        facts = FileFacts(
            sample_rate_hz=rate_hz,
            n_samples=n_samples,
            datatype=datatypes[number],
            title=loaded.recipe.title,
            description=describe(prepared),
            generator=f"wavegen {__version__}",
            annotations=annotations,
            recipe_sha512=hashlib.sha512(loaded.text.encode()).hexdigest(),
            n_channels=len(prepared.channels),
        )
        form.check(facts, where)
        names = form.files(stems[number], facts.datatype)
        centre_hz = None
        centre_where = f"{where}.real.centre"
        if wanted.real is not None:
            try:
                centre_hz, notes = snapped_centre(
                    wanted.real.centre_hz,
                    sample_rate_hz=rate_hz,
                    n_samples=n_samples,
                    where=centre_where,
                )
            except RecipeError as error:
                raise loaded.resolve(error) from error
            prepared.notes.extend(notes)
        paths = tuple(drafts.add(name) for name in names)
        targets.append(Target(form, facts, names, paths, centre_where, centre_hz))
    if not targets:
        raise loaded.resolve(
            RecipeError(
                where="output.iq",
                problem="no file is asked for",
                allowed=", ".join(FORMATS),
                remedy="Name at least one format.",
            )
        )
    return targets
