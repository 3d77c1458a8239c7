"""One subject, measured: the passes over its samples, and what they read."""

from __future__ import annotations

import math
from concurrent.futures import Executor
from dataclasses import dataclass, replace
from typing import Any

from wavegen.core.errors import ArgumentsError
from wavegen.core.excerpt import excerpt
from wavegen.core.progress import Progress, silent
from wavegen.core.render import Tap, render
from wavegen.core.signal import Signal
from wavegen.meters.batches import BatchedPowerMeter, BatchedStatistics
from wavegen.meters.faults import FaultSearch, RecordCheck, check_record
from wavegen.meters.offset import WithoutOffset
from wavegen.meters.peak import BetweenSamplesPeak, peak_between_samples
from wavegen.meters.power import PowerMeter, PowerStatistics
from wavegen.meters.repetition import data_period
from wavegen.meters.sensor import sensor_view
from wavegen.meters.sensor_sample import sample_by_sensor
from wavegen.meters.symbol_papr import SymbolPaprMeter, SymbolPaprStatistics
from wavegen.meters.useful_symbols import UsefulSymbols
from wavegen.production.measure_settings import MeasureSettings, SensorSettings
from wavegen.production.measured_gate import (
    GatedFigures,
    find_gate,
    gate_taps,
    gated_figures,
    within_period,
)
from wavegen.production.subject import Subject

SYMBOL_REFERENCES = ("ensemble", "symbol")


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class SampledPart:
    """What a subject tells of its process: a recording, or one data period of a loop.

    Parameters
    ----------
    whole : BatchedStatistics
        Of all of it.
    on : BatchedStatistics or None
        Of its on-time.
    n_samples : int
        Its length.
    sensor : BatchedStatistics or None
        What a sensor reads of it.
    """

    whole: BatchedStatistics
    on: BatchedStatistics | None
    n_samples: int
    sensor: BatchedStatistics | None = None


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class MeasuredSignal:
    """What was measured of one subject.

    Parameters
    ----------
    subject : Subject
        What it is.
    signal : Signal
        Its samples, less what was asked to be taken off.
    statistics : PowerStatistics
        Of all of it, exact.
    peak : BetweenSamplesPeak or None
        Between samples; None of a power series.
    gate : GatedFigures or None
        Of the on-time.
    part : SampledPart or None
        What intervals are made from.
    check : RecordCheck or None
        Its faults.
    removed : complex
        Offset that was taken off.
    bandwidth_hz : float or None
        Of a flat spectrum of the same spread, Hz.
    sensor : PowerStatistics or None
        As a sensor sees it, over the true mean.
    symbols : tuple of SymbolPaprStatistics
        PAPR of its OFDM symbols, over the mean of all and over each symbol's own.
    """

    subject: Subject
    signal: Signal
    statistics: PowerStatistics
    peak: BetweenSamplesPeak | None
    gate: GatedFigures | None = None
    part: SampledPart | None = None
    check: RecordCheck | None = None
    removed: complex = 0j
    bandwidth_hz: float | None = None
    sensor: PowerStatistics | None = None
    symbols: tuple[SymbolPaprStatistics, ...] = ()


def measure_signal(
    subject: Subject,
    settings: MeasureSettings,
    *,
    workers: int = 1,
    executor: Executor | None = None,
    progress: Progress = silent,
) -> MeasuredSignal:
    """Measure one subject: one pass over its samples, more where more is asked.

    Parameters
    ----------
    subject : Subject
        What is measured.
    settings : MeasureSettings
        What is asked.
    workers, executor, progress
        As in :func:`wavegen.core.render.render`.

    Returns
    -------
    MeasuredSignal

    Raises
    ------
    ArgumentsError
        A setting that means nothing for this subject.
    SignalError
        A sample is not finite, or there is nothing but zeros.
    FileError
        The file cannot be read to its end.
    """
    how: dict[str, Any] = {"workers": workers, "executor": executor, "progress": progress}
    where, loops = subject.name, subject.loops
    search, check, signal = _examined(subject, settings, how)
    found = find_gate(subject, signal, settings.gate, **how)
    period = signal.n_samples
    if loops and settings.states_process and not subject.every_loop:
        step = 1 / subject.code_scale if subject.code_scale else 0.0
        period = data_period(signal, code_step=step, **how)
    has_sample = settings.states_process and not subject.every_loop
    is_one = has_sample and period == signal.n_samples
    meter = BatchedPowerMeter(where=where, loops=loops) if is_one else PowerMeter(where=where)
    symbols = _symbol_taps(subject, signal)
    taps = (
        Tap(name="power", signal=signal, meter=meter),
        *gate_taps(found, signal, loops=loops, where=where),
        *(search.taps if search and check is None else ()),
        *symbols,
    )
    read = render(signal, taps=taps, task=f"measuring {where}", **how)
    power = read["power"]
    statistics = power.statistics if is_one else power
    gate = gated_figures(
        found,
        read,
        signal,
        each=settings.gate is not None and settings.gate.each,
        loops=loops,
        where=where,
        **how,
    )
    part = None
    if is_one:
        part = SampledPart(whole=power, on=gate.on if gate else None, n_samples=period)
    elif has_sample:
        part = _one_period(signal, period, gate, where, how)
    if search is not None and check is None:
        check = search.result(read)
    sensor = None
    if settings.sensor is not None:
        sensor, part = _by_sensor(
            subject, signal, settings.sensor, mean=statistics.mean, part=part, how=how
        )
    return MeasuredSignal(
        subject=subject,
        signal=signal,
        statistics=statistics,
        peak=None if subject.is_power else peak_between_samples(signal, statistics, loops=loops),
        gate=gate,
        part=part,
        check=check,
        removed=check.offset if check and settings.removes_offset else 0j,
        bandwidth_hz=_bandwidth_hz(subject, search),
        sensor=sensor,
        symbols=tuple(read[tap.name] for tap in symbols),
    )


def _examined(
    subject: Subject, settings: MeasureSettings, how: dict[str, Any]
) -> tuple[FaultSearch | None, RecordCheck | None, Signal]:
    """Return the search for faults, what it found if it ran alone, and what is to be measured."""
    signal = subject.signal
    is_wanted = settings.finds_faults and not subject.is_described
    if settings.removes_offset and subject.is_power:
        raise ArgumentsError(
            where="--remove-dc",
            problem=f"{subject.name} holds power alone, which has no offset to take off",
            allowed="--remove-dc with samples of I and Q, or real ones",
            remedy="Leave it out.",
        )
    if subject.is_power or not (is_wanted or settings.removes_offset):
        return None, None, signal
    options: dict[str, Any] = {
        "loops": subject.loops,
        "code_scale": subject.code_scale,
        "n_rails": 1 if subject.is_real else 2,
    }
    if not settings.removes_offset:
        return FaultSearch.of(signal, **options), None, signal
    check = check_record(signal, **options, **how)
    even = WithoutOffset.of(signal, check.offset)
    return FaultSearch.of(even, **options), check, even


def _bandwidth_hz(subject: Subject, search: FaultSearch | None) -> float | None:
    if search is None or not search.seen.flat_bandwidth:
        return None
    return search.seen.flat_bandwidth * float(subject.signal.sample_rate_hz)


def _symbol_taps(subject: Subject, signal: Signal) -> tuple[Tap, ...]:
    """Return the taps of the PAPR per symbol: over the mean of all, and over each one's own."""
    if subject.symbols is None:
        return ()
    prefixed = subject.symbols.prefixed
    useful = UsefulSymbols.of(signal, prefixed)
    return tuple(
        Tap(
            name=f"symbols over {reference}",
            signal=useful,
            meter=SymbolPaprMeter(
                n_fft=prefixed.layout.n_fft,
                reference=reference,  # type: ignore[arg-type] # one of the two that it takes
                is_shifted=prefixed.is_shifted,
            ),
        )
        for reference in SYMBOL_REFERENCES
    )


def _one_period(
    signal: Signal, period: int, gate: GatedFigures | None, where: str, how: dict[str, Any]
) -> SampledPart:
    """Measure one data period of a loop: what is played over again is no further sample."""
    once = excerpt(signal, 0, period)
    taps = [
        Tap(name="power", signal=once, meter=BatchedPowerMeter(where=where, loops=True)),
    ]
    bursts = within_period(gate.found, period) if gate else None
    if bursts is not None:
        meter = BatchedPowerMeter(where=where, loops=True, bursts=bursts)
        taps.append(Tap(name="on", signal=once, meter=meter))
    read = render(once, taps=tuple(taps), task=f"one data period of {where}", **how)
    return SampledPart(whole=read["power"], on=read.get("on"), n_samples=period)


def _by_sensor(
    subject: Subject,
    signal: Signal,
    sensor: SensorSettings,
    *,
    mean: float,
    part: SampledPart | None,
    how: dict[str, Any],
) -> tuple[PowerStatistics, SampledPart | None]:
    """Measure what a sensor would read; its mean is the signal's, which its filter keeps."""
    view = sensor_view(
        signal,
        video_bandwidth_hz=sensor.video_bandwidth_hz,
        sensor_rate_hz=sensor.sensor_rate_hz,
        shape=sensor.shape,
        loops=subject.loops,
    )
    is_all = part is not None and part.n_samples == signal.n_samples
    if part is not None:
        once = view.n_samples
        if not is_all:  # one data period of a loop
            ratio = signal.sample_rate_hz / view.sample_rate_hz
            once = math.ceil(part.n_samples / ratio)
        sampled = sample_by_sensor(
            view, n_readings=once, loops=subject.loops, mean=mean, where=subject.name, **how
        )
        part = replace(part, sensor=sampled)
        if is_all:
            return sampled.statistics, part
    tap = Tap(name="sensor", signal=view, meter=PowerMeter(where=subject.name))
    read = render(view, taps=(tap,), task="as the sensor sees it", **how)
    return replace(read["sensor"], mean=mean), part


def on_peak_db(measured: MeasuredSignal) -> float:
    """Return the peak between samples of the on-time, dB over full scale; NaN if not known.

    The largest place of the whole is that of the on-time too if it lies there.
    """
    gate, peak = measured.gate, measured.peak
    if gate is None or gate.found.bursts is None or peak is None:
        return math.nan
    before = math.floor(peak.position_samples)
    if not gate.found.bursts.is_on(before, before + 2).all():
        return math.nan
    return 10 * math.log10(peak.power)
