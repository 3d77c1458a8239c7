"""A side that has samples: measured, as a loop or as a sample of its process."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np

from wavegen.comparison.curves import Curve, ExactCurve, SampledCurve, ScaleStatistics
from wavegen.comparison.side import LOOP, RECORDING, Side, SideSettings
from wavegen.core.errors import SignalError
from wavegen.core.progress import Progress, silent
from wavegen.dsp.bursts import Bursts
from wavegen.meters.batches import BatchedStatistics
from wavegen.meters.intervals import SampledStatistics
from wavegen.meters.power_statistics import PowerStatistics
from wavegen.production.measure_settings import GateSettings, MeasureSettings
from wavegen.production.measured_rows import fault_rows, fault_text
from wavegen.production.measured_signal import MeasuredSignal, measure_signal, on_peak_db
from wavegen.production.subject import Subject


def measured_side(
    subject: Subject,
    settings: SideSettings,
    *,
    kind: str | None = None,
    workers: int = 1,
    progress: Progress = silent,
) -> Side:
    """Measure a subject as one side.

    Parameters
    ----------
    subject : Subject
        What is measured.
    settings : SideSettings
        Gate and offset.
    kind : str, optional
        What it is, in words, if neither a loop nor a recording says it.
    workers, progress
        As in :func:`wavegen.core.render.render`.

    Raises
    ------
    SignalError
        Nothing but zeros, or no bursts where they were asked for.
    """
    gated = settings.gate is not None
    wanted = MeasureSettings(
        gate=settings.gate,
        removes_offset=settings.removes_offset,
        states_process=not subject.loops,
    )
    # A gate of the recipe's own is not asked for here: all of the time is compared.
    if not gated and subject.bursts is not None:
        subject = _ungated(subject)
    found = measure_signal(subject, wanted, workers=workers, progress=progress)
    statistics, batched, bursts = _of_interest(found, gate=settings.gate)
    warnings = list(subject.warnings)
    faults = _told(found, settings) if not subject.is_described else []
    warnings += [fault_text(row) for row in faults]
    level_dbm = subject.reference_level_dbm
    shift_db = statistics.mean_db + (level_dbm or 0.0)
    low_db = high_db = shift_db
    curve: Curve = ExactCurve(source=statistics)
    scale: Curve = ExactCurve(source=statistics, shift_db=shift_db)
    if batched is not None:
        sampled = SampledStatistics.of(batched)
        curve = SampledCurve(sampled=sampled)
        scale = SampledCurve(sampled=ScaleStatistics.of(batched), shift_db=shift_db)
        low_db, high_db = (x + (level_dbm or 0.0) for x in sampled.mean_interval_db())
    levelled = _levelled_curve(found)
    peak_db = statistics.peak_db
    if gated:
        between = on_peak_db(found)
        peak_db = between if np.isfinite(between) else peak_db
    elif found.peak is not None:
        peak_db = 10 * float(np.log10(found.peak.power))
    return Side(
        name=subject.name,
        is_=kind or (LOOP if subject.loops else RECORDING),
        curve=levelled or curve,
        scale_curve=None if levelled else scale,  # bursts brought to one level have none
        mean_db=shift_db,
        mean_low_db=low_db,
        mean_high_db=high_db,
        peak_db=peak_db + (level_dbm or 0.0),
        scale="dBFS" if level_dbm is None else "dBm",
        sample_rate_hz=float(subject.signal.sample_rate_hz),
        n_samples=statistics.n_samples,
        duty=statistics.n_samples / found.signal.n_samples if gated else None,
        signal=found.signal,
        loops=subject.loops,
        is_power=subject.is_power,
        bursts=bursts,
        fault_db=max((row["size"] for row in faults if _lifts_mean(row)), default=0.0),
        warnings=tuple(warnings),
    )


def _lifts_mean(row: dict[str, Any]) -> bool:
    """Return whether a fault is of fill words whose share of the mean is known."""
    return bool(row["kind"] == "fill" and row["unit"] == "dB")


def _ungated(subject: Subject) -> Subject:
    return replace(subject, bursts=None)


def _told(found: MeasuredSignal, settings: SideSettings) -> list[dict[str, Any]]:
    """Return the faults that were not taken off."""
    rows: list[dict[str, Any]] = fault_rows(found.check)
    if settings.removes_offset:
        rows = [row for row in rows if row["kind"] != "dc_offset"]
    return rows


def _of_interest(
    found: MeasuredSignal, *, gate: GateSettings | None
) -> tuple[PowerStatistics, BatchedStatistics | None, Bursts | None]:
    """Return statistics, batches of a recording, and bursts, of what is compared."""
    if gate is None:
        return found.statistics, found.part.whole if found.part else None, None
    seen = found.gate
    if seen is None or seen.on is None:
        reason = seen.found.reason if seen else "there are none"
        raise SignalError(
            where=found.subject.name,
            problem=f"has no bursts to compare: {reason}",
            allowed="a signal that is switched on and off, with --gate",
            remedy="Leave --gate out for this side, or help with --threshold.",
        )
    recorded = None if found.subject.loops else seen.on
    return seen.on.statistics, recorded, seen.found.bursts


def _levelled_curve(found: MeasuredSignal) -> Curve | None:
    """Return the curve of bursts each over its own mean, None unless that was asked for."""
    levelled = found.gate.levelled if found.gate else None
    if levelled is None:
        return None
    if found.subject.loops:
        return ExactCurve(source=levelled.statistics)
    return SampledCurve(sampled=SampledStatistics.of(levelled))
