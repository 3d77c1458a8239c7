"""One file of a stimulus in one pass: scale, round, meter the codes, hash, write."""

from __future__ import annotations

from collections import deque
from collections.abc import Iterator, Sequence
from concurrent.futures import Future, ThreadPoolExecutor
from dataclasses import dataclass, replace
from fractions import Fraction
from pathlib import Path
from typing import Any

import numpy as np

from wavegen.core.progress import Progress, silent
from wavegen.core.render import Meter, Reading, Tap, render, samples_of
from wavegen.core.signal import Range, Samples, Signal
from wavegen.dsp.bursts import Bursts
from wavegen.files.analytic import analytic_loop, analytic_recording
from wavegen.files.datatypes import (
    Codes,
    Datatype,
    encode,
    encode_held,
    join_channels,
    quantised,
)
from wavegen.files.format import FileFacts, Format
from wavegen.files.real_if import real_if
from wavegen.meters.batches import BatchedPowerMeter, BatchedStatistics
from wavegen.meters.gated import GatedPowerMeter
from wavegen.meters.opening import OpeningMeter
from wavegen.meters.peak import BetweenSamplesPeak, peak_between_samples
from wavegen.meters.power import PowerMeter, PowerStatistics

STRIP_SAMPLES = 1 << 19
WHERE = "the written codes"


@dataclass(frozen=True, eq=False, kw_only=True)
class Written(Signal):
    """A signal as a file holds it: scaled to full scale 1.0 and rounded to codes.

    Parameters
    ----------
    gain : float
        Amplitude factor.
    datatype : Datatype
        Codes.
    """

    gain: float
    datatype: Datatype

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Scale, round and read back."""
        return quantised(arrays[0] * np.float32(self.gain), self.datatype)


@dataclass(frozen=True, slots=True, kw_only=True)
class ChannelCodes:
    """What the codes of one channel measure.

    Parameters
    ----------
    statistics : PowerStatistics
        Of the codes, full scale 1.0; of real ones that of their analytic signal.
    peak : BetweenSamplesPeak
        Of the codes.
    on_statistics : PowerStatistics or None
        Of the codes while the signal is on, ramps excluded; None if it is never off.
    sampled : BatchedStatistics or None
        Of one period of the data, where that was asked for; of its on-time if it is ever off.
    """

    statistics: PowerStatistics
    peak: BetweenSamplesPeak
    on_statistics: PowerStatistics | None = None
    sampled: BatchedStatistics | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class ExportedFile:
    """What was written and what its codes measure.

    Parameters
    ----------
    names : tuple of str
        Files made, the data file first.
    format : str
        As in the recipe's terms.
    datatype : Datatype
        How samples are coded.
    sha512 : str
        Of the data file.
    n_saturated : int
        Rails that were cut at full scale.
    channels : tuple of ChannelCodes
        One or two.
    centre_hz : Fraction or None
        Intermediate frequency of real samples, Hz.
    """

    names: tuple[str, ...]
    format: str
    datatype: Datatype
    sha512: str
    n_saturated: int
    channels: tuple[ChannelCodes, ...]
    centre_hz: Fraction | None = None

    @property
    def statistics(self) -> PowerStatistics:
        """Those of the first channel."""
        return self.channels[0].statistics

    @property
    def peak(self) -> BetweenSamplesPeak:
        """That of the first channel."""
        return self.channels[0].peak

    @property
    def on_statistics(self) -> PowerStatistics | None:
        """Those of the first channel."""
        return self.channels[0].on_statistics


@dataclass(frozen=True, slots=True, kw_only=True)
class Channel:
    """One channel to write.

    Parameters
    ----------
    signal : Signal
        The loop, a leaf whose ranges can be read.
    bursts : Bursts or None
        When it is on; then the on-time is measured too.
    data_samples : int or None
        Samples after which its data come round again; then the batches of so many are kept, from
        which follows how sure its figures are of the process. None: they are not asked for.
    """

    signal: Signal
    bursts: Bursts | None = None
    data_samples: int | None = None

    @property
    def meters(self) -> tuple[Meter, ...]:
        """What measures its codes: all of them, those of the on-time, one period of the data."""
        every: Meter = PowerMeter(where=WHERE)
        on_time = () if self.bursts is None else (GatedPowerMeter(bursts=self.bursts, where=WHERE),)
        if self.data_samples is None:
            return (every, *on_time)
        batched = BatchedPowerMeter(where=WHERE, loops=True, bursts=self.bursts)
        if self.data_samples < self.signal.n_samples:
            return (every, *on_time, OpeningMeter(meter=batched, n_samples=self.data_samples))
        return (batched,) if self.bursts is None else (every, batched)

    def codes(self, readings: Iterator[Any], written: Signal, *, loops: bool) -> ChannelCodes:
        """Return what the meters read, and the peak of what was written."""
        found = [next(readings) for _ in self.meters]
        sampled = None if self.data_samples is None else found[-1]
        plain = [item.statistics if isinstance(item, BatchedStatistics) else item for item in found]
        return ChannelCodes(
            statistics=plain[0],
            peak=peak_between_samples(written, plain[0], loops=loops),
            on_statistics=None if self.bursts is None else plain[1],
            sampled=sampled,
        )


def _encode_strip(
    channels: Sequence[Channel], gain: np.float32, datatype: Datatype, strip: Range
) -> tuple[Codes, int, list[Reading]]:
    """Return codes of a strip, how many saturated, and what complex ones measure."""
    together: list[Codes] = []
    readings: list[Reading] = []
    n_saturated = 0
    for channel in channels:
        source = channel.signal
        is_leaf = not source.inputs
        samples = source.compute(*strip) if is_leaf else samples_of(source, *strip)
        if datatype.is_real:  # its envelope is measured when all of it is there
            with np.errstate(invalid="ignore", over="ignore"):  # not finite is told by name
                codes, n_cut = encode(samples * gain, datatype)
        else:
            codes, n_cut, held = encode_held(samples, datatype, float(gain))
            for meter in channel.meters:
                reading = meter.begin(source)
                reading.feed(strip[0], held)
                readings.append(reading)
        together.append(codes)
        n_saturated += n_cut
    codes = together[0] if len(together) == 1 else join_channels(*together)
    return codes, n_saturated, readings


def export(
    channels: Sequence[Channel],
    *,
    gain: float,
    form: Format,
    facts: FileFacts,
    names: tuple[str, ...],
    drafts: tuple[Path, ...],
    centre_hz: Fraction | None = None,
    loops: bool = True,
    workers: int = 1,
    progress: Progress = silent,
) -> ExportedFile:
    """Write one file of a rendered loop.

    Parameters
    ----------
    channels : sequence of Channel
        One, or two of one length.
    gain : float
        Amplitude factor to full scale 1.0, of both.
    form : Format
        Who writes it.
    facts : FileFacts
        What the file says about itself.
    names, drafts : tuple
        Final names and temporary paths, the data file first.
    centre_hz : Fraction, optional
        Intermediate frequency of a real datatype, Hz, on the loop's grid.
    loops : bool
        Whether the last sample is followed by the first, for the peak between samples.
    workers : int
        Threads that encode; one more writes and hashes.
    progress : Progress
        Told after every strip.

    Returns
    -------
    ExportedFile

    Raises
    ------
    FileError
        The disk refuses.
    """
    datatype = facts.datatype
    factor = np.float32(gain)
    if centre_hz is not None:
        channels = [
            replace(channel, signal=real_if(channel.signal, centre_hz, WHERE))
            for channel in channels
        ]
    n_samples = channels[0].signal.n_samples
    writer = form.writer(drafts, facts)
    waiting: deque[tuple[int, Future[tuple[Codes, int, list[Reading]]]]] = deque()
    starts = iter(range(0, n_samples, STRIP_SAMPLES))
    n_saturated = 0
    totals: list[Reading] = []
    pool = ThreadPoolExecutor(workers, thread_name_prefix="encode")

    def submit() -> None:
        start = next(starts, None)
        if start is not None:
            stop = min(start + STRIP_SAMPLES, n_samples)
            future = pool.submit(_encode_strip, channels, factor, datatype, (start, stop))
            waiting.append((stop, future))

    try:
        for _ in range(workers + 1):
            submit()
        while waiting:
            stop, future = waiting.popleft()
            codes, saturated, readings = future.result()
            submit()
            writer.write(codes)
            n_saturated += saturated
            if totals:
                for total, reading in zip(totals, readings, strict=True):
                    total.merge(reading)
            else:
                totals = readings
            progress(f"writing {names[0]}", stop, n_samples)
        figures = iter([total.result() for total in totals])
        measured = tuple(
            _measured(channel, gain, datatype, figures, workers, loops=loops)
            for channel in channels
        )
        writer.finish(brief(measured[0].statistics, measured[0].peak))
    finally:
        writer.close()
        pool.shutdown(cancel_futures=True)
    return ExportedFile(
        names=names,
        format=form.name,
        datatype=datatype,
        sha512=writer.sha512,
        n_saturated=n_saturated,
        channels=measured,
        centre_hz=centre_hz,
    )


def _measured(
    channel: Channel,
    gain: float,
    datatype: Datatype,
    figures: Iterator[Any],
    workers: int,
    *,
    loops: bool,
) -> ChannelCodes:
    """Return what one channel's codes measure; those of real samples are measured here."""
    written: Signal = Written(
        sample_rate_hz=channel.signal.sample_rate_hz,
        n_samples=channel.signal.n_samples,
        inputs=(channel.signal,),
        mean_power=None,
        gain=gain,
        datatype=datatype,
    )
    if datatype.is_real:
        written = analytic_loop(written) if loops else analytic_recording(written)
        taps = tuple(
            Tap(name=str(number), signal=written, meter=meter)
            for number, meter in enumerate(channel.meters)
        )
        figures = iter(render(written, taps=taps, workers=workers).values())
    return channel.codes(figures, written, loops=loops)


def brief(statistics: PowerStatistics, peak: BetweenSamplesPeak) -> dict[str, object]:
    """Return the few figures that a file's own header carries.

    Returns
    -------
    dict
        Mean and peaks in dBFS, PAPR in dB, and the levels of the CCDF.
    """
    return {
        "mean_dbfs": round(statistics.mean_db, 6),
        "peak_dbfs": round(statistics.peak_db, 6),
        "peak_between_samples_dbfs": round(10 * float(np.log10(peak.power)), 6),
        "papr_db": round(statistics.papr_db, 6),
        "levels": [
            {"probability": row.probability, "level_db": round(row.level_db, 4)}
            for row in statistics.levels()
            if row.resolved
        ],
    }
