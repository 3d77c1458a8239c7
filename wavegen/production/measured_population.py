"""Several records as one population: refused, or brought to one scale, and sampled together."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from typing import Literal

from wavegen.core.errors import ArgumentsError
from wavegen.meters.batches import BatchedStatistics, pooled
from wavegen.meters.intervals import SampledStatistics
from wavegen.meters.population import check_same_rate, merged
from wavegen.production.measured_signal import MeasuredSignal
from wavegen.production.prepare import Levelled
from wavegen.production.subject import Subject


def reconciled(subjects: Sequence[Subject]) -> tuple[Subject, ...]:
    """Return subjects of one rate on one scale, or refuse them.

    Raises
    ------
    ArgumentsError
        Names the first that does not go with the others, and what to do.
    """
    if len(subjects) == 1:
        return tuple(subjects)
    names = [item.name for item in subjects]
    check_same_rate([item.signal.sample_rate_hz for item in subjects], names)
    first = subjects[0]
    for item in subjects:
        if item.is_power != first.is_power:
            raise ArgumentsError(
                where=item.name,
                problem=f"holds {'power alone' if item.is_power else 'samples'}, {first.name} "
                f"holds {'power alone' if first.is_power else 'samples'}",
                allowed="files of one kind as one population",
                remedy="Measure them one by one.",
            )
        if (item.reference_level_dbm is None) != (first.reference_level_dbm is None):
            unknown = item if item.reference_level_dbm is None else first
            raise ArgumentsError(
                where=unknown.name,
                problem="does not say how much 0 dBFS is in dBm, another file does",
                allowed="files whose levels can be compared",
                remedy="Add --reference-level, which holds for all of them.",
            )
    return tuple(_on_scale_of(first, item) for item in subjects)


def _on_scale_of(first: Subject, item: Subject) -> Subject:
    """Return a subject whose 0 dBFS is that of the first."""
    if item.reference_level_dbm is None or first.reference_level_dbm is None:
        return item
    over_db = item.reference_level_dbm - first.reference_level_dbm
    if not over_db:
        return item
    signal = Levelled(
        sample_rate_hz=item.signal.sample_rate_hz,
        n_samples=item.signal.n_samples,
        inputs=(item.signal,),
        mean_power=None,
        gain=10 ** (over_db / 20),
    )
    text = f"0 dBFS is {over_db:+.2f} dB over that of {first.name}: its samples are scaled to that"
    return replace(
        item,
        signal=signal,
        reference_level_dbm=first.reference_level_dbm,
        code_scale=None,
        warnings=(*item.warnings, text),
    )


def sampled(
    found: Sequence[MeasuredSignal], of: Literal["whole", "on", "sensor"]
) -> SampledStatistics | None:
    """Return what all subjects together tell of their process; None where one says nothing.

    Parameters
    ----------
    found : sequence of MeasuredSignal
        One or more.
    of : {"whole", "on", "sensor"}
        All of the time, the on-time, or what a sensor reads.
    """
    parts: list[BatchedStatistics] = []
    for item in found:
        part: BatchedStatistics | None = None if item.part is None else getattr(item.part, of)
        if part is None:
            return None
        parts.append(part)
    if len(parts) == 1:
        return SampledStatistics.of(parts[0])
    return SampledStatistics(
        statistics=merged([part.statistics for part in parts]),
        batches=pooled([part.batches for part in parts]),
    )
