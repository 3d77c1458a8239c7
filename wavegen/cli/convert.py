"""`wavegen convert`: a data file in another format, datatype, level or rate."""

from __future__ import annotations

import argparse
from pathlib import Path
from typing import Any

from wavegen.cli.console import Console, ConsoleProgress
from wavegen.cli.options import add_reading, add_workers, hints_of, level_dbfs, rate, ratio_db

DIFFERS = 5


class Convert:
    """The verb ``convert``."""

    summary = "write a data file in another format, datatype, level or rate"
    description = (
        "Write a data file anew, to OUT/NAME/. A stimulus stays the loop that its sidecar\n"
        "describes: it is written with a new sidecar, measured on the new codes. Any\n"
        "other file is a recording. --sample-rate is the rate of the output; a file that\n"
        "does not say its own rate is taken to have it already, unless\n"
        "--input-sample-rate says another."
    )

    @staticmethod
    def arguments(parser: argparse.ArgumentParser) -> None:
        """Declare the arguments."""
        parser.add_argument("file", type=Path, metavar="FILE", help="a recording or a stimulus")
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
        from wavegen.production.convert import Conversion, convert

        wanted = Conversion(
            format=arguments.to,
            datatype=arguments.datatype,
            bits=arguments.bits,
            align=arguments.align,
            peak_dbfs=arguments.peak,
            gain_db=arguments.gain or 0.0,
            sample_rate_hz=arguments.sample_rate,
            name=arguments.name,
        )
        progress = ConsoleProgress()
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
            show(document, console)
        return DIFFERS if made.differs else 0


def show(document: dict[str, Any], console: Console) -> None:
    """Print one conversion."""
    from wavegen.reports.inspection import converted_words
    from wavegen.reports.tables import file_table, level_table, summary_table, verdict_lines

    for note in document["warnings"]:
        console.warn(f"{note['where']}: {note['text']}")
    kind = document.get("is", "this loop")
    name = document["files"][0]["name"]
    console.line(f"Converted {converted_words(document['converted'])}.")
    console.table(summary_table(document, title=f"{name} ({kind})"))
    console.table(level_table(document))
    if document.get("is") != "a recording":
        for line in verdict_lines(document):
            console.line(line)
    console.line(f"In {document['folder']}:")
    console.table(file_table(document))
