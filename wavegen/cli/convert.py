"""`wavegen convert`: a data file in another format, datatype, level or rate."""

from __future__ import annotations

import argparse
from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any

from wavegen.cli.console import Console
from wavegen.cli.options import add_reading, add_workers, hints_of, level_dbfs, rate, ratio_db

if TYPE_CHECKING:
    from wavegen.core.site import Note

DIFFERS = 5


class Convert:
    """The verb ``convert``."""

    summary = "write a data file in another format, datatype, level or rate"
    description = (
        "Write a data file anew, to OUT/NAME/. A stimulus stays the loop that its sidecar\n"
        "describes: it is written with a new sidecar, measured on the new codes. Any\n"
        "other file is a recording. --sample-rate is the rate of the output; a file that\n"
        "does not say its own rate is taken to have it already, unless\n"
        "--input-sample-rate says another. Two channels stay together, on one scale,\n"
        "unless --channel names one. Real samples stay real unless a complex datatype is\n"
        "asked for; then they become complex baseband where their intermediate frequency\n"
        "is known, else their analytic signal around it."
    )
    examples = ("wavegen convert output/valley-cell-20mhz/valley-cell-20mhz.sigmf-data --to wav",)

    @staticmethod
    def arguments(parser: argparse.ArgumentParser) -> None:
        """Declare the arguments."""
        parser.add_argument(
            "file", type=Path, metavar="FILE", help="a recording, or a stimulus (its folder too)"
        )
        parser.add_argument("--to", required=True, metavar="FORMAT", help="such as sigmf or wav")
        parser.add_argument(
            "--datatype", metavar="NAME", help="such as cf32_le (default: the source's, if it can)"
        )
        parser.add_argument(
            "--bits", type=int, choices=(12, 14, 16), help="bits of words in 16-bit containers"
        )
        parser.add_argument(
            "--align", choices=("left", "right"), help="where shorter words shall stand"
        )
        parser.add_argument(
            "--real-centre",
            type=rate,
            metavar="FREQUENCY",
            help="real samples around this intermediate frequency, such as 30MHz",
        )
        parser.add_argument(
            "--input-real-centre",
            type=rate,
            metavar="FREQUENCY",
            help="where the carrier of a file of real samples stands (default: by its sidecar)",
        )
        level = parser.add_mutually_exclusive_group()
        level.add_argument(
            "--peak",
            type=level_dbfs,
            metavar="LEVEL",
            help="peak between samples, such as -1dBFS (default: the level stays)",
        )
        level.add_argument("--gain", type=ratio_db, metavar="RATIO", help="such as -3dB")
        parser.add_argument(
            "--sample-rate", type=rate, metavar="RATE", help="of the output, such as 30.72MHz"
        )
        parser.add_argument("--name", metavar="NAME", help="stem of the files")
        parser.add_argument(
            "--out", type=Path, default=Path("output"), metavar="DIR", help="default: output"
        )
        parser.add_argument("--overwrite", action="store_true", help="replace files that exist")
        add_reading(parser, before="input-")
        add_workers(parser)

    @staticmethod
    def run(arguments: argparse.Namespace, console: Console) -> int:
        """Convert and print what the new file measures."""
        from wavegen.core.allocation import keep_large_blocks

        keep_large_blocks()
        from wavegen.production.conversion import Conversion
        from wavegen.production.convert import convert

        wanted = Conversion(
            format=arguments.to,
            datatype=arguments.datatype,
            bits=arguments.bits,
            align=arguments.align,
            real_centre_hz=arguments.real_centre,
            input_real_centre_hz=arguments.input_real_centre,
            peak_dbfs=arguments.peak,
            gain_db=arguments.gain or 0.0,
            sample_rate_hz=arguments.sample_rate,
            name=arguments.name,
        )
        progress = console.progress()
        try:
            made = convert(
                arguments.file,
                wanted,
                hints=hints_of(arguments),
                out=arguments.out,
                overwrite=arguments.overwrite,
                workers=arguments.workers,
                progress=progress,
            )
        finally:
            progress.close()
        document = {"folder": str(made.folder), **made.document}
        if arguments.json:
            console.document(document)
        else:
            show(document, [note for note in made.notes if note.kind != "warning"], console)
        return DIFFERS if made.differs else 0


def show(document: dict[str, Any], notes: Sequence[Note], console: Console) -> None:
    """Print one conversion: its own notes, and the warnings that go along with the file."""
    from wavegen.reports.inspection import converted_words
    from wavegen.reports.tables import (
        channel_table,
        file_table,
        level_table,
        summary_table,
        verdict_lines,
    )

    for note in notes:
        change = f" (asked {note.asked}, got {note.given})" if note.given else ""
        console.warn(f"{note.where}: {note.text}{change}")
    for row in document["warnings"]:
        console.warn(f"{row['where']}: {row['text']}")
    kind = document.get("is", "this loop")
    name = document["files"][0]["name"]
    console.line(f"Converted {converted_words(document['converted'])}.")
    console.table(summary_table(document, title=f"{name} ({kind})"))
    console.table(level_table(document))
    if document.get("is") != "a recording":
        for line in verdict_lines(document):
            console.line(line)
    channels = channel_table(document)
    if channels:
        console.table(channels)
    console.line(f"In {document['folder']}:")
    console.table(file_table(document))
