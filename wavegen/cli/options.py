"""Arguments that several verbs share."""

from __future__ import annotations

import argparse
import os
from fractions import Fraction
from pathlib import Path
from typing import TYPE_CHECKING

from wavegen.core.errors import ArgumentsError
from wavegen.core.units import DIMENSIONS, QuantityError, parse_quantity, split_quantity

if TYPE_CHECKING:
    from wavegen.files.format import ReadHints

MOST_WORKERS = 256


def workers(text: str) -> int:
    """Read ``--workers``: a whole number from 1.

    Raises
    ------
    argparse.ArgumentTypeError
        Anything else.
    """
    if not text.isascii() or not text.isdigit() or not 1 <= int(text) <= MOST_WORKERS:
        message = f"{text!r} is no number of workers; allowed: 1 to {MOST_WORKERS}"
        raise argparse.ArgumentTypeError(message)
    return int(text)


def add_workers(parser: argparse.ArgumentParser) -> None:
    """Declare ``--workers``."""
    parser.add_argument(
        "--workers",
        type=workers,
        metavar="N",
        default=min(os.cpu_count() or 1, MOST_WORKERS),
        help="threads that compute (default: one a processor); the bytes do not depend on it",
    )


def add_overrides(parser: argparse.ArgumentParser) -> None:
    """Declare ``--set``."""
    parser.add_argument(
        "--set",
        action="append",
        default=[],
        metavar="PATH=VALUE",
        dest="overrides",
        help="override a key of the recipe, such as --set 'signal.symbol_rate=1 MHz'",
    )


def add_reading(parser: argparse.ArgumentParser, *, before: str = "") -> None:
    """Declare what says how a file without a header is read.

    Parameters
    ----------
    parser : ArgumentParser
        Of a verb.
    before : str
        Stands before the names that a verb needs for its output: ``input-``.
    """
    group = parser.add_argument_group("files without a header, or with several signals")
    group.add_argument("--format", metavar="NAME", help="a format or datatype, such as ci16_le")
    group.add_argument(
        f"--{before}sample-rate", dest="told_rate", type=rate, metavar="RATE", help="such as 20MHz"
    )
    group.add_argument("--full-scale", type=positive, metavar="CODE", help="code that reads as 1.0")
    group.add_argument(
        f"--{before}bits",
        dest="told_bits",
        type=int,
        choices=(12, 14, 16),
        help="bits of the words in 16-bit containers",
    )
    group.add_argument(
        f"--{before}align",
        dest="told_align",
        choices=("left", "right"),
        help="where shorter words stand in their containers",
    )
    group.add_argument(
        "--channel", type=whole, metavar="N", help="which of several channels, from 0"
    )
    group.add_argument("--variable", metavar="NAME", help="which array of several")


def hints_of(arguments: argparse.Namespace) -> ReadHints:
    """Return what the options of :func:`add_reading` say."""
    from wavegen.files.format import ReadHints

    return ReadHints(
        format=arguments.format,
        sample_rate_hz=arguments.told_rate,
        full_scale=arguments.full_scale,
        bits=arguments.told_bits,
        align=arguments.told_align,
        channel=arguments.channel,
        variable=arguments.variable,
        reference_level_dbm=getattr(arguments, "reference_level", None),
    )


_READING = {
    "format": "format",
    "told_rate": "sample-rate",
    "full_scale": "full-scale",
    "told_bits": "bits",
    "told_align": "align",
    "channel": "channel",
    "variable": "variable",
}


def refuse_reading(arguments: argparse.Namespace, problem: str) -> None:
    """Refuse the options of :func:`add_reading` where there is nothing to read by them.

    Raises
    ------
    ArgumentsError
        The first that is given.
    """
    for name, option in _READING.items():
        if getattr(arguments, name) is not None:
            raise ArgumentsError(
                where=f"--{option}",
                problem=problem,
                allowed="this option with a data file",
                remedy="Leave it out.",
            )


RECIPE_SUFFIXES = {".yaml", ".yml"}


def is_recipe(subject: str) -> bool:
    """Return whether an argument means a recipe: by its ending, or as the name of a shipped one."""
    path = Path(subject)
    if path.suffix.lower() in RECIPE_SUFFIXES:
        return True
    try:
        is_there = path.exists()
    except (OSError, ValueError):  # too long, or with a NUL: no such file, and no such name
        return False
    if is_there or path.suffix or len(path.parts) > 1:
        return False
    from wavegen.recipe.find import shipped_paths

    return subject in shipped_paths()


def rate(text: str) -> Fraction:
    """Read a rate with its unit, such as ``20MHz`` or ``1625/6 kHz``.

    Raises
    ------
    argparse.ArgumentTypeError
        No rate.
    """
    return _quantity(text, "_hz", least=Fraction(0))


def level_dbm(text: str) -> float:
    """Read a level with its unit, such as ``-10dBm``.

    Raises
    ------
    argparse.ArgumentTypeError
        No level in dBm.
    """
    return float(_quantity(text, "_dbm"))


def ratio_db(text: str) -> float:
    """Read a ratio with its unit, such as ``-3dB``.

    Raises
    ------
    argparse.ArgumentTypeError
        No ratio in dB.
    """
    return float(_quantity(text, "_db"))


def level_dbfs(text: str) -> float:
    """Read a level with its unit, such as ``-1dBFS``.

    Raises
    ------
    argparse.ArgumentTypeError
        No level in dBFS.
    """
    return float(_quantity(text, "_dbfs"))


def tolerance_db(text: str) -> float:
    """Read a tolerance such as ``0.05dB``.

    Raises
    ------
    argparse.ArgumentTypeError
        No ratio in dB, or a negative one.
    """
    value = ratio_db(text)
    if value < 0:
        message = f"{text!r} is negative; allowed: from 0 dB. Write it like 0.05dB."
        raise argparse.ArgumentTypeError(message)
    return value


def _quantity(text: str, suffix: str, least: Fraction | None = None) -> Fraction:
    try:
        value = parse_quantity(text, DIMENSIONS[suffix])
    except QuantityError as error:
        raise argparse.ArgumentTypeError(str(error)) from error
    if least is not None and value <= least:
        message = f"{text!r} is not above zero; allowed: more than 0. Write it like 20 MHz."
        raise argparse.ArgumentTypeError(message)
    return value


def whole(text: str) -> int:
    """Read a whole number from 0.

    Raises
    ------
    argparse.ArgumentTypeError
        Anything else.
    """
    if not text.isascii() or not text.isdigit() or len(text) > 9:
        message = f"{text[:40]!r} is no whole number; allowed: 0 and up"
        raise argparse.ArgumentTypeError(message)
    return int(text)


def positive(text: str) -> float:
    """Read a number above zero.

    Raises
    ------
    argparse.ArgumentTypeError
        No such number.
    """
    try:
        number, unit = split_quantity(text)
    except QuantityError as error:
        raise argparse.ArgumentTypeError(str(error)) from error
    if unit or number <= 0:
        message = f"{text!r} is no number above zero; allowed: such as 32768"
        raise argparse.ArgumentTypeError(message)
    return float(number)


def place(text: str | None, rate_hz: Fraction, where: str) -> int | None:
    """Return a time or sample number in samples.

    Parameters
    ----------
    text : str or None
        ``10 ms`` or ``4096 samples``.
    rate_hz : Fraction
        Sample rate, Hz.
    where : str
        The option, for messages.

    Raises
    ------
    ArgumentsError
        Neither, negative, or between two samples.
    """
    if text is None:
        return None
    try:
        number, unit = split_quantity(text)
    except QuantityError as error:
        raise ArgumentsError(
            where=where, problem=error.problem, allowed=error.allowed, remedy=error.remedy
        ) from error
    seconds = DIMENSIONS["_s"].units
    if unit in DIMENSIONS["_samples"].units:
        samples = number
    elif unit in seconds:
        samples = number * seconds[unit] * rate_hz
    else:
        raise ArgumentsError(
            where=where,
            problem=f"{text!r} is neither a time nor a sample number",
            allowed="a number with s, ms, us, ns or samples",
            remedy="Write it like 10 ms or 4096 samples.",
        )
    if samples < 0 or samples.denominator != 1:
        raise ArgumentsError(
            where=where,
            problem=f"{text!r} is {float(samples):.9g} samples",
            allowed="whole samples from 0",
            remedy="Give it in samples.",
        )
    return int(samples)
