"""Given bits as data, repeated."""

from __future__ import annotations

import re
from dataclasses import dataclass
from pathlib import Path
from typing import ClassVar, Self

import numpy as np
from numpy.typing import NDArray

from wavegen.core.site import Site
from wavegen.core.units import QuantityError
from wavegen.sources.bit_symbols import BitSymbols, RepeatedBits, bind_bits

MOST_BITS = 1 << 16


@dataclass(frozen=True, slots=True)
class BitText:
    """Bits as they are written.

    Parameters
    ----------
    written : str
        Zeros and ones, or ``0x`` and hexadecimal digits; blanks between them do not count.
    """

    written: str
    example: ClassVar[str] = '"1100"'

    @property
    def bits(self) -> NDArray[np.uint8]:
        """Zeros and ones, the first one first; four a hexadecimal digit."""
        digits = "".join(self.written.split())
        if digits.startswith("0x"):
            digits = "".join(f"{int(digit, 16):04b}" for digit in digits[2:])
        return np.frombuffer(digits.encode(), np.uint8) - ord("0")

    def text(self) -> str:
        """Return the value as a recipe writes it."""
        return self.written

    @classmethod
    def parse(cls, value: object) -> Self:
        """Read bits or hexadecimal digits.

        Parameters
        ----------
        value : object
            Text as YAML gives it; quotes keep YAML from reading a number.

        Returns
        -------
        BitText

        Raises
        ------
        QuantityError
            No text, other characters, nothing, or more than 65536 bits.

        Examples
        --------
        >>> BitText.parse("0xA 1").bits.tolist()
        [1, 0, 1, 0, 0, 0, 0, 1]
        """
        allowed = f"zeros and ones, or 0x and hexadecimal digits, 1 to {MOST_BITS} bits"
        if not isinstance(value, str):
            raise QuantityError(
                problem=f"{str(value)[:40]} is not text",
                allowed=allowed,
                remedy='Put it in quotes, like "1100" or "0xF0".',
            )
        digits = "".join(value.split())
        if not re.fullmatch(r"[01]+|0x[0-9a-fA-F]+", digits):
            raise QuantityError(
                problem=f"{value[:40]!r} holds no bits"
                if not digits
                else f"{value[:40]!r} holds something that is no bit",
                allowed=allowed,
                remedy='Write it like "1100" or "0xF0".',
            )
        if (4 * (len(digits) - 2) if digits.startswith("0x") else len(digits)) > MOST_BITS:
            raise QuantityError(
                problem=f"{value[:20]!r}... is too long",
                allowed=allowed,
                remedy="Put the bits in a file: data: {kind: file, path: bits.txt}.",
            )
        return cls(value)

    @classmethod
    def json_schema(cls) -> dict[str, object]:
        """Return the JSON Schema of what :meth:`parse` reads."""
        pattern = r"^\s*(?:[01][01\s]*|0\s*x[0-9a-fA-F\s]+)$"
        return {"type": "string", "pattern": pattern, "examples": ["1100", "0xF0"]}


@dataclass(frozen=True, slots=True, kw_only=True)
class Pattern:
    """Settings of a repeated pattern.

    Parameters
    ----------
    bits : BitText
        The pattern, first bit first: ``"1100"``, or ``"0xF0"`` with four bits a digit.

    Notes
    -----
    The pattern runs on from symbol to symbol: its length need not be whole symbols. A loop that
    is not whole patterns cuts the last one at its seam, which is noted.
    """

    bits: BitText

    def period_bits(self, folder: Path = Path()) -> int | None:
        """Return the bits after which the data repeat."""
        return self.bits.bits.size

    def bind(self, site: Site, *, n_bits: int, period: int, label: str = "") -> BitSymbols:
        """Return the symbols of one stream.

        Parameters
        ----------
        site : Site
            Takes a note where the loop cuts the pattern.
        n_bits : int
            Bits a symbol.
        period : int
            Symbols in one loop.
        label : str
            Which stream of the part; all of them begin with the same bit.

        Returns
        -------
        BitSymbols
        """
        made = RepeatedBits.of(self.bits.bits)
        return bind_bits(
            site, made, n_bits=n_bits, period=period, label=label, called="the pattern"
        )
