"""Seeded random symbols, addressed by index."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from wavegen.core.rng import random_words, stream_key
from wavegen.core.site import Site


@dataclass(frozen=True, eq=False, slots=True)
class RandomSymbols:
    """Uniform symbol numbers on a cyclic axis.

    Parameters
    ----------
    key : uint64 array, shape (2,)
        Stream, from :func:`wavegen.core.rng.stream_key`.
    n_bits : int
        Bits a symbol, 1 to 16.
    period : int
        Symbols in one loop.
    """

    key: NDArray[np.uint64]
    n_bits: int
    period: int

    def words(self, first: int, count: int) -> NDArray[np.unsignedinteger]:
        """Return words whose low ``n_bits`` bits number the symbols ``first ...``.

        Parameters
        ----------
        first, count : int
            Symbol range; indices may pass the seam, be negative or cover several periods.

        Returns
        -------
        uint8 array (up to 8 bits) or uint16 array, shape (count,)
            Higher bits are random too: index a table that repeats (``Constellation.wide``).
        """
        width = 1 if self.n_bits <= 8 else 2
        return random_words(self.key, first, count, period=self.period, width_bytes=width)


@dataclass(frozen=True, slots=True, kw_only=True)
class Random:
    """Settings of random data.

    Parameters
    ----------
    share : str, optional
        Draw the data of the part with this name; without it every part draws its own.
    """

    share: str | None = None

    def period_bits(self, folder: Path = Path()) -> int | None:
        """Return None: random data have no period of their own."""
        return None

    def bind(self, site: Site, *, n_bits: int, period: int, label: str = "") -> RandomSymbols:
        """Return the symbols of one stream.

        Parameters
        ----------
        site : Site
            Gives seed and label.
        n_bits : int
            Bits a symbol.
        period : int
            Symbols in one loop.
        label : str
            Appended to the part's label: tells apart several streams of one part.

        Returns
        -------
        RandomSymbols
        """
        name = (self.share or site.label) + label
        return RandomSymbols(stream_key(site.seed, name), n_bits, period)
