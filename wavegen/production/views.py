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
from wavegen.meters.mask import SpectralMask
from wavegen.meters.power import PowerMeter, PowerStatistics
from wavegen.meters.spectrum import Spectrum, SpectrumMeter
from wavegen.meters.symbol_clouds import SymbolCloud, symbol_clouds
from wavegen.production.neighbours import spectrum_meter
from wavegen.production.surroundings import ChannelView, Corners, Surroundings, mask_corners

AROUND_SEAM = 120
"""Samples shown on each side of a loop's seam."""
_MOST_BURSTS = 200
_FEWEST_BINS = 32


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Before:
    """A signal before what a recipe does to its peaks.

    Parameters
    ----------
    name : str
        As a legend has it: ``before its peaks are reduced``.
    power : PowerStatistics
        Of all of it.
    spectrum : Spectrum or None
        As of the signal itself.
    """

    name: str
    power: PowerStatistics
    spectrum: Spectrum | None


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
    channels : tuple of ChannelView
        The carrier and its neighbours, where a recipe tells them.
    mask : (frequencies in Hz, limits in dBc/Hz) or None
        Of the recipe.
    before : Before or None
        The same signal before its peaks are reduced.
    """

    sample_rate_hz: float
    envelope: Envelope
    spectrum: Spectrum | None
    around_seam: Samples | None
    on_times_s: tuple[tuple[float, float], ...] = ()
    clouds: tuple[SymbolCloud, ...] = ()
    channels: tuple[ChannelView, ...] = ()
    mask: Corners | None = None
    before: Before | None = None


def views_of(
    signal: Signal,
    *,
    loops: bool,
    graph: Signal | None = None,
    bursts: Bursts | None = None,
    mask: SpectralMask | None = None,
    before: tuple[str, Signal] | None = None,
    is_power: bool = False,
    centre_hz: float = 0.0,
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
        The recipe's graph on the same axis, for constellation and channels.
    bursts : Bursts, optional
        When it is on.
    mask : SpectralMask, optional
        Of the recipe; drawn where there is a graph, whose band it stands around.
    before : (str, Signal), optional
        The same before its peaks are reduced, and what that is called.
    is_power : bool
        The samples are power without a phase: there is no spectrum, and no rails at the seam.
    centre_hz : float
        Intermediate frequency around which the samples hold what the graph holds around 0 Hz.
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
    rate = float(signal.sample_rate_hz)
    around = None if graph is None else Surroundings.of(graph)
    if around is not None:
        around = around.moved(centre_hz, sample_rate_hz=rate)
    meter = None if is_power else _spectrum_meter(signal, around, mask, loops=loops)
    taps = [Tap(name="envelope", signal=signal, meter=EnvelopeMeter())]
    if meter is not None:
        taps.append(Tap(name="spectrum", signal=signal, meter=meter))
    found = render(
        signal, taps=tuple(taps), workers=workers, progress=progress, task="reading for pictures"
    )
    spectrum = found.get("spectrum")
    corners = None
    if mask is not None and around is not None and spectrum is not None:
        corners = mask_corners(mask, spectrum, centre_hz=around.band.centre_hz)
    return Views(
        sample_rate_hz=rate,
        envelope=found["envelope"],
        spectrum=spectrum,
        around_seam=_around_seam(signal) if loops and not is_power else None,
        on_times_s=_on_times(bursts, signal.n_samples, rate),
        clouds=() if graph is None else _clouds(graph),
        channels=around.channels(spectrum) if around and spectrum is not None else (),
        mask=corners,
        # Around another frequency than the samples, its spectrum cannot be laid over theirs.
        before=None
        if before is None
        else _before(*before, None if centre_hz else meter, workers, progress),
    )


def _around_seam(signal: Signal) -> Samples | None:
    half, n = min(AROUND_SEAM, signal.n_samples // 2), signal.n_samples
    if not half:
        return None
    return np.concatenate([samples_of(signal, n - half, n), samples_of(signal, 0, half)])


def _before(
    name: str, signal: Signal, meter: SpectrumMeter | None, workers: int, progress: Progress
) -> Before:
    taps = [Tap(name="power", signal=signal, meter=PowerMeter())]
    if meter is not None:
        taps.append(Tap(name="spectrum", signal=signal, meter=meter))
    found = render(signal, taps=tuple(taps), workers=workers, progress=progress, task=name)
    return Before(name=name, power=found["power"], spectrum=found.get("spectrum"))


def _spectrum_meter(
    signal: Signal, around: Surroundings | None, mask: SpectralMask | None, *, loops: bool
) -> SpectrumMeter | None:
    """Return a meter whose segments are short enough for several; None for a few samples."""
    size = 1 << max(min(12, (signal.n_samples // 8).bit_length() - 1), 0)
    if around is not None:
        size = max(size, min(spectrum_meter(signal, around.band.width_hz, mask).n_fft, 4 * size))
    return SpectrumMeter(n_fft=size, overlap=0.75, loops=loops) if size >= _FEWEST_BINS else None


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
