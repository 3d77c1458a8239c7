"""Differential phase encoding: the data turn the phase from symbol to symbol."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from wavegen.core.evaluate import fold, repeat

CELL = 1 << 14
"""Symbols between two kept sums."""
_SCAN = 1 << 20
"""Symbols read at a time while the loop is summed."""


class Numbers(Protocol):
    """Symbol numbers by index."""

    def words(self, first: int, count: int) -> NDArray[np.unsignedinteger]:
        """Return words whose low bits number the symbols ``first ...``."""


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class PhaseStates:
    """Phases after each symbol, as steps of ``1 / order`` of a turn.

    Parameters
    ----------
    numbers : Numbers
        The data.
    steps : uint16 array, shape (order,)
        Steps by which each symbol number turns the phase.
    period : int
        Symbols in one loop.
    sums : uint16 array, shape (ceil(period / CELL),)
        Phase before each cell of the absolute grid.
    residue : int
        Steps that the loop's data are short of a whole number of turns; the last symbol of the
        loop makes up for them.
    """

    numbers: Numbers
    steps: NDArray[np.uint16]
    period: int
    sums: NDArray[np.uint16]
    residue: int

    def words(self, first: int, count: int) -> NDArray[np.unsignedinteger]:
        """Return the phases after symbols ``first ...``, shape (count,); 0 after the last one.

        Parameters
        ----------
        first, count : int
            Symbol range; indices may pass the seam, be negative or cover several periods.
        """
        if count > self.period or (count == self.period and first % self.period):
            return repeat(self._phases(0, self.period), first, first + count)
        pieces = [self._phases(low, high) for low, high in fold(first, first + count, self.period)]
        return pieces[0] if len(pieces) == 1 else np.concatenate([self.steps[:0], *pieces])

    def _phases(self, low: int, high: int) -> NDArray[np.uint16]:
        start = low // CELL * CELL
        turned = steps_of(self.numbers, self.steps, start, high)
        turned[0] += self.sums[start // CELL]  # 16-bit sums wrap at multiples of the order
        phases = np.cumsum(turned, dtype=np.uint16)[low - start :]
        phases &= np.uint16(self.steps.size - 1)
        if high == self.period:
            phases[-1] = 0
        return phases


def steps_of(
    numbers: Numbers, steps: NDArray[np.uint16], low: int, high: int
) -> NDArray[np.uint16]:
    """Return the steps of symbols ``[low, high)``."""
    words = numbers.words(low, high - low)
    return steps.take(words & words.dtype.type(steps.size - 1))


def integrate(numbers: Numbers, steps: NDArray[np.uint16], period: int) -> PhaseStates:
    """Sum a loop's steps once, and keep the sum before each cell.

    Parameters
    ----------
    numbers : Numbers
        The data.
    steps : uint16 array, shape (order,)
        Steps by symbol number, ``order`` a power of 2.
    period : int
        Symbols in one loop.

    Returns
    -------
    PhaseStates
    """
    totals = np.zeros(-(-period // CELL), np.uint16)
    for low in range(0, period, _SCAN):
        high = min(low + _SCAN, period)
        turned = steps_of(numbers, steps, low, high)
        turned = np.pad(turned, (0, -turned.size % CELL)).reshape(-1, CELL)
        totals[low // CELL : low // CELL + turned.shape[0]] = turned.sum(axis=1, dtype=np.uint16)
    after = np.cumsum(totals, dtype=np.uint16)
    return PhaseStates(
        numbers=numbers,
        steps=steps,
        period=period,
        sums=after - totals,
        residue=int(-int(after[-1]) % steps.size),
    )


def phase_steps(points: NDArray[np.complex128]) -> NDArray[np.uint16] | None:
    """Return by how many steps each symbol number turns the phase.

    Parameters
    ----------
    points : complex128 array, shape (order,)
        Points by symbol number.

    Returns
    -------
    uint16 array, shape (order,), or None
        Steps of ``1 / order`` of a turn from point 0 to each; None unless the points share one
        circle at equal distances.

    Examples
    --------
    >>> phase_steps(np.array([1, 1j, -1j, -1])).tolist()
    [0, 1, 3, 2]
    """
    if not np.all(points):
        return None
    order = points.size
    turns = np.angle(points / points[0]) * order / (2 * np.pi)
    steps = np.rint(turns)
    is_even = np.allclose(turns, steps, atol=1e-6) and np.allclose(np.abs(points), 1, atol=1e-6)
    numbers = (steps.astype(np.int64) % order).astype(np.uint16)
    return numbers if is_even and np.unique(numbers).size == order else None
