"""`wavegen predict`: the power statistics that a recipe must have, without a sample."""

from __future__ import annotations

import argparse
from typing import Any

from wavegen.cli.console import Console
from wavegen.cli.measure_options import probability
from wavegen.cli.options import add_overrides, ratio_db
from wavegen.core.errors import ArgumentsError


class Predict:
    """The verb ``predict``."""

    summary = "say what a recipe's power statistics must be, without a sample"
    description = (
        "Print the levels that mathematics gives for a recipe at 10 % ... 1e-9, and the\n"
        "highest peak that can occur; behind clips and amplifiers, EVM and ACLR of signals\n"
        "like Gaussian noise. What has no law says so by name. With --fault and --at, say\n"
        "how long a loop must be for its verdict to find such a fault."
    )
    examples = (
        "wavegen predict harbour-link-qpsk",
        "wavegen predict valley-cell-clipped --fault 0.1dB --at 0.1%",
    )

    @staticmethod
    def arguments(parser: argparse.ArgumentParser) -> None:
        """Declare the arguments."""
        parser.add_argument("recipe", metavar="RECIPE", help="a file, or a shipped recipe's name")
        parser.add_argument(
            "--fault",
            type=ratio_db,
            metavar="LEVEL",
            help="say how long a loop must be to show that a level is off by this; needs --at",
        )
        parser.add_argument(
            "--at",
            type=probability,
            metavar="P",
            help="probability of the level with the fault, such as 0.1%%",
        )
        add_overrides(parser)

    @staticmethod
    def run(arguments: argparse.Namespace, console: Console) -> int:
        """Predict and print."""
        from wavegen.production.predict import predict
        from wavegen.recipe.find import find_recipe
        from wavegen.recipe.load import load_recipe

        if (arguments.fault is None) != (arguments.at is None):
            raise ArgumentsError(
                where="--fault and --at",
                problem="one of the two is missing",
                allowed="both or none",
                remedy="Write --fault 0.1dB --at 0.1%.",
            )
        fault = None if arguments.fault is None else (arguments.fault, arguments.at)
        loaded = load_recipe(find_recipe(arguments.recipe), overrides=tuple(arguments.overrides))
        document = predict(loaded, fault=fault)
        if arguments.json:
            console.document(document)
        else:
            show(document, console, asks_for_length=fault is not None)
        return 0


def show(document: dict[str, Any], console: Console, *, asks_for_length: bool = False) -> None:
    """Print one prediction."""
    from wavegen.reports.tables import distortion_table, fault_words, law_table, lowest_words

    for note in (*document["rounded"], *document["warnings"]):
        console.warn(f"{note['where']}: {note['text']}")
    title = document["title"] or document["name"]
    if document["law"] is None:
        console.line(f"{title}: no law. {document['no_law']}.")
        if asks_for_length:
            console.line("Without a law nothing says how long a loop must be to show a fault.")
        return
    console.table(law_table(document["law"], title=title))
    rarest = lowest_words(document["law"])
    if rarest is not None:
        console.line(rarest)
    distortion = document["distortion"]
    if distortion is not None and distortion["says"] is None:
        console.table(distortion_table(distortion))
    elif distortion is not None:
        console.line(f"EVM and ACLR: {distortion['says']}.")
    if document["fault"]:
        console.line(fault_words(document["fault"]))
