"""What a record looks like besides its power: rails, codes, runs, ends, and sums by cells."""

from __future__ import annotations

from dataclasses import dataclass
from operator import itemgetter
from typing import Self

import numpy as np
from numpy.typing import NDArray

from wavegen.core.signal import Samples, Signal
from wavegen.dsp.cell_sums import CELL
from wavegen.dsp.record_kernel import (
    FLOAT_SHIFT,
    N_FLOAT_CODES,
    count_codes,
    glance,
    longest_repeat,
    sum_rails,
    sum_rails_by_numpy,
)

Floats = NDArray[np.float64]
Indices = NDArray[np.int64]
N_HEAD = 64
"""Samples at the start that are kept, and left out of the sums: records begin with fill words
and start-up."""
N_SUMS = 4
FINEST_CODES = 1 << 15
"""Codes to full scale up to which each is counted; finer ones are counted by octaves."""
_CELLS_AT_LEAST = 256
_LONGEST_CELL = 1 << 12
_MOST_CELLS = 1 << 17
_SHORTEST_CELL = 1 << 4
_BLOCK = 1 << 14
"""Samples looked at in turn: 128 kB, which stay in the cache."""
_MOST_FRESH = 1 << 31
"""Samples after which counts of 32 bits are added up."""


def cell_length(n_samples: int) -> int:
    """Return the length of a cell of sums: a power of two.

    256 to 511 cells of up to 4096 samples each; of very long records longer ones, so that there
    are never more than 131072.
    """
    wanted = 1 << max(n_samples // _CELLS_AT_LEAST, 1).bit_length() - 1
    longest = max(_LONGEST_CELL, 1 << (max(n_samples - 1, 0) // _MOST_CELLS).bit_length())
    return min(max(wanted, _SHORTEST_CELL), longest)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class RecordFigures:
    """What was seen of a record.

    Parameters
    ----------
    n_samples : int
        Length.
    offset : complex
        What sums and distances are taken about.
    n_bad, first_bad : int
        Samples that are not finite, and the first of them (-1: none). They count as ``offset``
        in everything else.
    head, last : complex64 array
        The first 64 samples and the last one.
    total_power : float
        Sum of ``|x|^2`` of all finite samples.
    head_power : float
        Part of it in the head.
    peak : float
        Largest ``|x|^2``, head included.
    nearest, furthest : float
        Least and largest ``|x - offset|^2`` outside the head.
    cells : float64 array, shape (n_cells, 4)
        Of each cell of ``cell_samples``: count, sums of I, of Q and of ``|x - offset|^2``,
        without the head.
    cell_samples : int
        Length of a cell.
    code_scale : float or None
        Codes to full scale, where codes were counted.
    rails : tuple of (float64 array, int64 array)
        Of each rail: values that occur, rising (codes, or edges of bins of 1/512 octave), and how
        often.
    n_fill, first_fill : int
        Samples with both rails at the lowest code, and the first of them.
    first_run, last_run, longest_run : int
        Equal samples in a row at the start, at the end, and most anywhere between.
    """

    n_samples: int
    offset: complex
    n_bad: int
    first_bad: int
    head: Samples
    last: Samples
    total_power: float
    head_power: float
    peak: float
    nearest: float
    furthest: float
    cells: Floats
    cell_samples: int
    code_scale: float | None
    rails: tuple[tuple[Floats, Indices], ...]
    n_fill: int
    first_fill: int
    first_run: int
    last_run: int
    longest_run: int


@dataclass(slots=True)
class _Runs:
    """Equal samples in a row over one stretch."""

    n: int = 0
    first: complex = 0j
    last: complex = 0j
    first_run: int = 0
    last_run: int = 0
    longest: int = 0

    @classmethod
    def of(cls, samples: Samples) -> Self:
        repeats = longest_repeat(samples)
        return cls(samples.size, complex(samples[0]), complex(samples[-1]), *repeats)

    def append(self, other: _Runs) -> None:
        if not self.n or not other.n:
            if other.n:
                self.n, self.first, self.last = other.n, other.first, other.last
                self.first_run, self.last_run = other.first_run, other.last_run
                self.longest = other.longest
            return
        joined = self.last == other.first
        mine_is_one, its_is_one = self.first_run == self.n, other.first_run == other.n
        middle = self.last_run + other.first_run if joined else 0
        longest = max(self.longest, other.longest)
        if joined:
            if not mine_is_one and not its_is_one:
                longest = max(longest, middle)
            first = middle if mine_is_one else self.first_run
            last = middle if its_is_one else other.last_run
        else:
            if not mine_is_one:
                longest = max(longest, self.last_run)
            if not its_is_one:
                longest = max(longest, other.first_run)
            first, last = self.first_run, other.last_run
        self.n += other.n
        self.last, self.first_run, self.last_run, self.longest = other.last, first, last, longest


class RecordReading:
    """Running figures of one stretch.

    Parameters
    ----------
    meter : RecordMeter
        Settings.
    n_samples : int
        Length of the whole record.
    """

    def __init__(self, meter: RecordMeter, n_samples: int) -> None:
        self._meter = meter
        self._n_record = n_samples
        self._cell = cell_length(n_samples)
        self._n = 0
        self._start = -1
        self._n_bad = 0
        self._first_bad = -1
        self._head = np.zeros(0, np.complex64)
        self._last = np.zeros(0, np.complex64)
        self._head_power = 0.0
        self._peak = 0.0
        self._nearest = np.inf
        self._furthest = 0.0
        self._open: list[tuple[int, Samples]] = []
        self._cells: list[tuple[int, Floats]] = []
        self._counts = np.zeros((0, 0), np.int64)
        self._fresh = np.zeros((0, 0), np.uint32)
        self._n_fresh = 0
        self._n_fill = 0
        self._first_fill = -1
        self._runs = _Runs()

    def feed(self, start: int, samples: Samples) -> None:
        """Take in samples whose first has index ``start``; anything may be among them."""
        if not samples.size:
            return
        if self._start < 0:
            self._start = start
        samples = np.asarray(samples, np.complex64)
        low = 0
        while low < samples.size:
            high = min(low + _BLOCK - (start + low) % _BLOCK, samples.size)
            self._take(start + low, samples[low:high])
            low = high

    def _take(self, start: int, samples: Samples) -> None:
        """Take in samples of one block of the absolute grid."""
        seen = glance(samples)
        if seen.has_bad:
            good = np.isfinite(samples)
            bad = np.flatnonzero(~good)
            self._n_bad += bad.size
            if self._first_bad < 0:
                self._first_bad = start + int(bad[0])
            samples = np.where(good, samples, np.complex64(self._meter.offset))
        self._n += samples.size
        self._runs.append(_Runs.of(samples))
        self._last = samples[-1:].copy()
        n_head = min(max(N_HEAD - start, 0), samples.size)
        if n_head:
            head = samples[:n_head]
            self._head = np.concatenate([self._head, head])
            power = np.abs(head.astype(np.complex128)) ** 2
            self._head_power += float(power.sum())
            self._peak = max(self._peak, float(power.max()))
        if seen.has_lowest:
            self._fill(start, samples)
        self._count(samples)
        self._add(start + n_head, samples[n_head:])

    def merge(self, following: Self) -> None:
        """Append the reading of the stretch that starts where this one ends."""
        if not following._n:
            return
        if self._start < 0:
            self._start = following._start
        if self._first_bad < 0:
            self._first_bad = following._first_bad
        if self._first_fill < 0:
            self._first_fill = following._first_fill
        self._n += following._n
        self._n_bad += following._n_bad
        self._n_fill += following._n_fill
        self._head = np.concatenate([self._head, following._head])
        self._head_power += following._head_power
        self._last = following._last
        self._peak = max(self._peak, following._peak)
        self._nearest = min(self._nearest, following._nearest)
        self._furthest = max(self._furthest, following._furthest)
        self._runs.append(following._runs)
        self._settle()
        following._settle()
        self._counts = self._counts + following._counts if self._counts.size else following._counts
        self._fresh = self._fresh if self._fresh.size else following._fresh
        self._open.extend(following._open)
        self._cells.extend(following._cells)
        self._close()

    def result(self) -> RecordFigures:
        """Return what was seen."""
        self._settle()
        self._close(everything=True)
        parts = [sums for _, sums in sorted(self._cells, key=itemgetter(0))]
        cells = np.concatenate([np.zeros((0, N_SUMS)), *parts])
        offset = self._meter.offset
        body = cells.sum(axis=0)
        # |x|^2 = |x - o|^2 + 2 Re(x o*) - |o|^2, summed.
        body_power = float(
            body[3]
            + 2 * (offset.real * body[1] + offset.imag * body[2])
            - abs(offset) ** 2 * body[0]
        )
        return RecordFigures(
            n_samples=self._n,
            offset=offset,
            n_bad=self._n_bad,
            first_bad=self._first_bad,
            head=self._head,
            last=self._last,
            total_power=body_power + self._head_power,
            head_power=self._head_power,
            peak=self._peak,
            nearest=float(self._nearest),
            furthest=float(self._furthest),
            cells=cells,
            cell_samples=self._cell,
            code_scale=self._scale,
            rails=tuple(self._values(counts) for counts in self._counts),
            n_fill=self._n_fill,
            first_fill=self._first_fill,
            first_run=self._runs.first_run,
            last_run=self._runs.last_run,
            longest_run=self._runs.longest,
        )

    @property
    def _scale(self) -> float | None:
        scale = self._meter.code_scale
        return scale if scale is not None and scale <= FINEST_CODES else None

    def _fill(self, start: int, samples: Samples) -> None:
        if self._meter.code_scale is None:
            return
        low = np.flatnonzero(samples == np.complex64(-1 - 1j))
        if low.size:
            self._n_fill += low.size
            if self._first_fill < 0:
                self._first_fill = start + int(low[0])

    def _count(self, samples: Samples) -> None:
        """Count the values of each rail."""
        if not self._counts.size:
            size = 2 * FINEST_CODES + 1 if self._scale else N_FLOAT_CODES
            self._counts = np.zeros((self._meter.n_rails, size), np.int64)
            self._fresh = np.zeros(self._counts.shape, np.uint32)
        count_codes(samples, self._fresh, self._scale)
        self._n_fresh += samples.size
        if self._n_fresh >= _MOST_FRESH:
            self._settle()

    def _settle(self) -> None:
        """Add what was counted in 32 bits to what 64 bits hold."""
        if self._n_fresh:
            self._counts += self._fresh
            self._fresh[:] = 0
            self._n_fresh = 0

    def _values(self, counts: NDArray[np.int64]) -> tuple[Floats, Indices]:
        found = np.flatnonzero(counts)
        if self._scale:
            return (found - FINEST_CODES).astype(np.float64), counts[found]
        bits = (found.astype(np.uint32) << np.uint32(FLOAT_SHIFT)).view(np.float32)
        order = np.argsort(bits, kind="stable")
        return bits[order].astype(np.float64), counts[found][order]

    def _add(self, start: int, samples: Samples) -> None:
        """Sum whole cells; what is cut by the stretch waits for its other part."""
        if not samples.size:
            return
        cell, stop = self._cell, start + samples.size
        first, last = -(-start // cell) * cell, stop // cell * cell
        if first > last:  # inside one cell
            self._open.append((start, samples.copy()))
            self._close()
            return
        if first > start:
            self._open.append((start, samples[: first - start].copy()))
        rows = max(_BLOCK // cell, 1) * cell
        for low in range(first, last, rows):
            high = min(low + rows, last)
            self._sum(low, samples[low - start : high - start].reshape(-1, cell))
        if stop > last:
            self._open.append((last, samples[last - start :].copy()))
        self._close()

    def _sum(self, start: int, rows: Samples) -> None:
        """Sum cells, shape (n_rows, length); whole ones from 1024 samples by compiled loops."""
        n_rows, length = rows.shape
        if length % CELL:
            found = [sum_rails_by_numpy(row, self._meter.offset) for row in rows]
        else:
            found = [sum_rails(rows.reshape(-1), self._meter.offset)]
        sums = np.empty((n_rows, N_SUMS))
        sums[:, 0] = length
        parts = np.concatenate([part.sums for part in found]).reshape(n_rows, -1, N_SUMS - 1)
        sums[:, 1:] = _tree(parts)
        self._nearest = min(self._nearest, *(part.nearest for part in found))
        self._furthest = max(self._furthest, *(part.furthest for part in found))
        self._peak = max(self._peak, *(part.peak for part in found))
        self._cells.append((start, sums))

    def _close(self, *, everything: bool = False) -> None:
        """Sum the cells whose parts are all there, or all of them."""
        if not self._open:
            return
        whole: dict[int, list[tuple[int, Samples]]] = {}
        for item in self._open:
            whole.setdefault(item[0] // self._cell, []).append(item)
        self._open = []
        for number, parts in whole.items():
            count = sum(part.size for _, part in parts)
            low = max(number * self._cell, N_HEAD)
            high = min((number + 1) * self._cell, self._n_record)
            if everything or count == high - low:
                joined = np.concatenate([part for _, part in parts])
                self._sum(number * self._cell, joined[None, :])
            else:
                self._open.extend(parts)


def _tree(parts: Floats) -> Floats:
    """Return sums over the middle axis, which holds some 1024-sample cells, two by two."""
    while parts.shape[1] > 1:
        if parts.shape[1] % 2:
            parts = np.concatenate([parts, np.zeros_like(parts[:, :1])], axis=1)
        parts = parts[:, 0::2] + parts[:, 1::2]
    return parts[:, 0]


@dataclass(frozen=True, slots=True, kw_only=True)
class RecordMeter:
    """Settings of the meter of a record's looks.

    Parameters
    ----------
    offset : complex
        Sums and distances are taken about this; a good guess of the DC offset keeps them exact.
    code_scale : float or None
        Codes to full scale, for files of integers; None for floats.
    n_rails : int
        1 for a file of real samples, whose Q was computed; else 2.
    """

    offset: complex = 0j
    code_scale: float | None = None
    n_rails: int = 2

    def begin(self, signal: Signal) -> RecordReading:
        """Return an empty reading."""
        return RecordReading(self, signal.n_samples)
