"""Measure recordings, looped files, or a recipe without writing it."""

from __future__ import annotations

from collections.abc import Sequence
from concurrent.futures import Executor
from dataclasses import replace
from typing import Any

from wavegen.core.allocation import keep_large_blocks
from wavegen.core.progress import Progress, silent
from wavegen.files.format import ReadHints, Recording, told_channel
from wavegen.laws.term import NoLaw
from wavegen.meters.intervals import SampledStatistics
from wavegen.meters.population import merged, populate
from wavegen.meters.power import PowerStatistics
from wavegen.meters.seam import seam_figure
from wavegen.meters.stationarity import ALWAYS_ON
from wavegen.meters.statistic_names import INSTANTANEOUS
from wavegen.production import measured_rows as rows
from wavegen.production.judgement import law_of
from wavegen.production.measure_settings import MeasureSettings
from wavegen.production.measured_on_time import on_time_rows
from wavegen.production.measured_population import reconciled, sampled
from wavegen.production.measured_signal import MeasuredSignal, measure_signal
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
from wavegen.production.subject import Subject
from wavegen.production.symbol_plan import symbol_plan
from wavegen.stages.channel.gate import on_time

__all__ = ["Subject", "absolute", "completed_hints", "measure", "measure_recipe"]

LOOP, RECORDING = "this loop", "a recording"
WHOLE = "all of the time, off-times included"
BENCH = "so that the average at the device is that of the recipe's bench"
DEFAULT = MeasureSettings()


def measure(
    *subjects: Subject,
    settings: MeasureSettings = DEFAULT,
    workers: int = 1,
    executor: Executor | None = None,
    progress: Progress = silent,
) -> dict[str, Any]:
    """Measure the power statistics of a subject, or of several as one population.

    Parameters
    ----------
    *subjects : Subject
        One or more, of one sample rate; powers are brought to the reference of the first.
    settings : MeasureSettings
        What is asked besides.
    workers, executor, progress
        As in :func:`wavegen.core.render.render`.

    Returns
    -------
    dict
        JSON values, with the keys of a sidecar where they mean the same. Two statements are
        made: of these samples, exactly; and, under ``process`` (of a recording in ``levels`` and
        ``ccdf`` too), of the process that they sample, in intervals. Peaks between samples are
        null of a power series.

    Raises
    ------
    ArgumentsError
        Subjects that cannot be one population, or a setting that means nothing for one of them.
    SignalError
        A sample is not finite, or there is nothing but zeros.
    FileError
        A file cannot be read to its end.
    """
    keep_large_blocks()
    subjects = reconciled(subjects)
    found = [
        measure_signal(item, settings, workers=workers, executor=executor, progress=progress)
        for item in subjects
    ]
    first = subjects[0]
    statistics = merged([item.statistics for item in found])
    peaks = [item.peak for item in found if item.peak is not None]
    peak = max(peaks, key=lambda item: item.power, default=None)
    sample = sampled(found, "whole")
    asked = rows.asked_probabilities(settings.probabilities)
    rate_hz = first.signal.sample_rate_hz
    kinds = {LOOP if item.loops else RECORDING for item in subjects}
    document: dict[str, Any] = {
        "format": f"{FORMAT}.measurement",
        "version": 1,
        "name": first.name if len(found) == 1 else f"{len(found)} files",
        "is": _kind(kinds, len(found)),
        "statistic": INSTANTANEOUS,
        "of": WHOLE,
        "is_power": first.is_power,
        "sample_rate_hz": float(rate_hz),
        "duration_s": float(statistics.n_samples / rate_hz),
        **power_figures(statistics, peak),
        "levels": rows.exact_levels(statistics, asked),
        "averages": rows.averages(statistics),
        "reference": gaussian_reference(grid_db(statistics)),
        "law": None,
        "versions": versions(),
        "warnings": [],
        **(first.facts if len(found) == 1 else {}),
    }
    if sample is not None:
        document["process"] = _process(found, sample, asked)
        if kinds == {RECORDING}:
            document["levels"] = document["process"]["levels"]
            document["ccdf"] = rows.sampled_curve(sample)
    elif first.every_loop:
        document["process"] = {
            "is": rows.PROCESS,
            "says": f"the same for every loop of its recipe ({first.every_loop})",
        }
    on = on_time_rows(found, asked)
    if on is not None:
        document["on_time"] = on
    _add_absolute(document, first)
    _add_views(document, found, settings, statistics=statistics, sample=sample)
    _add_faults(document, found, settings)
    if len(found) > 1:
        population = populate([(item.subject.name, item.statistics) for item in found])
        document["files"] = [_member(item) for item in found]
        document["warnings"] += _warnings(document["name"], population.warnings)
    elif first.loops and first.cycle_samples is not None and not first.is_power:
        seam = seam_figure(found[0].signal, cycle_samples=first.cycle_samples)
        document["seam"] = seam_row(seam)
    return document


def _kind(kinds: set[str], count: int) -> str:
    if count == 1:
        return next(iter(kinds))
    if len(kinds) > 1:
        return f"a population of {count} loops and recordings"
    return f"a population of {count} {'loops' if kinds == {LOOP} else 'recordings'}"


def _process(
    found: Sequence[MeasuredSignal], sample: SampledStatistics, asked: Sequence[float]
) -> dict[str, Any]:
    first = found[0]
    n_samples = sum(item.part.n_samples for item in found if item.part)
    turns = None
    if any(item.subject.loops for item in found):
        turns = first.signal.n_samples // n_samples if len(found) == 1 else 1
    return rows.process_rows(
        sample,
        n_samples=n_samples,
        n_turns=turns,
        sample_rate_hz=float(first.signal.sample_rate_hz),
        probabilities=asked,
    )


def _add_absolute(document: dict[str, Any], subject: Subject) -> None:
    """Add levels in dBm where it is known how much 0 dBFS is."""
    level_dbm, whence = _reference(document, subject)
    if level_dbm is None:
        return
    document |= absolute(document, level_dbm)
    document["reference_is"] = whence
    mean_dbm = document["mean_dbfs"] + level_dbm
    document["absolute"] = {
        "levels": [
            {
                "probability": row["probability"],
                "level_dbm": None
                if row["level_db"] is None
                else rounded(row["level_db"] + mean_dbm, 4),
            }
            for row in document["levels"]
        ],
        "level_dbm": [round(level + mean_dbm, 4) for level in document["ccdf"]["level_db"]],
        "is": "the grid of pdf, cdf and ccdf in dBm",
    }


def _reference(document: dict[str, Any], subject: Subject) -> tuple[float | None, str]:
    """Return how much 0 dBFS is, dBm, and who says so."""
    if subject.reference_level_dbm is not None or subject.bench is None:
        return subject.reference_level_dbm, subject.reference_is
    bench = subject.bench
    mean_dbfs = document["mean_dbfs"]
    if bench.averaged_over == "burst" and "on_time" in document:
        mean_dbfs = document["on_time"]["mean_dbfs"]
    return bench.average_power_at_device_dbm - mean_dbfs, BENCH


def _add_views(
    document: dict[str, Any],
    found: Sequence[MeasuredSignal],
    settings: MeasureSettings,
    *,
    statistics: PowerStatistics,
    sample: SampledStatistics | None,
) -> None:
    """Add what was asked for besides, each under its own name."""
    first, asked = found[0], rows.asked_probabilities(settings.probabilities)
    if settings.above:
        of_recording = None if any(item.subject.loops for item in found) else sample
        document["time_shares"] = rows.time_rows(
            settings.above, statistics, of_recording, document.get("reference_level_dbm")
        )
    if settings.shows_rf or any(item.subject.is_real for item in found):
        document["rf"] = rows.rf_rows(statistics, asked)
    if settings.sensor is not None:
        seen = merged([item.sensor for item in found if item.sensor is not None])
        document["sensor"] = rows.sensor_rows(
            replace(seen, mean=statistics.mean),
            statistics,
            settings.sensor,
            asked,
            sample=sampled(found, "sensor"),
            loops=any(item.subject.loops for item in found),
        )
    if len(found) == 1:
        plan = first.subject.symbols
        per_symbol = rows.symbol_rows(first.symbols, plan.law if plan else None)
        if per_symbol is not None:
            document["per_symbol"] = per_symbol
        if not first.subject.loops:
            expected = rows.peak_rows(
                duration_s=document["duration_s"], bandwidth_hz=first.bandwidth_hz
            )
            if expected is not None:
                document["record_peak"] = expected


def _add_faults(
    document: dict[str, Any], found: Sequence[MeasuredSignal], settings: MeasureSettings
) -> None:
    """Add faults, and everything doubtful as warnings."""
    faults = []
    for item in found:
        name = item.subject.name
        document["warnings"] += _warnings(name, item.subject.warnings)
        mine = [] if item.subject.is_described else rows.fault_rows(item.check)
        if settings.removes_offset and item.check is not None:
            mine = [row for row in mine if row["kind"] != "dc_offset"]
            offset = item.removed
            text = (
                f"a DC offset was taken off, as --remove-dc says: I {offset.real:+.4g}, "
                f"Q {offset.imag:+.4g} of full scale, {item.check.offset_dbc:.2f} dB over the rest"
            )
            document["warnings"] += _warnings(name, (text,))
            document["removed_offset"] = {
                "i": offset.real,
                "q": offset.imag,
                "over_signal_db": rounded(item.check.offset_dbc, 3),
            }
        document["warnings"] += [
            {"kind": "fault", "where": name, "text": rows.fault_text(row)} for row in mine
        ]
        faults += [row | {"file": name} for row in mine]
        if item.gate is None and item.check is not None and item.check.on_share < ALWAYS_ON:
            text = (
                f"it is on for about {100 * item.check.on_share:.0f} % of the time, and the rest "
                "counts too: --gate auto measures the on-time by itself"
            )
            document["warnings"] += _warnings(name, (text,))
        if item.gate is not None and item.gate.on is None:
            text = f"no bursts were found: {item.gate.found.reason}"
            document["warnings"] += _warnings(name, (text,))
    if settings.finds_faults:
        document["faults"] = faults


def _warnings(where: str, texts: Sequence[str]) -> list[dict[str, Any]]:
    return [{"kind": "warning", "where": where, "text": text} for text in texts]


def _member(item: MeasuredSignal) -> dict[str, Any]:
    """Return the figures of one subject of several."""
    statistics = item.statistics
    return {
        "name": item.subject.name,
        "is": LOOP if item.subject.loops else RECORDING,
        "n_samples": statistics.n_samples,
        "mean_dbfs": rounded(statistics.mean_db),
        "peak_dbfs": rounded(statistics.peak_db),
        "papr_db": rounded(statistics.papr_db),
        **item.subject.facts,
    }


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
    settings: MeasureSettings = DEFAULT,
    workers: int = 1,
    executor: Executor | None = None,
    progress: Progress = silent,
) -> dict[str, Any]:
    """Measure what a recipe would make; levels in dBFS are over unit mean power.

    Parameters
    ----------
    prepared : Prepared
        From :func:`wavegen.production.prepare.prepare`, or one of its ``channels``.
    settings, workers, executor, progress
        As in :func:`measure`.

    Returns
    -------
    dict
        As :func:`measure`, with what was rounded.
    """
    recipe, signal = prepared.loaded.recipe, prepared.built.signal
    subject = Subject(
        name=prepared.loaded.name,
        signal=signal,
        loops=True,
        every_loop=_every_loop(prepared) if settings.states_process else "",
        cycle_samples=prepared.cycle_samples,
        bench=recipe.bench,
        is_described=True,
        bursts=on_time(signal),
        symbols=symbol_plan(prepared),
    )
    document = measure(
        subject, settings=settings, workers=workers, executor=executor, progress=progress
    )
    for kind, key in (("rounded", "rounded"), ("warning", "warnings"), ("info", "notes")):
        found = note_rows([note for note in prepared.notes if note.kind == kind])
        document[key] = [*found, *document.get(key, ())]
    return document


def _every_loop(prepared: Prepared) -> str:
    """Return the law of a recipe if it holds for every loop, else nothing."""
    law = law_of(prepared)
    return "" if isinstance(law, NoLaw) or law.holds != "every loop" else law.name
