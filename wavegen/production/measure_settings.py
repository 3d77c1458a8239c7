"""What a measurement is asked for."""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction
from typing import Literal

from wavegen.core.errors import ArgumentsError
from wavegen.core.timespan import TimeSpan
from wavegen.meters.sensor import Shape

NO_TIME = TimeSpan(Fraction(0), "samples")


@dataclass(frozen=True, slots=True, kw_only=True)
class AskedLevel:
    """A level of which the share of time above it is wanted.

    Parameters
    ----------
    level_db : float
        In ``unit``.
    unit : {"dB", "dBFS", "dBm"}
        Over the mean, over full scale, or absolute.
    """

    level_db: float
    unit: Literal["dB", "dBFS", "dBm"]


@dataclass(frozen=True, slots=True, kw_only=True)
class GateSettings:
    """Which part of the time is measured apart, beside all of it.

    Parameters
    ----------
    by : {"level", "markers", "pattern"}
        How it is known.
    window, dead_time, shortest, guard : TimeSpan or None
        As in :class:`wavegen.meters.burst_search.BurstSearch`; the guard holds for all three.
    threshold_db, hysteresis_db : float or None
        As there.
    edges : {"moved", "crossing"}
        As there.
    label : str
        Of the markers that count; all if empty.
    pattern : str
        Slots, 1 on and 0 off; they repeat.
    slot : TimeSpan or None
        Length of a slot.
    delay : TimeSpan
        Where the pattern starts.
    each : bool
        Whether bursts are measured one by one too, each over its own mean.
    """

    by: Literal["level", "markers", "pattern"]
    window: TimeSpan | None = None
    threshold_db: float | None = None
    hysteresis_db: float | None = None
    edges: Literal["moved", "crossing"] = "moved"
    dead_time: TimeSpan | None = None
    shortest: TimeSpan | None = None
    guard: TimeSpan | None = None
    label: str = ""
    pattern: str = ""
    slot: TimeSpan | None = None
    delay: TimeSpan = NO_TIME
    each: bool = False


@dataclass(frozen=True, slots=True, kw_only=True)
class SensorSettings:
    """The power sensor through which the signal is looked at.

    Parameters
    ----------
    video_bandwidth_hz : float or None
        Of the filter behind the detector, Hz.
    shape : {"one_pole", "brick_wall"}
        Of that filter.
    sensor_rate_hz : Fraction or None
        Rate of its readings, Hz.
    """

    video_bandwidth_hz: float | None = None
    shape: Shape = "one_pole"
    sensor_rate_hz: Fraction | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class MeasureSettings:
    """What is to be measured besides mean, peaks and levels.

    Parameters
    ----------
    probabilities : tuple of float
        Whose levels are wanted besides 10 % to 0.0001 %.
    above : tuple of AskedLevel
        Levels of which the share of time is wanted.
    gate : GateSettings or None
        What is measured apart.
    sensor : SensorSettings or None
        How a sensor would see it.
    removes_offset : bool
        Whether a DC offset is taken off first.
    states_process : bool
        Whether intervals about the process are wanted.
    finds_faults : bool
        Whether faults of recordings are looked for.
    shows_rf : bool
        Whether the RF waveform's own levels are wanted; of real samples they always are.
    """

    probabilities: tuple[float, ...] = ()
    above: tuple[AskedLevel, ...] = ()
    gate: GateSettings | None = None
    sensor: SensorSettings | None = None
    removes_offset: bool = False
    states_process: bool = True
    finds_faults: bool = True
    shows_rf: bool = False


EXACT = MeasureSettings(states_process=False, finds_faults=False)
"""Figures of the samples alone."""


def whole_samples(span: TimeSpan, sample_rate_hz: Fraction, where: str, *, least: int = 0) -> int:
    """Return a time in whole samples.

    Parameters
    ----------
    span : TimeSpan
        As asked.
    sample_rate_hz : Fraction
        Hz.
    where : str
        The option, for messages.
    least : int
        Smallest that is allowed.

    Raises
    ------
    ArgumentsError
        Between two samples, or less than allowed.
    """
    samples = span.samples(sample_rate_hz)
    if samples < least or samples.denominator != 1:
        raise ArgumentsError(
            where=where,
            problem=f"{span} is {float(samples):.9g} samples",
            allowed=f"whole samples from {least}",
            remedy="Give it in samples.",
        )
    return int(samples)


def rounded_samples(
    span: TimeSpan | None, sample_rate_hz: Fraction, where: str, *, least: int = 0
) -> int | None:
    """Return a time in samples, rounded to whole ones: for settings where one is as good.

    Raises
    ------
    ArgumentsError
        Less than allowed.
    """
    if span is None:
        return None
    samples = round(span.samples(sample_rate_hz))
    if span.value < 0 or samples < least:
        raise ArgumentsError(
            where=where,
            problem=f"{span} is {samples} samples",
            allowed=f"{least} samples or more",
            remedy="Give a longer time.",
        )
    return samples
