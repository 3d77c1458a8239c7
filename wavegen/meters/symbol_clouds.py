"""Symbols as a receiver finds them, beside those that were sent: for looking at."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from wavegen.core.errors import SignalError
from wavegen.core.render import samples_of
from wavegen.core.signal import Samples, Signal
from wavegen.meters.arrivals import LocatedSource, locate_sources

MOST_SYMBOLS = 4000


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class SymbolCloud:
    """The first symbols of one class.

    Parameters
    ----------
    path, name : str
        Its source, and its class there: ``groups[0]``, ``pilots``.
    constellation : str
        Name; empty for pilots.
    received, ideal : complex64 array, shape (n,)
        After one complex gain for all of the source, and what was sent; RMS of the ideal is 1.
    evm_percent : float
        RMS of the differences of these symbols, % of the RMS of the ideal.
    """

    path: str
    name: str
    constellation: str
    received: Samples
    ideal: Samples
    evm_percent: float

    @property
    def label(self) -> str:
        """Where the symbols are from, in a line."""
        what = f"{self.name}, {self.constellation}" if self.constellation else self.name
        return what if self.path == "signal" else f"{self.path}: {what}"


def symbol_clouds(
    graph: Signal, conditioned: Signal | None = None, *, most: int = MOST_SYMBOLS
) -> list[SymbolCloud]:
    """Return the first symbols of every source that a linear receiver can read.

    Parameters
    ----------
    graph : Signal
        What is sent: sources through sums and stages.
    conditioned : Signal, optional
        What is received; ``graph`` itself if not given.
    most : int
        Places looked at on the symbol axis of each source.

    Returns
    -------
    list of SymbolCloud
        One for each class of symbols in them; empty where nothing has symbols.

    Raises
    ------
    SignalError
        A source cannot be followed through the stages.
    """
    return [
        cloud
        for source in locate_sources(graph, conditioned)
        if source.has_symbols
        for cloud in _clouds_of(source, most)
    ]


def _clouds_of(source: LocatedSource, most: int) -> list[SymbolCloud]:
    try:
        reception = source.reception()
    except SignalError:  # a pulse without a matched filter: nothing to look at
        return []
    if reception.spread is not None:
        reception = reception.spread.reception(reception.received)
    count = min(most, reception.ideal.n_samples)
    ideal = samples_of(reception.ideal, 0, count)
    received = samples_of(reception.received, 0, count)
    energy = np.vdot(ideal, ideal).real
    if not energy > 0:
        return []
    received = received / (np.vdot(ideal, received) / energy)
    labels = np.zeros(count, np.int16)
    if reception.labels is not None:
        flat = reception.labels.reshape(-1)
        labels = flat[np.arange(count) % flat.size]
    clouds = []
    for number, item in enumerate(reception.classes):
        chosen = (labels == number) & (ideal != 0)
        if not chosen.any():
            continue
        rms = np.sqrt(np.mean(np.abs(ideal[chosen]) ** 2))
        sent, got = ideal[chosen] / rms, received[chosen] / rms
        clouds.append(
            SymbolCloud(
                path=source.path,
                name=item.name,
                constellation=item.constellation,
                received=got.astype(np.complex64),
                ideal=sent.astype(np.complex64),
                evm_percent=100 * float(np.sqrt(np.mean(np.abs(got - sent) ** 2))),
            )
        )
    return clouds
