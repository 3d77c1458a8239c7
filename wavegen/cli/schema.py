"""`wavegen schema`: the JSON Schema of recipes, for editors."""

from __future__ import annotations

import argparse

from wavegen.cli.console import Console


class Schema:
    """The verb ``schema``."""

    summary = "print the JSON Schema of recipes, for editors"
    description = (
        "Print the JSON Schema (draft 2020-12) of recipes. An editor that is given it\n"
        "completes keys and kinds, explains them, and marks what is wrong."
    )
    examples = ("wavegen schema > recipe.schema.json",)

    @staticmethod
    def arguments(parser: argparse.ArgumentParser) -> None:
        """Declare the arguments: there are none."""

    @staticmethod
    def run(  # the signature of every verb
        arguments: argparse.Namespace,  # noqa: ARG004
        console: Console,
    ) -> int:
        """Print the schema, with and without ``--json``."""
        from wavegen.recipe.json_schema import recipe_schema

        console.document(recipe_schema())
        return 0
