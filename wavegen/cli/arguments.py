"""The argument parser: help that fits the terminal, faults that name what was probably meant."""

from __future__ import annotations

import argparse
import re
import shutil
import textwrap
from collections.abc import Iterable, Mapping, Sequence
from pathlib import Path
from typing import Any, NoReturn

from wavegen.core.errors import ArgumentsError
from wavegen.core.registry import nearest

WIDTH = 80
"""Columns of help and results, where the terminal has as many."""

NARROWEST = 40
"""Columns below which nothing more is folded."""

_WORDS = (
    (r"the following arguments are required: (.*)", r"\1 is missing", ""),
    (r"expected .*arguments?", "its value is missing", "the option with a value after it"),
    (r"ignored explicit argument .*", "it takes no value", "the option alone"),
    (r"not allowed with argument (.*)", r"cannot stand beside \1", "one of the two"),
)
"""What the parser of the library says, what is said instead, and what is allowed."""


def columns() -> int:
    """Return how wide help and results may be, from the terminal (or ``COLUMNS``)."""
    return max(NARROWEST, min(shutil.get_terminal_size().columns, WIDTH))


class Formatter(argparse.HelpFormatter):
    """Help within the terminal and 80 columns; indented lines are kept as they are."""

    def __init__(self, prog: str, **settings: Any) -> None:
        super().__init__(prog, **{"width": columns(), **settings})

    def _fill_text(self, text: str, width: int, indent: str) -> str:
        """Fold paragraphs, but not the examples and lists, which are indented."""
        filled = []
        for paragraph in text.split("\n\n"):
            head, break_, kept = f"\n{paragraph}".partition("\n ")
            folded = textwrap.fill(
                head.strip(), width, initial_indent=indent, subsequent_indent=indent
            )
            filled.append((folded + break_ + kept).lstrip("\n"))
        return "\n\n".join(filled)


class Parser(argparse.ArgumentParser):
    """A parser whose faults are raised as the errors of the program; options are never shortened.

    Parameters
    ----------
    example : str
        A command that works, for whoever leaves out what is needed.
    **settings
        Those of the library's parser.
    """

    def __init__(self, *, example: str = "", **settings: Any) -> None:
        super().__init__(**{"formatter_class": Formatter, "allow_abbrev": False, **settings})
        self.example = example

    def _check_value(self, action: argparse.Action, value: Any) -> None:
        """Refuse a value that is none of the choices, with the nearest of them."""
        if action.choices is None or value in action.choices:
            return
        known = [str(choice) for choice in action.choices]
        guess = nearest(str(value), known)
        remedy = f" Did you mean {guess}?" if guess else ""
        message = f"there is no {str(value)[:100]!r}; allowed: {', '.join(known)}.{remedy}"
        raise argparse.ArgumentError(action, message)

    def error(self, message: str) -> NoReturn:
        """Raise a fault of the arguments.

        Raises
        ------
        ArgumentsError
            Always.
        """
        named = re.fullmatch(r"argument ([^:]+): (.*)", message, re.DOTALL)
        where, text = (f"{self.prog} {named[1]}", named[2]) if named else (self.prog, message)
        problem, _, rest = text.partition("; allowed: ")
        allowed, _, remedy = rest.partition(". ")
        for said, ours, wanted in _WORDS:
            if re.fullmatch(said, problem):
                problem, allowed = re.sub(said, ours, problem), wanted
        raise ArgumentsError(
            where=where,
            problem=problem,
            allowed=allowed.rstrip(".") or f"what `{self.prog} --help` tells",
            remedy=remedy or (f"For example: {self.example}" if self.example else "Look there."),
        )


def add_common(parser: argparse.ArgumentParser) -> None:
    """Declare what every verb takes."""
    parser.add_argument("--json", action="store_true", help="one JSON document on stdout")
    parser.add_argument(
        "--quiet", action="store_true", help="no notes and no progress: results and errors alone"
    )
    parser.add_argument(
        "--no-color", action="store_true", help="no colours (nor where NO_COLOR is set)"
    )


def epilogue(examples: Sequence[str], before: str | None = None) -> str:
    """Return what stands under the help of a verb: its examples, one a line.

    Examples
    --------
    >>> print(epilogue(["wavegen list pulses"]))
    example:
      wavegen list pulses
    """
    heading = "example:" if len(examples) == 1 else "examples:"
    lines = [heading, *(f"  {example}" for example in examples)]
    return "\n\n".join([*([before] if before else []), "\n".join(lines)])


def join_negative(argv: Sequence[str]) -> list[str]:
    """Join long options with values that start with a minus, which argparse takes for options.

    Examples
    --------
    >>> join_negative(["measure", "a.wav", "--reference-level", "-10dBm"])
    ['measure', 'a.wav', '--reference-level=-10dBm']
    """
    joined: list[str] = []
    for word in argv:
        is_value = re.match(r"-\.?[0-9]", word)
        if is_value and joined and re.fullmatch(r"--[a-z][a-z-]*", joined[-1]):
            joined[-1] = f"{joined[-1]}={word}"
        else:
            joined.append(word)
    return joined


def refuse_unknown(
    top: argparse.ArgumentParser,
    verbs: Mapping[str, argparse.ArgumentParser],
    words: Sequence[str],
) -> None:
    """Refuse a verb or an option that there is not, with the nearest that there is.

    Parameters
    ----------
    top : ArgumentParser
        That of the program.
    verbs : mapping of str to ArgumentParser
        Those of the verbs.
    words : sequence of str
        The arguments.

    Raises
    ------
    ArgumentsError
        The first that is unknown.
    """
    n_before = next((n for n, word in enumerate(words) if not word.startswith("-")), len(words))
    before, verb, after = words[:n_before], words[n_before : n_before + 1], words[n_before + 1 :]
    for option in options_in(before):
        if option not in top._option_string_actions:
            raise ArgumentsError(
                where=f"{top.prog} {option}",
                problem="stands before the verb",
                allowed="--help or --version there; the options of a verb after it",
                remedy=f"Write it after the verb: {top.prog} {verb[0] if verb else 'VERB'} ...",
            )
    if not verb or set(before) & {"-h", "--help", "--version"}:
        return
    if verb[0] not in verbs:
        raise _no_such_verb(top.prog, verb[0], list(verbs))
    known = verbs[verb[0]]._option_string_actions
    for option in options_in(after):
        if option not in known:
            guess = nearest(option, list(known))
            raise ArgumentsError(
                where=f"{top.prog} {verb[0]} {option[:100]}",
                problem="there is no such option",
                allowed=f"those that `{top.prog} {verb[0]} --help` lists",
                remedy=f"Did you mean {guess}?" if guess else "Look there.",
            )


def options_in(words: Iterable[str]) -> list[str]:
    """Return the options among words, without their values.

    Examples
    --------
    >>> options_in(["a.wav", "--gate=auto", "-3dB", "--", "--file"])
    ['--gate']
    """
    found = []
    for word in words:
        if word == "--":
            break
        if re.match(r"--|-[A-Za-z]", word):
            found.append(word.partition("=")[0])
    return found


def _no_such_verb(prog: str, word: str, verbs: list[str]) -> ArgumentsError:
    guess = nearest(word, verbs)
    remedy = f"Did you mean {guess}?" if guess else f"See `{prog} --help`."
    if word.casefold().endswith((".yaml", ".yml")):
        remedy = f"To make a recipe, write: {prog} make {word}"
    elif not guess and Path(word).exists():
        remedy = f"To measure a file, write: {prog} measure {word}"
    return ArgumentsError(
        where=prog,
        problem=f"there is no verb {word[:100]!r}",
        allowed=", ".join(verbs),
        remedy=remedy,
    )
