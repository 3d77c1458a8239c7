"""`wavegen show`: what a file or a recipe says about itself."""

from __future__ import annotations

import argparse
from pathlib import Path
from typing import Any

from wavegen.cli.console import Console
from wavegen.cli.options import add_overrides, add_reading, hints_of, is_recipe, refuse_reading
from wavegen.cli.progress import ConsoleProgress
from wavegen.core.errors import ArgumentsError


class Show:
    """The verb ``show``."""

    summary = "show what a file, a sidecar or a recipe says about itself"
    description = (
        "Show format, rate, length and level as a file's header or sidecar says, and\n"
        "whether its bytes are those that were described; the loop, the roundings and\n"
        "the parts of a recipe; the summary of a sidecar, or of the folder it is in; the\n"
        "range of a CCDF curve. Nothing is measured (see `wavegen measure`) or rendered."
    )
    examples = ("wavegen show output/valley-cell-20mhz", "wavegen show valley-cell-clipped")

    @staticmethod
    def arguments(parser: argparse.ArgumentParser) -> None:
        """Declare the arguments."""
        parser.add_argument(
            "subject",
            metavar="FILE",
            help="a data file, a sidecar or its folder, a CCDF curve in CSV, or a recipe",
        )
        add_reading(parser)
        add_overrides(parser)

    @staticmethod
    def run(arguments: argparse.Namespace, console: Console) -> int:
        """Describe and print."""
        progress = console.progress()
        try:
            document = _document(arguments, progress)
        finally:
            progress.close()
        if arguments.json:
            console.document(document)
        else:
            show(document, console)
        return 0


def _document(arguments: argparse.Namespace, progress: ConsoleProgress) -> dict[str, Any]:
    from wavegen.production import show as room
    from wavegen.production.prepare import prepare
    from wavegen.production.stimulus import find_stimulus
    from wavegen.recipe.find import find_recipe
    from wavegen.recipe.load import load_recipe

    if is_recipe(arguments.subject):
        refuse_reading(arguments, "a recipe says itself what it is")
        loaded = load_recipe(find_recipe(arguments.subject), overrides=tuple(arguments.overrides))
        return room.show_recipe(prepare(loaded))
    if arguments.overrides:
        raise ArgumentsError(
            where="--set",
            problem="a file has no recipe to change",
            allowed="--set with a recipe",
            remedy="Leave it out.",
        )
    path = Path(arguments.subject)
    if room.is_sidecar(path):
        refuse_reading(arguments, "a sidecar says itself what it is")
        return room.show_sidecar(find_stimulus(path))
    hints = hints_of(arguments)
    if hints.format is None and room.is_curve(path):
        return room.show_curve(path)
    return room.show_recording(path, hints, progress=progress)


def show(document: dict[str, Any], console: Console) -> None:
    """Print one description."""
    from wavegen.reports import inspection

    for note in document["warnings"]:
        console.warn(note if isinstance(note, str) else f"{note['where']}: {note['text']}")
    for note in document.get("rounded", ()):
        change = f" (asked {note['asked']}, got {note['given']})" if "given" in note else ""
        console.warn(f"{note['where']}: {note['text']}{change}")
    console.table(inspection.facts_table(document))
    tree = inspection.tree_table(document)
    if tree:
        console.table(tree)
    files = inspection.listed_files(document)
    if files:
        console.table(files)
