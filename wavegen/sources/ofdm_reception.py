"""What a receiver makes of OFDM: subcarriers by one transform a symbol, points behind them."""

from __future__ import annotations

from dataclasses import dataclass, replace
from functools import cached_property
from typing import Protocol

import numpy as np
import scipy.fft
from numpy.typing import NDArray

from wavegen.core.errors import SignalError
from wavegen.core.signal import Range, Samples, Signal
from wavegen.core.symbol_bodies import Undo
from wavegen.dsp.arrival import Arrival, bring_back
from wavegen.sources.ofdm_carried import Carried, Pinned
from wavegen.sources.ofdm_layout import Layout
from wavegen.sources.reception import Reception, SymbolClass

FFT_SAMPLES = 1 << 16
"""Samples gathered and transformed at a time: 512 kB."""
FEWEST_ROWS = 4
"""Rows an FFT call has at least; a short last group is filled up."""


@dataclass(frozen=True, eq=False, kw_only=True)
class ReceivedSubcarriers(Signal):
    """Subcarriers of OFDM symbols: index ``symbol * n_active + position``, ascending.

    Parameters
    ----------
    layout : Layout
        Prefixes.
    indices : intp array, shape (n_active,)
        Subcarriers in use in any symbol.
    early_samples : int
        How long before the useful part the transform begins, inside the prefix; undone in phase.
    on : bool array, shape (n_frame, n_active), or None
        Which of them are on in each symbol of the frame; the others read 0. None: all.
    is_shifted : bool
        Whether every subcarrier stands half a spacing higher.
    """

    layout: Layout
    indices: NDArray[np.intp]
    early_samples: int
    on: NDArray[np.bool_] | None = None
    is_shifted: bool = False

    @cached_property
    def starts(self) -> list[int]:
        """Where the transform of each symbol of the pattern begins, samples from its start."""
        before = np.cumsum([0, *(prefix + self.layout.n_fft for prefix in self.layout.prefixes)])
        return [
            int(start) + prefix - self.early_samples
            for start, prefix in zip(before[:-1], self.layout.prefixes, strict=True)
        ]

    @cached_property
    def _turn(self) -> Samples:
        """What undoes an early transform, and the scale; shape (n_active,)."""
        n = self.layout.n_fft
        turn = self.indices * self.early_samples % n / n
        return np.asarray(np.exp(2j * np.pi * turn) / n).astype(np.complex64)

    @cached_property
    def _unshift(self) -> Samples:
        """What undoes the shift by half a subcarrier over the samples of a transform."""
        n = np.arange(self.layout.n_fft) - self.early_samples
        return np.asarray(np.exp(-1j * np.pi / self.layout.n_fft * n)).astype(np.complex64)

    def _start_of(self, symbol: int) -> int:
        pattern, place = divmod(symbol, self.layout.n_symbols)
        return pattern * self.layout.n_samples + self.starts[place]

    def needs(self, start: int, stop: int) -> tuple[Range, ...]:
        """Return the samples of the transforms."""
        first, last = start // self.indices.size, stop // self.indices.size - 1
        return ((self._start_of(first), self._start_of(last) + self.layout.n_fft),)

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Transform whole symbols."""
        n_fft, n_active = self.layout.n_fft, self.indices.size
        first, end = start // n_active, stop // n_active
        origin = self._start_of(first)
        out = np.empty((end - first, n_active), np.complex64)
        most = max(FFT_SAMPLES // n_fft // FEWEST_ROWS, 1) * FEWEST_ROWS
        most = min(most, -(-out.shape[0] // FEWEST_ROWS) * FEWEST_ROWS)
        work = np.empty((most, n_fft), np.complex64)
        bins = self.indices % n_fft
        for low in range(0, out.shape[0], most):
            count = min(most, out.shape[0] - low)
            for row in range(count):
                place = self._start_of(first + low + row) - origin
                work[row] = arrays[0][place : place + n_fft]
            used = -(-count // FEWEST_ROWS) * FEWEST_ROWS
            work[count:used] = 0
            if self.is_shifted:
                work[:used] *= self._unshift
            lines: Samples = scipy.fft.fft(work[:used], axis=1, overwrite_x=True)
            out[low : low + count] = lines[:count, bins]
        out *= self._turn
        if self.on is not None:
            np.multiply(out, self.on[np.arange(first, end) % self.on.shape[0]], out=out)
        return out.reshape(-1)


@dataclass(frozen=True, eq=False, kw_only=True)
class ReceivedPoints(Signal):
    """Points of groups before DFT spreading: index ``symbol * n_points + position``.

    Parameters
    ----------
    carried : tuple of Carried
        The groups, in the order of the points.
    columns : tuple of intp array
        Positions of each group's subcarriers on the axis of the input.
    n_active : int
        Subcarriers a symbol on that axis.
    """

    carried: tuple[Carried, ...]
    columns: tuple[NDArray[np.intp], ...]
    n_active: int

    @property
    def _n_points(self) -> int:
        return sum(columns.size for columns in self.columns)

    def needs(self, start: int, stop: int) -> tuple[Range, ...]:
        """Return the subcarriers of the same symbols."""
        n = self._n_points
        return ((start // n * self.n_active, stop // n * self.n_active),)

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Undo the spreading of whole symbols."""
        rows = arrays[0].reshape(-1, self.n_active)
        out = np.zeros((rows.shape[0], self._n_points), np.complex64)
        first, column = start // self._n_points, 0
        for part, columns in zip(self.carried, self.columns, strict=True):
            places = part.presence.places(first, rows.shape[0])
            values = rows[:, columns] if places is None else rows[places][:, columns]
            if part.is_spread and values.size:
                values = _despread(values)
            where = slice(None) if places is None else places
            out[where, column : column + columns.size] = values
            column += columns.size
        return out.reshape(-1)


def _despread(values: Samples) -> Samples:
    """Return inverse DFT rows over their root; always a multiple of four rows at once."""
    count = values.shape[0]
    filled = np.zeros((-(-count // FEWEST_ROWS) * FEWEST_ROWS, values.shape[1]), np.complex64)
    filled[:count] = values
    made = scipy.fft.ifft(filled, axis=1, norm="ortho", overwrite_x=True)
    return np.asarray(made[:count], np.complex64)


class Grid(Protocol):
    """What is on which subcarriers: the useful parts of the symbols."""

    @property
    def carried(self) -> tuple[Carried, ...]:
        """Groups."""

    @property
    def pinned(self) -> tuple[Pinned, ...]:
        """Pilots."""

    @property
    def indices(self) -> NDArray[np.intp]:
        """Subcarriers in use in any symbol, ascending."""

    @property
    def n_fft(self) -> int:
        """Useful samples of a symbol."""


def columns_of(bins: NDArray[np.intp] | NDArray[np.uint32], grid: Grid) -> NDArray[np.intp]:
    """Return the positions of FFT bins among the subcarriers in use."""
    place = np.empty(grid.n_fft, np.intp)
    place[grid.indices % grid.n_fft] = np.arange(grid.indices.size)
    return place[bins]


def labels_of(grid: Grid) -> NDArray[np.int16]:
    """Return the class of each subcarrier over the frame: groups, then pilots; -1 where none is.

    Parameters
    ----------
    grid : Grid
        What is on which subcarriers.

    Returns
    -------
    int16 array, shape (n_frame, n_active)
        One row where nothing is scheduled.
    """
    parts: list[Carried | Pinned] = [*grid.carried, *grid.pinned]
    n_frame = 1 if all(p.presence.is_always for p in parts) else parts[0].presence.on.size
    labels = np.full((n_frame, grid.indices.size), -1, np.int16)
    for number, part in enumerate(parts):
        rows = np.flatnonzero(part.presence.on[:n_frame])
        labels[np.ix_(rows, columns_of(part.bins, grid))] = number
    return labels


@dataclass(frozen=True, eq=False, kw_only=True)
class PointsBehind:
    """How to go from subcarriers to the points of the groups.

    Parameters
    ----------
    grid : Grid
        What is on which subcarriers.
    points : Signal
        The points sent.
    """

    grid: Grid
    points: Signal

    def reception(self, subcarriers: Signal) -> Reception:
        """Return the reception on the axis of the points.

        Parameters
        ----------
        subcarriers : Signal
            As received and equalised.
        """
        parts = self.grid.carried
        labels = [
            np.where(part.presence.on[:, None], np.int16(number), np.int16(-1)).repeat(
                part.bins.size, axis=1
            )
            for number, part in enumerate(parts)
        ]
        received = ReceivedPoints(
            sample_rate_hz=self.points.sample_rate_hz,
            n_samples=self.points.n_samples,
            step=self.points.step,
            inputs=(subcarriers,),
            mean_power=None,
            carried=parts,
            columns=tuple(columns_of(part.bins, self.grid) for part in parts),
            n_active=self.grid.indices.size,
        )
        return Reception(
            received=received,
            ideal=self.points,
            classes=classes_of(self.grid)[: len(parts)],
            n_columns=sum(part.bins.size for part in parts),
            labels=np.concatenate(labels, axis=1),
        )


def classes_of(grid: Grid) -> tuple[SymbolClass, ...]:
    """Return the classes of a grid: groups, then pilots."""
    groups = [SymbolClass(name=p.name, constellation=p.constellation) for p in grid.carried]
    return (*groups, *(SymbolClass(name=part.name) for part in grid.pinned))


def receive_subcarriers(
    conditioned: Signal,
    arrival: Arrival,
    *,
    layout: Layout,
    ideal: Signal,
    points: Signal | None,
    is_shifted: bool,
    early_samples: int | None,
    undone_by: tuple[Undo, ...] = (),
) -> Reception:
    """Return the subcarriers sent and received; see ``Prefixed.receive``.

    Parameters
    ----------
    conditioned : Signal
        What a receiver gets.
    arrival : Arrival
        How the OFDM signal stands in it.
    layout : Layout
        Prefixes and edge.
    ideal : Subcarriers
        What each subcarrier carries.
    points : Points or None
        Points before DFT spreading.
    is_shifted : bool
        Whether every subcarrier stands half a spacing higher.
    early_samples : int or None
        How long before the useful part the transform begins.
    undone_by : tuple of Undo
        What is taken back of what stages did to the symbols, in this order.

    Raises
    ------
    SignalError
        The transform would begin outside the shortest prefix.
    """
    grid: Grid = ideal.bodies  # type: ignore[attr-defined] # Subcarriers, which imports this
    longest = min(layout.prefixes)
    early = (longest - layout.edge) // 2 if early_samples is None else early_samples
    if not 0 <= early <= longest:
        raise SignalError(
            where="ofdm",
            problem=f"a transform {early} samples before the useful part of a symbol",
            allowed=f"0 to {longest}: inside the shortest prefix",
            remedy="Choose a shorter window of timings.",
        )
    labels = labels_of(grid)
    received: Signal = ReceivedSubcarriers(
        sample_rate_hz=ideal.sample_rate_hz,
        n_samples=ideal.n_samples,
        step=ideal.step,
        inputs=(bring_back(conditioned, arrival),),
        mean_power=None,
        layout=replace(layout, edge=0),
        indices=grid.indices,
        early_samples=early,
        on=None if (labels >= 0).all() else labels >= 0,
        is_shifted=is_shifted,
    )
    for one in undone_by:
        received = one.undo(received)
    return Reception(
        received=received,
        ideal=ideal,
        classes=classes_of(grid),
        n_columns=grid.indices.size,
        labels=labels,
        spread=None if points is None else PointsBehind(grid=grid, points=points),
        remarks=arrival.remarks,
    )
