"""`wavegen match`: a stimulus against the field."""

from __future__ import annotations

import argparse
from dataclasses import replace
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

SIDES = ("stimulus", "field")


class Match:
    """The verb ``match``."""

    summary = "compare the power statistics of a stimulus and of the field"
    description = (
        "Compare two CCDFs, level by level, with an interval for each difference. A side\n"
        "is a stimulus with its sidecar (this loop, exact), a recording (a sample of its\n"
        "process), a recipe (its law, or the loop that it makes), a sidecar, or a CCDF\n"
        "curve in CSV. Verdict: match, if the whole interval is within the tolerance at\n"
        "every probability from 50 % down; differ, if one is surely outside; else\n"
        "undecided, and how many more samples would decide. Either is wrong in at most\n"
        "5 % of the cases. Exit status: 0 match, 5 differ, 6 undecided."
    )
    examples = (
        "wavegen match output/valley-cell-20mhz valley-cell-20mhz",
        "wavegen match valley-cell-20mhz valley-cell-clipped --tolerance 0.5dB",
    )

    @staticmethod
    def arguments(parser: argparse.ArgumentParser) -> None:
        """Declare the arguments."""
        parser.add_argument("stimulus", metavar="STIMULUS", help="what is compared")
        parser.add_argument("field", metavar="FIELD", help="what it is compared with")
        add_verdict(
            parser,
            tolerance="largest difference that matches",
            down_to="least probability compared",
        )
        parser.add_argument(
            "--as-recorded",
            action="store_true",
            help="compare recordings as they stand, exactly, not as samples of what was recorded",
        )
        add_reports(parser)
        add_workers(parser)
        add_sides(parser, SIDES)

    @staticmethod
    def run(arguments: argparse.Namespace, console: Console) -> int:
        """Compare and print."""
        from wavegen.comparison.match import MatchSettings, match

        are_wanted(arguments)
        sides = (
            side_of(arguments, "stimulus", arguments.stimulus),
            side_of(arguments, "field", arguments.field),
        )
        refuse_stray_overrides(arguments, sides)
        settings = replace(
            MatchSettings(is_of_records=arguments.as_recorded), **verdict_of(arguments)
        )
        document = compared(
            arguments,
            console,
            lambda progress: match(*sides, settings, workers=arguments.workers, progress=progress),
            show,
        )
        return STATUS[document["verdict"]]


def show(document: dict[str, Any], console: Console) -> None:
    """Print one comparison."""
    from wavegen.reports.comparison import match_lines, match_tables

    for note in document["warnings"]:
        console.warn(f"{note['where']}: {note['text']}")
    for table in match_tables(document):
        console.table(table)
    for line in match_lines(document):
        console.line(line)
