"""Bits from a file as data, repeated."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from wavegen.core.site import Site
from wavegen.core.units import QuantityError
from wavegen.sources.bit_symbols import BitSymbols, RepeatedBits, bind_bits
from wavegen.sources.small_file import read_small_file

MOST_BITS = 1 << 26
MOST_BYTES = 1 << 28
_BETWEEN = b" \t\r\n\v\f,;"


@dataclass(frozen=True, slots=True, kw_only=True)
class File:
    """Settings of data from a file.

    Parameters
    ----------
    path : str
        File, relative to the recipe. A name that ends in ``.bin`` holds eight bits a byte, the
        first one most significant; any other holds zeros and ones as text, with blanks, line
        ends, commas or semicolons between them.

    Notes
    -----
    The bits repeat; a loop that is not whole repetitions cuts the last one at its seam, which is
    noted.
    """

    path: str

    def period_bits(self, folder: Path = Path()) -> int | None:
        """Return the bits after which the data repeat.

        Parameters
        ----------
        folder : Path
            What the path is relative to.

        Raises
        ------
        QuantityError
            The file cannot be read or holds no bits.
        """
        return read_bits(folder / self.path).size

    def bind(self, site: Site, *, n_bits: int, period: int, label: str = "") -> BitSymbols:
        """Return the symbols of one stream.

        Parameters
        ----------
        site : Site
            Gives the folder; takes a note where the loop cuts the bits.
        n_bits : int
            Bits a symbol.
        period : int
            Symbols in one loop.
        label : str
            Which stream of the part; all of them begin with the same bit.

        Returns
        -------
        BitSymbols

        Raises
        ------
        RecipeError
            The file cannot be read or holds no bits.
        """
        try:
            bits = read_bits(site.folder / self.path)
        except QuantityError as error:
            raise site.error(
                key=f"{label}.data.path".lstrip("."),
                problem=error.problem,
                allowed=error.allowed,
                remedy=error.remedy,
            ) from error
        return bind_bits(
            site,
            RepeatedBits.of(bits),
            n_bits=n_bits,
            period=period,
            label=label,
            called=self.path,
        )


def read_bits(path: Path) -> NDArray[np.uint8]:
    """Return the bits of a file.

    Parameters
    ----------
    path : Path
        ``.bin`` for packed bits; text otherwise.

    Returns
    -------
    uint8 array, shape (n_bits,)
        Zeros and ones.

    Raises
    ------
    QuantityError
        No such file, not a regular one, too large, without bits, or with other characters.
    """
    content = read_small_file(path, most_bytes=MOST_BYTES)
    allowed = f"1 to {MOST_BITS} bits"
    if path.suffix.casefold() == ".bin":
        bits = np.unpackbits(np.frombuffer(content[: MOST_BITS // 8 + 1], np.uint8))
    else:
        digits = content.translate(None, delete=_BETWEEN)
        bits = np.frombuffer(digits, np.uint8) - np.uint8(ord("0"))
        if np.any(bits > 1):
            odd = chr(digits[int(np.flatnonzero(bits > 1)[0])])
            line = content[: content.index(odd.encode("latin-1"))].count(b"\n") + 1
            raise QuantityError(
                problem=f"{path.name}: line {line} holds {odd!r}",
                allowed="zeros and ones, with blanks, line ends, commas or semicolons between",
                remedy="Remove it; packed bits need a name that ends in .bin.",
            )
    if not 1 <= bits.size <= MOST_BITS:
        raise QuantityError(
            problem=f"{path.name} holds {'no bits' if not bits.size else 'too many bits'}",
            allowed=allowed,
            remedy="Name another file.",
        )
    return bits
