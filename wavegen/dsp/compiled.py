"""Loops compiled by numba, where it is installed; callers have a twin in plain NumPy."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any


def numba_types() -> Any | None:
    """Return numba's types, from which signatures are made; None where it is missing or off."""
    try:
        import numba
    except ImportError:
        return None
    if getattr(numba.config, "DISABLE_JIT", False):
        return None
    return numba.types


def compiled(signature: Any, loop: Callable[..., Any]) -> Callable[..., Any]:
    """Return a loop compiled for stated types, that lets other threads run meanwhile.

    Parameters
    ----------
    signature : numba signature, or list of them
        One explicit signature for each kind of call: without it, read-only and writable arrays
        would each compile a version of their own.
    loop : callable
        Plain Python that numba understands.

    Notes
    -----
    A division by zero gives what it gives in NumPy; a check for it would keep loops from working
    on several samples at once.
    """
    import numba

    made: Callable[..., Any]
    try:
        made = numba.njit(signature, nogil=True, error_model="numpy", cache=True)(loop)
    except RuntimeError:  # no folder can be written for the cache
        made = numba.njit(signature, nogil=True, error_model="numpy")(loop)
    return made
