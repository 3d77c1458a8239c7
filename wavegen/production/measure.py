"""Measure a recording, a looped file, or a recipe without writing it."""

from __future__ import annotations

from concurrent.futures import Executor
from dataclasses import dataclass, replace
from typing import Any

from wavegen.core.allocation import keep_large_blocks
from wavegen.core.progress import Progress, silent
from wavegen.core.render import Tap, render
from wavegen.core.signal import Signal
from wavegen.files.format import ReadHints, Recording, told_channel
from wavegen.meters.peak import peak_between_samples
from wavegen.meters.power import PowerMeter, PowerStatistics
from wavegen.meters.seam import seam_figure
from wavegen.production.prepare import Prepared
from wavegen.production.sidecar import (
    FORMAT,
    gaussian_reference,
    grid_db,
    note_rows,
    power_figures,
    rounded,
    seam_row,
    versions,
)


@dataclass(frozen=True, slots=True, kw_only=True)
class Subject:
    """What is measured.

    Parameters
    ----------
    name : str
        What it is called.
    signal : Signal
        The samples, full scale 1.0.
    loops : bool
        A loop is read cyclically and its figures are exact; a recording is a sample of its
        process.
    cycle_samples : int or None
        Shortest loop, where known: then the seam is judged.
    reference_level_dbm : float or None
        Power at 0 dBFS, dBm, where known.
    is_power : bool
        The samples are power against time without a phase: then there is no peak between them.
    """

    name: str
    signal: Signal
    loops: bool
    cycle_samples: int | None = None
    reference_level_dbm: float | None = None
    is_power: bool = False


def measure(
    subject: Subject,
    *,
    workers: int = 1,
    executor: Executor | None = None,
    progress: Progress = silent,
) -> dict[str, Any]:
    """Measure the power statistics of a subject.

    Parameters
    ----------
    subject : Subject
        What is measured.
    workers, executor, progress
        As in :func:`wavegen.core.render.render`.

    Returns
    -------
    dict
        JSON values, with the keys of a sidecar where they mean the same. Peaks between samples
        are null of a power series.

    Raises
    ------
    SignalError
        A sample is not finite, or there is nothing but zeros.
    FileError
        The file cannot be read to its end.
    """
    keep_large_blocks()
    signal = subject.signal
    tap = Tap(name="power", signal=signal, meter=PowerMeter(where=subject.name))
    reading = render(
        signal,
        taps=(tap,),
        workers=workers,
        executor=executor,
        progress=progress,
        task=f"measuring {subject.name}",
    )
    statistics: PowerStatistics = reading["power"]
    peak = None
    if not subject.is_power:
        peak = peak_between_samples(signal, statistics, loops=subject.loops)
    document: dict[str, Any] = {
        "format": f"{FORMAT}.measurement",
        "version": 1,
        "name": subject.name,
        "is": "this loop" if subject.loops else "a recording",
        "is_power": subject.is_power,
        "sample_rate_hz": float(signal.sample_rate_hz),
        "duration_s": float(signal.n_samples / signal.sample_rate_hz),
        **power_figures(statistics, peak),
        "reference": gaussian_reference(grid_db(statistics)),
        "law": None,
        "versions": versions(),
        "warnings": [],
    }
    if subject.reference_level_dbm is not None:
        document |= absolute(document, subject.reference_level_dbm)
    if subject.loops and subject.cycle_samples is not None and not subject.is_power:
        seam = seam_figure(signal, cycle_samples=subject.cycle_samples)
        document["seam"] = seam_row(seam)
    return document


def absolute(document: dict[str, Any], reference_level_dbm: float) -> dict[str, Any]:
    """Return mean and peak envelope power in dBm; the two always stand together.

    Of a power series the peak is its largest sample: nothing is known between them.
    """
    peak = document["peak_between_samples_dbfs"]
    if peak is None:
        peak = document["peak_dbfs"]
    return {
        "reference_level_dbm": reference_level_dbm,
        "mean_dbm": rounded(document["mean_dbfs"] + reference_level_dbm),
        "peak_envelope_dbm": rounded(peak + reference_level_dbm),
    }


def completed_hints(entry: dict[str, Any], recording: Recording, hints: ReadHints) -> ReadHints:
    """Return hints completed by what a sidecar says of a file that does not say it itself.

    Parameters
    ----------
    entry : dict
        The file's entry in the sidecar's ``files``.
    recording : Recording
        The file as the hints open it.
    hints : ReadHints
        What the user says; it wins.

    Returns
    -------
    ReadHints
        ``hints`` itself where nothing is missing.

    Raises
    ------
    FileError
        The file holds two channels and none is named.
    """
    if entry["channels"] is not None:
        told_channel(recording.path, n_channels=len(entry["channels"]), hints=hints)
    is_told = hints.bits is not None or hints.align is not None or recording.datatype.is_padded
    if entry["bits"] is None or is_told:
        return hints
    return replace(hints, bits=entry["bits"], align=entry["align"])


def measure_recipe(
    prepared: Prepared,
    *,
    workers: int = 1,
    executor: Executor | None = None,
    progress: Progress = silent,
) -> dict[str, Any]:
    """Measure what a recipe would make; levels in dBFS are over unit mean power.

    Parameters
    ----------
    prepared : Prepared
        From :func:`wavegen.production.prepare.prepare`, or one of its ``channels``.
    workers, executor, progress
        As in :func:`measure`.

    Returns
    -------
    dict
        As :func:`measure`, with what was rounded.
    """
    subject = Subject(
        name=prepared.loaded.name,
        signal=prepared.built.signal,
        loops=True,
        cycle_samples=prepared.cycle_samples,
    )
    document = measure(subject, workers=workers, executor=executor, progress=progress)
    for kind, key in (("rounded", "rounded"), ("warning", "warnings"), ("info", "notes")):
        document[key] = note_rows([note for note in prepared.notes if note.kind == kind])
    return document
