"""`wavegen gain-curve`: a device's gain from two power distributions."""

from __future__ import annotations

import argparse
from dataclasses import replace
from pathlib import Path
from typing import Any

from wavegen.cli.check import STATUS
from wavegen.cli.console import Console
from wavegen.cli.options import add_workers
from wavegen.cli.report_options import add_reports, are_wanted, compared
from wavegen.cli.side_options import (
    add_sides,
    add_verdict,
    refuse_stray_overrides,
    side_of,
    verdict_of,
)
from wavegen.core.errors import ArgumentsError

SIDES = ("input", "output")


class GainCurve:
    """The verb ``gain-curve``."""

    summary = "find a device's gain curve from the power at its input and output"
    description = (
        "A device without memory whose output rises with its input maps level to level at\n"
        "equal probability: two CCDFs tell its gain, without alignment, also of different\n"
        "captures. Whole loops of one stimulus (--loop) are exact, other captures get\n"
        "intervals. Levels are absolute where --input-reference-level and\n"
        "--output-reference-level say what 0 dBFS is. Exit status: 0 linear within the\n"
        "tolerance, 5 not, 6 undecided."
    )
    examples = ("wavegen gain-curve valley-cell-20mhz valley-cell-clipped",)

    @staticmethod
    def arguments(parser: argparse.ArgumentParser) -> None:
        """Declare the arguments."""
        parser.add_argument("source", metavar="INPUT", help="what goes into the device")
        parser.add_argument("output", metavar="OUTPUT", help="what comes out of it")
        add_verdict(
            parser,
            tolerance="within this of each other the curves are those of a linear device",
            down_to="least probability at which that is looked at",
        )
        parser.add_argument(
            "--model",
            type=Path,
            metavar="FILE.csv",
            help="write the device as a table for `kind: measured_amplifier`",
        )
        parser.add_argument(
            "--model-from",
            choices=("points", "rapp"),
            default="points",
            help="as measured (default), or by the fitted Rapp curve",
        )
        parser.add_argument(
            "--overwrite", action="store_true", help="replace a file that exists already"
        )
        add_reports(parser, has_overwrite=True)
        add_workers(parser)
        add_sides(parser, SIDES)

    @staticmethod
    def run(arguments: argparse.Namespace, console: Console) -> int:
        """Measure and print."""
        from wavegen.comparison.gain_curve import GainSettings, gain_curve

        sides = (
            side_of(arguments, "input", arguments.source),
            side_of(arguments, "output", arguments.output),
        )
        refuse_stray_overrides(arguments, sides)
        draws = are_wanted(arguments)
        writes = draws or arguments.model is not None
        if (arguments.overwrite and not writes) or (
            arguments.model is None and arguments.model_from != "points"
        ):
            raise ArgumentsError(
                where="--overwrite/--model-from",
                problem="no file is written",
                allowed="these together with --model (or --overwrite with --report or --figures)",
                remedy="Add --model device.csv, or leave them out.",
            )
        settings = GainSettings(
            model=arguments.model,
            by_fit=arguments.model_from == "rapp",
            overwrite=arguments.overwrite,
        )
        settings = replace(settings, **verdict_of(arguments))
        document = compared(
            arguments,
            console,
            lambda progress: gain_curve(
                *sides, settings, workers=arguments.workers, progress=progress
            ),
            show,
        )
        return STATUS[document["verdict"]]


def show(document: dict[str, Any], console: Console) -> None:
    """Print one gain curve."""
    from wavegen.production.sidecar import SAFETY
    from wavegen.reports.gain_curve import gain_lines, gain_tables

    for note in document["warnings"]:
        console.warn(f"{note['where']}: {note['text']}")
    for table in gain_tables(document):
        console.table(table)
    for line in gain_lines(document):
        console.line(line)
    if any("peak_dbm" in document[side] for side in SIDES):
        console.line(SAFETY)
