"""What OFDM subcarriers carry: points drawn for each symbol, DFT-spread or not, and pilots."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import Protocol

import numpy as np
import scipy.fft
from numpy.typing import NDArray

from wavegen.core.signal import Samples
from wavegen.dsp.mapping_kernel import write_points, write_values
from wavegen.sources.ofdm_schedule import Presence

Drawn = NDArray[np.unsignedinteger]
"""Words, shape (n_symbols, n): one row for each symbol in which the part is on."""


class Words(Protocol):
    """Symbol numbers on a cyclic axis, as data sources give them."""

    def words(self, first: int, count: int) -> NDArray[np.unsignedinteger]:
        """Return words whose low bits number the symbols ``first ...``."""


@dataclass(frozen=True, eq=False, kw_only=True)
class Carried:
    """Subcarriers that carry one stream of data.

    Parameters
    ----------
    data : Words
        Word ``k * n + i`` is for subcarrier ``i`` of the ``k``-th symbol in which the part is
        on.
    table : complex64 array, shape (order,)
        Point of each symbol number, level and scale included.
    bins : uint32 array, shape (n,)
        FFT bin of each subcarrier.
    presence : Presence
        When it is on.
    rotation : complex64 array, shape (n,), or None
        Factor of each point of a symbol.
    is_spread : bool
        Whether the points of a symbol go through a DFT of their number, over its root.
    name : str
        Its place in the settings.
    constellation : str
        Name of its constellation.
    """

    data: Words
    table: Samples
    bins: NDArray[np.uint32]
    presence: Presence
    rotation: Samples | None = None
    is_spread: bool = False
    name: str = "group"
    constellation: str = "points"

    def rows(self, first: int, count: int) -> Drawn:
        """Return the words of symbols ``first ...``, of those in which the part is on."""
        n = self.bins.size
        low, high = self.presence.rank(first), self.presence.rank(first + count)
        return self.data.words(low * n, (high - low) * n).reshape(high - low, n)

    def between(self, words: Drawn, first: int, skip: int, count: int) -> Drawn:
        """Return what the words drawn from ``first`` on hold for symbols ``first + skip ...``."""
        rank = self.presence.rank
        low, high = rank(first + skip), rank(first + skip + count)
        return words[low - rank(first) : high - rank(first)]

    @cached_property
    def _order(self) -> NDArray[np.uint32]:
        return np.arange(self.bins.size, dtype=np.uint32)

    def points(self, words: Drawn) -> Samples:
        """Return the points of words before spreading, rotated."""
        made = np.empty(words.shape, np.complex64)
        write_points(made, words, table=self.table, bins=self._order)
        if self.rotation is not None:
            made *= self.rotation
        return made

    def write(self, rows: Samples, words: Drawn, first: int) -> None:
        """Write what the subcarriers carry.

        Parameters
        ----------
        rows : complex64 array, shape (n_symbols, n_fft)
            FFT bins of symbols ``first ...``; written to where the part is on.
        words : unsigned integer array, shape (n_places, n)
            Words of those symbols.
        first : int
            Their first.
        """
        if not words.shape[0]:
            return
        places = self.presence.places(first, rows.shape[0])
        if self.rotation is None and not self.is_spread:
            write_points(rows, words, table=self.table, bins=self.bins, places=places)
            return
        values = self.points(words)
        if self.is_spread:
            values = scipy.fft.fft(values, axis=1, norm="ortho", overwrite_x=True)
        write_values(rows, values, bins=self.bins, places=places)


@dataclass(frozen=True, eq=False, kw_only=True)
class Pinned:
    """Subcarriers that carry the same values in each symbol in which they are on.

    Parameters
    ----------
    bins : intp array, shape (n,)
        FFT bins.
    values : complex64 array, shape (n,)
        What they carry, level and scale included.
    presence : Presence
        When they are on.
    name : str
        Their place in the settings.
    """

    bins: NDArray[np.intp]
    values: Samples
    presence: Presence
    name: str = "pilots"
