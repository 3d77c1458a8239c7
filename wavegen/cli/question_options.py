"""Arguments that say how a file is compared with its law."""

from __future__ import annotations

import argparse
from typing import TYPE_CHECKING

from wavegen.cli.measure_options import probability
from wavegen.cli.options import ratio_db

if TYPE_CHECKING:
    from wavegen.production.judgement import Question

TOLERANCE_DB = 0.2
DOWN_TO = 1e-4
MOST_TRIES = 10_000


def law_tolerance_db(text: str) -> float:
    """Read a tolerance about a law, such as ``0.2dB``.

    Raises
    ------
    argparse.ArgumentTypeError
        No ratio in dB, or not above 0.
    """
    value = ratio_db(text)
    if not value > 0:
        message = f"{text!r} is no tolerance about a law; allowed: above 0 dB, such as 0.2dB"
        raise argparse.ArgumentTypeError(message)
    return value


def least_probability(text: str) -> float:
    """Read the probability down to which levels are compared, such as ``0.01%``.

    Raises
    ------
    argparse.ArgumentTypeError
        Not above 0, or above 10 %.
    """
    value = probability(text)
    if value > 0.1:
        message = f"{text!r} leaves no level to compare; allowed: up to 10%, such as 0.01%"
        raise argparse.ArgumentTypeError(message)
    return value


def tries(text: str) -> int:
    """Read ``--best-of``.

    Raises
    ------
    argparse.ArgumentTypeError
        No whole number from 2.
    """
    if not text.isascii() or not text.isdigit() or not 2 <= int(text[:9]) <= MOST_TRIES:
        message = f"{text[:40]!r} is no number of seeds; allowed: 2 to {MOST_TRIES}"
        raise argparse.ArgumentTypeError(message)
    return int(text)


def add_question(
    parser: argparse.ArgumentParser, *, tolerance: str = "--tolerance", is_stated: bool = False
) -> None:
    """Declare what *agrees* means.

    Parameters
    ----------
    parser : ArgumentParser
        Of a verb.
    tolerance : str
        Name of the option for the tolerance.
    is_stated : bool
        Whether the sidecar says it where it is not given.
    """
    otherwise = "that of the sidecar" if is_stated else f"{TOLERANCE_DB}dB"
    parser.add_argument(
        tolerance,
        type=law_tolerance_db,
        metavar="LEVEL",
        default=None if is_stated else TOLERANCE_DB,
        help=f"a loop agrees if its process lies within this of the law (default: {otherwise})",
    )
    otherwise = "that of the sidecar" if is_stated else "0.01%%"
    parser.add_argument(
        "--down-to",
        type=least_probability,
        metavar="P",
        default=None if is_stated else DOWN_TO,
        help=f"least probability at which levels are compared with the law (default: {otherwise})",
    )


def question_of(tolerance_db: float | None, down_to: float | None) -> Question | None:
    """Return what is asked, None if nothing is."""
    if tolerance_db is None and down_to is None:
        return None
    from wavegen.production.judgement import Question

    return Question(
        tolerance_db=TOLERANCE_DB if tolerance_db is None else tolerance_db,
        down_to=DOWN_TO if down_to is None else down_to,
    )
