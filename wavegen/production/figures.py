"""All figures of one signal of a recipe: symbols, neighbours, power, in one rendering."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Any

from wavegen.core.errors import SignalError
from wavegen.core.progress import Progress, silent
from wavegen.core.render import Tap, render
from wavegen.core.signal import Signal
from wavegen.meters.batches import BatchedPowerMeter, BatchedStatistics
from wavegen.meters.evm_probe import probes_of
from wavegen.meters.fidelity import Fidelity, FidelityProbe, FidelitySettings
from wavegen.meters.intervals import SampledStatistics
from wavegen.stages.channel.gate import on_time

POWER = "power"


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Figures:
    """What one signal measures.

    Parameters
    ----------
    fidelity : Fidelity
        EVM, spectrum, neighbours.
    power : BatchedStatistics
        Envelope power; of a gated signal while it is on.
    """

    fidelity: Fidelity
    power: BatchedStatistics

    def level_db(self, probability: float) -> float:
        """Return the level at a probability, dB over the mean: exact for this loop."""
        return float(self.power.statistics.level_db(probability))

    @property
    def peak_db(self) -> float:
        """Highest power at a sample over the mean, dB."""
        return self.power.statistics.papr_db

    def interval_db(self, probability: float) -> tuple[float, float]:
        """Return between which levels that of the process lies, dB; 95 %."""
        (found,) = SampledStatistics.of(self.power).levels([probability])
        return found.low_db, found.high_db


def has_symbols(signal: Signal) -> tuple[bool, str]:
    """Return whether a receiver finds symbols of a signal, and why not.

    Parameters
    ----------
    signal : Signal
        End of a graph.
    """
    try:
        probes = probes_of(signal)
    except SignalError as error:
        return False, error.problem
    return bool(probes), "" if probes else "no source of it has symbols that a receiver finds"


def measure_figures(
    signal: Signal,
    *,
    settings: FidelitySettings,
    reference: Signal | None = None,
    workers: int = 1,
    progress: Progress = silent,
    task: str = "fidelity",
) -> Figures:
    """Measure a signal.

    Parameters
    ----------
    signal : Signal
        End of a graph of sources, sums and stages.
    settings : FidelitySettings
        What is measured; ``evm`` is left out where no receiver finds symbols.
    reference : Signal, optional
        What the whole waveform is compared with: the signal before the reduction of its peaks.
    workers, progress, task
        As in :func:`wavegen.core.render.render`.

    Returns
    -------
    Figures

    Raises
    ------
    SignalError
        The sample rate does not hold channels or mask; no power; samples that are not finite.
    """
    if settings.evm is not None and not has_symbols(signal)[0]:
        settings = replace(settings, evm=None)
    probe = FidelityProbe.of(signal, settings=settings, reference=reference)
    power = Tap(
        name=POWER, signal=signal, meter=BatchedPowerMeter(loops=True, bursts=on_time(signal))
    )

    def run(taps: tuple[Tap, ...]) -> dict[str, Any]:
        return render(signal, taps=taps, workers=workers, progress=progress, task=task)

    first = run((*probe.taps(), power))
    more = probe.second_taps(first)
    fidelity = probe.result(first, run(more) if more else None)
    return Figures(fidelity=fidelity, power=first[POWER])
