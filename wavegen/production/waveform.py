"""A rendered loop and what was measured on it."""

from __future__ import annotations

import math
from collections.abc import Mapping
from concurrent.futures import Executor
from dataclasses import dataclass
from typing import Literal

from wavegen.core.progress import Progress, silent
from wavegen.core.render import Tap, render
from wavegen.core.signal import Signal
from wavegen.core.stored import Scratch
from wavegen.dsp.bursts import Bursts
from wavegen.meters.gated import GatedPowerMeter
from wavegen.meters.mean import MeanMeter
from wavegen.meters.peak import BetweenSamplesPeak, peak_between_samples
from wavegen.meters.power import PowerMeter, PowerStatistics
from wavegen.meters.rails import RailPeaks, rail_peaks
from wavegen.meters.seam import SeamFigure, seam_figure
from wavegen.production.graph import Built
from wavegen.production.side_information import Choices, choice_taps, take_choices
from wavegen.stages.channel.gate import on_time

POWER = "power"
ON_TIME = "on-time"


@dataclass(frozen=True, slots=True, kw_only=True)
class Waveform:
    """One rendered loop.

    Parameters
    ----------
    signal : Signal
        Its samples; unit mean power is nominal.
    statistics : PowerStatistics
        Of all samples.
    peak : BetweenSamplesPeak
        Largest envelope power between samples.
    seam : SeamFigure
        How the loop closes.
    part_means : mapping of str to float
        Realised mean power of each part, by its path.
    rails : RailPeaks
        Largest value of each rail, between samples too.
    bursts : Bursts or None
        When the signal is on, if one gate decides that for all of it.
    on_statistics : PowerStatistics or None
        Of the on-time, ramps excluded.
    choices : tuple of Choices
        What stages of selected mapping chose.
    """

    signal: Signal
    statistics: PowerStatistics
    peak: BetweenSamplesPeak
    seam: SeamFigure
    part_means: Mapping[str, float]
    rails: RailPeaks
    bursts: Bursts | None = None
    on_statistics: PowerStatistics | None = None
    choices: tuple[Choices, ...] = ()

    @property
    def longest_burst_s(self) -> float | None:
        """Longest on-time, s; None if it is on all the time."""
        if self.bursts is None:
            return None
        longest = max(stop - start for start, stop in self.bursts.runs)
        return float(longest / self.signal.sample_rate_hz)

    def papr_over(self, mean_of: Literal["period", "burst"]) -> float:
        """Return the peak between samples over the mean of the loop or of the on-time, dB."""
        return 10 * math.log10(self.peak.power) - self.mean_over_db(mean_of)

    def mean_over_db(self, mean_of: Literal["period", "burst"]) -> float:
        """Return the mean of the loop or of the on-time, dB over unit power."""
        on_time = self.on_statistics if mean_of == "burst" else None
        return (on_time or self.statistics).mean_db

    @property
    def papr_db(self) -> float:
        """Peak between samples over the mean, dB: the PAPR that a device sees."""
        return self.papr_over("period")


def render_loop(
    built: Built,
    scratch: Scratch,
    *,
    cycle_samples: int,
    workers: int = 1,
    executor: Executor | None = None,
    progress: Progress = silent,
) -> Waveform:
    """Render one loop to scratch while meters run.

    Parameters
    ----------
    built : Built
        The graph.
    scratch : Scratch
        Takes the samples.
    cycle_samples : int
        Shortest loop of the signal: where stretches compare with the seam.
    workers, executor, progress
        As in :func:`wavegen.core.render.render`.

    Returns
    -------
    Waveform

    Raises
    ------
    SignalError
        A sample is not finite, or the loop is all zeros.
    """
    taps = [Tap(name=POWER, signal=built.signal, meter=PowerMeter())]
    taps += [Tap(name=part.path, signal=part.signal, meter=MeanMeter()) for part in built.parts]
    taps += choice_taps(built.signal)
    bursts = on_time(built.signal)
    if bursts is not None:
        meter = GatedPowerMeter(bursts=bursts)
        taps.append(Tap(name=ON_TIME, signal=built.signal, meter=meter))
    readings = render(
        built.signal,
        taps=tuple(taps),
        sink=scratch.write,
        workers=workers,
        executor=executor,
        progress=progress,
        task="rendering",
    )
    stored = scratch.signal()
    statistics: PowerStatistics = readings.pop(POWER)
    return Waveform(
        signal=stored,
        statistics=statistics,
        peak=peak_between_samples(stored, statistics),
        seam=seam_figure(stored, cycle_samples=cycle_samples),
        rails=rail_peaks(stored, statistics),
        bursts=bursts,
        on_statistics=readings.pop(ON_TIME, None),
        choices=take_choices(built.signal, readings),
        part_means=readings,
    )
