"""What pictures of a signal need beyond its power statistics, gathered in one reading of it."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from wavegen.core.errors import SignalError
from wavegen.core.progress import Progress, silent
from wavegen.core.render import Tap, render, samples_of
from wavegen.core.signal import Samples, Signal
from wavegen.dsp.bursts import Bursts
from wavegen.meters.envelope import Envelope, EnvelopeMeter
from wavegen.meters.spectrum import Spectrum, SpectrumMeter
from wavegen.meters.symbol_clouds import SymbolCloud, symbol_clouds

AROUND_SEAM = 120
"""Samples shown on each side of a loop's seam."""
_MOST_BURSTS = 200


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Views:
    """Material for pictures of one signal.

    Parameters
    ----------
    sample_rate_hz : float
        Hz.
    envelope : Envelope
        Power against time.
    spectrum : Spectrum or None
        None for a signal too short for one.
    around_seam : complex64 array, shape (2 n,), or None
        The end of a loop and its start; None for a recording.
    on_times_s : tuple of (float, float)
        When a gate is on, s; empty without a gate, or with more than 200 bursts.
    clouds : tuple of SymbolCloud
        Received symbols; empty where nothing has any, or what is received is not known.
    """

    sample_rate_hz: float
    envelope: Envelope
    spectrum: Spectrum | None
    around_seam: Samples | None
    on_times_s: tuple[tuple[float, float], ...] = ()
    clouds: tuple[SymbolCloud, ...] = ()


def views_of(
    signal: Signal,
    *,
    loops: bool,
    graph: Signal | None = None,
    bursts: Bursts | None = None,
    workers: int = 1,
    progress: Progress = silent,
) -> Views:
    """Read a signal once for its pictures.

    Parameters
    ----------
    signal : Signal
        Samples as they are in a file.
    loops : bool
        Whether the last sample is followed by the first.
    graph : Signal, optional
        The recipe's graph on the same axis, for the constellation.
    bursts : Bursts, optional
        When it is on.
    workers : int
        Threads.
    progress : Progress
        Told after every strip.

    Returns
    -------
    Views

    Raises
    ------
    FileError, SignalError
        It cannot be read, or a sample is not finite.
    """
    taps = [Tap(name="envelope", signal=signal, meter=EnvelopeMeter())]
    meter = _spectrum_meter(signal.n_samples, loops=loops)
    if meter is not None:
        taps.append(Tap(name="spectrum", signal=signal, meter=meter))
    found = render(
        signal, taps=tuple(taps), workers=workers, progress=progress, task="reading for pictures"
    )
    half = min(AROUND_SEAM, signal.n_samples // 2)
    around = None
    if loops and half:
        n = signal.n_samples
        around = np.concatenate([samples_of(signal, n - half, n), samples_of(signal, 0, half)])
    rate = float(signal.sample_rate_hz)
    return Views(
        sample_rate_hz=rate,
        envelope=found["envelope"],
        spectrum=found.get("spectrum"),
        around_seam=around,
        on_times_s=_on_times(bursts, signal.n_samples, rate),
        clouds=() if graph is None else _clouds(graph),
    )


def _spectrum_meter(n_samples: int, *, loops: bool) -> SpectrumMeter | None:
    """Return a meter whose segments are short enough for several; None for a few samples."""
    size = 1 << max(min(12, (n_samples // 8).bit_length() - 1), 0)
    return SpectrumMeter(n_fft=size, overlap=0.75, loops=loops) if size >= 32 else None


def _on_times(
    bursts: Bursts | None, n_samples: int, rate_hz: float
) -> tuple[tuple[float, float], ...]:
    if bursts is None:
        return ()
    found: list[tuple[float, float]] = []
    for start, stop in bursts.within(0, n_samples):
        if len(found) == _MOST_BURSTS:
            return ()
        found.append((start / rate_hz, stop / rate_hz))
    return tuple(found)


def _clouds(graph: Signal) -> tuple[SymbolCloud, ...]:
    try:
        return tuple(symbol_clouds(graph))
    except SignalError:  # a stage through which no receiver follows: there is no picture of it
        return ()
