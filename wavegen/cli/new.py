"""`wavegen new`: a shipped recipe to edit."""

from __future__ import annotations

import argparse
from pathlib import Path

from wavegen.cli.console import Console

SUFFIXES = (".yaml", ".yml")


class New:
    """The verb ``new``."""

    summary = "copy a shipped recipe here, to edit"
    description = (
        "Copy a shipped recipe into the current folder, comments and all. See\n"
        "`wavegen list recipes` for their names."
    )
    examples = ("wavegen new valley-cell-20mhz --as my-cell.yaml",)

    @staticmethod
    def arguments(parser: argparse.ArgumentParser) -> None:
        """Declare the arguments."""
        parser.add_argument("name", metavar="NAME", help="name of a shipped recipe")
        parser.add_argument(
            "--as", dest="target", type=Path, metavar="FILE", help="default: NAME.yaml, here"
        )
        parser.add_argument("--overwrite", action="store_true", help="replace a file that exists")

    @staticmethod
    def run(arguments: argparse.Namespace, console: Console) -> int:
        """Copy and say what to do next."""
        from wavegen.core.errors import ArgumentsError
        from wavegen.files.atomic import Drafts
        from wavegen.files.faults import told
        from wavegen.recipe.find import find_shipped
        from wavegen.recipe.load import load_recipe

        source = find_shipped(arguments.name)
        target: Path = arguments.target or Path(source.name)
        if target.suffix.lower() not in SUFFIXES:
            raise ArgumentsError(
                where="--as",
                problem=f"{str(target)[:200]!r} does not end like a recipe",
                allowed=" or ".join(SUFFIXES),
                remedy=f"Write --as {target.name or source.stem}.yaml.",
            )
        with Drafts(target.parent, overwrite=arguments.overwrite) as drafts:
            draft = drafts.add(target.name)
            with told(source):
                content = source.read_bytes()
            with told(draft):
                draft.write_bytes(content)
        title = load_recipe(target).recipe.title
        if arguments.json:
            console.document({"file": str(target), "recipe": source.stem, "title": title})
            return 0
        console.line(f"{target} is a copy of the shipped recipe {source.stem}: {title}.")
        console.line(f"Edit it, look at it with `wavegen show {target}`, then make its files with")
        console.line(f"`wavegen make {target}`.")
        return 0
