"""Symbols of continuous phase modulation on a cyclic axis: encoded, closed, summed exactly."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Literal, Protocol

import numpy as np
from numpy.typing import NDArray

BLOCK_SYMBOLS = 1 << 14
"""One exact sum is kept for each block of so many symbols."""
_BLOCKS_AT_ONCE = 64

Encoding = Literal["plain", "differential", "shaped_offset", "half_sine_offset"]
"""How data become symbols; see :func:`encode`."""


class Words(Protocol):
    """Data by index: what settings of data give when bound to a site."""

    def words(self, first: int, count: int) -> NDArray[np.unsignedinteger]:
        """Return words whose low bits are the data ``first ...``; indices may pass the seam."""


def encode(
    words: Words, encoding: Encoding, numbers: NDArray[np.uint8], first: int, count: int
) -> NDArray[np.uint8]:
    """Return the numbers of symbols ``[first, first + count)`` in their ascending alphabet.

    Parameters
    ----------
    words : Words
        The data.
    encoding : {"plain", "differential", "shaped_offset", "half_sine_offset"}
        ``plain``: each word by a table. ``differential``: level +1 where neighbouring bits are
        equal, else -1 (3GPP TS 45.004 cl. 2). ``shaped_offset``: the ternary precoder of SOQPSK,
        ``(-1)^(i+1) (2 a[i-1] - 1) (a[i] - a[i-2])`` (IRIG 106 ch. 2, cl. 2.4.3.2).
        ``half_sine_offset``: chips on alternate rails, even ones on I, as the turns of MSK,
        ``(-1)^(i+1) c[i] c[i-1]`` with ``c`` = +-1 (derivation:
        ``tests/truth/test_phase_modulation.py``).
    numbers : uint8 array, shape (a power of 2,)
        Number of a symbol by word, for ``plain``.
    first, count : int
        Range; indices may pass the seam or be negative.

    Returns
    -------
    uint8 array, shape (count,)
    """
    if encoding == "plain":
        return numbers.take(words.words(first, count) & (numbers.size - 1))
    if encoding == "differential":
        bits = _bits(words, first - 1, count + 1)
        return (bits[1:] ^ bits[:-1]) ^ np.uint8(1)
    is_odd = (np.arange(first & 1, count + (first & 1)) & 1).astype(np.uint8)
    if encoding == "half_sine_offset":
        bits = _bits(words, first - 1, count + 1)
        return bits[1:] ^ bits[:-1] ^ is_odd
    bits = _bits(words, first - 2, count + 2)
    turns_up = bits[1:-1] ^ is_odd ^ np.uint8(1)  # whether a[i] above a[i-2] turns forward
    rise = bits[2:] - bits[:-2] + np.uint8(1)  # 0, 1, 2 once wrapped
    return np.where(turns_up, rise, 2 - rise).astype(np.uint8)


def _bits(words: Words, first: int, count: int) -> NDArray[np.uint8]:
    return (words.words(first, count) & 1).astype(np.uint8)


def start_eighths(words: Words, encoding: Encoding) -> int:
    """Return the phase before symbol 0 in eighths of a turn.

    Parameters
    ----------
    words : Words
        The data.
    encoding : Encoding
        For both forms of offset QPSK the phase is that at which even bits stand on the I rail and
        odd ones on Q, 1 as +1; else it is 0.

    Returns
    -------
    int
        0 to 7.
    """
    if encoding == "half_sine_offset":
        return 2 if _bits(words, -1, 1)[0] else 6
    if encoding == "shaped_offset":
        i, q = _bits(words, -2, 2).tolist()
        return {(1, 1): 1, (0, 1): 3, (0, 0): 5, (1, 0): 7}[i, q]
    return 0


@dataclass(frozen=True, eq=False, kw_only=True)
class PhaseSymbols:
    """Symbols of a loop and their exact sums.

    Parameters
    ----------
    words : Words
        The data.
    encoding : Encoding
        How they become symbols.
    numbers : uint8 array, shape (a power of 2,)
        Number of a symbol by word.
    alphabet : tuple of int
        Levels, ascending.
    period : int
        Symbols in the loop.
    tail : uint8 array, shape (n,)
        Numbers that stand in for those of the last ``n`` symbols of the loop.
    sums : int64 array, shape (n_blocks,)
        Levels before each block of 2^14 symbols, added up.
    """

    words: Words
    encoding: Encoding
    numbers: NDArray[np.uint8]
    alphabet: tuple[int, ...]
    period: int
    tail: NDArray[np.uint8]
    sums: NDArray[np.int64]

    def range(self, first: int, count: int) -> NDArray[np.uint8]:
        """Return symbol numbers ``[first, first + count)``; indices may pass the seam."""
        made = encode(self.words, self.encoding, self.numbers, first, count)
        if not self.tail.size:
            return made
        stop = first + count
        end = -(-(first + 1) // self.period) * self.period  # of the period that holds `first`
        while end - self.tail.size < stop:
            low, high = max(end - self.tail.size, first), min(end, stop)
            if low < high:
                made[low - first : high - first] = self.tail[low - end : high - end or None]
            end += self.period
        return made

    def with_tail(self, tail: NDArray[np.uint8]) -> PhaseSymbols:
        """Return the same symbols with others at the end of the loop."""
        sums = self.sums.copy()
        made = replace(self, tail=tail, sums=sums)
        for block in range((self.period - tail.size) // BLOCK_SYMBOLS + 1, sums.size):
            levels = self.levels(made.range((block - 1) * BLOCK_SYMBOLS, BLOCK_SYMBOLS))
            sums[block] = sums[block - 1] + levels.sum()
        return made

    def levels(self, numbers: NDArray[np.uint8]) -> NDArray[np.int64]:
        """Return the levels of symbol numbers."""
        spacing = self.alphabet[1] - self.alphabet[0]
        return numbers.astype(np.int64) * spacing + self.alphabet[0]

    def sum_before(self, index: int) -> int:
        """Return the levels of symbols ``[0, index)`` added up, for any index of the loop.

        Notes
        -----
        At most a block is added. An index outside the loop is folded into it: a closed loop's sum
        leaves the phase as it was.
        """
        folded = index % self.period
        block = folded // BLOCK_SYMBOLS
        low = block * BLOCK_SYMBOLS
        return int(self.sums[block]) + int(self.levels(self.range(low, folded - low)).sum())


def scan(
    words: Words,
    *,
    encoding: Encoding,
    numbers: NDArray[np.uint8],
    alphabet: tuple[int, ...],
    period: int,
) -> tuple[PhaseSymbols, int]:
    """Read a loop of data once, in blocks, and keep one exact sum a block.

    Parameters
    ----------
    words, encoding, numbers, alphabet, period
        As in :class:`PhaseSymbols`.

    Returns
    -------
    symbols : PhaseSymbols
        Without a tail.
    total : int
        Levels of the whole loop added up.
    """
    spacing, lowest = alphabet[1] - alphabet[0], alphabet[0]
    sums = np.zeros(-(-period // BLOCK_SYMBOLS) + 1, np.int64)
    for first in range(0, period, BLOCK_SYMBOLS * _BLOCKS_AT_ONCE):
        count = min(BLOCK_SYMBOLS * _BLOCKS_AT_ONCE, period - first)
        made = encode(words, encoding, numbers, first, count)
        edges = np.arange(0, count, BLOCK_SYMBOLS)
        sizes = np.diff(edges, append=count)
        block = first // BLOCK_SYMBOLS + 1
        risen = np.add.reduceat(made, edges, dtype=np.int64) * spacing + sizes * lowest
        sums[block : block + edges.size] = risen
    sums = np.cumsum(sums)
    symbols = PhaseSymbols(
        words=words,
        encoding=encoding,
        numbers=numbers,
        alphabet=alphabet,
        period=period,
        tail=np.zeros(0, np.uint8),
        sums=sums[:-1],
    )
    return symbols, int(sums[-1])


def closing_tail(
    last: NDArray[np.uint8], *, total: int, n_states: int, order: int
) -> NDArray[np.uint8] | None:
    """Return last symbols that close the phase over the loop, as few as will do.

    Parameters
    ----------
    last : uint8 array, shape (n,)
        Numbers of the last symbols; the levels of ``order`` of them are 2 apart.
    total : int
        Levels of the loop added up.
    n_states : int
        The sum must be a multiple of it.
    order : int
        Levels.

    Returns
    -------
    uint8 array or None
        Numbers that stand in for the last ones; None if the symbols given are too few.

    Examples
    --------
    >>> closing_tail(np.array([1, 1, 0, 1], np.uint8), total=2, n_states=4, order=2)
    array([0], dtype=uint8)
    """
    missing = -total % n_states
    best: NDArray[np.uint8] | None = None
    for change in (missing, missing - n_states, missing + n_states, missing - 2 * n_states):
        tail = None if change % 2 else _moved(last, change // 2, order)
        if tail is not None and (best is None or tail.size < best.size):
            best = tail
    return best


def _moved(last: NDArray[np.uint8], steps: int, order: int) -> NDArray[np.uint8] | None:
    """Return the shortest tail whose numbers add up to ``steps`` more, or None."""
    left, made = steps, []
    for number in last[::-1].tolist():
        if not left:
            break
        moved = min(max(number + left, 0), order - 1)
        left -= moved - number
        made.append(moved)
    return np.array(made[::-1], np.uint8) if not left else None
