"""`wavegen measure`: the power statistics of a file or a recipe."""

from __future__ import annotations

import argparse
from pathlib import Path
from typing import Any

from wavegen.cli.console import Console, ConsoleProgress
from wavegen.cli.options import (
    add_overrides,
    add_reading,
    add_workers,
    hints_of,
    is_recipe,
    level_dbm,
    place,
    refuse_reading,
)
from wavegen.core.errors import ArgumentsError


class Measure:
    """The verb ``measure``."""

    summary = "measure the power statistics of a file or a recipe"
    description = (
        "Measure mean, peaks and the CCDF of a recording, of a stimulus file, or of what\n"
        "a recipe would make. A file with a sidecar is a loop; any other is a recording\n"
        "unless --loop or --period says otherwise."
    )

    @staticmethod
    def arguments(parser: argparse.ArgumentParser) -> None:
        """Declare the arguments."""
        parser.add_argument(
            "subject", metavar="FILE|RECIPE", help="a data file, or a recipe by file or name"
        )
        add_reading(parser)
        parser.add_argument(
            "--reference-level",
            type=level_dbm,
            metavar="LEVEL",
            help="power at 0 dBFS, such as -20dBm",
        )
        parser.add_argument(
            "--from", dest="first", metavar="AT", help="first sample: 10ms or 4096samples"
        )
        parser.add_argument("--to", dest="stop", metavar="AT", help="where to stop (not included)")
        loops = parser.add_mutually_exclusive_group()
        loops.add_argument("--loop", action="store_true", help="the file repeats as a whole")
        loops.add_argument(
            "--period", metavar="N", help="it repeats after this time or number of samples"
        )
        add_overrides(parser)
        add_workers(parser)

    @staticmethod
    def run(arguments: argparse.Namespace, console: Console) -> int:
        """Measure and print."""
        from wavegen.core.allocation import keep_large_blocks

        keep_large_blocks()
        progress = ConsoleProgress()
        try:
            if is_recipe(arguments.subject):
                document = _recipe(arguments, progress)
            else:
                document = _file(arguments, progress)
        finally:
            progress.close()
        if arguments.json:
            console.document(document)
        else:
            show(document, console)
        return 0


def _recipe(arguments: argparse.Namespace, progress: ConsoleProgress) -> dict[str, Any]:
    from wavegen.production.measure import measure_recipe
    from wavegen.production.prepare import prepare
    from wavegen.recipe.find import find_recipe
    from wavegen.recipe.load import load_recipe

    problem = "a recipe is measured as the whole loop that it makes"
    refuse_reading(argparse.Namespace(**vars(arguments) | {"channel": None}), problem)
    for option in ("reference_level", "first", "stop", "period", "loop"):
        given = getattr(arguments, option)
        if given is not None and given is not False:
            name = {"first": "from", "stop": "to"}.get(option, option.replace("_", "-"))
            raise ArgumentsError(
                where=f"--{name}",
                problem=problem,
                allowed="this option with a data file",
                remedy="Leave it out, or change the recipe with --set.",
            )
    loaded = load_recipe(find_recipe(arguments.subject), overrides=tuple(arguments.overrides))
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
    document = measure_recipe(channels[chosen or 0], workers=arguments.workers, progress=progress)
    return document | ({"channel": chosen} if len(channels) > 1 else {})


def _file(arguments: argparse.Namespace, progress: ConsoleProgress) -> dict[str, Any]:
    from wavegen.core.excerpt import excerpt
    from wavegen.files.analytic import edge_text, looped
    from wavegen.files.read import open_recording
    from wavegen.production.measure import Subject, completed_hints, measure
    from wavegen.production.stimulus import mismatch, sidecar_of

    if arguments.overrides:
        raise ArgumentsError(
            where="--set",
            problem="a data file has no recipe to change",
            allowed="--set with a recipe",
            remedy="Leave it out.",
        )
    hints = hints_of(arguments)
    recording = open_recording(Path(arguments.subject), hints)
    sidecar = sidecar_of(recording)
    if sidecar is not None:
        name = recording.path.name
        entry = next(item for item in sidecar["files"] if item["name"] == name)
        completed = completed_hints(entry, recording, hints)
        if completed is not hints:
            recording = open_recording(Path(arguments.subject), completed)
    warnings = list(recording.warnings)
    if sidecar is not None:
        other = mismatch(recording, sidecar)
        if other is not None:
            sidecar = None
            warnings.append(other)
    rate_hz, n_samples = recording.sample_rate_hz, recording.n_samples
    first = place(arguments.first, rate_hz, "--from") or 0
    stop = place(arguments.stop, rate_hz, "--to")
    period = place(arguments.period, rate_hz, "--period")
    is_cut = first > 0 or stop is not None or period is not None
    stop = n_samples if stop is None else stop
    if period is not None:
        stop = min(stop, first + period)
    if not 0 <= first < stop <= n_samples or (period is not None and stop - first < period):
        raise ArgumentsError(
            where="--from/--to/--period",
            problem=f"samples {first} to {stop} are asked of {n_samples}",
            allowed=f"a stretch inside 0 to {n_samples} samples that is not empty",
            remedy="Correct the limits.",
        )
    loops = arguments.loop or period is not None or (sidecar is not None and not is_cut)
    if loops and recording.is_real:  # what follows the end is known
        ends = edge_text(recording.path, recording.n_samples)
        warnings = [text for text in warnings if text != ends]
    subject = Subject(
        name=recording.path.name,
        signal=looped(recording, first, stop) if loops else excerpt(recording.signal, first, stop),
        loops=loops,
        cycle_samples=sidecar["loop"]["cycle_samples"] if sidecar and not is_cut else None,
        reference_level_dbm=recording.reference_level_dbm,
        is_power=recording.is_power,
    )
    document = measure(subject, workers=arguments.workers, progress=progress)
    document |= {
        "file_format": recording.format,
        "datatype": recording.datatype.label,
        "is_real": recording.is_real,
    }
    if recording.n_channels > 1:
        document["channel"] = recording.channel
    document["warnings"] = [
        {"kind": "warning", "where": str(recording.path), "text": text} for text in warnings
    ]
    return document


def show(document: dict[str, Any], console: Console) -> None:
    """Print one measurement."""
    from wavegen.production.sidecar import SAFETY
    from wavegen.reports.tables import level_table, summary_table

    for note in (*document.get("rounded", ()), *document["warnings"]):
        console.warn(f"{note['where']}: {note['text']}")
    kind = ""
    if "file_format" in document:
        coded = "power series" if document["is_power"] else document["datatype"]
        kind = f"{document['file_format']} {coded}, "
    if "channel" in document:
        kind += f"channel {document['channel']}, "
    console.table(summary_table(document, title=f"{document['name']} ({kind}{document['is']})"))
    console.table(level_table(document))
    if "mean_dbm" in document:
        console.line(SAFETY)
