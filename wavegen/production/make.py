"""Walk 1: recipe -> signals -> strips -> meters and scratch -> files, verified."""

from __future__ import annotations

import hashlib
from concurrent.futures import Executor
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from wavegen import __version__
from wavegen.core.allocation import keep_large_blocks
from wavegen.core.errors import RecipeError
from wavegen.core.progress import Progress, silent
from wavegen.core.stored import Scratch
from wavegen.files import FORMATS, markers
from wavegen.files.atomic import Drafts
from wavegen.files.faults import told
from wavegen.files.format import FileFacts, Format, pick_datatype
from wavegen.production.bench import path_levels, refuse_overload
from wavegen.production.doubts import doubts_of_files, doubts_of_mean, refuse_unresolved
from wavegen.production.export import ExportedFile, export
from wavegen.production.marking import markers_of
from wavegen.production.prepare import Prepared, prepare
from wavegen.production.scaling import gain_for
from wavegen.production.sidecar import as_csv, as_json, describe, stimulus_document
from wavegen.production.verify import law_of, worst_verdict
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
    """

    folder: Path
    files: tuple[Path, ...]
    document: dict[str, Any]

    @property
    def differs(self) -> bool:
        """Whether a file differs from the law."""
        law = self.document["law"]
        return law is not None and law["verdict"] == "differs"


@dataclass(frozen=True, slots=True)
class Target:
    """One file to write: who writes it, what it says, and where."""

    form: Format
    facts: FileFacts
    names: tuple[str, ...]
    drafts: tuple[Path, ...]


def make(
    loaded: LoadedRecipe,
    *,
    out: Path,
    overwrite: bool = False,
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
    RecipeError
        What cannot be honoured.
    FileError
        An output exists, or the disk refuses. Nothing half-written is left.
    TargetMissed
        A rating of the bench would be exceeded; nothing is written.
    """
    keep_large_blocks()
    prepared = prepare(loaded)
    with Drafts(out / loaded.name, overwrite=overwrite) as drafts:
        targets = plan_files(prepared, drafts)
        sidecar = drafts.add(f"{loaded.name}.ccdf.json")
        curve = drafts.add(f"{loaded.name}.ccdf.csv")
        marks = drafts.add(f"{loaded.name}{markers.SUFFIX}")
        with Scratch(
            folder=drafts.folder,
            sample_rate_hz=loaded.recipe.sample_rate_hz,
            n_samples=prepared.site.n_samples,
        ) as scratch:
            waveform = render_loop(
                prepared.built,
                scratch,
                cycle_samples=prepared.cycle_samples,
                workers=workers,
                executor=executor,
                progress=progress,
            )
            prepared.notes.extend(doubts_of_mean(prepared, waveform))
            gain = gain_for(loaded, waveform)
            refuse_unresolved(loaded, waveform, gain, [t.facts.datatype for t in targets])
            bench = loaded.recipe.bench
            levels = path_levels(bench, waveform.papr_over(bench.averaged_over)) if bench else []
            refuse_overload(levels)
            files = [_export(target, waveform, gain, workers, progress) for target in targets]
        prepared.notes.extend(doubts_of_files(files))
        law = law_of(prepared)
        document = stimulus_document(
            prepared,
            waveform,
            files=files,
            gain=gain,
            law=law,
            verdict=worst_verdict(law, files),
            levels=levels,
        )
        texts = {sidecar: as_json(document), curve: as_csv(document)}
        texts[marks] = markers.markers_text(targets[0].facts.annotations)
        for path, text in texts.items():
            with told(path):
                path.write_text(text, encoding="utf-8")
    names = [name for target in targets for name in target.names]
    names += [f"{loaded.name}{end}" for end in (".ccdf.json", ".ccdf.csv", markers.SUFFIX)]
    folder = out / loaded.name
    return Made(folder=folder, files=tuple(folder / name for name in names), document=document)


def _export(
    target: Target, waveform: Waveform, gain: float, workers: int, progress: Progress
) -> ExportedFile:
    return export(
        waveform.signal,
        gain=gain,
        form=target.form,
        facts=target.facts,
        names=target.names,
        drafts=target.drafts,
        bursts=waveform.bursts,
        workers=workers,
        progress=progress,
    )


def plan_files(prepared: Prepared, drafts: Drafts) -> list[Target]:
    """Choose formats, names and temporary paths; refuse what a format cannot hold.

    Raises
    ------
    FileError
        An output exists, or a format has no room for the rate or the length.
    RecipeError
        A format does not write a datatype.
    """
    loaded = prepared.loaded
    annotations = markers_of(prepared)
    targets = []
    for number, wanted in enumerate(loaded.recipe.output.iq):
        form: Format = FORMATS.load(wanted.format)()
        where = f"output.iq[{number}]"
        facts = FileFacts(
            sample_rate_hz=loaded.recipe.sample_rate_hz,
            n_samples=prepared.site.n_samples,
            datatype=pick_datatype(form, wanted.datatype, where),
            title=loaded.recipe.title,
            description=describe(prepared),
            generator=f"wavegen {__version__}",
            annotations=annotations,
            recipe_sha512=hashlib.sha512(loaded.text.encode()).hexdigest(),
        )
        form.check(facts, where)
        names = form.files(wanted.name or loaded.name, facts.datatype)
        targets.append(Target(form, facts, names, tuple(drafts.add(name) for name in names)))
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
