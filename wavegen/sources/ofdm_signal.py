"""OFDM as signals: useful symbols on one axis, prefix and edge on the other."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import Protocol

import numpy as np
import scipy.fft
from numpy.typing import NDArray

from wavegen.core.signal import Range, Samples, Signal
from wavegen.dsp.mapping_kernel import write_points
from wavegen.sources.ofdm_layout import Layout

FFT_SAMPLES = 1 << 16
"""Samples filled and transformed at a time: 512 kB, so that the FFT finds them in cache."""
LAID_SAMPLES = 1 << 18
"""Samples laid at a time: fewer cost calls, more lose the cache."""
FEWEST_ROWS = 4
"""Rows an FFT call should have: single rows run several times slower."""
MOST_GAPS = 12
"""Up to here the bins without data are cleared gap by gap; beyond, clearing all is faster."""


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
        Word ``symbol * n + i`` is for subcarrier ``i`` of a symbol.
    table : complex64 array, shape (order,)
        Point of each symbol number, level and scale included.
    bins : uint32 array, shape (n,)
        FFT bin of each subcarrier.
    """

    data: Words
    table: Samples
    bins: NDArray[np.uint32]

    def rows(self, first: int, count: int) -> NDArray[np.unsignedinteger]:
        """Return the words of symbols ``first ...``, shape (count, n)."""
        n = self.bins.size
        return self.data.words(first * n, count * n).reshape(count, n)


@dataclass(frozen=True, eq=False, kw_only=True)
class SymbolBodies(Signal):
    """The useful part of every symbol: symbol ``k`` at ``[k n_fft, (k + 1) n_fft)``.

    Parameters
    ----------
    n_fft : int
        Useful samples of a symbol.
    carried : tuple of Carried
        What is drawn anew in each symbol.
    fixed : complex64 array, shape (n_fft,)
        FFT bins that are the same in each symbol (pilots), zero elsewhere.
    indices : intp array, shape (n_active,)
        Subcarriers in use, ascending; 0 is the centre.
    """

    n_fft: int
    carried: tuple[Carried, ...]
    fixed: Samples
    indices: NDArray[np.intp]

    @property
    def block_rows(self) -> int:
        """Symbols worked on at a time."""
        return max(FFT_SAMPLES // self.n_fft, FEWEST_ROWS)

    @cached_property
    def gaps(self) -> list[slice]:
        """Bins without data, few slices: empty ones and pilots, or simply all."""
        free = np.ones(self.n_fft, np.bool_)
        for part in self.carried:
            free[part.bins] = False
        edges = np.flatnonzero(np.diff(np.concatenate(([False], free, [False]))))
        if edges.size > 2 * MOST_GAPS:
            return [slice(0, self.n_fft)]
        return [slice(int(a), int(b)) for a, b in edges.reshape(-1, 2)]

    def fill(self, some: Samples, words: list[NDArray[np.unsignedinteger]]) -> None:
        """Write the bins of successive symbols.

        Parameters
        ----------
        some : complex64 array, shape (n_symbols, n_fft)
            Written to; contiguous.
        words : list of unsigned integer array, shape (n_symbols, n)
            One for each of ``carried``.
        """
        for gap in self.gaps:
            some[:, gap] = self.fixed[gap]
        for part, numbers in zip(self.carried, words, strict=True):
            write_points(some, numbers, table=part.table, bins=part.bins)

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Return whole symbols: FFT bins filled, then transformed in place."""
        first = start // self.n_fft
        rows = np.empty((stop // self.n_fft - first, self.n_fft), np.complex64)
        words = [part.rows(first, rows.shape[0]) for part in self.carried]
        for low in range(0, rows.shape[0], self.block_rows):
            some = rows[low : low + self.block_rows]
            self.fill(some, [numbers[low : low + self.block_rows] for numbers in words])
            done = scipy.fft.ifft(some, axis=1, norm="forward", overwrite_x=True)
            if not np.may_share_memory(done, some):
                some[:] = done
        return rows.reshape(-1)


@dataclass(frozen=True, eq=False, kw_only=True)
class Subcarriers(Signal):
    """What each subcarrier carries: index ``symbol * n_active + position``, ascending.

    Parameters
    ----------
    bodies : SymbolBodies
        Whose subcarriers; values are on the scale of ``fft(body) / n_fft``.
    """

    bodies: SymbolBodies

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Return the values of whole symbols."""
        bodies = self.bodies
        n_active = bodies.indices.size
        first = start // n_active
        out = np.empty((stop // n_active - first, n_active), np.complex64)
        words = [part.rows(first, out.shape[0]) for part in bodies.carried]
        room = np.empty((min(bodies.block_rows, out.shape[0]), bodies.n_fft), np.complex64)
        bins = bodies.indices % bodies.n_fft
        for low in range(0, out.shape[0], bodies.block_rows):
            some = room[: out.shape[0] - low]
            bodies.fill(some, [numbers[low : low + bodies.block_rows] for numbers in words])
            out[low : low + bodies.block_rows] = some[:, bins]
        return out.reshape(-1)


@dataclass(frozen=True, eq=False, kw_only=True)
class Prefixed(Signal):
    """Symbols in time: prefix before each body, edges overlapping.

    Parameters
    ----------
    layout : Layout
        The repeating pattern; the loop holds a whole number of them.
    ideal : Signal
        What each subcarrier carries, on the (symbol, subcarrier) axis.
    """

    layout: Layout
    ideal: Signal

    @cached_property
    def starts(self) -> NDArray[np.int64]:
        """First sample of each symbol of the pattern, and the end, shape (n_symbols + 1,)."""
        lengths = np.array([0, *self.layout.prefixes]) + self.layout.n_fft
        lengths[0] = 0
        return np.cumsum(lengths)

    @cached_property
    def runs(self) -> list[tuple[int, int, int]]:
        """Neighbours in the pattern with equal prefixes: ``(first, end, prefix)``."""
        found: list[tuple[int, int, int]] = []
        for j, prefix in enumerate(self.layout.prefixes):
            length = prefix + self.layout.n_fft
            last = found[-1] if found else (0, 0, -1)
            if last[2] == prefix and (j + 1 - last[0]) * length <= LAID_SAMPLES:
                found[-1] = (last[0], j + 1, prefix)
            else:
                found.append((j, j + 1, prefix))
        return found

    def symbol_at(self, sample: int) -> int:
        """Return the symbol, prefix included, that a sample belongs to."""
        pattern, rest = divmod(sample, self.layout.n_samples)
        place = int(np.searchsorted(self.starts, rest, side="right")) - 1
        return pattern * self.layout.n_symbols + place

    def start_of(self, symbol: int) -> int:
        """Return the first sample of a symbol's prefix."""
        pattern, place = divmod(symbol, self.layout.n_symbols)
        return pattern * self.layout.n_samples + int(self.starts[place])

    def needs(self, start: int, stop: int) -> tuple[Range, ...]:
        """Return the bodies of the symbols touched, and of the one that fades out."""
        n = self.layout.n_fft
        lead = 1 if self.layout.edge else 0
        return (((self.symbol_at(start) - lead) * n, (self.symbol_at(stop - 1) + 1) * n),)

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Return samples, laid pattern by pattern so that short symbols cost no more."""
        layout = self.layout
        bodies = arrays[0].reshape(-1, layout.n_fft)
        first, end = self.symbol_at(start), self.symbol_at(stop - 1) + 1
        origin = self.start_of(first)
        out = np.empty(self.start_of(end) - origin, np.complex64)
        before = bodies[: end - first]  # row i: the symbol before symbol first + i
        current = bodies[1:] if layout.edge else bodies
        m = layout.n_symbols
        per_block = max(LAID_SAMPLES // layout.n_samples, 1)
        symbol = first
        while symbol < end:
            place, left = symbol % m, end - symbol
            n_patterns, count = min(left // m, per_block), m
            if place or left < m:
                n_patterns, count = 1, min(m - place, left)
            after = symbol + n_patterns * count
            rows = slice(symbol - first, after - first)
            self._lay(
                out[self.start_of(symbol) - origin : self.start_of(after) - origin],
                current[rows].reshape(n_patterns, count, -1),
                before[rows].reshape(n_patterns, count, -1),
                place,
            )
            symbol = after
        return out[start - origin : stop - origin]

    @cached_property
    def _weights(self) -> tuple[NDArray[np.float32], NDArray[np.float32]]:
        """Edge of the incoming and of the outgoing symbol, for I and Q in turn."""
        rising = np.repeat(self.layout.rising, 2)
        return rising.astype(np.float32), (1 - rising).astype(np.float32)

    def _lay(self, out: Samples, current: Samples, before: Samples, place: int) -> None:
        """Write the same part of several patterns, from symbol ``place`` of the pattern on."""
        n_patterns, count, n_fft = current.shape
        rows = out.reshape(n_patterns, -1)
        edge = self.layout.edge
        for low, high, prefix in self.runs:
            a, b = max(low - place, 0), min(high - place, count)
            if a >= b:
                continue
            offset = int(self.starts[place + a] - self.starts[place])
            length = prefix + n_fft
            part = rows[:, offset : offset + (b - a) * length].reshape(n_patterns, b - a, length)
            body = current[:, a:b]
            part[..., prefix:] = body
            part[..., :prefix] = body[..., n_fft - prefix :]
            if edge:
                rising, falling = self._weights
                mixed = part[..., :edge].view(np.float32)
                mixed *= rising
                mixed += before[:, a:b, :edge].view(np.float32) * falling
