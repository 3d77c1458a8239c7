"""`wavegen list`: what there is to write in a recipe."""

from __future__ import annotations

import argparse
import re
from typing import Any

from wavegen.cli.console import Console
from wavegen.core.table import Table

TOPICS = ("sources", "constellations", "pulses", "data", "stages", "formats", "meters", "recipes")


class Listing:
    """The verb ``list``."""

    summary = "show the sources, pulses, stages, formats and recipes there are"
    description = "Show what a recipe may name; without a topic, everything."
    examples = ("wavegen list recipes",)

    @staticmethod
    def arguments(parser: argparse.ArgumentParser) -> None:
        """Declare the arguments."""
        parser.add_argument(
            "topic", nargs="?", choices=TOPICS, metavar="TOPIC", help=", ".join(TOPICS)
        )

    @staticmethod
    def run(arguments: argparse.Namespace, console: Console) -> int:
        """Print the names with one line each."""
        topics = (arguments.topic,) if arguments.topic else TOPICS
        found = {topic: _members(topic) for topic in topics}
        if arguments.json:
            console.document(
                {topic: [{"name": n, "about": a} for n, a in rows] for topic, rows in found.items()}
            )
            return 0
        for topic, rows in found.items():
            console.table(
                Table(title=topic.capitalize(), headings=("name", "about"), rows=tuple(rows))
            )
        return 0


def _members(topic: str) -> list[tuple[str, str]]:
    if topic == "recipes":
        from wavegen.recipe.find import shipped_recipes

        return [(name, title) for name, title, _ in shipped_recipes()]
    rows: list[tuple[str, str]] = []
    for table in _tables(topic):
        for name in table:
            member = table.load(name)
            rows.append((name, about(member.__doc__ or "")))
    return rows


def about(docstring: str) -> str:
    """Return what a docstring says first, in words for people.

    Examples
    --------
    >>> about("Settings of a gate: ``duty`` over a period.")
    'gate: duty over a period'
    """
    text = (docstring.strip().splitlines() or [""])[0].removesuffix(".")
    text = re.sub(r"^(Settings of|Return) (an? |the )?", "", text)
    text = re.sub(r": (it has )?none\b.*$", "", text)
    return re.sub(r":\w+:`(\w+)`|`", r"\1", text)


def _tables(topic: str) -> tuple[Any, ...]:
    from wavegen.dsp.pulses import PULSES
    from wavegen.files import FORMATS
    from wavegen.meters import METERS
    from wavegen.sources import SOURCES
    from wavegen.sources.data import DATA
    from wavegen.sources.mapping import MAPPINGS
    from wavegen.stages import COMBINERS, STAGES

    return {
        "sources": (SOURCES, COMBINERS),
        "constellations": (MAPPINGS,),
        "pulses": (PULSES,),
        "data": (DATA,),
        "stages": (STAGES,),
        "formats": (FORMATS,),
        "meters": (METERS,),
    }[topic]
