"""OFDM as signals: useful symbols on one axis, prefix and edge on the other."""

from __future__ import annotations

from dataclasses import dataclass, replace
from functools import cached_property
from typing import Self

import numpy as np
import scipy.fft
from numpy.typing import NDArray

from wavegen.core.signal import Range, Samples, Signal
from wavegen.core.symbol_bodies import Undo
from wavegen.dsp.arrival import Arrival
from wavegen.dsp.mapping_kernel import write_values
from wavegen.dsp.symbol_rows import half_turn
from wavegen.sources.ofdm_carried import Carried, Drawn, Pinned
from wavegen.sources.ofdm_layout import Layout
from wavegen.sources.ofdm_reception import labels_of, receive_subcarriers
from wavegen.sources.ofdm_schedule import states
from wavegen.sources.reception import Reception

FFT_SAMPLES = 1 << 16
"""Samples filled and transformed at a time: 512 kB, so that the FFT finds them in cache."""
LAID_SAMPLES = 1 << 18
"""Samples laid at a time: fewer cost calls, more lose the cache."""
FEWEST_ROWS = 4
"""Rows an FFT call should have: single rows run several times slower."""
MOST_GAPS = 12
"""Up to here the bins without data are cleared gap by gap; beyond, clearing all is faster."""


@dataclass(frozen=True, eq=False, kw_only=True)
class SymbolBodies(Signal):
    """The useful part of every symbol: symbol ``k`` at ``[k n_fft, (k + 1) n_fft)``.

    Parameters
    ----------
    n_fft : int
        Useful samples of a symbol.
    carried : tuple of Carried
        What is drawn anew in each symbol.
    pinned : tuple of Pinned
        What is the same in each symbol in which it is on: pilots.
    indices : intp array, shape (n_active,)
        Subcarriers in use in any symbol, ascending; 0 is the centre.
    is_shifted : bool
        Whether every subcarrier stands half a spacing higher, its phase counted from the start
        of the useful part.
    """

    n_fft: int
    carried: tuple[Carried, ...]
    pinned: tuple[Pinned, ...]
    indices: NDArray[np.intp]
    is_shifted: bool = False

    @property
    def block_rows(self) -> int:
        """Symbols worked on at a time."""
        return max(FFT_SAMPLES // self.n_fft, FEWEST_ROWS)

    @cached_property
    def gaps(self) -> list[slice]:
        """Bins without data in some symbol, few slices: empty ones and pilots, or simply all."""
        free = np.ones(self.n_fft, np.bool_)
        for part in self.carried:
            if part.presence.is_always:
                free[part.bins] = False
        edges = np.flatnonzero(np.diff(np.concatenate(([False], free, [False]))))
        if edges.size > 2 * MOST_GAPS:
            return [slice(0, self.n_fft)]
        return [slice(int(a), int(b)) for a, b in edges.reshape(-1, 2)]

    @cached_property
    def backgrounds(self) -> tuple[Samples, NDArray[np.intp]]:
        """Bins of what is pinned, shape (n_states, n_fft), and the state of each symbol."""
        if not self.pinned:
            return np.zeros((1, self.n_fft), np.complex64), np.zeros(1, np.intp)
        on, numbers = states([part.presence for part in self.pinned])
        grids = np.zeros((on.shape[0], self.n_fft), np.complex64)
        for part, is_on in zip(self.pinned, on.T, strict=True):
            grids[np.ix_(is_on, part.bins)] = part.values
        return grids, numbers

    @cached_property
    def on(self) -> NDArray[np.bool_]:
        """Whether each subcarrier is on in each symbol of the frame, (n_frame, n_active)."""
        return labels_of(self) >= 0

    @cached_property
    def turn(self) -> Samples:
        """Shift by half a subcarrier, shape (n_fft,)."""
        return half_turn(self.n_fft).astype(np.complex64)

    def draw(self, first: int, count: int) -> list[Drawn]:
        """Return the words of symbols ``first ...`` for each of ``carried``."""
        return [part.rows(first, count) for part in self.carried]

    def fill(self, some: Samples, drawn: list[Drawn], *, first: int, skip: int) -> None:
        """Write the bins of successive symbols.

        Parameters
        ----------
        some : complex64 array, shape (n_symbols, n_fft)
            Written to; contiguous.
        drawn : list of unsigned integer array
            What :meth:`draw` gave for symbols ``first ...``.
        first : int
            Its first symbol.
        skip : int
            Symbols of it before those written here.
        """
        grids, numbers = self.backgrounds
        symbol, count = first + skip, some.shape[0]
        for gap in self.gaps:
            if grids.shape[0] == 1:
                some[:, gap] = grids[0, gap]
            else:
                which = numbers[np.arange(symbol, symbol + count) % numbers.size]
                some[:, gap] = grids[which, gap]
        for part, words in zip(self.carried, drawn, strict=True):
            part.write(some, part.between(words, first, skip, count), symbol)

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Return whole symbols: FFT bins filled, then transformed in place."""
        first = start // self.n_fft
        rows = np.empty((stop // self.n_fft - first, self.n_fft), np.complex64)
        drawn = self.draw(first, rows.shape[0])
        for low in range(0, rows.shape[0], self.block_rows):
            some = rows[low : low + self.block_rows]
            self.fill(some, drawn, first=first, skip=low)
            done = scipy.fft.ifft(some, axis=1, norm="forward", overwrite_x=True)
            if not np.may_share_memory(done, some):
                some[:] = done
            if self.is_shifted:
                some *= self.turn
        return rows.reshape(-1)


@dataclass(frozen=True, eq=False, kw_only=True)
class Subcarriers(Signal):
    """What each subcarrier carries: index ``symbol * n_active + position``, ascending.

    Zero where a subcarrier is off.

    Parameters
    ----------
    bodies : SymbolBodies
        Whose subcarriers; values are on the scale of ``fft(body) / n_fft``, once a shift by
        half a subcarrier is undone.
    """

    bodies: SymbolBodies

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Return the values of whole symbols."""
        bodies = self.bodies
        n_active = bodies.indices.size
        first = start // n_active
        out = np.empty((stop // n_active - first, n_active), np.complex64)
        drawn = bodies.draw(first, out.shape[0])
        room = np.empty((min(bodies.block_rows, out.shape[0]), bodies.n_fft), np.complex64)
        bins = bodies.indices % bodies.n_fft
        for low in range(0, out.shape[0], bodies.block_rows):
            some = room[: out.shape[0] - low]
            bodies.fill(some, drawn, first=first, skip=low)
            out[low : low + bodies.block_rows] = some[:, bins]
        return out.reshape(-1)


@dataclass(frozen=True, eq=False, kw_only=True)
class Points(Signal):
    """Points of the groups before DFT spreading: index ``symbol * n_points + position``.

    Group by group, in each the order in which its subcarriers are listed; zero where a group is
    off. Rotation, level and scale are included: the DFT of a spread group's points, over the
    root of their number, is what :class:`Subcarriers` has for it.

    Parameters
    ----------
    bodies : SymbolBodies
        Whose groups.
    """

    bodies: SymbolBodies

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Return the points of whole symbols."""
        parts = self.bodies.carried
        n_points = sum(part.bins.size for part in parts)
        first = start // n_points
        out = np.zeros((stop // n_points - first, n_points), np.complex64)
        column = 0
        for part in parts:
            place = np.arange(column, column + part.bins.size, dtype=np.uint32)
            points = part.points(part.rows(first, out.shape[0]))
            write_values(out, points, bins=place, places=part.presence.places(first, out.shape[0]))
            column += part.bins.size
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
    points : Signal or None
        Points before DFT spreading, on the (symbol, point) axis; None where nothing is spread.
    is_shifted : bool
        Whether subcarriers stand half a spacing higher: what goes on beyond a useful symbol, on
        either side, is then its other end with the sign changed.
    undone_by : tuple of Undo
        What a receiver takes back of what stages did to the bodies, the last first.
    """

    layout: Layout
    ideal: Subcarriers
    points: Signal | None = None
    is_shifted: bool = False
    undone_by: tuple[Undo, ...] = ()

    @property
    def bodies(self) -> Signal:
        """Useful parts of the symbols: those of the source, or what stages made of them."""
        return self.inputs[0]

    @property
    def grid(self) -> SymbolBodies:
        """What the source puts on its subcarriers."""
        return self.ideal.bodies

    def with_bodies(self, bodies: Signal, *, undo: Undo | None = None) -> Self:
        """Return the same with other bodies; what was sent stays the reference of EVM.

        Parameters
        ----------
        bodies : Signal
            Of the same length and mean power.
        undo : Undo, optional
            What a receiver takes back before it compares.
        """
        more = () if undo is None else (undo,)
        return replace(self, inputs=(bodies,), undone_by=(*more, *self.undone_by))

    def receive(
        self, conditioned: Signal, arrival: Arrival, *, early_samples: int | None = None
    ) -> Reception:
        """Return the subcarriers sent and those behind one transform a symbol.

        Parameters
        ----------
        conditioned : Signal
            What a receiver gets, at the sample rate of this signal.
        arrival : Arrival
            How this signal stands in it.
        early_samples : int, optional
            How long before the useful part the transform begins; in the middle of what the edge
            leaves of the shortest prefix if not given. Earlier ones meet the symbol before.

        Returns
        -------
        Reception

        Raises
        ------
        SignalError
            The transform would begin outside the shortest prefix.
        """
        return receive_subcarriers(
            conditioned,
            arrival,
            layout=self.layout,
            ideal=self.ideal,
            points=self.points,
            is_shifted=self.is_shifted,
            early_samples=early_samples,
            undone_by=self.undone_by,
        )

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
        falling = rising - 1 if self.is_shifted else 1 - rising
        return rising.astype(np.float32), falling.astype(np.float32)

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
            if self.is_shifted:
                np.negative(body[..., n_fft - prefix :], out=part[..., :prefix])
            else:
                part[..., :prefix] = body[..., n_fft - prefix :]
            if edge:
                rising, falling = self._weights
                mixed = part[..., :edge].view(np.float32)
                mixed *= rising
                mixed += before[:, a:b, :edge].view(np.float32) * falling
