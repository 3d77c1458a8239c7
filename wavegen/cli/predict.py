"""`wavegen predict`: the power statistics that a recipe must have, without a sample."""

from __future__ import annotations

import argparse
from typing import Any

from wavegen.cli.console import Console
from wavegen.cli.options import add_overrides


class Predict:
    """The verb ``predict``."""

    summary = "say what a recipe's power statistics must be, without a sample"
    description = (
        "Print the levels that mathematics gives for a recipe at 10 % ... 1e-9, and the\n"
        "highest peak that can occur. What has no law says so by name."
    )

    @staticmethod
    def arguments(parser: argparse.ArgumentParser) -> None:
        """Declare the arguments."""
        parser.add_argument("recipe", metavar="RECIPE", help="a file, or a shipped recipe's name")
        add_overrides(parser)

    @staticmethod
    def run(arguments: argparse.Namespace, console: Console) -> int:
        """Predict and print."""
        from wavegen.production.predict import predict
        from wavegen.recipe.find import find_recipe
        from wavegen.recipe.load import load_recipe

        loaded = load_recipe(find_recipe(arguments.recipe), overrides=tuple(arguments.overrides))
        document = predict(loaded)
        if arguments.json:
            console.document(document)
        else:
            show(document, console)
        return 0


def show(document: dict[str, Any], console: Console) -> None:
    """Print one prediction."""
    from wavegen.reports.tables import law_table

    for note in (*document["rounded"], *document["warnings"]):
        console.warn(f"{note['where']}: {note['text']}")
    title = document["title"] or document["name"]
    if document["law"] is None:
        console.line(f"{title}: no law. {document['no_law']}.")
        return
    console.table(law_table(document["law"], title=title))
