"""The level of what a conversion writes: a peak that is asked for, and codes that would be cut."""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np

from wavegen.core.errors import ArgumentsError
from wavegen.core.progress import Progress, silent
from wavegen.core.render import Tap, render, samples_of
from wavegen.core.signal import Signal
from wavegen.meters.peak import peak_between_samples
from wavegen.meters.power import PowerMeter, PowerStatistics
from wavegen.production.export import STRIP_SAMPLES, ExportedFile


def power_of(signal: Signal, *, workers: int = 1, progress: Progress = silent) -> PowerStatistics:
    """Measure the power of a signal whose ranges can be read.

    Raises
    ------
    SignalError
        A sample is not finite, or all are zero.
    """
    tap = Tap(name="power", signal=signal, meter=PowerMeter(where="the samples"))
    found: PowerStatistics = render(
        signal, taps=(tap,), workers=workers, progress=progress, task="measuring"
    )["power"]
    return found


def gain_to_peak(
    signals: Sequence[Signal],
    powers: Sequence[PowerStatistics],
    peak_dbfs: float,
    *,
    loops: bool,
) -> float:
    """Return the amplitude factor that puts the peak between samples at a level.

    Parameters
    ----------
    signals : sequence of Signal
        The channels; the larger of their peaks counts.
    powers : sequence of PowerStatistics
        Of each.
    peak_dbfs : float
        Where that peak shall stand.
    loops : bool
        Whether the last sample is followed by the first.
    """
    peaks = [
        peak_between_samples(signal, power, loops=loops).power
        for signal, power in zip(signals, powers, strict=True)
    ]
    return math.sqrt(10 ** (peak_dbfs / 10) / max(peaks))


def refuse_cut(file: ExportedFile, signals: Sequence[Signal], gain: float) -> None:
    """Refuse codes that were cut at full scale by more than rounding (+1.0 itself has no code).

    Parameters
    ----------
    file : ExportedFile
        As written.
    signals : sequence of Signal
        What was written, before the gain.
    gain : float
        Amplitude factor.

    Raises
    ------
    ArgumentsError
        Says by how much.
    """
    largest = 0.0
    for signal in signals:
        for start in range(0, signal.n_samples, STRIP_SAMPLES):
            samples = samples_of(signal, start, min(start + STRIP_SAMPLES, signal.n_samples))
            largest = max(largest, float(np.abs(samples.view(np.float32)).max()))
    largest *= gain
    if largest <= 1.0:
        return
    is_real = file.datatype.is_real
    peak = "the largest sample stands" if is_real else "the larger rail peaks"
    raise ArgumentsError(
        where="--gain",
        problem=f"{file.n_saturated} {'codes' if is_real else 'I or Q codes'} would be cut: "
        f"{peak} {20 * math.log10(largest):.3g} dB over full scale",
        allowed="peaks up to full scale, or a float datatype",
        remedy="Add --peak -1dBFS, or --gain with a lower level.",
    )
