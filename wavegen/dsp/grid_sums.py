"""Sums of arrays over cells of an absolute grid that do not depend on how the samples were cut.

Cells are added in aligned pairs, pairs in aligned pairs, and so on: a binary tree over the
absolute cell numbers. A stretch keeps the largest aligned blocks that it holds, at most two for
each power of two, so that memory stays flat at any length.
"""

from __future__ import annotations

from typing import Any, Self

import numpy as np
from numpy.typing import NDArray

from wavegen.core.signal import Samples

Sums = NDArray[np.float64]


class GridSums:
    """Running sums of arrays numbered from any first cell on, in order.

    Examples
    --------
    >>> whole, left, right = GridSums(), GridSums(), GridSums()
    >>> whole.add(0, np.arange(5.0)); left.add(0, np.arange(3.0)); right.add(3, np.arange(3.0, 5))
    >>> left.append(right)
    >>> float(whole.total()) == float(left.total()) == 10
    True
    """

    def __init__(self) -> None:
        self._nodes: list[tuple[int, int, Sums]] = []

    def _push(self, level: int, number: int, value: Sums) -> None:
        """Append a block of ``2**level`` cells; join it with its left sister."""
        nodes = self._nodes
        while number & 1 and nodes and nodes[-1][:2] == (level, number - 1):
            value = nodes.pop()[2] + value
            level, number = level + 1, number >> 1
        nodes.append((level, number, value))

    def add(self, first: int, values: Sums) -> None:
        """Append cells.

        Parameters
        ----------
        first : int
            Number of the first one: that after the last appended.
        values : float64 array, shape (n_cells, ...)
            Any shape behind the first axis.
        """
        level = 0
        last: list[tuple[int, int, Sums]] = []
        while values.shape[0]:
            if first & 1:
                self._push(level, first, values[0].copy())
                first, values = first + 1, values[1:]
            if values.shape[0] & 1:
                last.append((level, first + values.shape[0] - 1, values[-1].copy()))
                values = values[:-1]
            if values.shape[0]:
                values = values[0::2] + values[1::2]
            first, level = first >> 1, level + 1
        for node in reversed(last):
            self._push(*node)

    def append(self, following: GridSums) -> None:
        """Append the sums of the cells that follow."""
        for node in following._nodes:
            self._push(*node)

    def total(self) -> Sums | None:
        """Return the sum of all; None where there are none."""
        if not self._nodes:
            return None
        total = self._nodes[-1][2]
        for _, _, value in reversed(self._nodes[:-1]):
            total = value + total
        return total


class CellReading:
    """Base of meters that reduce cells of samples to sums: cuts anywhere, same bits.

    What is cut by the edge of a stretch is kept as samples until its other part is merged.

    Parameters
    ----------
    cell_samples : int
        Length of a cell of the absolute grid.
    """

    def __init__(self, cell_samples: int) -> None:
        self._cell = cell_samples
        self._start = self._stop = -1
        self._head: list[Samples] = []
        self._tail: list[Samples] = []
        self._sums = GridSums()

    def reduce(self, first: int, samples: Samples) -> Sums:
        """Return one array for each cell.

        Parameters
        ----------
        first : int
            Number of the first cell.
        samples : complex64 array, shape (n_cells * cell_samples,)
            Whole cells; the last of a signal is filled with zeros.

        Returns
        -------
        float64 array, shape (n_cells, ...)
            The answer for a cell must not depend on its neighbours.
        """
        raise TypeError(type(self).__name__)  # the base only cuts

    @property
    def n_samples(self) -> int:
        """Samples taken in."""
        return self._stop - self._start

    @property
    def _first_edge(self) -> int:
        return -(-self._start // self._cell) * self._cell

    def feed(self, start: int, samples: Samples) -> None:
        """Take in samples whose first has index ``start``; stretches come in order."""
        if not samples.size:
            return
        if self._start < 0:
            self._start = self._stop = start
        samples = np.asarray(samples, np.complex64)
        head = min(max(self._first_edge - self._stop, 0), samples.size)
        self._add_part(samples[:head], self._head)
        rest = samples[head:]
        lead = min(-self._stop % self._cell, rest.size)
        self._add_part(rest[:lead], self._tail)
        rest = rest[lead:]
        whole = rest.size // self._cell * self._cell
        if whole:
            self._sums.add(
                self._stop // self._cell, self.reduce(self._stop // self._cell, rest[:whole])
            )
            self._stop += whole
        self._add_part(rest[whole:], self._tail)

    def _add_part(self, samples: Samples, into: list[Samples]) -> None:
        """Keep part of a cell; reduce the cell if that completes it."""
        if not samples.size:
            return
        into.append(samples.copy())
        self._stop += samples.size
        if into is self._tail and self._stop % self._cell == 0:
            number = self._stop // self._cell - 1
            self._sums.add(number, self.reduce(number, np.concatenate(self._tail)))
            self._tail.clear()

    def merge(self, following: Self) -> None:
        """Append the reading of the stretch that starts where this one ends."""
        if following._start < 0:
            return
        for samples in following._head:
            self.feed(following._start, samples)
        if following._stop >= following._first_edge:
            self._start = self._start if self._start >= 0 else following._first_edge
            self._sums.append(following._sums)
            self._stop = following._stop - sum(part.size for part in following._tail)
            for samples in following._tail:
                self.feed(self._stop, samples)

    def total(self) -> Sums | None:
        """Return the sum over all cells, cut ones included; None where there are no samples."""
        sums = GridSums()
        if self._head:
            number = self._start // self._cell
            sums.add(number, self.reduce(number, self._filled(self._head, self._start)))
        sums.append(self._sums)
        if self._tail:
            number = self._stop // self._cell
            first = number * self._cell
            sums.add(number, self.reduce(number, self._filled(self._tail, first)))
        return sums.total()

    def _filled(self, parts: list[Samples], start: int) -> Samples:
        """Return one cell with zeros where there are no samples."""
        cell: NDArray[Any] = np.zeros(self._cell, np.complex64)
        samples = np.concatenate(parts)
        place = start % self._cell
        cell[place : place + samples.size] = samples
        return cell
