"""How OFDM sources and stages speak of symbols: their useful parts, before prefix and window."""

from __future__ import annotations

from typing import Protocol, Self, runtime_checkable

import numpy as np
from numpy.typing import NDArray

from wavegen.core.signal import Samples, Signal


class Turns(Protocol):
    """In which symbols something is on."""

    @property
    def on(self) -> NDArray[np.bool_]:
        """Whether it is on in each symbol of the frame, which repeats; shape (n_frame,)."""

    def places(self, first: int, count: int) -> NDArray[np.intp] | None:
        """Return which of the symbols ``first ...`` it is on in; None for all of them."""


class Stream(Protocol):
    """Subcarriers that carry one stream of data."""

    @property
    def table(self) -> Samples:
        """Point of each symbol number, level and scale included, shape (order,)."""

    @property
    def bins(self) -> NDArray[np.uint32]:
        """FFT bin of each subcarrier, shape (n,)."""

    @property
    def presence(self) -> Turns:
        """When it is on."""

    @property
    def rotation(self) -> Samples | None:
        """Factor of each point of a symbol, shape (n,)."""

    @property
    def is_spread(self) -> bool:
        """Whether the points go through a DFT before they stand on subcarriers."""

    @property
    def name(self) -> str:
        """Its place in the settings."""

    def rows(self, first: int, count: int) -> NDArray[np.unsignedinteger]:
        """Return the words of those of the symbols ``first ...`` in which it is on, by row."""


class Grid(Protocol):
    """What stands on which subcarriers."""

    @property
    def n_fft(self) -> int:
        """Samples of a useful symbol."""

    @property
    def indices(self) -> NDArray[np.intp]:
        """Subcarriers in use in any symbol, ascending; 0 is the centre."""

    @property
    def is_shifted(self) -> bool:
        """Whether every subcarrier stands half a spacing higher."""

    @property
    def carried(self) -> tuple[Stream, ...]:
        """Groups of data, in the order of the settings."""

    @property
    def on(self) -> NDArray[np.bool_]:
        """Whether each of ``indices`` is on in each symbol of the frame, (n_frame, n_active)."""


class Undo(Protocol):
    """What a receiver that knows of it takes back."""

    def undo(self, subcarriers: Signal) -> Signal:
        """Return received subcarriers as if it had not been done.

        Index of both: ``symbol * n_active + position``, as in :class:`Grid`'s ``indices``.
        """


@runtime_checkable
class HasBodies(Protocol):
    """A signal made of symbol bodies to which prefixes and edges come last."""

    @property
    def bodies(self) -> Signal:
        """Useful parts: symbol ``k`` at ``[k n_fft, (k + 1) n_fft)``."""

    @property
    def grid(self) -> Grid:
        """What the source puts on its subcarriers."""

    @property
    def undone_by(self) -> tuple[Undo, ...]:
        """What a receiver takes back, the last first."""

    def with_bodies(self, bodies: Signal, *, undo: Undo | None = None) -> Self:
        """Return the same with other bodies; what was sent stays the reference of EVM."""
