"""What a file or a recipe says about itself; no sample is measured or rendered."""

from __future__ import annotations

from collections import Counter
from dataclasses import replace
from pathlib import Path
from typing import Any

from wavegen.core.errors import FileError
from wavegen.core.progress import Progress, silent
from wavegen.files import FORMATS
from wavegen.files.csv_table import open_table
from wavegen.files.curve import curve_columns, read_curve
from wavegen.files.digest import sha512_of
from wavegen.files.faults import regular_size, told
from wavegen.files.format import ReadHints, Recording
from wavegen.files.read import open_recording
from wavegen.production.prepare import Prepared
from wavegen.production.sidecar import FORMAT, note_rows
from wavegen.production.stimulus import (
    SUFFIX,
    Stimulus,
    listing,
    loop_warnings,
    mismatch,
    open_listed,
)
from wavegen.recipe.dump import dump
from wavegen.recipe.tables import TABLES, kind_of_class

VERSION = 1
LARGEST_CURVE_BYTES = 16_000_000
"""Tables beyond this are not looked through for a curve: they hold samples."""

_FIGURES = ("mean_dbfs", "peak_dbfs", "peak_between_samples_dbfs", "papr_db")


def _head(kind: str, name: str) -> dict[str, Any]:
    return {"format": f"{FORMAT}.show", "version": VERSION, "is": kind, "name": name}


# Recordings -------------------------------------------------------------------------------


def show_recording(path: Path, hints: ReadHints, *, progress: Progress = silent) -> dict[str, Any]:
    """Describe a data file: what its header and its sidecar say, and whether its bytes agree.

    Parameters
    ----------
    path : Path
        The file.
    hints : ReadHints
        What the user says about it.
    progress : Progress
        Told how far the hash has come.

    Returns
    -------
    dict
        JSON values. ``hash`` is ``equal`` or ``differs`` where the sidecar or the file itself
        states one, else ``none stated``; levels are shown only where the bytes are those that
        were measured.

    Raises
    ------
    FileError
        No such file, or one that cannot be read.
    """
    stimulus = listing(path)
    if stimulus is not None:
        if stimulus.items[0]["channels"] and hints.channel is None:
            hints = replace(hints, channel=0)
        return _described(open_listed(path, stimulus.document, hints), stimulus, progress)
    try:
        recording = open_recording(path, hints)
    except FileError:
        if hints.channel is not None:
            raise
        recording = open_recording(path, replace(hints, channel=0))
        if recording.format == "raw":  # where naming a channel says that there are two
            raise
    return _described(recording, None, progress)


def _described(
    recording: Recording, stimulus: Stimulus | None, progress: Progress
) -> dict[str, Any]:
    item = stimulus.items[0] if stimulus else None
    verdict = _hash_verdict(recording, item, progress)
    warnings = loop_warnings(recording) if stimulus else list(recording.warnings)
    law = None
    if stimulus is not None:
        other = mismatch(recording, stimulus.document)
        warnings += [other] if other else []
        found = stimulus.document["law"]
        law = {"name": found["name"], "verdict": found["verdict"]} if found else None
    if verdict == "differs":
        warnings.append("its bytes are not those that were described: levels are left out")
    source = item or recording.statistics
    is_known = source is not None and verdict != "differs"
    if item and item["channels"]:
        source = item["channels"][recording.channel]
    level = {key: source[key] for key in _FIGURES if key in source} if is_known and source else None
    datatype = recording.datatype
    return _head("stimulus" if stimulus else "recording", recording.path.name) | {
        "file_format": recording.format,
        "datatype": datatype.name,
        "bits": datatype.n_bits if datatype.is_padded else None,
        "align": datatype.align,
        "sample_rate_hz": float(recording.sample_rate_hz),
        "sample_rate_exact_hz": str(recording.sample_rate_hz),
        "n_samples": recording.n_samples,
        "duration_s": float(recording.n_samples / recording.sample_rate_hz),
        "n_channels": recording.n_channels,
        "channel": recording.channel,
        "is_real": recording.is_real,
        "real_centre_hz": item["real"]["centre_hz"] if item and item["real"] else None,
        "is_power": recording.is_power,
        "title": recording.title,
        "description": recording.description,
        "centre_frequency_hz": recording.centre_frequency_hz,
        "reference_level_dbm": recording.reference_level_dbm,
        "n_annotations": len(recording.annotations),
        "labels": dict(Counter(mark.label for mark in recording.annotations)),
        "level": level,
        "level_from": ("sidecar" if item else "header") if level else None,
        "sidecar": str(stimulus.path) if stimulus else None,
        "hash": verdict,
        "law": law,
        "warnings": warnings,
    }


def _hash_verdict(recording: Recording, item: dict[str, Any] | None, progress: Progress) -> str:
    if item is not None:
        stated, found = item["sha512"], sha512_of(recording.path, progress)
    elif recording.sha512 is not None:
        stated = recording.sha512.lower()
        found = sha512_of(
            recording.path, progress, start=recording.data_start, n_bytes=recording.data_bytes
        )
    else:
        return "none stated"
    return "equal" if stated == found else "differs"


# Sidecars and curves ----------------------------------------------------------------------


def show_sidecar(stimulus: Stimulus) -> dict[str, Any]:
    """Describe a sidecar: what was made, its level, and which of its files are there.

    Parameters
    ----------
    stimulus : Stimulus
        From :func:`wavegen.production.stimulus.find_stimulus`.

    Returns
    -------
    dict
        JSON values.
    """
    document = stimulus.document
    law = document["law"]
    kept = (
        "title",
        "seed",
        "sample_rate_hz",
        "sample_rate_exact_hz",
        "n_samples",
        "duration_s",
        *_FIGURES,
        "papr_between_samples_db",
        "n_zeros",
        "loop",
        "rounded",
        "warnings",
        "notes",
    )
    return (
        _head("sidecar", stimulus.path.name)
        | {key: document[key] for key in kept}
        | {
            "recipe": document["recipe"]["name"],
            "law": {"name": law["name"], "verdict": law["verdict"]} if law else None,
            "converted": document.get("converted"),
            "files": [
                {
                    "name": item["name"],
                    "all_names": item["all_names"],
                    "format": item["format"],
                    "datatype": item["datatype"],
                    "is_there": all(
                        (stimulus.path.parent / name).is_file() for name in item["all_names"]
                    ),
                }
                for item in document["files"]
            ],
        }
    )


def is_curve(path: Path) -> bool:
    """Return whether a file is a table with the headings of a CCDF.

    Raises
    ------
    FileError
        It is no table, or cannot be read.
    """
    is_table = path.suffix.lower() in FORMATS.load("csv").suffixes
    if not is_table or regular_size(path) > LARGEST_CURVE_BYTES:
        return False
    return curve_columns(open_table(path)) is not None


def show_curve(path: Path) -> dict[str, Any]:
    """Describe a CCDF curve in a table.

    Raises
    ------
    FileError
        As :func:`wavegen.files.curve.read_curve`.
    """
    curve = read_curve(path)
    positive = curve.probability[curve.probability > 0]
    return _head("ccdf curve", path.name) | {
        "n_points": int(curve.level_db.size),
        "lowest_level_db": float(curve.level_db[0]),
        "highest_level_db": float(curve.level_db[-1]),
        "highest_probability": float(curve.probability[0]),
        "lowest_probability": float(positive[-1]) if positive.size else None,
        "n_samples": curve.n_samples,
        "warnings": [],
    }


def is_sidecar(path: Path) -> bool:
    """Return whether a path is a sidecar, or a folder, which stands for the one inside.

    Raises
    ------
    FileError
        Out of reach.
    """
    with told(path):
        return path.name.lower().endswith(SUFFIX) or path.is_dir()


# Recipes ----------------------------------------------------------------------------------


def show_recipe(prepared: Prepared) -> dict[str, Any]:
    """Describe a recipe: its loop, what was rounded, and the tree of its parts.

    Parameters
    ----------
    prepared : Prepared
        The recipe as a graph; nothing has been computed.

    Returns
    -------
    dict
        JSON values. ``tree`` has a row for each source, sum, part and stage.
    """
    loaded = prepared.loaded
    recipe = loaded.recipe
    rate = recipe.sample_rate_hz
    n_samples = prepared.site.n_samples
    document = _head("recipe", loaded.name) | {
        "file": loaded.file,
        "title": recipe.title,
        "seed": recipe.seed,
        "overrides": list(loaded.overrides),
        "sample_rate_hz": float(rate),
        "sample_rate_exact_hz": str(rate),
        "n_samples": n_samples,
        "duration_s": float(n_samples / rate),
        "cycle_samples": prepared.cycle_samples,
        "n_cycles": n_samples // prepared.cycle_samples,
        "tree": _tree(recipe.signal, recipe.stages, path="signal", stages_path="stages", depth=0),
        "files": [
            {"format": wanted.format, "datatype": wanted.datatype, "name": wanted.name}
            for wanted in recipe.output.iq
        ],
    }
    for kind, key in (("rounded", "rounded"), ("warning", "warnings"), ("info", "notes")):
        document[key] = note_rows([note for note in prepared.notes if note.kind == kind])
    return document


def _tree(
    signal: Any, stages: tuple[Any, ...], *, path: str, stages_path: str, depth: int
) -> list[dict[str, Any]]:
    rows = [_row("signal", signal, path, depth)]
    for number, part in enumerate(getattr(signal, "parts", ())):
        where = f"{path}.parts[{number}]"
        told = _settings_words(part, left_out=("signal", "stages", "name"))
        rows.append(
            {"path": where, "depth": depth + 1, "kind": "part", "name": part.name, "says": told}
        )
        rows += _tree(
            part.signal,
            part.stages,
            path=f"{where}.signal",
            stages_path=f"{where}.stages",
            depth=depth + 2,
        )
    rows += [
        _row("stage", stage, f"{stages_path}[{number}]", depth)
        for number, stage in enumerate(stages)
    ]
    return rows


def _row(table: str, settings: Any, path: str, depth: int) -> dict[str, Any]:
    return {
        "path": path,
        "depth": depth,
        "kind": kind_of_class(TABLES, (table,), type(settings)) or type(settings).__name__,
        "name": None,
        "says": _settings_words(settings, left_out=("parts",)),
    }


def _settings_words(settings: Any, *, left_out: tuple[str, ...]) -> str:
    """Return settings as a recipe writes them, on one line."""
    found: dict[str, list[str]] = {}
    key = ""
    for line in dump(settings).splitlines():
        if line.startswith(" "):
            found[key].append(line.strip().removeprefix("- "))
            continue
        key, _, value = line.partition(":")
        found[key] = [value.strip()] if value else []
    return ", ".join(
        f"{key} {'; '.join(values)}" for key, values in found.items() if key not in left_out
    )
