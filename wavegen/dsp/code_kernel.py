"""Samples to 16-bit codes and back to what the codes stand for, in one pass over memory.

A compiled loop does it where numba is installed; plain NumPy gives the same bits otherwise and is
the referee of the compiled loop.
"""

from __future__ import annotations

from collections.abc import Callable
from functools import cache

import numpy as np
from numpy.typing import NDArray

from wavegen.dsp.compiled import compiled, numba_types

_CELL = 2048
"""Rails looked at before they are overwritten."""


def round_and_hold(
    rails: NDArray[np.float32],
    codes: NDArray[np.int16],
    *,
    gain: np.float32,
    full_scale: float,
    lowest: int,
    highest: int,
    shift: int = 0,
) -> tuple[int, int]:
    """Round rails to codes, and put in their place what the codes stand for.

    Parameters
    ----------
    rails : float32 array, shape (n,)
        Contiguous; afterwards the codes over full scale.
    codes : int16 array, shape (n,)
        Written to; half rounds to even, what lies outside saturates.
    gain : float32
        Factor to full scale 1.0, applied (and rounded to float32) first.
    full_scale : float
        Code that stands for 1.0, a power of two.
    lowest, highest : int
        Ends of the codes.
    shift : int
        Zero bits below each code.

    Returns
    -------
    n_saturated : int
        Rails whose rounded value lay outside the codes.
    bad : int
        First rail that is not finite, or -1. Nothing else is valid then.
    """
    word = np.array([gain, full_scale, lowest, highest], np.float32)
    found = np.array([0, -1], np.int64)
    kernel = _compile()
    work = round_and_hold_by_numpy if kernel is None else kernel
    work(rails, codes, word, 1 << shift, found)
    n_saturated, bad = found.tolist()
    return n_saturated, bad


def round_and_hold_by_numpy(
    rails: NDArray[np.float32],
    codes: NDArray[np.int16],
    word: NDArray[np.float32],
    factor: int,
    found: NDArray[np.int64],
) -> None:
    """Do what :func:`round_and_hold` does, without a compiler.

    Parameters
    ----------
    rails, codes : array
        As there.
    word : float32 array, shape (4,)
        Gain, full scale, lowest and highest code.
    factor : int
        What codes are multiplied by.
    found : int64 array, shape (2,)
        Takes what saturated, and the first rail that is not finite.
    """
    gain, full_scale, lowest, highest = word
    for start in range(0, rails.size, _CELL):
        held = rails[start : start + _CELL]
        with np.errstate(invalid="ignore", over="ignore"):
            held *= gain
            held *= full_scale
        finite = np.isfinite(held)
        if not finite.all():
            found[1] = start + int(np.argmin(finite))
            return
        np.rint(held, out=held)
        found[0] += np.count_nonzero((held < lowest) | (held > highest))
        np.clip(held, lowest, highest, out=held)
        codes[start : start + _CELL] = held.astype(np.int16) * np.int16(factor)
        held *= np.float32(1) / full_scale


@cache
def _compile() -> Callable[..., None] | None:
    kinds = numba_types()
    if kinds is None:
        return None
    signature = kinds.void(
        kinds.Array(kinds.float32, 1, "C"),
        kinds.Array(kinds.int16, 1, "C"),
        kinds.Array(kinds.float32, 1, "C"),
        kinds.int64,
        kinds.Array(kinds.int64, 1, "C"),
    )
    return compiled(signature, _round)


def _round(
    rails: NDArray[np.float32],
    codes: NDArray[np.int16],
    word: NDArray[np.float32],
    factor: int,
    found: NDArray[np.int64],
) -> None:  # pragma: no cover - compiled
    """Look at a cell; where all of it lies within the codes, no sample needs a question."""
    gain, full_scale, lowest, highest = word[0], word[1], word[2], word[3]
    step = np.float32(1) / full_scale
    multiple = np.int16(factor)
    for start in range(0, rails.size, _CELL):
        held = rails[start : start + _CELL]
        mine = codes[start : start + _CELL]
        n_outside = 0
        for i in range(held.size):
            value = held[i] * gain * full_scale
            held[i] = value
            n_outside += 0 if lowest <= value <= highest else 1
        if n_outside:
            for i in range(held.size):
                if not np.isfinite(held[i]):
                    found[1] = start + i
                    return
                value = np.rint(held[i])
                found[0] += 1 if value < lowest or value > highest else 0
                held[i] = min(max(value, lowest), highest)
        for i in range(held.size):
            value = np.rint(held[i])
            mine[i] = np.int16(value) * multiple
            held[i] = value * step
