"""`wavegen shape`: a stimulus from the field's spectrum and CCDF."""

from __future__ import annotations

import argparse
from pathlib import Path
from typing import Any

from wavegen.cli.check import STATUS
from wavegen.cli.console import Console
from wavegen.cli.measure_options import add_gate, add_part, gate_of, span
from wavegen.cli.options import (
    add_overrides,
    add_reading,
    add_workers,
    hints_of,
    is_recipe,
    rate,
    refuse_reading,
    tolerance_db,
    whole,
)
from wavegen.cli.report_options import add_reports, are_wanted, compared
from wavegen.core.errors import ArgumentsError

MOST_SEED = 2**63 - 1


class Shape:
    """The verb ``shape``."""

    summary = "make a stimulus with a field signal's spectrum and power statistics"
    description = (
        "Make a new stimulus with the spectrum and the CCDF of a field signal, and none\n"
        "of its content. The field is a recording, a stimulus or a recipe; or a CCDF\n"
        "curve in CSV, with --bandwidth and --sample-rate. A DC offset, fill words and\n"
        "start-up are left out. With --gate the on-time is followed, and a regular gate\n"
        "of the same duty goes on top. OUT/NAME/ gets the recipe (to edit and make\n"
        "again), the curve and the spectrum that it follows, and what `wavegen make`\n"
        "writes. Exit status: 0 if every level lies within the tolerance, else 5: then\n"
        "the files are the nearest found."
    )
    examples = ("wavegen shape output/valley-cell-20mhz/valley-cell-20mhz.sigmf-meta",)

    @staticmethod
    def arguments(parser: argparse.ArgumentParser) -> None:
        """Declare the arguments."""
        parser.add_argument("field", metavar="FIELD", help="what is followed")
        parser.add_argument("--name", metavar="NAME", help="default: that of the field, -shaped")
        parser.add_argument(
            "--out", type=Path, default=Path("output"), metavar="DIR", help="default: output"
        )
        parser.add_argument("--overwrite", action="store_true", help="replace files that exist")
        parser.add_argument(
            "--duration",
            type=span,
            metavar="TIME",
            help="length of the loop (default: that of the field, 1048576 samples at most)",
        )
        parser.add_argument("--seed", type=whole, default=1, metavar="N", help="default: 1")
        parser.add_argument(
            "--bandwidth",
            type=rate,
            metavar="FREQUENCY",
            help="a flat spectrum of this width in place of the field's",
        )
        parser.add_argument(
            "--tolerance",
            type=tolerance_db,
            metavar="LEVEL",
            help="what a level may be off by (default: 0.05dB)",
        )
        parser.add_argument("--keep-dc", action="store_true", help="follow a DC offset too")
        add_reports(parser, has_overwrite=True)
        add_workers(parser)
        add_overrides(parser)
        add_reading(parser)
        add_part(parser)
        add_gate(parser)

    @staticmethod
    def run(arguments: argparse.Namespace, console: Console) -> int:
        """Shape a stimulus and print how near it came."""
        from wavegen.comparison.shape import TOLERANCE_DB, ShapeSettings, shape
        from wavegen.recipe.names import LONGEST

        are_wanted(arguments)
        field = _field(arguments)
        name = arguments.name or f"{Path(field.subject).name.partition('.')[0]}-shaped"
        _check_name(name)
        settings = ShapeSettings(
            name=name,
            title=f"In the shape of {Path(field.subject).name}"[:LONGEST],
            seed=_seed(arguments.seed),
            duration=arguments.duration,
            bandwidth_hz=arguments.bandwidth,
            sample_rate_hz=field.hints.sample_rate_hz,
            tolerance_db=TOLERANCE_DB if arguments.tolerance is None else arguments.tolerance,
        )
        document = compared(
            arguments,
            console,
            lambda progress: shape(
                field,
                settings,
                out=arguments.out,
                overwrite=arguments.overwrite,
                workers=arguments.workers,
                progress=progress,
            ),
            show,
        )
        return STATUS[document["verdict"]]


def _field(arguments: argparse.Namespace) -> Any:
    from wavegen.comparison.side import SideSettings
    from wavegen.production.subject_files import FilePart

    if is_recipe(arguments.field):
        refuse_reading(arguments, "a recipe is no file to be read")
        return SideSettings(
            subject=arguments.field, is_recipe=True, overrides=tuple(arguments.overrides)
        )
    return SideSettings(
        subject=arguments.field,
        hints=hints_of(arguments),
        part=FilePart(
            first=arguments.first,
            stop=arguments.stop,
            period=arguments.period,
            loops=arguments.loop,
        ),
        gate=gate_of(arguments),
        removes_offset=not arguments.keep_dc,
        overrides=tuple(arguments.overrides),
    )


def _check_name(name: str) -> None:
    from wavegen.core.units import QuantityError
    from wavegen.recipe.names import check_name

    try:
        check_name(name)
    except QuantityError as error:
        raise ArgumentsError(
            where="--name",
            problem=error.problem,
            allowed=error.allowed,
            remedy=error.remedy,
        ) from error


def _seed(seed: int) -> int:
    if not 0 <= seed <= MOST_SEED:
        raise ArgumentsError(
            where="--seed",
            problem=f"{seed} is out of bounds",
            allowed=f"0 to {MOST_SEED}",
            remedy="Choose a seed within these bounds.",
        )
    return seed


def show(document: dict[str, Any], console: Console) -> None:
    """Print what came of it."""
    from wavegen.reports.shape import lines, tables

    for note in document["warnings"]:
        console.warn(f"{note['where']}: {note['text']}")
    for table in tables(document):
        console.table(table)
    console.line(f"In {document['folder']}.")
    for line in lines(document):
        console.line(line)
