"""Each side of a comparison, whatever it is, as a curve with its uncertainty."""

from __future__ import annotations

from pathlib import Path
from typing import Any

from wavegen.comparison.curves import ExactCurve
from wavegen.comparison.measured_side import measured_side
from wavegen.comparison.printed_curves import loop_curve, read_points
from wavegen.comparison.side import (
    CURVE_FORMAT,
    GENERATED,
    LAW,
    LOOP,
    POINTS,
    SIDECAR,
    Side,
    SideSettings,
)
from wavegen.core.errors import ArgumentsError
from wavegen.core.progress import Progress, silent
from wavegen.laws.term import NoLaw
from wavegen.production.law_walk import law_of_recipe
from wavegen.production.prepare import Prepared, prepare
from wavegen.production.show import is_curve, is_sidecar
from wavegen.production.stimulus import find_stimulus
from wavegen.production.subject import Subject
from wavegen.production.subject_files import open_subject
from wavegen.recipe.find import find_recipe
from wavegen.recipe.load import load_recipe
from wavegen.stages.channel.gate import on_time


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
