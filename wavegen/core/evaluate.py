"""Plan and evaluate: each signal of a graph computed once for a strip.

One backward pass collects the ranges wanted of each signal, one forward pass computes them,
cut at the seam, and frees them after their last reader. Nothing pulls recursively: recursion
would double the work per round at the seam.
"""

from __future__ import annotations

from bisect import bisect_right
from collections.abc import Mapping
from dataclasses import dataclass
from typing import TypeVar

import numpy as np
from numpy.typing import NDArray

from wavegen.core.signal import Range, Samples, Signal

Scalar = TypeVar("Scalar", bound=np.generic)

BYTES_PER_SAMPLE = 8
MERGE_GAP = 1 << 12
"""Ranges of one signal closer than this are computed as one; it only saves calls."""


@dataclass(frozen=True, slots=True)
class Work:
    """What one signal computes for a plan: folded ranges ``0 <= start < stop <= n_samples``."""

    signal: Signal
    segments: tuple[Range, ...]

    @property
    def n_samples(self) -> int:
        """Samples computed in all segments."""
        return sum(stop - start for start, stop in self.segments)


@dataclass(frozen=True, slots=True)
class Plan:
    """The work for a set of ranges, in the order of computing."""

    work: tuple[Work, ...]
    wanted: Mapping[Signal, Range]

    @property
    def cost_samples(self) -> int:
        """Samples computed over all signals."""
        return sum(item.n_samples for item in self.work)

    @property
    def peak_bytes(self) -> int:
        """Most bytes of samples alive at once while evaluating (temporaries excluded)."""
        readers = _count_readers(self.work)
        size = {item.signal: item.n_samples * BYTES_PER_SAMPLE for item in self.work}
        alive = most = 0
        for item in self.work:
            alive += size[item.signal]
            most = max(most, alive)
            for source in item.signal.inputs:
                readers[source] -= 1
                if not readers[source] and source not in self.wanted:
                    alive -= size[source]
        return most


def order(roots: list[Signal]) -> list[Signal]:
    """Return all signals below ``roots``, inputs before their readers, each once."""
    done: list[Signal] = []
    seen: set[Signal] = set()
    stack: list[tuple[Signal, bool]] = [(root, False) for root in reversed(roots)]
    while stack:
        signal, expanded = stack.pop()
        if expanded:
            done.append(signal)
        elif signal not in seen:
            seen.add(signal)
            stack.append((signal, True))
            stack.extend((source, False) for source in reversed(signal.inputs))
    return done


def plan(wanted: Mapping[Signal, Range]) -> Plan:
    """Collect what must be computed of each signal for the ranges wanted.

    Parameters
    ----------
    wanted : mapping of Signal to (start, stop)
        Each range on the signal's own axis; indices may pass the seam.

    Returns
    -------
    Plan
        Work in the order of computing.
    """
    ordered = order(list(wanted))
    want: dict[Signal, list[Range]] = {signal: [] for signal in ordered}
    for signal, (start, stop) in wanted.items():
        want[signal].extend(fold(start, stop, signal.n_samples))
    work: list[Work] = []
    for signal in reversed(ordered):
        segments = _merge(want[signal], signal.step, signal.n_samples)
        work.append(Work(signal, segments))
        for start, stop in segments:
            needed = signal.needs(start, stop)
            for source, (low, high) in zip(signal.inputs, needed, strict=True):
                want[source].extend(fold(low, high, source.n_samples))
    return Plan(tuple(reversed(work)), dict(wanted))


def fold(start: int, stop: int, period: int) -> list[Range]:
    """Fold an unfolded range into ``[0, period)``: in order, cut at each seam.

    Examples
    --------
    >>> fold(-2, 3, 10)
    [(8, 10), (0, 3)]
    """
    if stop - start >= period:
        return [(0, period)]
    if start >= stop:
        return []
    first = start % period
    last = first + stop - start
    return [(first, last)] if last <= period else [(first, period), (0, last - period)]


def repeat(period: NDArray[Scalar], start: int, stop: int) -> NDArray[Scalar]:
    """Return a range of a cyclic array by copying whole periods.

    Parameters
    ----------
    period : array, shape (n,)
        One period.
    start, stop : int
        Range; indices may pass the seam, be negative or cover several periods.

    Returns
    -------
    array, shape (stop - start,)

    Notes
    -----
    ``take(mode="wrap")`` steps each index down by one period at a time: far along a short
    period it never ends.

    Examples
    --------
    >>> repeat(np.array([0, 1, 2]), -2, 6)
    array([1, 2, 0, 1, 2, 0, 1, 2])
    """
    first = start % period.size
    begun = np.concatenate((period[first:], period[:first]))
    return np.tile(begun, -(-(stop - start) // period.size))[: stop - start]


def _merge(ranges: list[Range], step: int, period: int) -> tuple[Range, ...]:
    """Widen folded ranges to the grid and join those that touch or nearly touch."""
    gap = max(step, MERGE_GAP)
    merged: list[Range] = []
    for low, high in sorted(ranges):
        start = low // step * step
        stop = min(-(-high // step) * step, period)
        if merged and start <= merged[-1][1] + gap:
            merged[-1] = (merged[-1][0], max(merged[-1][1], stop))
        else:
            merged.append((start, stop))
    return tuple(merged)


class _Held:
    """The computed segments of one signal."""

    def __init__(self, signal: Signal, segments: tuple[Range, ...]) -> None:
        self.period = signal.n_samples
        self.starts = [start for start, _ in segments]
        self.arrays: list[Samples] = []

    def read(self, start: int, stop: int) -> Samples:
        """Return an unfolded range; a view where it lies in one segment."""
        if stop - start > self.period:
            return repeat(self.arrays[0], start, stop)
        pieces: list[Samples] = []
        position = start
        while position < stop:
            folded = position % self.period
            number = bisect_right(self.starts, folded) - 1
            offset = folded - self.starts[number]
            array = self.arrays[number]
            count = min(stop - position, array.size - offset)
            pieces.append(array[offset : offset + count])
            position += count
        if len(pieces) == 1:
            return pieces[0]
        return np.concatenate(pieces) if pieces else np.empty(0, np.complex64)


def _count_readers(work: tuple[Work, ...]) -> dict[Signal, int]:
    readers: dict[Signal, int] = {item.signal: 0 for item in work}
    for item in work:
        for source in item.signal.inputs:
            readers[source] += 1
    return readers


def evaluate(
    wanted: Mapping[Signal, Range], *, made: dict[Signal, int] | None = None
) -> dict[Signal, Samples]:
    """Compute ranges of signals, each signal of the graph once.

    Parameters
    ----------
    wanted : mapping of Signal to (start, stop)
        Each range on the signal's own axis. Indices may pass the seam, be negative, or cover
        several periods.
    made : dict, optional
        Filled with the number of samples computed of each signal (recomputation shows here).

    Returns
    -------
    dict of Signal to complex64 array, shape (stop - start,)
        Contiguous. Not to be written to: two entries may share memory.

    Raises
    ------
    ValueError
        A signal computed another number of samples than it was asked for.
    """
    todo = plan(wanted)
    readers = _count_readers(todo.work)
    held: dict[Signal, _Held] = {}
    for item in todo.work:
        signal = item.signal
        store = _Held(signal, item.segments)
        for start, stop in item.segments:
            needed = signal.needs(start, stop)
            arrays = [
                held[source].read(low, high)
                for source, (low, high) in zip(signal.inputs, needed, strict=True)
            ]
            samples = np.ascontiguousarray(signal.compute(start, stop, *arrays))
            if samples.shape != (stop - start,):
                kind = type(signal).__name__
                msg = f"{kind}.compute gave {samples.shape} for [{start}, {stop})"
                raise ValueError(msg)
            store.arrays.append(samples)
        held[signal] = store
        if made is not None:
            made[signal] = made.get(signal, 0) + item.n_samples
        for source in signal.inputs:
            readers[source] -= 1
            if not readers[source] and source not in wanted:
                held.pop(source, None)
    return {signal: held[signal].read(start, stop) for signal, (start, stop) in wanted.items()}
