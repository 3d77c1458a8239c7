"""Each side of a comparison, whatever it is, as a curve with its uncertainty."""

from __future__ import annotations

from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any

import numpy as np

from wavegen.comparison.curves import (
    Curve,
    ExactCurve,
    SampledCurve,
    ScaleStatistics,
)
from wavegen.comparison.printed_curves import loop_curve, read_points
from wavegen.core.errors import ArgumentsError, SignalError
from wavegen.core.progress import Progress, silent
from wavegen.core.signal import Signal
from wavegen.dsp.bursts import Bursts
from wavegen.files.format import ReadHints
from wavegen.laws.term import NoLaw
from wavegen.meters.batches import BatchedStatistics
from wavegen.meters.intervals import SampledStatistics
from wavegen.meters.power_statistics import PowerStatistics
from wavegen.production.law_walk import law_of_recipe
from wavegen.production.measure_settings import GateSettings, MeasureSettings
from wavegen.production.measured_rows import fault_rows, fault_text
from wavegen.production.measured_signal import MeasuredSignal, measure_signal, on_peak_db
from wavegen.production.prepare import Prepared, prepare
from wavegen.production.show import is_curve, is_sidecar
from wavegen.production.stimulus import find_stimulus
from wavegen.production.subject import Subject
from wavegen.production.subject_files import WHOLE_FILE, FilePart, open_subject
from wavegen.recipe.find import find_recipe
from wavegen.recipe.load import load_recipe
from wavegen.stages.channel.gate import on_time

LOOP, RECORDING = "this loop", "a recording"
LAW, GENERATED = "the law of a recipe", "the loop that a recipe makes"
SIDECAR, POINTS = "a sidecar", "a CCDF curve by its points"
CURVE_FORMAT = "curve"
"""Format by which a table without headings is read as a curve."""


@dataclass(frozen=True, slots=True, kw_only=True)
class SideSettings:
    """What one side is, and how it is read.

    Parameters
    ----------
    subject : str
        A data file, a folder or sidecar of a stimulus, a curve in CSV, or a recipe.
    is_recipe : bool
        Whether it means a recipe, by file or name.
    hints : ReadHints
        How a file without a header is read; the reference level too.
    part : FilePart
        Which part of a data file, and whether it repeats.
    gate : GateSettings or None
        If given, the on-time alone is compared.
    removes_offset : bool
        Whether a DC offset is taken off first.
    overrides : tuple of str
        Of a recipe.
    curve_samples : int or None
        Samples that a curve by points was measured on, where its file does not say.
    reading_db : float
        Half-width of what its levels may be off by reading, dB.
    """

    subject: str
    is_recipe: bool = False
    hints: ReadHints = ReadHints()  # noqa: RUF009 - frozen
    part: FilePart = WHOLE_FILE
    gate: GateSettings | None = None
    removes_offset: bool = False
    overrides: tuple[str, ...] = ()
    curve_samples: int | None = None
    reading_db: float = 0.0


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Side:
    """One side, as far as it is known.

    Parameters
    ----------
    name : str
        What it is called.
    is_ : str
        What it is, in words.
    curve : Curve
        Levels over its mean.
    scale_curve : Curve or None
        Levels on ``scale``; None where its mean is not known.
    mean_db, mean_low_db, mean_high_db : float or None
        Mean power on ``scale`` and between what that of the process lies.
    peak_db : float or None
        Peak between samples on ``scale``, else that at the samples.
    scale : {"dBm", "dBFS"}
        dBm where the power at full scale is known.
    sample_rate_hz : float or None
        Of its samples.
    n_samples : int or None
        How many were measured.
    duty : float or None
        Share of time that was measured, of a gated side.
    signal : Signal or None
        Its samples, less an offset that was taken off; None where there are none.
    loops : bool
        Whether they repeat.
    is_power : bool
        Whether they have no phase.
    bursts : Bursts or None
        The on-time that was measured.
    fault_db : float
        By how much fill words, which are no part of any signal, lift the mean.
    warnings : tuple of str
        What is doubtful.
    """

    name: str
    is_: str
    curve: Curve
    scale_curve: Curve | None = None
    mean_db: float | None = None
    mean_low_db: float | None = None
    mean_high_db: float | None = None
    peak_db: float | None = None
    scale: str = "dBFS"
    sample_rate_hz: float | None = None
    n_samples: int | None = None
    duty: float | None = None
    signal: Signal | None = None
    loops: bool = False
    is_power: bool = False
    bursts: Bursts | None = None
    fault_db: float = 0.0
    warnings: tuple[str, ...] = ()


def open_side(settings: SideSettings, *, workers: int = 1, progress: Progress = silent) -> Side:
    """Return one side of a comparison.

    Parameters
    ----------
    settings : SideSettings
        What it is.
    workers, progress
        As in :func:`wavegen.core.render.render`.

    Returns
    -------
    Side

    Raises
    ------
    FileError, RecipeError, SignalError
        It cannot be read, made or measured.
    ArgumentsError
        A setting that means nothing for what it is.
    """
    if settings.is_recipe:
        return _recipe_side(settings, workers=workers, progress=progress)
    path = Path(settings.subject)
    if settings.overrides:
        raise _misfit(settings, "--set", "is no recipe", "--set with a recipe")
    if settings.hints.format == CURVE_FORMAT:
        return _points_side(settings, path)
    if settings.hints.format is None and path.is_file():
        if path.name.lower().endswith(".ccdf.json"):
            return _sidecar_side(settings, path)
        if is_curve(path):
            return _points_side(settings, path)
    if is_sidecar(path):  # of a folder: its data file stands for it
        stimulus = find_stimulus(path)
        path = stimulus.path.parent / stimulus.names[0]
    reads_markers = settings.gate is not None and settings.gate.by == "markers"
    subject = open_subject(path, settings.hints, settings.part, reads_markers=reads_markers)
    return measured_side(subject, settings, workers=workers, progress=progress)


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


# Recipes ----------------------------------------------------------------------------------


def _recipe_side(settings: SideSettings, *, workers: int, progress: Progress) -> Side:
    loaded = load_recipe(find_recipe(settings.subject), overrides=settings.overrides)
    channels = prepare(loaded).channels
    chosen = settings.hints.channel
    if (chosen is None and len(channels) > 1) or not 0 <= (chosen or 0) < len(channels):
        allowed = "0" if len(channels) == 1 else "0 or 1"
        raise _misfit(settings, "--channel", f"has {len(channels)} channels", allowed)
    if settings.part.is_cut or settings.part.loops:
        text = "is a recipe, which is compared as a whole"
        raise _misfit(settings, "--from/--to/--period/--loop", text, "these with a data file")
    prepared = channels[chosen or 0]
    warnings = tuple(note.text for note in prepared.notes if note.kind == "warning")
    law = _law(prepared)
    if settings.gate is not None:
        law = getattr(law, "on_time", NoLaw(reason="its gate is not told by a law"))
    if not isinstance(law, NoLaw):
        return Side(
            name=loaded.name,
            is_=f"{LAW} ({law.name}, {law.holds})",
            curve=ExactCurve(source=law),
            sample_rate_hz=float(prepared.loaded.recipe.sample_rate_hz),
            signal=prepared.built.signal,
            loops=True,
            warnings=warnings,
        )
    subject = Subject(
        name=loaded.name,
        signal=prepared.built.signal,
        loops=True,
        is_described=True,
        bursts=on_time(prepared.built.signal),
        warnings=(*warnings, f"it is generated: {law.reason}"),
    )
    return measured_side(subject, settings, kind=GENERATED, workers=workers, progress=progress)


def _law(prepared: Prepared) -> Any:
    recipe = prepared.loaded.recipe
    return law_of_recipe(recipe.signal, recipe.stages, prepared.site)


# Sidecars and curves ----------------------------------------------------------------------


def _sidecar_side(settings: SideSettings, path: Path) -> Side:
    _refuse_samples(settings, "is a sidecar, whose curve is of its loop as a whole")
    document = find_stimulus(path).document
    figures = document
    if settings.gate is not None:
        figures = document["on_time"]
        if figures is None:
            raise _misfit(settings, "--gate", "has no on-time apart", "--gate with a gated loop")
    curve = loop_curve(figures["ccdf"]["level_db"], figures["ccdf"]["probability"])
    return Side(
        name=path.name,
        is_=f"{SIDECAR}: {document['title'] or document['recipe']['name']}, {LOOP}",
        curve=curve,
        mean_db=figures["mean_dbfs"],
        mean_low_db=figures["mean_dbfs"],
        mean_high_db=figures["mean_dbfs"],
        sample_rate_hz=document["sample_rate_hz"],
        n_samples=figures.get("n_samples", document["n_samples"]),
        duty=figures.get("duty") if settings.gate else None,
        loops=True,
    )


def _points_side(settings: SideSettings, path: Path) -> Side:
    _refuse_samples(settings, "is a curve by its points, without samples")
    if settings.gate is not None:
        raise _misfit(settings, "--gate", "is a curve by its points", "--gate with samples")
    curve = read_points(path, n_samples=settings.curve_samples, reading_db=settings.reading_db)
    n_samples = curve.n_samples
    told = (
        f"its uncertainty is that of {n_samples} independent samples"
        if n_samples
        else "its uncertainty is unknown: it does not say how many samples it was measured on"
    )
    return Side(
        name=path.name,
        is_=POINTS,
        curve=curve,
        n_samples=n_samples,
        warnings=(told,),
    )


def _refuse_samples(settings: SideSettings, problem: str) -> None:
    """Refuse settings that are about samples."""
    part = settings.part
    for is_given, option in (
        (settings.removes_offset, "--remove-dc"),
        (part.is_cut or part.loops, "--from/--to/--period/--loop"),
    ):
        if is_given:
            raise _misfit(settings, option, problem, f"{option} with a data file")


def _misfit(settings: SideSettings, option: str, problem: str, allowed: str) -> ArgumentsError:
    return ArgumentsError(
        where=option,
        problem=f"{settings.subject} {problem}",
        allowed=allowed,
        remedy="Leave it out for this side.",
    )
