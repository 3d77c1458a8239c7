"""`wavegen measure`: the power statistics of files or of a recipe."""

from __future__ import annotations

import argparse
from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any

from wavegen.cli.console import Console
from wavegen.cli.measure_options import (
    add_gate,
    add_levels,
    add_part,
    add_sensor,
    settings_of,
)
from wavegen.cli.options import (
    add_overrides,
    add_reading,
    add_workers,
    hints_of,
    is_recipe,
    refuse_reading,
)
from wavegen.cli.progress import ConsoleProgress
from wavegen.cli.report_options import add_reports, are_wanted, report_measurement
from wavegen.core.errors import ArgumentsError

if TYPE_CHECKING:
    from wavegen.meters.mask import SpectralMask
    from wavegen.production.measure_settings import MeasureSettings
    from wavegen.production.subject import Subject
    from wavegen.production.views import Views

DONE, UNDECIDED = 0, 6


class Measure:
    """The verb ``measure``."""

    summary = "measure the power statistics of files or of a recipe"
    description = (
        "Measure mean, peaks and the CCDF of recordings, of stimulus files, or of what a\n"
        "recipe would make. A file with a sidecar is a loop; any other is a recording\n"
        "unless --loop or --period says otherwise. Two statements are made: what these\n"
        "samples are, exactly; and what is known of the process that they sample, in\n"
        "intervals. Several files count as one population. Exit status 6 if none of the\n"
        "levels asked for with --at is resolved."
    )
    examples = (
        "wavegen measure output/valley-cell-20mhz/valley-cell-20mhz.sigmf-meta",
        "wavegen measure harbour-link-qpsk --at 0.001% --above 4dB",
    )

    @staticmethod
    def arguments(parser: argparse.ArgumentParser) -> None:
        """Declare the arguments."""
        parser.add_argument(
            "subjects",
            nargs="+",
            metavar="FILE|RECIPE",
            help="data files of one sample rate, or one recipe by file or name",
        )
        add_reading(parser)
        add_part(parser)
        add_levels(parser)
        add_gate(parser)
        add_sensor(parser)
        add_reports(parser)
        add_overrides(parser)
        add_workers(parser)

    @staticmethod
    def run(arguments: argparse.Namespace, console: Console) -> int:
        """Measure and print."""
        from wavegen.core.allocation import keep_large_blocks

        keep_large_blocks()
        settings = settings_of(arguments)
        are_wanted(arguments)
        progress = console.progress()
        try:
            if any(is_recipe(subject) for subject in arguments.subjects):
                document, subjects, mask = _recipe(arguments, settings, progress)
            else:
                document, subjects = _files(arguments, settings, progress)
                mask = None
            said: list[str] = []
            if are_wanted(arguments):
                views = _views(arguments, subjects, mask, progress)
                said = report_measurement(arguments, document, views)
        finally:
            progress.close()
        if arguments.json:
            console.document(document)
        else:
            show(document, console)
            for line in said:
                console.line(line)
        return status_of(document, arguments.at)


def status_of(document: dict[str, Any], asked: list[float]) -> int:
    """Return 6 where levels were asked for and the data are too few for any of them."""
    if document["is"] == "this loop" or not asked:
        return DONE
    resolved = [row["resolved"] for row in document["levels"] if row["probability"] in asked]
    return DONE if any(resolved) else UNDECIDED


def _views(
    arguments: argparse.Namespace,
    subjects: Sequence[Subject],
    mask: SpectralMask | None,
    progress: ConsoleProgress,
) -> Views | None:
    """Return the material for pictures of one subject; of several there is no one signal."""
    if len(subjects) != 1:
        return None
    from wavegen.production.views import views_of

    subject = subjects[0]
    return views_of(
        subject.signal,
        loops=subject.loops,
        graph=subject.signal if is_recipe(arguments.subjects[0]) else None,
        bursts=subject.bursts,
        mask=mask,
        is_power=subject.is_power,
        workers=arguments.workers,
        progress=progress,
    )


def _recipe(
    arguments: argparse.Namespace, settings: MeasureSettings, progress: ConsoleProgress
) -> tuple[dict[str, Any], list[Subject], SpectralMask | None]:
    from wavegen.production.measure import measure_recipe
    from wavegen.production.prepare import prepare
    from wavegen.production.subject import Subject
    from wavegen.recipe.find import find_recipe
    from wavegen.recipe.load import load_recipe
    from wavegen.stages.channel.gate import on_time

    problem = "a recipe is measured as the whole loop that it makes"
    if len(arguments.subjects) > 1:
        raise ArgumentsError(
            where=next(item for item in arguments.subjects if is_recipe(item)),
            problem="is a recipe, and other things are to be measured with it",
            allowed="one recipe, or data files as one population",
            remedy="Measure it by itself.",
        )
    refuse_reading(argparse.Namespace(**vars(arguments) | {"channel": None}), problem)
    for option in ("reference_level", "first", "stop", "period", "loop", "remove_dc", "marker"):
        given = getattr(arguments, option)
        if given is not None and given is not False:
            name = {"first": "from", "stop": "to"}.get(option, option.replace("_", "-"))
            raise _misfit(where=f"--{name}", problem=problem)
    if settings.gate is not None and settings.gate.by == "markers":
        text = "a recipe has no markers: its own gate is shown anyway"
        raise _misfit(where="--gate markers", problem=text)
    (subject,) = arguments.subjects
    loaded = load_recipe(find_recipe(subject), overrides=tuple(arguments.overrides))
    channels = prepare(loaded).channels
    chosen = arguments.channel
    if (chosen is None and len(channels) > 1) or not 0 <= (chosen or 0) < len(channels):
        raise ArgumentsError(
            where="--channel",
            problem=f"the recipe has {len(channels)} channel{'s' if len(channels) > 1 else ''}"
            + ("" if chosen is None else f", and channel {chosen} is asked for"),
            allowed="one at a time: " + ("0 or 1" if len(channels) > 1 else "0"),
            remedy="Add --channel 0, or another." if len(channels) > 1 else "Leave it out.",
        )
    prepared = channels[chosen or 0]
    document = measure_recipe(
        prepared, settings=settings, workers=arguments.workers, progress=progress
    )
    signal = prepared.built.signal
    seen = Subject(name=loaded.name, signal=signal, loops=True, bursts=on_time(signal))
    told = {"channel": chosen} if len(channels) > 1 else {}
    return document | told, [seen], loaded.recipe.mask


def _misfit(*, where: str, problem: str) -> ArgumentsError:
    return ArgumentsError(
        where=where,
        problem=problem,
        allowed="this option with a data file",
        remedy="Leave it out, or change the recipe with --set.",
    )


def _files(
    arguments: argparse.Namespace, settings: MeasureSettings, progress: ConsoleProgress
) -> tuple[dict[str, Any], list[Subject]]:
    from wavegen.production.measure import measure
    from wavegen.production.subject_files import FilePart, open_subject

    if arguments.overrides:
        raise ArgumentsError(
            where="--set",
            problem="a data file has no recipe to change",
            allowed="--set with a recipe",
            remedy="Leave it out.",
        )
    part = FilePart(
        first=arguments.first,
        stop=arguments.stop,
        period=arguments.period,
        loops=arguments.loop,
    )
    hints = hints_of(arguments)
    reads_markers = settings.gate is not None and settings.gate.by == "markers"
    subjects = [
        open_subject(Path(name), hints, part, reads_markers=reads_markers)
        for name in arguments.subjects
    ]
    document = measure(*subjects, settings=settings, workers=arguments.workers, progress=progress)
    return document, subjects


def show(document: dict[str, Any], console: Console) -> None:
    """Print one measurement."""
    from wavegen.production.sidecar import SAFETY
    from wavegen.reports.measurement import lines, tables

    for note in (*document.get("rounded", ()), *document["warnings"]):
        console.warn(f"{note['where']}: {note['text']}")
    for table in tables(document):
        console.table(table)
    for line in lines(document):
        console.line(line)
    if "mean_dbm" in document:
        console.line(SAFETY)
