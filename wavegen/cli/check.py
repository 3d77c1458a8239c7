"""`wavegen check`: a stimulus against its sidecar."""

from __future__ import annotations

import argparse
from pathlib import Path
from typing import Any

from wavegen.cli.console import Console
from wavegen.cli.options import add_workers, tolerance_db
from wavegen.cli.question_options import add_question, question_of

STATUS = {"match": 0, "differ": 5, "undecided": 6}
UNREADABLE = 4


class Check:
    """The verb ``check``."""

    summary = "check a stimulus against its sidecar"
    description = (
        "Check that files are still what their sidecar says: by their SHA-512, and where\n"
        "that differs, by measuring them as a loop; and how they compare with the law of\n"
        "their recipe. A folder or a sidecar stands for all files that it lists, a data\n"
        "file for itself. Exit status: 0 match, 5 differ (from the sidecar or the law),\n"
        "6 undecided, 4 if a file is missing or cannot be read."
    )
    examples = ("wavegen check output/valley-cell-20mhz",)

    @staticmethod
    def arguments(parser: argparse.ArgumentParser) -> None:
        """Declare the arguments."""
        parser.add_argument(
            "stimulus", type=Path, metavar="STIMULUS", help="a folder, a sidecar or a data file"
        )
        parser.add_argument(
            "--tolerance",
            type=tolerance_db,
            metavar="LEVEL",
            default=None,
            help="largest difference that matches (default: 0.05dB, more than rounding makes)",
        )
        add_question(parser, tolerance="--law-tolerance", is_stated=True)
        add_workers(parser)

    @staticmethod
    def run(arguments: argparse.Namespace, console: Console) -> int:
        """Compare and print."""
        from wavegen.core.allocation import keep_large_blocks

        keep_large_blocks()
        from wavegen.production.check import TOLERANCE_DB, check
        from wavegen.production.stimulus import find_stimulus

        progress = console.progress()
        try:
            document = check(
                find_stimulus(arguments.stimulus),
                tolerance_db=TOLERANCE_DB if arguments.tolerance is None else arguments.tolerance,
                question=question_of(arguments.law_tolerance, arguments.down_to),
                workers=arguments.workers,
                progress=progress,
            )
        finally:
            progress.close()
        if arguments.json:
            console.document(document)
        else:
            show(document, console)
        for row in document["files"]:
            if not row["is_readable"]:
                console.fail("; ".join(row["reasons"]))
        if not document["is_complete"]:
            return UNREADABLE
        return STATUS["differ" if document["differs_from_law"] else document["verdict"]]


def show(document: dict[str, Any], console: Console) -> None:
    """Print one check."""
    from wavegen.reports.inspection import check_table, law_lines, verdict_words

    for row in document["files"]:
        for warning in row["warnings"]:
            console.warn(f"{row['name']}: {warning}")
    console.table(check_table(document))
    for row in document["files"]:
        for reason in row["reasons"] if row["is_readable"] else ():
            console.line(f"{row['name']}: {reason}.")
    for line in law_lines(document):
        console.line(line)
    console.line(verdict_words(document))
