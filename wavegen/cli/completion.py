"""`wavegen completion`: the shell completes verbs, options, recipes and what may be named."""

from __future__ import annotations

import argparse
from collections.abc import Callable, Mapping
from typing import Any

from wavegen.cli.console import Console

SHELLS = ("bash", "zsh", "fish")


class Completion:
    """The verb ``completion``."""

    summary = "print what makes a shell complete commands"
    description = (
        "Print the lines that make a shell complete verbs, options, the names of shipped\n"
        "recipes, and of sources, stages, formats and methods where they may stand. Once,\n"
        "in its start-up file:\n"
        "\n"
        '  bash, zsh: eval "$(wavegen completion bash)"   (or zsh)\n'
        "  fish:      wavegen completion fish | source"
    )
    examples = ("wavegen completion bash",)

    @staticmethod
    def arguments(parser: argparse.ArgumentParser) -> None:
        """Declare the arguments."""
        parser.add_argument("shell", choices=SHELLS, metavar="SHELL", help=", ".join(SHELLS))

    @staticmethod
    def run(arguments: argparse.Namespace, console: Console) -> int:
        """Print the lines."""
        from argcomplete.shell_integration import shellcode

        lines = shellcode(["wavegen"], shell=arguments.shell)
        if arguments.json:
            console.document({"shell": arguments.shell, "lines": lines})
        else:
            console.text(lines)
        return 0


def complete(top: argparse.ArgumentParser, verbs: Mapping[str, argparse.ArgumentParser]) -> None:
    """Answer the shell that asks what may follow, and end the process.

    Parameters
    ----------
    top : ArgumentParser
        That of the program.
    verbs : mapping of str to ArgumentParser
        Those of the verbs.
    """
    import argcomplete

    for parser in verbs.values():
        for action in parser._actions:
            candidates = CANDIDATES.get(action.dest if action.option_strings else action.metavar)
            if candidates is not None and action.choices is None:
                action.completer = candidates  # type: ignore[attr-defined]
    argcomplete.autocomplete(top)


def _recipes(prefix: str, **_: Any) -> list[str]:
    """Return shipped recipes and the recipe files here."""
    from argcomplete.completers import FilesCompleter

    from wavegen.recipe.find import shipped_paths

    return [*shipped_paths(), *FilesCompleter(("yaml", "yml"))(prefix)]


def _shipped(**_: Any) -> list[str]:
    from wavegen.recipe.find import shipped_paths

    return list(shipped_paths())


def _subjects(prefix: str, **_: Any) -> list[str]:
    """Return shipped recipes and all files here."""
    from argcomplete.completers import FilesCompleter

    from wavegen.recipe.find import shipped_paths

    return [*shipped_paths(), *FilesCompleter()(prefix)]


def _formats(**_: Any) -> list[str]:
    from wavegen.files import FORMATS

    return list(FORMATS)


def _read_formats(**_: Any) -> list[str]:
    return [*_formats(), *_datatypes()]


def _datatypes(**_: Any) -> list[str]:
    from wavegen.files.datatypes import DATATYPES

    return list(DATATYPES)


def _methods(**_: Any) -> list[str]:
    from wavegen.stages import STAGES

    return [name for name in STAGES if ".crest." in STAGES[name]]


CANDIDATES: dict[str | tuple[str, ...] | None, Callable[..., list[str]]] = {
    "RECIPE": _recipes,
    "FILE|RECIPE": _subjects,
    "FILE": _subjects,
    "STIMULUS": _subjects,
    "FIELD": _subjects,
    "INPUT": _subjects,
    "OUTPUT": _subjects,
    "NAME": _shipped,
    "to": _formats,
    "format": _read_formats,
    "datatype": _datatypes,
    "method": _methods,
}
"""What may stand in a place: by the option's name, or by what help calls an argument."""
