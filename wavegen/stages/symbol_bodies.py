"""Stages that act on OFDM symbols before their prefixes: how they find and replace them."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from wavegen.core.errors import RecipeError
from wavegen.core.signal import Samples, Signal
from wavegen.core.site import Note, Site
from wavegen.core.symbol_bodies import Grid, HasBodies
from wavegen.dsp.symbol_rows import SymbolRows
from wavegen.stages.ceiling import look, reduce_to
from wavegen.stages.combine.sum import Summed

Found = Callable[[float], Signal]
"""Bodies after a method, at an amplitude."""


@dataclass(frozen=True, eq=False, kw_only=True)
class Symbols:
    """Symbols of OFDM as a stage finds them.

    Parameters
    ----------
    source : Signal and HasBodies
        OFDM with its prefixes.
    view : SymbolRows
        How peaks are seen.
    """

    source: HasBodies
    view: SymbolRows

    @property
    def grid(self) -> Grid:
        """What stands on which subcarriers."""
        return self.source.grid

    @property
    def per_band(self) -> float:
        """Points over the band on which peaks are seen."""
        return self.view.per_band(self.grid.indices)


def symbols_of(site: Site, source: Signal, *, per_band: float) -> Symbols:
    """Return the symbols of OFDM that nothing has changed but stages like these.

    Parameters
    ----------
    site : Site
        Of the stage.
    source : Signal
        What it is applied to.
    per_band : float
        Points over the band on which peaks are wanted to be seen.

    Raises
    ------
    RecipeError
        It is no OFDM, or is behind a stage that changed the waveform, or inside a sum.
    """
    if not isinstance(source, HasBodies):
        raise _refusal(site, source)
    grid = source.grid
    view = SymbolRows.over_band(
        n_fft=grid.n_fft,
        indices=grid.indices,
        per_band=per_band,
        is_shifted=grid.is_shifted,
    )
    return Symbols(source=source, view=view)


def _refusal(site: Site, source: Signal) -> RecipeError:
    """Return why a signal has no symbols to act on."""
    allowed = "OFDM, before any stage that changes the waveform"
    if isinstance(source, Summed):
        return site.error(
            key="kind",
            problem="it acts on OFDM symbols before their prefixes, which a sum no longer has",
            allowed=allowed,
            remedy="Write it under the stages of the OFDM part.",
        )
    if _has_bodies_within(source):
        return site.error(
            key="kind",
            problem="it acts on OFDM symbols before their prefixes, but a stage before it has "
            "changed the waveform",
            allowed=allowed,
            remedy="Put it before that stage.",
        )
    return site.error(
        key="kind",
        problem="it acts on OFDM symbols, and this signal has none",
        allowed=allowed,
        remedy="Choose a method that acts on the waveform, such as clip_filter.",
    )


def _has_bodies_within(source: Signal) -> bool:
    waiting = [source]
    while waiting:
        one = waiting.pop()
        if isinstance(one, HasBodies):
            return True
        waiting.extend(one.inputs)
    return False


@dataclass(frozen=True, eq=False, kw_only=True)
class Reworked(Signal):
    """Symbol bodies after a method that takes each by itself.

    Parameters
    ----------
    view : SymbolRows
        How peaks are seen.
    gain : float
        Amplitude ratio of the whole.
    """

    view: SymbolRows
    gain: float = 1.0

    def rework(self, rows: Samples, first: int) -> Samples:
        """Return symbols after the method, before the gain.

        Parameters
        ----------
        rows : complex64 array, shape (n_rows, n_fft)
            Not changed.
        first : int
            Number of the first.

        Returns
        -------
        complex64 array, shape (n_rows, n_fft)
        """
        raise TypeError(type(self).__name__)

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Rework whole symbols, some at a time."""
        n_fft = self.view.n_fft
        rows = arrays[0].reshape(-1, n_fft)
        out = np.empty(rows.shape, np.complex64)
        for low, high in self.view.blocks(rows.shape[0]):
            made = self.rework(rows[low:high], start // n_fft + low)
            np.multiply(
                made.view(np.float32), np.float32(self.gain), out=out[low:high].view(np.float32)
            )
        return out.reshape(-1)


def reduce_symbols(
    site: Site,
    source: Signal,
    symbols: Symbols,
    *,
    ceiling_db: float,
    rework: Callable[[float, float], Signal],
    action: str,
) -> Signal:
    """Return OFDM with its symbols under a ceiling over the mean of the output.

    Parameters
    ----------
    site : Site
        Told of the points on which peaks are seen, of the amplitude, the change of mean power
        that is undone, and the peaks that prefixes and edges leave.
    source : Signal
        The same as ``symbols.source``.
    symbols : Symbols
        From :func:`symbols_of`.
    ceiling_db : float
        Over the mean of the output, dB.
    rework : callable
        The bodies after the method, at an amplitude and a gain.
    action : str
        What the method does: ``projects symbols in 20 rounds``.

    Raises
    ------
    RecipeError
        The signal is zero, or no amplitude gives the ceiling.
    """

    def process(amplitude: float, gain: float) -> Signal:
        made: Signal = symbols.source.with_bodies(rework(amplitude, gain))  # type: ignore[assignment] # a Signal too
        return made

    tell_points(site, symbols)
    pilot = look(source, oversampling=_oversampling(symbols), halo=2 * symbols.view.n_fft)
    return reduce_to(site, pilot, ceiling_db, process, action) or source


def tell_points(site: Site, symbols: Symbols) -> None:
    """Note on how many points of the band peaks are seen."""
    view = symbols.view
    times = view.n_points // view.n_fft
    how = "its own samples" if times == 1 else f"{times} points a sample"
    text = (
        f"acts on symbols before their prefixes; peaks are seen on {how}, "
        f"{symbols.per_band:.2f} over the band in use"
    )
    site.notes.append(Note(kind="info", where=site.path, text=text))


def _oversampling(symbols: Symbols) -> float:
    return SymbolRows(n_fft=symbols.view.n_fft, n_points=symbols.view.n_fft).per_band(
        symbols.grid.indices
    )
