"""Small files that a recipe names: bits and taps."""

from __future__ import annotations

import math
from pathlib import Path

from wavegen.core.units import QuantityError


def read_small_file(path: Path, *, most_bytes: int) -> bytes:
    """Return what a file holds.

    Parameters
    ----------
    path : Path
        A regular file.
    most_bytes : int
        Largest size accepted.

    Returns
    -------
    bytes

    Raises
    ------
    QuantityError
        No such file, none that may be read, no regular one, or too large.
    """
    remedy = "Check the name; paths are relative to the recipe."
    try:
        if not path.is_file():
            raise QuantityError(
                problem=f"{path} is no file" if path.exists() else f"there is no file {path}",
                allowed="a file that exists",
                remedy=remedy,
            )
        if path.stat().st_size > most_bytes:
            raise QuantityError(
                problem=f"{path} holds {path.stat().st_size} bytes",
                allowed=f"up to {most_bytes} bytes",
                remedy="Use a shorter file.",
            )
        return path.read_bytes()
    except (OSError, ValueError) as error:  # ValueError: also a name no system takes
        if isinstance(error, QuantityError):
            raise
        reason = getattr(error, "strerror", None) or "that is no name of a file"
        raise QuantityError(
            problem=f"{path} cannot be read: {reason}",
            allowed="a file that may be read",
            remedy=remedy,
        ) from error


def read_numbers(path: Path, *, most: int) -> tuple[float, ...]:
    """Return the numbers of a text file.

    Parameters
    ----------
    path : Path
        Decimal numbers with blanks, line ends, commas or semicolons between them; what follows a
        ``#`` on a line does not count.
    most : int
        Most numbers accepted.

    Returns
    -------
    tuple of float
        At least one, all finite.

    Raises
    ------
    QuantityError
        The file cannot be read, or holds something else.
    """
    content = read_small_file(path, most_bytes=64 * most)
    allowed = f"1 to {most} decimal numbers"
    numbers: list[float] = []
    for row, line in enumerate(content.decode("utf-8", errors="replace").splitlines(), 1):
        for word in line.partition("#")[0].replace(",", " ").replace(";", " ").split():
            try:
                number = float(word)
            except ValueError:
                number = math.nan
            if not math.isfinite(number):
                raise QuantityError(
                    problem=f"{path.name}: line {row} holds {word[:40]!r}",
                    allowed=allowed,
                    remedy="Write numbers like -0.125 with blanks or commas between them.",
                )
            numbers.append(number)
    if not 1 <= len(numbers) <= most:
        raise QuantityError(
            problem=f"{path.name} holds {len(numbers) or 'no'} numbers",
            allowed=allowed,
            remedy="Name another file.",
        )
    return tuple(numbers)
