"""`wavegen make`: stimulus files from recipes, measured and verified."""

from __future__ import annotations

import argparse
from pathlib import Path
from typing import TYPE_CHECKING, Any

from wavegen.cli.console import Console
from wavegen.cli.options import add_overrides, add_workers
from wavegen.cli.question_options import add_question, tries
from wavegen.core.errors import ArgumentsError

if TYPE_CHECKING:
    from wavegen.reports.stimulus_reports import Wanted

DIFFERS = 5


class Make:
    """The verb ``make``."""

    summary = "make stimulus files from recipes, measured and verified"
    description = (
        "Make the files of one or more recipes. Everything of a recipe goes to OUT/NAME/:\n"
        "the stimulus in each format asked for, and one sidecar NAME.ccdf.json and\n"
        "NAME.ccdf.csv with the power statistics of what was written."
    )
    examples = (
        "wavegen make valley-cell-20mhz",
        "wavegen make harbour-link-qpsk --set 'duration=20 ms' --out trial",
    )

    @staticmethod
    def arguments(parser: argparse.ArgumentParser) -> None:
        """Declare the arguments."""
        parser.add_argument(
            "recipes", nargs="+", metavar="RECIPE", help="a file, or a shipped recipe's name"
        )
        parser.add_argument(
            "--out", type=Path, default=Path("output"), metavar="DIR", help="default: output"
        )
        parser.add_argument("--overwrite", action="store_true", help="replace files that exist")
        add_question(parser)
        parser.add_argument(
            "--best-of",
            type=tries,
            metavar="K",
            default=1,
            help="try K seeds and make the loop whose levels lie nearest the law",
        )
        parser.add_argument(
            "--accept-risk",
            action="append",
            default=[],
            metavar="STAGE.RATING",
            help="let this one rating of the bench be exceeded, such as cable.peak_limit; recorded",
        )
        group = parser.add_argument_group("beside the files")
        group.add_argument(
            "--figures", action="store_true", help="pictures of the stimulus, as SVG and PNG"
        )
        group.add_argument("--report", action="store_true", help="a page that opens in any browser")
        group.add_argument(
            "--bench-sheet",
            action="store_true",
            help="a page to take to the bench: what to set, levels, ratings, order of work",
        )
        add_overrides(parser)
        add_workers(parser)

    @staticmethod
    def run(arguments: argparse.Namespace, console: Console) -> int:
        """Make the files and print what they measure."""
        from wavegen.core.allocation import keep_large_blocks

        keep_large_blocks()
        from wavegen.production.judgement import Question
        from wavegen.production.make import make
        from wavegen.recipe.find import find_recipe
        from wavegen.recipe.load import load_recipe

        if arguments.figures or arguments.report or arguments.bench_sheet:
            from wavegen.reports.stimulus_reports import refuse_beforehand, write_stimulus_reports

        loaded = [
            load_recipe(find_recipe(name), overrides=tuple(arguments.overrides))
            for name in arguments.recipes
        ]
        refuse_same_name([recipe.name for recipe in loaded])
        wanted = _wanted(arguments)
        if wanted is not None:
            for recipe in loaded:
                folder = arguments.out / recipe.name
                refuse_beforehand(recipe, wanted, folder, overwrite=arguments.overwrite)
        documents = []
        differs = False
        progress = console.progress()
        for recipe in loaded:
            try:
                made = make(
                    recipe,
                    out=arguments.out,
                    overwrite=arguments.overwrite,
                    question=Question(tolerance_db=arguments.tolerance, down_to=arguments.down_to),
                    best_of=arguments.best_of,
                    accepted_risks=arguments.accept_risk,
                    workers=arguments.workers,
                    progress=progress,
                )
                console.keep(str(made.folder))
                beside = []
                if wanted is not None:
                    beside = write_stimulus_reports(
                        made,
                        wanted,
                        overwrite=arguments.overwrite,
                        workers=arguments.workers,
                        progress=progress,
                    )
            finally:
                progress.close()
            differs = differs or made.differs
            document = {"folder": str(made.folder), **made.document}
            documents.append(document)
            if not arguments.json:
                show(document, console)
                if beside:
                    console.line(f"Beside them: {', '.join(beside)}.")
        if arguments.json:
            console.document(documents[0] if len(documents) == 1 else documents)
        return DIFFERS if differs else 0


def _wanted(arguments: argparse.Namespace) -> Wanted | None:
    """Return what is to be written beside the files, None if nothing is."""
    if not (arguments.figures or arguments.report or arguments.bench_sheet):
        return None
    from wavegen.reports.stimulus_reports import Wanted

    return Wanted(figures=arguments.figures, report=arguments.report, sheet=arguments.bench_sheet)


def refuse_same_name(names: list[str]) -> None:
    """Refuse two recipes that would write into one folder, before any is made.

    Raises
    ------
    ArgumentsError
        The name that occurs twice.
    """
    for number, name in enumerate(names):
        if name.casefold() in [other.casefold() for other in names[:number]]:
            raise ArgumentsError(
                where="RECIPE",
                problem=f"two recipes are called {name}, and both would go to one folder",
                allowed="recipes of different names",
                remedy="Name each once, or make them with a different --out.",
            )


def show(document: dict[str, Any], console: Console) -> None:
    """Print one stimulus: files, figures, levels, levels along the bench."""
    from wavegen.reports.tables import (
        bench_table,
        channel_table,
        file_table,
        level_table,
        process_table,
        summary_table,
        verdict_lines,
    )

    for note in (*document["rounded"], *document["warnings"]):
        change = f" (asked {note['asked']}, got {note['given']})" if "given" in note else ""
        console.warn(f"{note['where']}: {note['text']}{change}")
    title = document["title"] or document["recipe"]["name"]
    console.table(summary_table(document, title=title))
    console.table(level_table(document))
    against = process_table(document["law"])
    if against:
        console.table(against)
    for line in verdict_lines(document):
        console.line(line)
    channels = channel_table(document)
    if channels:
        console.table(channels)
    bench = bench_table(document)
    if bench:
        console.table(bench)
        console.line(document["safety"])
    console.line(f"In {document['folder']}:")
    console.table(file_table(document))
