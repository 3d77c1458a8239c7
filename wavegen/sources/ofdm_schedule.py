"""In which symbols of a repeating frame each part of an OFDM signal is on."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from wavegen.core.errors import RecipeError
from wavegen.core.index_set import SymbolSet


@dataclass(frozen=True, eq=False, kw_only=True)
class Presence:
    """Symbols in which one part is on; the frame repeats for ever, backwards too.

    Parameters
    ----------
    on : bool array, shape (n_frame,)
        Whether the part is on in each symbol of the frame.
    """

    on: NDArray[np.bool_]

    def __getstate__(self) -> dict[str, object]:
        """Leave out what is counted again: workers get a small description."""
        return {"on": self.on}

    @cached_property
    def is_always(self) -> bool:
        """Whether the part is on in every symbol."""
        return bool(self.on.all())

    @cached_property
    def n_on(self) -> int:
        """Symbols of a frame in which the part is on."""
        return int(self.on.sum())

    @cached_property
    def _before(self) -> NDArray[np.int64]:
        return np.concatenate(([0], np.cumsum(self.on)))

    def rank(self, symbol: int) -> int:
        """Return how many of the symbols 0 ... ``symbol - 1`` the part is on in.

        Examples
        --------
        >>> Presence(on=np.array([True, False, True])).rank(5)
        3
        """
        frame, rest = divmod(symbol, self.on.size)
        return frame * self.n_on + int(self._before[rest])

    def places(self, first: int, count: int) -> NDArray[np.intp] | None:
        """Return which of the symbols ``first ...`` the part is on in, counted from ``first``.

        Returns
        -------
        intp array, shape (n_places,), or None
            None stands for all of them.
        """
        if self.is_always:
            return None
        return np.flatnonzero(self.on[np.arange(first, first + count) % self.on.size])


def present(symbols: SymbolSet | None, *, n_frame: int, where: str) -> Presence:
    """Return when a part is on.

    Parameters
    ----------
    symbols : SymbolSet or None
        As asked; None for all.
    n_frame : int
        Symbols in a frame.
    where : str
        Path of the setting in the recipe, for messages.

    Raises
    ------
    RecipeError
        A symbol beyond the frame, or listed twice.
    """
    if symbols is None:
        return Presence(on=np.ones(n_frame, np.bool_))
    last = max(run[1] for run in symbols.runs)
    if last >= n_frame:
        raise RecipeError(
            where=where,
            problem=f"symbol {last} lies beyond a frame of {n_frame} symbols",
            allowed=f"0 to {n_frame - 1}",
            remedy=f"Leave it out, or write frame: {last + 1} symbols or more.",
        )
    on = np.zeros(n_frame, np.bool_)
    for symbol in symbols.numbers:
        if on[symbol]:
            raise RecipeError(
                where=where,
                problem=f"symbol {symbol} is listed twice",
                allowed="each symbol once",
                remedy="Leave one of the two out.",
            )
        on[symbol] = True
    return Presence(on=on)


def states(presences: Sequence[Presence]) -> tuple[NDArray[np.bool_], NDArray[np.intp]]:
    """Return the different sets of parts that are on together, and where each occurs.

    Parameters
    ----------
    presences : sequence of Presence
        All over the same frame; at least one.

    Returns
    -------
    states : bool array, shape (n_states, n_parts)
        Which parts are on.
    numbers : intp array, shape (n_frame,)
        State of each symbol of the frame.

    Examples
    --------
    >>> both = [Presence(on=np.array([True, True])), Presence(on=np.array([True, False]))]
    >>> found, numbers = states(both)
    >>> found[numbers].tolist()
    [[True, True], [True, False]]
    """
    found, numbers = np.unique(
        np.stack([part.on for part in presences], axis=1), axis=0, return_inverse=True
    )
    return found, numbers.reshape(-1)
