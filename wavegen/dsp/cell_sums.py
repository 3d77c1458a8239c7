"""Sums that do not depend on how the samples were cut."""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

CELL = 1024
"""Samples in a cell of the absolute index grid, over which power is summed in float64."""


def sum_cells(powers: NDArray[np.floating[Any]]) -> NDArray[np.float64]:
    """Return the sum of each cell of 1024 powers by a fixed pairwise tree.

    Parameters
    ----------
    powers : float array, shape (n,)
        The last cell may be short: zeros are added behind.

    Returns
    -------
    float64 array, shape (ceil(n / 1024),)
    """
    rows = np.zeros((-(-powers.size // CELL), CELL))
    rows.reshape(-1)[: powers.size] = powers
    quarter = CELL // 4
    first, second, third, fourth = (rows[:, k * quarter : (k + 1) * quarter] for k in range(4))
    total = (first + third) + (second + fourth)
    while total.shape[1] > 1:
        half = total.shape[1] // 2
        total = total[:, :half] + total[:, half:]
    return total[:, 0]


def sum_tree(values: NDArray[np.float64]) -> float:
    """Return a sum by a pairwise tree whose shape depends on the count alone."""
    while values.size > 1:
        if values.size % 2:
            values = np.append(values, 0.0)
        values = values[0::2] + values[1::2]
    return float(values[0]) if values.size else 0.0


_MOST_SMALL = 64


class CellSums:
    """Sums over cells of the absolute grid, from stretches cut anywhere.

    Parameters
    ----------
    start : int
        Index of the first sample.

    Notes
    -----
    Cells cut by the edge of a stretch are kept as single powers until their other part is
    merged, so that each sum is taken over the same samples in the same order, however the
    samples were cut. Memory: 16 bytes for 1024 samples.
    """

    def __init__(self, start: int) -> None:
        self.start = self.stop = start
        self._head: list[NDArray[np.float64]] = []
        self._tail: list[NDArray[np.float64]] = []
        self._sums: list[NDArray[np.float64]] = []
        self._maxima: list[NDArray[np.float64]] = []
        self._n_small = 0

    @property
    def _first_edge(self) -> int:
        return -(-self.start // CELL) * CELL

    def add_powers(self, powers: NDArray[np.float64]) -> None:
        """Append powers that lie inside one cell."""
        if not powers.size:
            return
        if self.stop < self._first_edge:
            self._head.append(powers)
        else:
            self._tail.append(powers)
        self.stop += powers.size
        if self.stop % CELL == 0 and self._tail:
            whole = np.concatenate(self._tail)
            self._tail = []
            self._keep(sum_cells(whole), whole.max(keepdims=True))

    def add_cells(self, sums: NDArray[np.float64], maxima: NDArray[np.float64]) -> None:
        """Append whole cells; this stretch must end on the grid."""
        if sums.size:
            self._keep(sums, maxima)
            self.stop += sums.size * CELL

    def _keep(self, sums: NDArray[np.float64], maxima: NDArray[np.float64]) -> None:
        """Append; many small arrays become one, lest they scatter over the memory."""
        self._sums.append(sums)
        self._maxima.append(maxima)
        self._n_small += 1
        if self._n_small == _MOST_SMALL:
            for kept in (self._sums, self._maxima):
                kept[-_MOST_SMALL:] = [np.concatenate(kept[-_MOST_SMALL:])]
            self._n_small = 0

    def append(self, following: CellSums) -> None:
        """Append the stretch that starts where this one ends."""
        for powers in following._head:
            self.add_powers(powers)
        for sums, maxima in zip(following._sums, following._maxima, strict=True):
            self.add_cells(sums, maxima)
        for powers in following._tail:
            self.add_powers(powers)

    def take(self, multiple: int) -> NDArray[np.float64]:
        """Return sums of the first whole cells, as many times ``multiple`` as there are; drop them.

        Of a stretch that starts on the grid; it starts behind them afterwards.
        """
        count = sum(item.size for item in self._sums) // multiple * multiple
        if self.start % CELL or not count:
            return np.zeros(0)
        sums, maxima = np.concatenate(self._sums), np.concatenate([np.zeros(0), *self._maxima])
        self._sums, self._maxima = [sums[count:].copy()], [maxima[count:].copy()]
        self._n_small = 0
        self.start += count * CELL
        return sums[:count]

    def sums(self) -> NDArray[np.float64]:
        """Return the sum of each cell of the grid, from that of the first sample."""
        ends = [np.concatenate(part) if part else None for part in (self._head, self._tail)]
        head, tail = (np.zeros(0) if part is None else sum_cells(part) for part in ends)
        return np.concatenate([head, *self._sums, tail])

    def maxima(self) -> NDArray[np.float64]:
        """Return the largest power of each cell of the grid, from that of the first sample."""
        ends = [
            np.concatenate(part).max(keepdims=True) if part else None
            for part in (self._head, self._tail)
        ]
        head, tail = (np.zeros(0) if part is None else part for part in ends)
        return np.concatenate([head, *self._maxima, tail])

    def cells(self) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
        """Return sum and largest power of each cell of the grid, from that of the first sample."""
        return self.sums(), self.maxima()

    def total(self) -> float:
        """Return the sum of all by a fixed pairwise tree."""
        return sum_tree(self.sums())
