"""Arguments that several verbs share."""

from __future__ import annotations

import argparse
import os
from fractions import Fraction

from wavegen.core.errors import ArgumentsError
from wavegen.core.units import DIMENSIONS, QuantityError, parse_quantity, split_quantity

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


def _quantity(text: str, suffix: str, least: Fraction | None = None) -> Fraction:
    try:
        value = parse_quantity(text, DIMENSIONS[suffix])
    except QuantityError as error:
        raise argparse.ArgumentTypeError(str(error)) from error
    if least is not None and value <= least:
        message = f"{text!r} is not above zero; allowed: more than 0. Write it like 20 MHz."
        raise argparse.ArgumentTypeError(message)
    return value


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
