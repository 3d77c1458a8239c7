"""Power statistics with what an interval needs: batches in time, runs above each level.

The samples of a record are correlated, so that counting them says little about how sure a figure
is. What is kept beside the statistics: for each of 64 to 128 stretches in a row (batches) how its
power is spread, and for every level in how many runs the samples above it come.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import Any, Self

import numpy as np
from numpy.typing import ArrayLike, NDArray

from wavegen.core.signal import Samples, Signal
from wavegen.dsp.bursts import Bursts
from wavegen.dsp.cell_sums import CELL, CellSums
from wavegen.dsp.pair_kernel import (
    FINE_PER_COARSE,
    added,
    coarse_edges,
    coarsened,
    joint,
    tally_pairs,
)
from wavegen.dsp.power_bins import bin_of
from wavegen.dsp.power_kernel import PowerTally, exact_powers, numbered_powers
from wavegen.meters.power import PowerReading
from wavegen.meters.power_statistics import PowerStatistics

LONGEST_HELD = 1 << 19
"""Samples of a gated record that are held whole, 4 MB, so that its batches may be short."""
FEWEST_BATCHES = 64
"""A Student quantile at 63 degrees is within 2 % of the normal one at 95 %."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Batches:
    """A record cut in stretches of equal length on the absolute grid.

    Parameters
    ----------
    batch_samples : int
        Length, a power of two: at least 64 whole ones fit in, less than 128; of gated records
        the longest of which 64 hold some on-time. What is left at the end is one of its own.
    n_measured : int64 array, shape (n_batches,)
        Samples that count in each: all, or those of the on-time; batches without any are left
        out.
    sums : float64 array, shape (n_batches, 3)
        Of ``p``, ``p^2`` and ``p^3``.
    counts : int64 array, shape (n_batches, n_bins)
        Samples in each bin of power; exact zeros are in none.
    pairs : int64 array, shape (n_bins,)
        Pairs of neighbours in the record by the lower of their powers.
    edges : float64 array, shape (n_bins + 1,)
        Powers: bin ``k`` holds ``edges[k] <= p < edges[k + 1]``; 64 an octave.
    loops : bool
        Whether the last sample has the first for its neighbour.
    """

    batch_samples: int
    n_measured: NDArray[np.int64]
    sums: NDArray[np.float64]
    counts: NDArray[np.int64]
    pairs: NDArray[np.int64]
    edges: NDArray[np.float64]
    loops: bool

    @property
    def n_batches(self) -> int:
        """How many there are, the short one at the end included."""
        return int(self.n_measured.size)

    def above(self, power: ArrayLike) -> NDArray[np.float64]:
        """Return how many samples of each batch have more than a power.

        Parameters
        ----------
        power : array, shape (n_levels,)
            On the scale of the samples.

        Returns
        -------
        float64 array, shape (n_levels, n_batches)
            Whole at the edges of bins, interpolated between.
        """
        return _read(self.counts, self.edges, power)

    def runs(self, power: ArrayLike) -> NDArray[np.float64]:
        """Return in how many runs the samples of the record with more than a power come.

        Parameters
        ----------
        power : array, shape (n_levels,)
            On the scale of the samples.

        Returns
        -------
        float64 array, shape (n_levels,)
            Whole at the edges of bins, interpolated between. A loop that never falls to the
            level has no run: none begins.
        """
        return _read((self.counts.sum(axis=0) - self.pairs)[np.newaxis], self.edges, power)[:, 0]


def _read(
    counts: NDArray[np.int64], edges: NDArray[np.float64], power: ArrayLike
) -> NDArray[np.float64]:
    """Return what lies above powers, shape (n_powers, n_rows), of counts (n_rows, n_bins)."""
    asked = np.atleast_1d(np.asarray(power, np.float64))
    beyond = np.zeros((counts.shape[1] + 1, counts.shape[0]))
    beyond[:-1] = np.cumsum(counts.T[::-1], axis=0)[::-1]
    if not counts.shape[1]:
        return np.zeros((asked.size, counts.shape[0]))
    place = np.clip(np.searchsorted(edges, asked, side="right") - 1, 0, edges.size - 2)
    width = edges[place + 1] - edges[place]
    part = np.clip((asked - edges[place]) / width, 0.0, 1.0)[:, np.newaxis]
    found: NDArray[np.float64] = beyond[place] + part * (beyond[place + 1] - beyond[place])
    return found


def in_pairs(batches: Batches) -> Batches:
    """Return batches of twice the length, the old ones added up two by two."""

    def paired(values: NDArray[Any]) -> NDArray[Any]:
        return np.add.reduceat(values, np.arange(0, values.shape[0], 2), axis=0)

    return replace(
        batches,
        batch_samples=2 * batches.batch_samples,
        n_measured=paired(batches.n_measured),
        sums=paired(batches.sums),
        counts=paired(batches.counts),
    )


def pooled(members: Sequence[Batches]) -> Batches:
    """Return the batches of several records as those of one.

    Parameters
    ----------
    members : sequence of Batches
        One or more, on one scale and of one sample rate; each record measured on its own, so
        that no run goes on from one to the next.

    Returns
    -------
    Batches
        The shortest are added up in pairs until fewer than 128 are left, or each record is one
        batch. Where the means of the records differ, the scatter of the batches says so.
    """
    parts = [*members]
    while sum(part.n_batches for part in parts) >= 2 * FEWEST_BATCHES:
        halved = [k for k, part in enumerate(parts) if part.n_batches > 1]
        if not halved:
            break
        shortest = min(halved, key=lambda k: parts[k].batch_samples)
        parts[shortest] = in_pairs(parts[shortest])
    used = [part for part in parts if part.pairs.size]
    if not used:
        return parts[0]
    firsts = [bin_of(float(part.edges[0])) // FINE_PER_COARSE for part in used]
    low = min(firsts)
    high = max(first + part.pairs.size for first, part in zip(firsts, used, strict=True))
    counts = np.zeros((sum(part.n_batches for part in parts), high - low), np.int64)
    pairs = np.zeros(high - low, np.int64)
    row = 0
    for part in parts:
        if part.pairs.size:
            first = bin_of(float(part.edges[0])) // FINE_PER_COARSE - low
            counts[row : row + part.n_batches, first : first + part.pairs.size] = part.counts
            pairs[first : first + part.pairs.size] += part.pairs
        row += part.n_batches
    return Batches(
        batch_samples=max(part.batch_samples for part in parts),
        n_measured=np.concatenate([part.n_measured for part in parts]),
        sums=np.concatenate([part.sums for part in parts]),
        counts=counts,
        pairs=pairs,
        edges=coarse_edges(low, high - low),
        loops=all(part.loops for part in parts),
    )


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class BatchedStatistics:
    """Power statistics of a record, and its batches.

    Parameters
    ----------
    statistics : PowerStatistics
        As the power meter states them.
    batches : Batches
        What intervals are made from.
    """

    statistics: PowerStatistics
    batches: Batches


def batch_length(n_samples: int) -> int:
    """Return the length of a batch: the power of two of which 64 to 127 fit in.

    Parameters
    ----------
    n_samples : int
        Length of the record.

    Returns
    -------
    int
        1 where there are fewer than 64 samples.
    """
    return 1 << max((n_samples // FEWEST_BATCHES).bit_length() - 1, 0)


def gated_batch_length(n_samples: int, bursts: Bursts) -> int:
    """Return the longest batch of which 64 hold some on-time.

    Parameters
    ----------
    n_samples : int
        Length of the record.
    bursts : Bursts
        When it is on.

    Returns
    -------
    int
        A power of two; never below a cell in records longer than ``LONGEST_HELD``, so that fewer
        than 64 may be on.
    """
    size = batch_length(n_samples)
    least = 1 if n_samples <= LONGEST_HELD or size < CELL else CELL
    if bursts.period_samples <= size:
        return size
    inset = bursts.ramp_samples
    runs = np.array(list(bursts.within(0, n_samples, inset=inset)), np.int64).reshape(-1, 2)
    while size > least and _n_touched(runs, size) < FEWEST_BATCHES:
        size //= 2
    return size


def _n_touched(runs: NDArray[np.int64], size: int) -> int:
    """Return how many batches hold a part of a run."""
    first, last = runs[:, 0] // size, (runs[:, 1] - 1) // size
    shared = np.count_nonzero(first[1:] == last[:-1])
    return int(np.sum(last - first + 1)) - int(shared)


class _Counts(PowerReading):
    """A power reading that keeps apart what lies in each batch."""

    def __init__(self, where: str, batch_samples: int) -> None:
        super().__init__(where)
        self.batch_samples = batch_samples
        self.rows: dict[int, tuple[NDArray[np.int64], int]] = {}

    def feed(self, start: int, samples: Samples) -> None:
        """Take in samples, batch by batch."""
        done = 0
        while done < samples.size:
            count = min(
                self.batch_samples - (start + done) % self.batch_samples, samples.size - done
            )
            super().feed(start + done, samples[done : done + count])
            done += count

    def _count(self, found: PowerTally, start: int) -> None:
        super()._count(found, start)
        self.add_row(start // self.batch_samples, *coarsened(found.counts, found.first_bin))

    def add_row(self, batch: int, counts: NDArray[np.int64], first_bin: int) -> None:
        """Add counts to those of a batch."""
        kept = self.rows.get(batch)
        self.rows[batch] = added(*kept, counts, first_bin) if kept else (counts, first_bin)

    def merge(self, following: Self) -> None:
        """Append the reading of the stretch that starts where this one ends."""
        super().merge(following)
        for batch, row in following.rows.items():
            self.add_row(batch, *row)


class _RowSums:
    """Sums of cells, made those of batches as soon as all cells of one are there.

    Parameters
    ----------
    start : int
        Index of the first sample.
    length : int
        Cells of a batch.

    Notes
    -----
    Only the stretch that starts a record does so: the batches of others may be cut.
    """

    def __init__(self, start: int, length: int) -> None:
        self.cells = CellSums(start)
        self._length = length
        self._is_first = start == 0
        self._rows: list[NDArray[np.float64]] = []

    def append(self, following: _RowSums) -> None:
        """Append the stretch that starts where this one ends."""
        self.cells.append(following.cells)
        if self._is_first:
            whole = self.cells.take(self._length)
            if whole.size:
                self._rows.append(_in_rows(whole, self._length))

    def rows(self) -> NDArray[np.float64]:
        """Return the sum of each batch."""
        return np.concatenate([*self._rows, _in_rows(self.cells.sums(), self._length)])


class BatchedPowerReading:
    """Running power statistics and batches of one stretch.

    Parameters
    ----------
    meter : BatchedPowerMeter
        Its settings.
    n_samples : int
        Length of the whole record: it fixes that of a batch.
    """

    def __init__(self, meter: BatchedPowerMeter, n_samples: int) -> None:
        self._meter = meter
        self._size = (
            batch_length(n_samples)
            if meter.bursts is None
            else gated_batch_length(n_samples, meter.bursts)
        )
        # Batches shorter than a cell come from records so short that they can be held whole.
        self._held: list[Samples] | None = [] if self._size < CELL else None
        self._power = (
            PowerReading(meter.where) if self._size < CELL else _Counts(meter.where, self._size)
        )
        self._first = self._last = np.zeros(0, np.complex64)
        self._pairs: tuple[NDArray[np.int64], int] = (np.zeros(0, np.int64), 0)
        self._squares: _RowSums | None = None
        self._cubes: _RowSums | None = None
        self._on: dict[int, int] = {}

    def feed(self, start: int, samples: Samples) -> None:
        """Take in samples whose first has index ``start``.

        Raises
        ------
        SignalError
            A sample is not finite.
        """
        if not samples.size:
            return
        samples = np.asarray(samples, np.complex64)
        bursts = self._meter.bursts
        is_on = None
        if bursts is not None:
            is_on = bursts.is_on(start, start + samples.size)
            kept = np.zeros(samples.size, np.complex64)
            np.copyto(kept, samples, where=is_on)
            samples = kept
        self._count_on(start, samples.size, is_on)
        self._power.feed(start, samples)
        self._join(samples[:1])
        self._last = samples[-1:].copy()
        if self._held is not None:
            self._held.append(samples.copy())
            return
        if self._squares is None or self._cubes is None:
            length = self._size // CELL
            self._squares, self._cubes = _RowSums(start, length), _RowSums(start, length)
        self._add_pieces(start, samples, self._squares.cells, self._cubes.cells)

    def _count_on(self, start: int, count: int, is_on: NDArray[np.bool_] | None) -> None:
        """Count the samples measured in each batch."""
        stop = start + count
        for batch in range(start // self._size, -(-stop // self._size)):
            low, high = max(batch * self._size, start), min((batch + 1) * self._size, stop)
            here = high - low
            if is_on is not None:
                here = int(np.count_nonzero(is_on[low - start : high - start]))
            self._on[batch] = self._on.get(batch, 0) + here

    def _add_pieces(self, start: int, samples: Samples, squares: CellSums, cubes: CellSums) -> None:
        """Count the pairs within a stretch and add its powers to the cells."""
        head = min(-start % CELL, samples.size)
        body = head + (samples.size - head) // CELL * CELL
        empty = np.zeros(0)
        for low, high, whole in ((0, head, False), (head, body, True), (body, samples.size, False)):
            if low == high:
                continue
            piece = samples[low:high]
            found = tally_pairs(piece)
            self._pairs = added(*self._pairs, found.counts, found.first_bin)
            if low:
                self._pairs = added(*self._pairs, *joint(samples[low - 1 : low + 1]))
            if whole:
                squares.add_cells(found.squares, empty)
                cubes.add_cells(found.cubes, empty)
            else:
                powers = exact_powers(piece)
                squares.add_powers(powers * powers)
                cubes.add_powers(powers * powers * powers)

    def _join(self, sample: Samples) -> None:
        """Count the pair of the last sample so far and the next one; keep the very first."""
        if not self._first.size:
            self._first = sample.copy()
        elif self._held is None:
            self._pairs = added(*self._pairs, *joint(np.concatenate([self._last, sample])))

    def merge(self, following: Self) -> None:
        """Append the reading of the stretch that starts where this one ends."""
        if not following._first.size:
            return
        self._power.merge(following._power)
        self._join(following._first)
        self._last = following._last
        for batch, count in following._on.items():
            self._on[batch] = self._on.get(batch, 0) + count
        if self._held is not None:
            self._held += following._held or []
            return
        self._pairs = added(*self._pairs, *following._pairs)
        if self._squares is None or self._cubes is None:
            self._squares, self._cubes = following._squares, following._cubes
        elif following._squares is not None and following._cubes is not None:
            self._squares.append(following._squares)
            self._cubes.append(following._cubes)

    def result(self) -> BatchedStatistics:
        """Return the statistics and the batches.

        Raises
        ------
        SignalError
            No samples, or every sample is zero.
        """
        statistics = self._power.result()
        n_measured = np.array([self._on[batch] for batch in sorted(self._on)], np.int64)
        n_on = int(n_measured.sum())
        if self._meter.bursts is not None:
            left_out = statistics.n_samples - n_on
            cells = self._power.cells
            total = cells.total() if cells else 0.0
            statistics = replace(
                statistics,
                n_samples=n_on,
                n_zeros=statistics.n_zeros - left_out,
                mean=total / n_on,
            )
        if self._held is not None:
            sums, rows = self._short(np.concatenate(self._held))
        else:
            sums, rows = self._sums(), getattr(self._power, "rows", {})
        pairs = self._pairs
        if self._meter.loops:
            pairs = added(*pairs, *joint(np.concatenate([self._last, self._first])))
        if self._meter.bursts is not None:  # of what is never on nothing is kept
            is_on = n_measured > 0
            number = np.cumsum(is_on) - 1
            rows = {int(number[k]): row for k, row in rows.items() if is_on[k]}
            n_measured, sums = n_measured[is_on], sums[is_on]
        counts, first_bin = _stacked(rows, n_measured.size)
        row, place = added(np.zeros(counts.shape[1], np.int64), first_bin, *pairs)
        return BatchedStatistics(
            statistics=statistics,
            batches=Batches(
                batch_samples=self._size,
                n_measured=n_measured,
                sums=sums,
                counts=counts,
                pairs=row[first_bin - place : first_bin - place + counts.shape[1]],
                edges=coarse_edges(first_bin, counts.shape[1]),
                loops=self._meter.loops,
            ),
        )

    def _sums(self) -> NDArray[np.float64]:
        """Return the sums of the first three powers in batches of whole cells."""
        if not self._power.cells or self._squares is None or self._cubes is None:
            return np.zeros((0, 3))
        powers = _in_rows(self._power.cells.sums(), self._size // CELL)
        return np.stack([powers, self._squares.rows(), self._cubes.rows()], axis=1)

    def _short(
        self, samples: Samples
    ) -> tuple[NDArray[np.float64], dict[int, tuple[NDArray[np.int64], int]]]:
        """Return sums and counts of batches shorter than a cell; counts the pairs too."""
        found = tally_pairs(samples)
        self._pairs = (found.counts, found.first_bin)
        powers = exact_powers(samples)
        sums = np.stack(
            [_in_rows(powers**order, self._size) for order in (1, 2, 3)],
            axis=1,
        )
        return sums, self._short_rows(samples)

    def _short_rows(self, samples: Samples) -> dict[int, tuple[NDArray[np.int64], int]]:
        """Return the counts of batches shorter than a cell, all on the same bins."""
        number = numbered_powers(samples)[1]
        used = np.flatnonzero(number >= 0)
        if not used.size:
            return {}
        coarse = number[used] // FINE_PER_COARSE
        first = int(coarse.min())
        width = int(coarse.max()) + 1 - first
        n_rows = -(-samples.size // self._size)
        place = used // self._size * width + (coarse - first)
        counts = np.bincount(place, minlength=n_rows * width).reshape(n_rows, width)
        return {row: (counts[row], first) for row in range(n_rows)}


def _in_rows(values: NDArray[np.float64], length: int) -> NDArray[np.float64]:
    """Return the sums of rows of ``length`` values, a power of two, by a fixed pairwise tree."""
    rows = np.zeros((-(-values.size // length), length))
    rows.reshape(-1)[: values.size] = values
    while rows.shape[1] > 1:
        half = rows.shape[1] // 2
        rows = rows[:, :half] + rows[:, half:]
    return rows[:, 0]


def _stacked(
    rows: dict[int, tuple[NDArray[np.int64], int]], n_rows: int
) -> tuple[NDArray[np.int64], int]:
    """Return rows of counts on common bins, shape (n_rows, n_bins), and the first bin."""
    used = {batch: row for batch, row in rows.items() if row[0].size}
    if not used:
        return np.zeros((n_rows, 0), np.int64), 0
    low = min(first for _, first in used.values())
    high = max(first + counts.size for counts, first in used.values())
    stacked = np.zeros((n_rows, high - low), np.int64)
    for batch, (counts, first) in used.items():
        stacked[batch, first - low : first - low + counts.size] = counts
    return stacked, low


@dataclass(frozen=True, slots=True, kw_only=True)
class BatchedPowerMeter:
    """Settings of the power meter that keeps what intervals need.

    Parameters
    ----------
    where : str
        What is measured: a file's name, a recipe path.
    loops : bool
        Whether the signal is a loop, so that a run may go on across its seam.
    bursts : Bursts, optional
        When the signal is on: then only what is fully on counts, as in
        :class:`wavegen.meters.gated.GatedPowerMeter`. A loop must close its bursts too.

    Notes
    -----
    The statistics are those of :class:`wavegen.meters.power.PowerMeter`, bit for bit. Runs cost
    about as much again as they do; batches cost next to nothing. Memory is flat: 128 rows of
    some 64 bins an octave, and 24 bytes for 1024 samples.
    """

    where: str = "signal"
    loops: bool = False
    bursts: Bursts | None = None

    def begin(self, signal: Signal) -> BatchedPowerReading:
        """Return an empty reading for a signal."""
        return BatchedPowerReading(self, signal.n_samples)


def measure_batches(
    samples: Samples,
    *,
    loops: bool = False,
    bursts: Bursts | None = None,
    where: str = "samples",
) -> BatchedStatistics:
    """Return the power statistics of an array with its batches.

    Parameters
    ----------
    samples : complex64 array, shape (n_samples,)
        On any scale.
    loops : bool
        Whether they are one period of a loop.
    bursts : Bursts, optional
        When the signal is on.
    where : str
        What it is called in messages.

    Returns
    -------
    BatchedStatistics

    Raises
    ------
    SignalError
        No samples, one that is not finite, or zeros only.
    """
    meter = BatchedPowerMeter(where=where, loops=loops, bursts=bursts)
    reading = BatchedPowerReading(meter, samples.size)
    reading.feed(0, samples)
    return reading.result()
