"""From symbols to samples of constant envelope, by tables alone.

Phases are whole numbers of 2^-32 turns, so that they add without rounding and wrap by themselves:
the order of adding, and how a range is cut, cannot change a bit. What the finished symbols have
turned is an exact state (whole numbers modulo the denominator of the index); the symbols still
turning are a pattern, looked up whole or in groups.
"""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction
from functools import cached_property
from typing import cast

import numpy as np
from numpy.typing import NDArray

from wavegen.core.signal import Samples
from wavegen.dsp.phase_pulses import PhasePulse

TURN = 1 << 32
"""Units of phase in a turn; half a unit is 7e-10 rad."""
MOST_GROUP_ENTRIES = 1 << 15
"""Entries of the table of one group of symbols, about: 128 kB stay in the cache."""
MOST_DIRECT_ENTRIES = 1 << 18
"""Entries of a table of samples, 2 MB: beyond, phases are added and their sine taken."""
MOST_PHASES = 1 << 12
"""Instants within a symbol that get a place of their own; beyond, places are interpolated."""
LINEAR_ERROR_RAD = 5e-8
"""Most that interpolating the phase on a straight line may err."""

Codes = tuple[NDArray[np.intp], ...]


@dataclass(frozen=True, eq=False, kw_only=True)
class PhaseTables:
    """Phases within a symbol by pattern, and what finished symbols leave.

    Parameters
    ----------
    pulse : PhasePulse
        Rise of the phase by one symbol.
    alphabet : tuple of int
        Levels, ascending and evenly spaced: number ``i`` of a symbol means ``alphabet[i]``.
    index : Fraction
        Modulation index: a symbol of level ``v`` turns the phase by ``index v / 2`` turns.
    start_turns : Fraction
        Phase before any symbol, turns; a multiple of 2^-32.
    n_phases : int
        Evenly spaced instants within a symbol that are asked for.
    """

    pulse: PhasePulse
    alphabet: tuple[int, ...]
    index: Fraction
    start_turns: Fraction
    n_phases: int

    @property
    def is_interpolated(self) -> bool:
        """Whether there are too many instants to tabulate each."""
        return self.n_phases > MOST_PHASES

    @property
    def n_states(self) -> int:
        """Sums of levels that leave different phases."""
        return states_of(self.index)

    @cached_property
    def n_places(self) -> int:
        """Places within a symbol at which phases are tabulated."""
        if not self.is_interpolated:
            return self.n_phases
        places = 256
        while self._linear_error_rad(places) > LINEAR_ERROR_RAD:
            places *= 2
        return places

    @property
    def row(self) -> int:
        """Entries of a pattern: the places, and one to interpolate to."""
        return self.n_places + self.is_interpolated

    @cached_property
    def sizes(self) -> tuple[int, ...]:
        """Symbols of each group, from the earliest that is still turning."""
        near, most = self.pulse.n_near, 1
        while len(self.alphabet) ** (most + 1) * self.row <= MOST_GROUP_ENTRIES:
            most += 1
        n_groups = -(-near // most)
        return tuple(near // n_groups + (i < near % n_groups) for i in range(n_groups))

    @cached_property
    def is_direct(self) -> bool:
        """Whether samples themselves are tabulated, by state and pattern."""
        n_rows = self.n_states * len(self.alphabet) ** self.pulse.n_near
        return not self.is_interpolated and n_rows * self.row <= MOST_DIRECT_ENTRIES

    @cached_property
    def states(self) -> NDArray[np.uint32]:
        """Phase that each sum of levels leaves, shape (n_states,)."""
        half = self.index / 2
        exact = [(half * state + self.start_turns) % 1 for state in range(self.n_states)]
        return np.array([round(turns * TURN) % TURN for turns in exact], np.uint32)

    @cached_property
    def groups(self) -> tuple[NDArray[np.uint32], ...]:
        """Phase by pattern and place, a table a group, shape (n_patterns * row,)."""
        made, first = [], 0
        for size in self.sizes:
            made.append(self._patterns(first, size).reshape(-1))
            first += size
        return tuple(made)

    @cached_property
    def direct(self) -> Samples:
        """Samples by state, pattern and place, shape (n_states * n_patterns, row)."""
        phases = self.states[:, None, None] + self._patterns(0, self.pulse.n_near)
        turns = phases.reshape(-1, self.row).astype(np.float64) / TURN
        return cast("Samples", np.exp(2j * np.pi * turns).astype(np.complex64))

    def codes(self, numbers: NDArray[np.uint8], sums: NDArray[np.int64]) -> Codes:
        """Return where in the tables each symbol interval lies.

        Parameters
        ----------
        numbers : uint8 array, shape (count + n_near - 1,)
            Symbols, from the earliest that still turns in the first interval.
        sums : int64 array, shape (count,)
            Levels of all symbols finished before each interval, added up.

        Returns
        -------
        tuple of intp array, shape (count,)
            One array of row numbers if :attr:`is_direct`; else state, then row numbers by group.
        """
        count, order = sums.size, len(self.alphabet)
        state = (sums % self.n_states).astype(np.intp)
        sizes = (self.pulse.n_near,) if self.is_direct else self.sizes
        made, first = [], 0
        for size in sizes:
            code = numbers[first : first + count].astype(np.intp)
            for place in range(first + 1, first + size):
                code *= order
                code += numbers[place : place + count]
            made.append(code)
            first += size
        if self.is_direct:
            state *= order**self.pulse.n_near
            state += made[0]
            return (state,)
        return (state, *made)

    def whole_symbols(self, codes: Codes, out: Samples) -> None:
        """Write all places of consecutive symbol intervals.

        Parameters
        ----------
        codes : tuple of intp array, shape (count,)
            From :meth:`codes`.
        out : complex64 array, shape (count * n_places,)
            Written.
        """
        rows = out.reshape(codes[0].size, self.row)
        if self.is_direct:
            self.direct.take(codes[0], axis=0, out=rows, mode="clip")
            return
        total = np.empty(rows.shape, np.uint32)
        total[...] = self.states.take(codes[0])[:, None]
        part = np.empty_like(total)
        for code, table in zip(codes[1:], self.groups, strict=True):
            table.reshape(-1, self.row).take(code, axis=0, out=part, mode="clip")
            total += part
        _turn(total.reshape(-1), out)

    def at_places(
        self, codes: Codes, interval: NDArray[np.intp], place: NDArray[np.intp], out: Samples
    ) -> None:
        """Write samples at tabulated places.

        Parameters
        ----------
        codes : tuple of intp array
            From :meth:`codes`.
        interval, place : intp array, shape (n,)
            Number of the interval among the codes, and place within it.
        out : complex64 array, shape (n,)
            Written.
        """
        if self.is_direct:
            self.direct.reshape(-1).take(
                self._where(codes[0], interval, place), out=out, mode="clip"
            )
            return
        total = self.states.take(codes[0]).take(interval)
        for code, table in zip(codes[1:], self.groups, strict=True):
            total += table.take(self._where(code, interval, place))
        _turn(total, out)

    def between_places(
        self, codes: Codes, interval: NDArray[np.intp], time: NDArray[np.float64], out: Samples
    ) -> None:
        """Write samples at any instants, phases interpolated between places.

        Parameters
        ----------
        codes : tuple of intp array
            From :meth:`codes`.
        interval : intp array, shape (n,)
            Number of the interval among the codes.
        time : float64 array, shape (n,)
            Instant within it, 0 to 1 symbol.
        out : complex64 array, shape (n,)
            Written.
        """
        scaled = time * self.n_places
        place = np.minimum(scaled.astype(np.intp), self.n_places - 1)
        beyond = scaled - place
        total = self.states.take(codes[0]).take(interval)
        for code, table in zip(codes[1:], self.groups, strict=True):
            where = self._where(code, interval, place)
            low = table.take(where)
            rise = (table.take(where + 1) - low).view(np.int32)
            total += low
            total += np.rint(rise * beyond).astype(np.int32).view(np.uint32)
        _turn(total, out)

    def _where(
        self, code: NDArray[np.intp], interval: NDArray[np.intp], place: NDArray[np.intp]
    ) -> NDArray[np.intp]:
        where = (code * self.row).take(interval)
        where += place
        return where

    def _patterns(self, first: int, size: int) -> NDArray[np.uint32]:
        """Return phases by pattern of ``size`` symbols, shape (n_patterns, row)."""
        order = len(self.alphabet)
        levels = np.array(self.alphabet, np.float64)
        pattern = np.arange(order**size)
        turns = np.zeros((pattern.size, self.row))
        u = np.arange(self.row) / self.n_places
        for place in range(size):
            level = levels[pattern // order ** (size - 1 - place) % order]
            turns += level[:, None] * self._rise(first + place, u)
        units = np.rint(turns * TURN).astype(np.int64)
        return (units % TURN).astype(np.uint32)

    def _rise(self, place: int, u: NDArray[np.float64]) -> NDArray[np.float64]:
        """Return turns by the near symbol ``place``, the earliest first, for level 1."""
        return float(self.index) * self.pulse.values(u + (self.pulse.last_symbols - 1 - place))

    def _linear_error_rad(self, places: int) -> float:
        """Return how far a straight line between places misses the phase, for the worst levels."""
        u = np.arange(places) / places
        total = np.zeros(places)
        for place in range(self.pulse.n_near):
            ends = self._rise(place, u) + self._rise(place, u + 1 / places)
            total += np.abs(self._rise(place, u + 0.5 / places) - ends / 2)
        return float(2 * np.pi * max(map(abs, self.alphabet)) * total.max())


def states_of(index: Fraction) -> int:
    """Return how many sums of levels leave different phases at a modulation index.

    Examples
    --------
    >>> states_of(Fraction(1, 2)), states_of(Fraction(8, 25))
    (4, 25)
    """
    return (index / 2).denominator


def _turn(units: NDArray[np.uint32], out: Samples) -> None:
    """Write ``exp(2 pi j units / TURN)``; the angle is rounded once, to float32."""
    angle = (units.view(np.int32) * (2 * np.pi / TURN)).astype(np.float32)
    np.cos(angle, out=out.real)
    np.sin(angle, out=out.imag)
