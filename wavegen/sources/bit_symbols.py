"""Symbols from a sequence of bits that runs from the start of the loop and is cut at its seam."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from wavegen.core.evaluate import fold, repeat
from wavegen.core.site import Note, Site


class BitSequence(Protocol):
    """An endless sequence of bits, addressed by position."""

    @property
    def period(self) -> int:
        """Return the bits after which it repeats."""

    def bits(self, first: int, count: int) -> NDArray[np.uint8]:
        """Return bits ``[first, first + count)``, ``first >= 0``."""


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class RepeatedBits:
    """Given bits, over and over.

    Parameters
    ----------
    packed : bytes
        The bits, first one highest in its byte.
    period : int
        How many.
    """

    packed: bytes
    period: int

    @classmethod
    def of(cls, bits: NDArray[np.uint8]) -> RepeatedBits:
        """Return the sequence that repeats an array of zeros and ones."""
        return cls(packed=np.packbits(bits).tobytes(), period=bits.size)

    def bits(self, first: int, count: int) -> NDArray[np.uint8]:
        """Return bits ``[first, first + count)``."""
        packed = np.frombuffer(self.packed, np.uint8)
        start = first % self.period
        if start + count <= self.period:
            low = start // 8
            part = np.unpackbits(packed[low : -(-(start + count) // 8)])
            return part[start - 8 * low : start - 8 * low + count]
        return repeat(np.unpackbits(packed, count=self.period), first, first + count)


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class BitSymbols:
    """Symbol numbers read from bits: symbol i takes bits ``[i m, (i + 1) m)``, first bit highest.

    Parameters
    ----------
    sequence : BitSequence
        Where the bits come from.
    n_bits : int
        Bits a symbol, 1 to 16.
    period : int
        Symbols in one loop.
    start : int
        Bit of the sequence at which the loop begins.
    """

    sequence: BitSequence
    n_bits: int
    period: int
    start: int = 0

    def words(self, first: int, count: int) -> NDArray[np.unsignedinteger]:
        """Return the numbers of the symbols ``first ...``.

        Parameters
        ----------
        first, count : int
            Symbol range; indices may pass the seam, be negative or cover several periods.

        Returns
        -------
        uint8 array (up to 8 bits) or uint16 array, shape (count,)
        """
        if count > self.period or (count == self.period and first % self.period):
            return repeat(self._words(0, self.period), first, first + count)
        pieces = [self._words(low, high) for low, high in fold(first, first + count, self.period)]
        if len(pieces) == 1:
            return pieces[0]
        return np.concatenate([np.empty(0, self._dtype), *pieces])

    @property
    def _dtype(self) -> np.dtype[np.unsignedinteger]:
        return np.dtype(np.uint8 if self.n_bits <= 8 else np.uint16)

    def _words(self, low: int, high: int) -> NDArray[np.unsignedinteger]:
        m = self.n_bits
        bits = self.sequence.bits(self.start + low * m, (high - low) * m)
        if m == 1:
            return bits
        if m == 8:
            return np.packbits(bits)
        places = bits.reshape(-1, m)
        words = places[:, 0].astype(self._dtype)
        for place in range(1, m):
            words <<= 1
            words |= places[:, place]
        return words


def bind_bits(
    site: Site,
    sequence: BitSequence,
    *,
    n_bits: int,
    period: int,
    label: str,
    called: str,
    start: int = 0,
) -> BitSymbols:
    """Return the symbols of a sequence in a loop, with a note where the loop cuts it.

    Parameters
    ----------
    site : Site
        Takes the note.
    sequence : BitSequence
        The bits.
    n_bits, period : int
        Bits a symbol, symbols in one loop.
    label : str
        Which stream of the part: ``.groups[0]``, or nothing.
    called : str
        What the sequence is called in the note.
    start : int
        First bit.

    Returns
    -------
    BitSymbols
    """
    whole, rest = divmod(n_bits * period, sequence.period)
    if rest:
        held = (
            f"{whole} period{'s' if whole > 1 else ''} and {rest} bits" if whole else f"{rest} bits"
        )
        text = (
            f"the loop holds {held} of {called}, whose period is {sequence.period} bits, and cuts "
            f"it at the seam; multiples of {sequence.period // math.gcd(sequence.period, n_bits)} "
            "symbols hold whole periods."
        )
        where = f"{site.path}{label}.data"
        site.notes.append(Note(kind="warning", where=where, text=text))
    return BitSymbols(sequence=sequence, n_bits=n_bits, period=period, start=start)
