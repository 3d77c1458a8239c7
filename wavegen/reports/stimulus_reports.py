"""Pictures, report page and bench sheet of a stimulus that was made, beside its files."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import Any

from wavegen.core.errors import ArgumentsError, FileError
from wavegen.core.progress import Progress, silent
from wavegen.core.signal import Signal
from wavegen.production.bench_sheet import bench_sheet, sheet_facts
from wavegen.production.make import Made
from wavegen.production.prepare import Prepared, prepare
from wavegen.production.subject_files import open_subject
from wavegen.production.views import views_of
from wavegen.recipe.load import LoadedRecipe
from wavegen.reports import bench_sheet as sheets
from wavegen.reports.figures.look import check_installed
from wavegen.reports.figures.stimulus import pictures_of
from wavegen.reports.pages.stimulus import stimulus_page
from wavegen.reports.written import write_page, write_pictures
from wavegen.stages.channel.gate import on_time

REPORT, SHEET = ".report.html", ".bench.html"
_CREST = "wavegen.stages.crest."


@dataclass(frozen=True, slots=True, kw_only=True)
class Wanted:
    """What is to be written beside the files.

    Parameters
    ----------
    figures, report, sheet : bool
        Pictures, the report page, the bench sheet.
    """

    figures: bool = False
    report: bool = False
    sheet: bool = False


def refuse_beforehand(
    loaded: LoadedRecipe, wanted: Wanted, folder: Any, *, overwrite: bool
) -> None:
    """Refuse what could not be written after the files were made.

    Raises
    ------
    ArgumentsError
        A bench sheet of a recipe that has no bench, or what draws is not installed.
    FileError
        A page that exists.
    """
    check_installed()
    if wanted.sheet and loaded.recipe.bench is None:
        raise ArgumentsError(
            where="--bench-sheet",
            problem=f"{loaded.name} has no bench",
            allowed="recipes that say what is on the bench",
            remedy="Add bench: with average_power_at_device and path to the recipe.",
        )
    for is_wanted, ending in ((wanted.report, REPORT), (wanted.sheet, SHEET)):
        path = folder / f"{loaded.name}{ending}"
        if is_wanted and path.exists() and not overwrite:
            raise FileError(
                where=str(path),
                problem="exists already",
                allowed="new names; a file that exists is kept",
                remedy="Give --overwrite to replace it, or choose another output folder.",
            )


def write_stimulus_reports(
    made: Made,
    wanted: Wanted,
    *,
    overwrite: bool = False,
    workers: int = 1,
    progress: Progress = silent,
) -> list[str]:
    """Write what is wanted, and return the names of the files.

    Parameters
    ----------
    made : Made
        From :func:`wavegen.production.make.make`.
    wanted : Wanted
        What.
    overwrite : bool
        Whether files that exist are replaced.
    workers, progress
        As in :func:`wavegen.core.render.render`.

    Returns
    -------
    list of str
        All in the folder of the stimulus.

    Raises
    ------
    FileError
        As raised while reading and writing.
    ArgumentsError
        What draws is not installed.
    """
    document, name = made.document, made.loaded.name
    written: list[str] = []
    sheet = None
    prepared = prepare(made.loaded)
    subject = open_subject(made.folder / document["files"][0]["name"])
    if wanted.sheet or (wanted.report and made.loaded.recipe.bench is not None):
        sheet = _sheet(made, prepared, subject.signal, workers, progress)
    if wanted.sheet and sheet is not None:
        path = made.folder / f"{name}{SHEET}"
        written.append(write_page(sheets.sheet_page(sheet), path, overwrite=overwrite))
    if not (wanted.figures or wanted.report):
        return written
    views = views_of(
        subject.signal,
        loops=True,
        graph=prepared.built.signal,
        bursts=on_time(prepared.built.signal),
        workers=workers,
        progress=progress,
    )
    pictures = pictures_of(document, views, title=document["title"] or name)
    if wanted.figures:
        written += write_pictures(pictures, made.folder, name, overwrite=overwrite)
    if wanted.report:
        page = stimulus_page(document, pictures)
        if sheet is not None:
            page = replace(page, sections=(*page.sections, *sheets.sections(sheet)))
        path = made.folder / f"{name}{REPORT}"
        written.append(write_page(page, path, overwrite=overwrite))
    return written


def _sheet(
    made: Made, prepared: Prepared, signal: Signal, workers: int, progress: Progress
) -> dict[str, Any]:
    bench = made.loaded.recipe.bench
    assert bench is not None  # noqa: S101 - asked by both callers
    facts = sheet_facts(
        signal,
        mean_power=10 ** (made.document["mean_dbfs"] / 10),
        bursts=on_time(prepared.built.signal),
        unreduced=without_reduction(made.loaded),
        workers=workers,
        progress=progress,
    )
    return bench_sheet(bench, made.document, facts)


def without_reduction(loaded: LoadedRecipe) -> Signal | None:
    """Return the signal of a recipe without crest-factor reduction, None if there is none in it.

    Parameters
    ----------
    loaded : LoadedRecipe
        Its stages are looked at; those of the parts of a sum are left as they are.
    """
    stages: Sequence[Any] = loaded.recipe.stages
    kept = tuple(stage for stage in stages if not type(stage).__module__.startswith(_CREST))
    if len(kept) == len(stages):
        return None
    return prepare(replace(loaded, recipe=replace(loaded.recipe, stages=kept))).built.signal
