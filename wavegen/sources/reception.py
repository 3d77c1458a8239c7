"""A source at the receiver: what was sent and what came, on one symbol axis."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Protocol, runtime_checkable

import numpy as np
from numpy.typing import NDArray

from wavegen.core.signal import Signal
from wavegen.dsp.arrival import Arrival


@dataclass(frozen=True, slots=True, kw_only=True)
class SymbolClass:
    """Symbols that are judged together: a group, the pilots, all of a carrier.

    Parameters
    ----------
    name : str
        Its place in the settings: ``groups[0]``; ``symbols`` for a single carrier.
    constellation : str
        Name of its constellation; empty for pilots.
    """

    name: str
    constellation: str = ""

    @property
    def is_data(self) -> bool:
        """Whether it carries data."""
        return bool(self.constellation)


@dataclass(frozen=True, eq=False, kw_only=True)
class Reception:
    """Received and ideal symbols of one source.

    Parameters
    ----------
    received, ideal : Signal
        On one axis: index ``row * n_columns + column``. Both 0 where nothing is sent.
    classes : tuple of SymbolClass
        What the labels stand for.
    n_columns : int
        Subcarriers of a symbol; 1 for a single carrier.
    labels : int16 array, shape (n_frame, n_columns), or None
        Class of each place over the frame, which repeats; -1 where nothing is sent. None: all 0.
    spread : Despread or None
        How to go on to the points of DFT-spread groups.
    rails : (Signal, Signal) or None
        Of a staggered carrier, received and ideal half symbols: I, then Q; of scale ``sqrt(2)``.
    remarks : tuple of str
        What the reader of the figures should know.
    """

    received: Signal
    ideal: Signal
    classes: tuple[SymbolClass, ...]
    n_columns: int = 1
    labels: NDArray[np.int16] | None = None
    spread: Despread | None = None
    rails: tuple[Signal, Signal] | None = None
    remarks: tuple[str, ...] = ()


class Despread(Protocol):
    """Goes from equalised subcarriers to points."""

    def reception(self, subcarriers: Signal) -> Reception:
        """Return the reception on the axis of the points."""


@runtime_checkable
class Receivable(Protocol):
    """A signal with symbols that a receiver can find again."""

    def receive(
        self, conditioned: Signal, arrival: Arrival, *, early_samples: int | None = None
    ) -> Reception:
        """Return the symbols as sent and as received.

        Parameters
        ----------
        conditioned : Signal
            What a receiver gets, at the source's own sample rate.
        arrival : Arrival
            How the source stands in it.
        early_samples : int, optional
            OFDM: how long before the useful part the transform begins.
        """
