"""One file of a stimulus in one pass: scale, round, meter the codes, hash, write."""

from __future__ import annotations

from collections import deque
from collections.abc import Sequence
from concurrent.futures import Future, ThreadPoolExecutor
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from wavegen.core.progress import Progress, silent
from wavegen.core.render import Meter, Reading
from wavegen.core.signal import Range, Samples, Signal
from wavegen.dsp.bursts import Bursts
from wavegen.files.datatypes import Codes, Datatype, decode, encode, quantised
from wavegen.files.format import FileFacts, Format
from wavegen.meters.gated import GatedPowerMeter
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
class ExportedFile:
    """What was written and what its codes measure.

    Parameters
    ----------
    names : tuple of str
        Files made, the data file first.
    format, datatype : str
        As in the recipe's terms.
    sha512 : str
        Of the data file.
    n_saturated : int
        Rails that were cut at full scale.
    statistics : PowerStatistics
        Of the codes, full scale 1.0.
    peak : BetweenSamplesPeak
        Of the codes.
    on_statistics : PowerStatistics or None
        Of the codes while the signal is on, ramps excluded; None if it is never off.
    """

    names: tuple[str, ...]
    format: str
    datatype: Datatype
    sha512: str
    n_saturated: int
    statistics: PowerStatistics
    peak: BetweenSamplesPeak
    on_statistics: PowerStatistics | None = None


def _encode_strip(
    source: Signal,
    gain: np.float32,
    datatype: Datatype,
    meters: Sequence[Meter],
    strip: Range,
) -> tuple[Codes, int, list[Reading]]:
    """Return codes of a strip, how many saturated, and what they measure."""
    samples = source.compute(*strip)
    samples *= gain
    codes, n_saturated = encode(samples, datatype)
    held = decode(codes, datatype)
    readings = [meter.begin(source) for meter in meters]
    for reading in readings:
        reading.feed(strip[0], held)
    return codes, n_saturated, readings


def export(
    stored: Signal,
    *,
    gain: float,
    form: Format,
    facts: FileFacts,
    names: tuple[str, ...],
    drafts: tuple[Path, ...],
    bursts: Bursts | None = None,
    workers: int = 1,
    progress: Progress = silent,
) -> ExportedFile:
    """Write one file of a rendered loop.

    Parameters
    ----------
    stored : Signal
        The loop, a leaf whose ranges can be read.
    gain : float
        Amplitude factor to full scale 1.0.
    form : Format
        Who writes it.
    facts : FileFacts
        What the file says about itself.
    names, drafts : tuple
        Final names and temporary paths, the data file first.
    bursts : Bursts, optional
        When the signal is on; then the on-time is measured too.
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
    writer = form.writer(drafts, facts)
    meters: list[Meter] = [PowerMeter(where=WHERE)]
    if bursts is not None:
        meters.append(GatedPowerMeter(bursts=bursts, where=WHERE))
    waiting: deque[tuple[int, Future[tuple[Codes, int, list[Reading]]]]] = deque()
    starts = iter(range(0, stored.n_samples, STRIP_SAMPLES))
    n_saturated = 0
    totals: list[Reading] = []
    pool = ThreadPoolExecutor(workers, thread_name_prefix="encode")

    def submit() -> None:
        start = next(starts, None)
        if start is not None:
            stop = min(start + STRIP_SAMPLES, stored.n_samples)
            waiting.append(
                (stop, pool.submit(_encode_strip, stored, factor, datatype, meters, (start, stop)))
            )

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
            progress(f"writing {names[0]}", stop, stored.n_samples)
        statistics: PowerStatistics = totals[0].result()
        written = Written(
            sample_rate_hz=stored.sample_rate_hz,
            n_samples=stored.n_samples,
            inputs=(stored,),
            gain=gain,
            datatype=datatype,
        )
        peak = peak_between_samples(written, statistics)
        writer.finish(brief(statistics, peak))
    finally:
        writer.close()
        pool.shutdown(cancel_futures=True)
    return ExportedFile(
        names=names,
        format=form.name,
        datatype=datatype,
        sha512=writer.sha512,
        n_saturated=n_saturated,
        statistics=statistics,
        peak=peak,
        on_statistics=totals[1].result() if bursts is not None else None,
    )


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
