"""Options that hold for both sides of a comparison, or for one alone."""

from __future__ import annotations

import argparse
from typing import TYPE_CHECKING, Any

from wavegen.cli.measure_options import add_gate, add_part, gate_of, probability
from wavegen.cli.options import (
    add_overrides,
    add_reading,
    hints_of,
    is_recipe,
    level_dbm,
    ratio_db,
    refuse_reading,
    tolerance_db,
)
from wavegen.core.errors import ArgumentsError

if TYPE_CHECKING:
    from wavegen.comparison.side import SideSettings


def count(text: str) -> int:
    """Read a number of samples above zero: ``1000000`` or ``1e6``.

    Raises
    ------
    argparse.ArgumentTypeError
        No such number.
    """
    try:
        value = float(text)
    except ValueError:
        value = 0.0
    if not 1 <= value <= 1e18 or value != int(value):
        message = f"{text[:40]!r} is no number of samples; allowed: whole, from 1, such as 1e6"
        raise argparse.ArgumentTypeError(message)
    return int(value)


def reading_db(text: str) -> float:
    """Read the half-width of a reading error such as ``0.1dB``.

    Raises
    ------
    argparse.ArgumentTypeError
        No ratio in dB, or outside 0 to 10 dB.
    """
    value = ratio_db(text)
    if not 0 <= value <= 10:
        message = f"{text!r} is no reading error; allowed: 0 to 10 dB. Write it like 0.1dB."
        raise argparse.ArgumentTypeError(message)
    return value


def _declare(parser: argparse.ArgumentParser) -> None:
    """Declare everything that says what a side is."""
    add_reading(parser)
    add_part(parser)
    add_gate(parser)
    group = parser.add_argument_group("levels, and curves by points")
    group.add_argument(
        "--remove-dc", action="store_true", default=None, help="take a DC offset off first"
    )
    group.add_argument(
        "--reference-level", type=level_dbm, metavar="LEVEL", help="power at 0 dBFS, such as -20dBm"
    )
    group.add_argument(
        "--curve-samples",
        type=count,
        metavar="N",
        help="independent samples that a curve in CSV was measured on, if it does not say",
    )
    group.add_argument(
        "--reading",
        type=reading_db,
        metavar="LEVEL",
        help="how far the levels of a curve in CSV may be off by reading, such as 0.1dB",
    )
    add_overrides(parser)


def add_sides(parser: argparse.ArgumentParser, sides: tuple[str, str]) -> None:
    """Declare the options of both sides.

    Parameters
    ----------
    parser : ArgumentParser
        Of a verb.
    sides : (str, str)
        Names of the sides: ``--gate`` holds for both, ``--field-gate`` for the field alone.
    """
    parser.epilog = (
        "Each option of the groups above may be given for one side alone:\n"
        f"--{sides[0]}-gate, --{sides[1]}-format and so on; it then wins over the one for both."
    )
    _declare(parser)
    for side in sides:
        hidden = argparse.ArgumentParser(add_help=False, argument_default=None)
        _declare(hidden)
        _copy(hidden, parser, side)


def _copy(source: argparse.ArgumentParser, target: argparse.ArgumentParser, side: str) -> None:
    """Add the options of one parser to another, under the name of a side, unseen in its help."""
    for action in source._actions:
        action.option_strings = [
            option.replace("--", f"--{side}-", 1) for option in action.option_strings
        ]
        action.dest = f"{side}_{action.dest}"
        action.help = argparse.SUPPRESS
        target._add_action(action)


def add_verdict(parser: argparse.ArgumentParser, *, tolerance: str, down_to: str) -> None:
    """Declare what a match means, with the words of a verb.

    Parameters
    ----------
    parser : ArgumentParser
        Of a verb.
    tolerance, down_to : str
        What the help says of each, without the default.
    """
    parser.add_argument(
        "--tolerance", type=tolerance_db, metavar="LEVEL", help=f"{tolerance} (default: 0.2dB)"
    )
    parser.add_argument(
        "--down-to",
        type=probability,
        metavar="PROBABILITY",
        help=f"{down_to} (default: 0.01%%)",
    )


def verdict_of(arguments: argparse.Namespace) -> dict[str, Any]:
    """Return what the options say a match means, by the names of settings; defaults are left out.

    Parameters
    ----------
    arguments : Namespace
        With the options of :func:`add_verdict`.
    """
    said = {"tolerance_db": arguments.tolerance, "down_to": arguments.down_to}
    return {key: value for key, value in said.items() if value is not None}


def side_of(arguments: argparse.Namespace, side: str, subject: str) -> SideSettings:
    """Return what the options say of one side.

    Parameters
    ----------
    arguments : Namespace
        All arguments.
    side : str
        Its name in :func:`add_sides`.
    subject : str
        The argument that names it.

    Raises
    ------
    ArgumentsError
        Options that do not go together, or that mean nothing for a recipe.
    """
    from wavegen.comparison.side import SideSettings
    from wavegen.production.subject_files import FilePart

    mine = _merged(arguments, side)
    recipe = is_recipe(subject)
    if not recipe and getattr(arguments, f"{side}_overrides"):
        raise _no_recipe(where=f"--{side}-set", problem=f"{subject} is no recipe")
    if recipe:
        _refuse_for_recipes(mine)
    return SideSettings(
        subject=subject,
        is_recipe=recipe,
        hints=hints_of(mine),
        part=FilePart(first=mine.first, stop=mine.stop, period=mine.period, loops=bool(mine.loop)),
        gate=gate_of(mine),
        removes_offset=bool(mine.remove_dc),
        overrides=tuple(mine.overrides) if recipe else (),
        curve_samples=mine.curve_samples,
        reading_db=mine.reading or 0.0,
    )


def refuse_stray_overrides(
    arguments: argparse.Namespace, sides: tuple[SideSettings, SideSettings]
) -> None:
    """Refuse ``--set`` where neither side is a recipe.

    Raises
    ------
    ArgumentsError
        Nothing would be changed by it.
    """
    if arguments.overrides and not any(side.is_recipe for side in sides):
        raise _no_recipe(where="--set", problem="neither side is a recipe")


def _no_recipe(*, where: str, problem: str) -> ArgumentsError:
    return ArgumentsError(
        where=where, problem=problem, allowed="--set with a recipe", remedy="Leave it out."
    )


def _refuse_for_recipes(mine: argparse.Namespace) -> None:
    problem = "a recipe is compared as the whole loop that it makes"
    refuse_reading(argparse.Namespace(**vars(mine) | {"channel": None}), problem)
    for option in ("remove_dc", "reference_level", "curve_samples", "reading"):
        if getattr(mine, option):
            raise ArgumentsError(
                where=f"--{option.replace('_', '-')}",
                problem=problem,
                allowed="this option for a data file or a curve",
                remedy="Give it for the other side alone, or leave it out.",
            )


def _merged(arguments: argparse.Namespace, side: str) -> argparse.Namespace:
    """Return the options of one side: its own, else those for both."""
    values: dict[str, Any] = vars(arguments)
    prefix = f"{side}_"
    own = {
        key.removeprefix(prefix): value for key, value in values.items() if key.startswith(prefix)
    }
    return argparse.Namespace(
        **{key: values.get(key) if is_unset(value) else value for key, value in own.items()}
    )


def is_unset(value: object) -> bool:
    """Return whether an option was not given."""
    return value is None or value is False or value == []
