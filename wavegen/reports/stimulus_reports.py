"""Pictures, report page and bench sheet of a stimulus that was made, beside its files."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from fractions import Fraction
from typing import Any

from wavegen.core.errors import ArgumentsError, FileError
from wavegen.core.progress import Progress, silent
from wavegen.core.signal import Signal
from wavegen.files.format import ReadHints
from wavegen.production.bench_sheet import bench_sheet, sheet_facts
from wavegen.production.chain_cut import CONVERTER, CREST, DEVICE, shelf_of
from wavegen.production.make import Made
from wavegen.production.prepare import Prepared, prepare
from wavegen.production.subject_files import open_subject
from wavegen.production.views import views_of
from wavegen.recipe.load import LoadedRecipe
from wavegen.reports import bench_sheet as sheets
from wavegen.reports.figures.look import check_installed
from wavegen.reports.figures.picture import Picture
from wavegen.reports.figures.stimulus import pictures_of
from wavegen.reports.pages.stimulus import stimulus_page
from wavegen.reports.written import write_page, write_pictures
from wavegen.stages.channel.gate import on_time

REPORT, SHEET = ".report.html", ".bench.html"
_SUFFIXES = ("", "-second")
"""Behind the names of pictures of the first and the second channel."""
_BEFORE = {
    CREST: "before its peaks are reduced",
    DEVICE: "before the device",
    CONVERTER: "before the converter",
}


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
    name = made.loaded.name
    channels = _channels(made)
    how: dict[str, Any] = {"workers": workers, "progress": progress}
    written: list[str] = []
    found: list[dict[str, Any]] = []
    if wanted.sheet or (wanted.report and made.loaded.recipe.bench is not None):
        found = [_sheet(made, channel, how) for channel in channels]
    if wanted.sheet and found:
        path = made.folder / f"{name}{SHEET}"
        written.append(write_page(sheets.sheet_page(found), path, overwrite=overwrite))
    if not (wanted.figures or wanted.report):
        return written
    pictures = [item for channel in channels for item in _pictures(made, channel, how)]
    if wanted.figures:
        written += write_pictures(pictures, made.folder, name, overwrite=overwrite)
    if wanted.report:
        sheet = sheets.sections(found) if found else ()
        page = stimulus_page(made.document, pictures, sheet=sheet)
        path = made.folder / f"{name}{REPORT}"
        written.append(write_page(page, path, overwrite=overwrite))
    return written


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class _Channel:
    """One channel of what was made.

    Parameters
    ----------
    number, count : int
        Which of how many.
    document : dict
        The sidecar, as it would be about this channel alone.
    prepared : Prepared
        Its recipe.
    signal : Signal
        Its samples in the first file.
    """

    number: int
    count: int
    document: dict[str, Any]
    prepared: Prepared
    signal: Signal


def _channels(made: Made) -> list[_Channel]:
    prepared = prepare(made.loaded).channels
    entry = made.document["files"][0]
    found = []
    for number, channel in enumerate(prepared):
        document = made.document
        if number:
            document = document | document["second_channel"] | entry["channels"][number]
        if len(prepared) > 1:
            document = document | {"channel": number}
        hints = ReadHints(
            datatype=entry["datatype"] if entry["format"] == "raw" else None,
            sample_rate_hz=Fraction(document["sample_rate_exact_hz"]),
            channel=number if len(prepared) > 1 else None,
        )
        subject = open_subject(made.folder / entry["name"], hints)
        found.append(
            _Channel(
                number=number,
                count=len(prepared),
                document=document,
                prepared=channel,
                signal=subject.signal,
            )
        )
    return found


def _pictures(made: Made, channel: _Channel, how: dict[str, Any]) -> list[Picture]:
    graph = channel.prepared.built.signal
    real = made.document["files"][0]["real"]
    views = views_of(
        channel.signal,
        loops=True,
        graph=graph,
        bursts=on_time(graph),
        mask=made.loaded.recipe.mask,
        centre_hz=real["centre_hz"] if real else 0.0,
        before=_before(made.loaded, channel.prepared, channel.number),
        **how,
    )
    title = made.document["title"] or made.loaded.name
    if channel.count > 1:
        title = f"Channel {channel.number}: {title}"
    return pictures_of(channel.document, views, title=title, suffix=_SUFFIXES[channel.number])


def _sheet(made: Made, channel: _Channel, how: dict[str, Any]) -> dict[str, Any]:
    bench = made.loaded.recipe.bench
    assert bench is not None  # noqa: S101 - asked by the caller
    mean_db = channel.document["mean_dbfs"]
    unreduced = without(made.loaded, (CREST,))
    facts = sheet_facts(
        channel.signal,
        mean_power=10 ** (mean_db / 10),
        bursts=on_time(channel.prepared.built.signal),
        unreduced=None if unreduced is None else unreduced.channels[channel.number].built.signal,
        **how,
    )
    return bench_sheet(bench, channel.document, facts, first=made.document)


def _before(loaded: LoadedRecipe, channel: Prepared, number: int) -> tuple[str, Signal] | None:
    """Return a channel before all that acts on its peaks, and in words; None if nothing does."""
    shelves = {shelf_of(stage) for stage in channel.loaded.recipe.stages}
    removed = [shelf for shelf in _BEFORE if shelf in shelves]
    if not removed:
        return None
    prepared = without(loaded, removed)
    assert prepared is not None  # noqa: S101 - there is something to leave out
    return _BEFORE[removed[0]], prepared.channels[number].built.signal


def without(loaded: LoadedRecipe, shelves: Sequence[str]) -> Prepared | None:
    """Return a recipe without the stages of some shelves, None if there are none in it.

    Parameters
    ----------
    loaded : LoadedRecipe
        Its stages, and those of its second channel; those of the parts of a sum are left as they
        are.
    shelves : sequence of str
        ``crest``, ``device``, ``converter``.
    """

    def kept(stages: Sequence[Any]) -> tuple[Any, ...]:
        return tuple(stage for stage in stages if shelf_of(stage) not in shelves)

    recipe, second = loaded.recipe, loaded.recipe.second_channel
    if second is not None:
        second = replace(second, stages=kept(second.stages))
    changed = replace(recipe, stages=kept(recipe.stages), second_channel=second)
    return None if changed == recipe else prepare(replace(loaded, recipe=changed))
