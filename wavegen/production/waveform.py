"""A rendered loop and what was measured on it."""

from __future__ import annotations

import math
from collections.abc import Mapping
from concurrent.futures import Executor
from dataclasses import dataclass

from wavegen.core.progress import Progress, silent
from wavegen.core.render import Tap, render
from wavegen.core.signal import Signal
from wavegen.core.stored import Scratch
from wavegen.meters.mean import MeanMeter
from wavegen.meters.peak import BetweenSamplesPeak, peak_between_samples
from wavegen.meters.power import PowerMeter, PowerStatistics
from wavegen.meters.seam import SeamFigure, seam_figure
from wavegen.production.graph import Built

POWER = "power"


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
    """

    signal: Signal
    statistics: PowerStatistics
    peak: BetweenSamplesPeak
    seam: SeamFigure
    part_means: Mapping[str, float]

    @property
    def papr_db(self) -> float:
        """Peak between samples over the mean, dB: the PAPR that a device sees."""
        return 10 * math.log10(self.peak.power) - self.statistics.mean_db


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
        part_means=readings,
    )
