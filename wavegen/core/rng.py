"""Random words addressed by (seed, label, index): any range can be drawn alone."""

from __future__ import annotations

import hashlib

import numpy as np
from numpy.typing import NDArray

from wavegen.core.evaluate import fold, repeat

_BLOCK_BYTES = 32
"""One Philox 4x64 counter value gives four 64-bit words."""


def stream_key(seed: int, label: str) -> NDArray[np.uint64]:
    """Return the Philox key of a named stream.

    Parameters
    ----------
    seed : int
        The recipe's seed, 0 to 2**64 - 1.
    label : str
        The part's name or path; other labels give independent streams.

    Returns
    -------
    uint64 array, shape (2,)
        Seed, and the first 64 bits of the label's BLAKE2 hash.
    """
    digest = hashlib.blake2b(label.encode(), digest_size=8).digest()
    return np.array([seed & (2**64 - 1), int.from_bytes(digest, "little")], dtype=np.uint64)


def random_bytes(key: NDArray[np.uint64], first: int, count: int) -> NDArray[np.uint8]:
    """Return bytes ``[first, first + count)`` of a stream.

    Parameters
    ----------
    key : uint64 array, shape (2,)
        From :func:`stream_key`.
    first, count : int
        Byte range, ``first >= 0``.

    Returns
    -------
    uint8 array, shape (count,)
        Uniform; the same for the same address, whatever else is drawn.

    Notes
    -----
    Philox 4x64-10, J. Salmon et al., "Parallel random numbers: as easy as 1, 2, 3", 2011.
    """
    low = first // _BLOCK_BYTES
    blocks = -(-(first + count) // _BLOCK_BYTES) - low
    generator = np.random.Philox(key=key, counter=[low, 0, 0, 0])
    raw = np.asarray(generator.random_raw(blocks * 4), dtype="<u8").view(np.uint8)
    offset = first - low * _BLOCK_BYTES
    return raw[offset : offset + count]


def random_words(
    key: NDArray[np.uint64], first: int, count: int, *, period: int, width_bytes: int = 1
) -> NDArray[np.unsignedinteger]:
    """Return uniform words by index on a cyclic axis.

    Parameters
    ----------
    key : uint64 array, shape (2,)
        From :func:`stream_key`.
    first, count : int
        Word range; indices may pass the seam, be negative or cover several periods.
    period : int
        Words in one period of the loop.
    width_bytes : int
        1, 2, 4 or 8 bytes a word.

    Returns
    -------
    unsigned integer array, shape (count,)
        uint8, uint16, uint32 or uint64.
    """
    dtype = np.dtype(f"<u{width_bytes}")
    if count > period or (count == period and first % period):
        whole = random_bytes(key, 0, period * width_bytes).view(dtype)
        return repeat(whole, first, first + count)
    pieces = [
        random_bytes(key, low * width_bytes, (high - low) * width_bytes).view(dtype)
        for low, high in fold(first, first + count, period)
    ]
    return pieces[0] if len(pieces) == 1 else np.concatenate([np.empty(0, dtype), *pieces])
