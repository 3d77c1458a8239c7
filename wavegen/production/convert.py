"""A data file in another format, datatype, level or rate; its sidecar goes along."""

from __future__ import annotations

import hashlib
import math
from collections.abc import Callable
from contextlib import ExitStack
from dataclasses import dataclass, replace
from fractions import Fraction
from pathlib import Path
from typing import Any

import numpy as np

from wavegen import __version__
from wavegen.core.errors import ArgumentsError, FileError
from wavegen.core.progress import Progress, silent
from wavegen.core.render import Tap, render, samples_of
from wavegen.core.signal import Signal
from wavegen.core.site import Note
from wavegen.core.stored import Scratch
from wavegen.core.units import format_hz
from wavegen.files import FORMATS, markers
from wavegen.files.analytic import looped
from wavegen.files.atomic import Drafts, check_name
from wavegen.files.datatypes import Datatype
from wavegen.files.faults import told
from wavegen.files.format import FileFacts, Format, ReadHints, Recording, pick_datatype
from wavegen.meters.peak import peak_between_samples
from wavegen.meters.power import PowerMeter, PowerStatistics
from wavegen.meters.seam import seam_figure
from wavegen.production.converted import Change, Origin, converted_document, origin_of
from wavegen.production.doubts import doubts_of_files
from wavegen.production.export import STRIP_SAMPLES, Channel, ExportedFile, Written, export
from wavegen.production.input_file import InputFile, moved, open_input
from wavegen.production.judgement import data_samples_of
from wavegen.production.resampling import loop_at_rate, recording_at_rate
from wavegen.production.sidecar import FORMAT, as_csv, as_json, note_rows
from wavegen.production.stimulus_document import file_row

_MOST_DB = 300
"""Beyond, float32 samples run out of range."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Conversion:
    """What is asked for.

    Parameters
    ----------
    format : str
        A member of FORMATS.
    datatype : str or None
        By any name that the format knows; None keeps the source's where the format writes it.
    bits, align
        Of shorter words in 16-bit containers, as in
        :func:`wavegen.files.format.told_word`.
    peak_dbfs : float or None
        Where the peak between samples shall stand; None leaves the level to ``gain_db``.
    gain_db : float
        Change of level, dB.
    sample_rate_hz : Fraction or None
        Rate wanted, Hz; None keeps that of the source.
    name : str or None
        Stem of the files; None makes it of the source's and the format's.
    """

    format: str
    datatype: str | None = None
    bits: int | None = None
    align: str | None = None
    peak_dbfs: float | None = None
    gain_db: float = 0.0
    sample_rate_hz: Fraction | None = None
    name: str | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Converted:
    """What was written.

    Parameters
    ----------
    folder : Path
        Where the files are.
    files : tuple of Path
        Every file, the data file first.
    document : dict
        The sidecar; of a recording, its figures alone.
    """

    folder: Path
    files: tuple[Path, ...]
    document: dict[str, Any]

    @property
    def differs(self) -> bool:
        """Whether the file differs from the law of its recipe."""
        law = self.document["law"]
        return law is not None and law["verdict"] == "differs"


def convert(
    path: Path,
    wanted: Conversion,
    *,
    hints: ReadHints,
    out: Path,
    overwrite: bool = False,
    workers: int = 1,
    progress: Progress = silent,
) -> Converted:
    """Write a data file anew; a stimulus as the loop that its sidecar describes.

    Parameters
    ----------
    path : Path
        The data file.
    wanted : Conversion
        Format, datatype, level and rate.
    hints : ReadHints
        What the user says about a file without a header.
    out : Path
        Files go to ``out/NAME/``.
    overwrite : bool
        Whether files that exist are replaced.
    workers, progress
        As in :func:`wavegen.core.render.render`.

    Returns
    -------
    Converted

    Raises
    ------
    ArgumentsError
        What cannot be honoured: a rate at which the loop is not whole, codes cut at full scale.
    FileError
        The source cannot be read, or the output cannot be written. Nothing half-written is left.
    TargetMissed
        A rating of the bench that the sidecar tells of would be exceeded.
    """
    _check(wanted)
    form = _format(wanted.format)
    source = open_input(path, hints, output_rate_hz=wanted.sample_rate_hz, progress=progress)
    datatype = _datatype(form, wanted, source.recording)
    signal, factor = _at_rate(source, wanted)
    origin = _origin(source, factor)
    name = check_name(wanted.name or f"{source.stem}-{wanted.format}", "--name")
    folder = out / name
    facts = _facts(source, signal, datatype, factor)
    form.check(facts, "--to")
    names = form.files(name, datatype)
    beside = _beside(name, facts, source)
    _refuse_own_source(source, folder, (*names, *beside.values()))
    with Drafts(folder, overwrite=overwrite) as drafts, ExitStack() as stack:
        paths = tuple(drafts.add(one) for one in names)
        texts = {key: drafts.add(one) for key, one in beside.items()}
        if signal.inputs:
            signal = _to_scratch(signal, stack, drafts.folder, workers, progress)
        gain = _gain(signal, wanted, workers, progress, loops=source.loops)
        file = export(
            [
                Channel(
                    signal=signal,
                    bursts=origin.bursts,
                    data_samples=data_samples_of(origin.law, signal, workers=workers),
                )
            ],
            gain=gain,
            form=form,
            facts=facts,
            names=names,
            drafts=paths,
            loops=source.loops,
            workers=workers,
            progress=progress,
        )
        if file.n_saturated:
            _refuse_cut(file, signal, gain)
        source.notes.extend(_doubts(file))
        change = Change(
            source=source.recording,
            sha512=source.sha512,
            rate_factor=factor,
            gain_db=20 * math.log10(gain),
        )
        document = _document(source, signal, file, change, origin)
        for key, draft in texts.items():
            with told(draft):
                draft.write_text(_CONTENT[key](document, facts), encoding="utf-8")
    files = tuple(folder / one for one in (*names, *beside.values()))
    return Converted(folder=folder, files=files, document=document)


def _at_rate(source: InputFile, wanted: Conversion) -> tuple[Signal, Fraction]:
    """Return what is written, at its rate, and the factor from the rate of the source."""
    recording = source.recording
    signal = looped(recording) if source.loops else recording.signal
    rate_hz = wanted.sample_rate_hz
    if rate_hz is None or rate_hz == signal.sample_rate_hz:
        return signal, Fraction(1)
    changed = loop_at_rate if source.loops else recording_at_rate
    made, doubts = changed(signal, rate_hz)
    source.warn(*doubts)
    return made, rate_hz / signal.sample_rate_hz


def _origin(source: InputFile, factor: Fraction) -> Origin:
    """Return what the recipe of a stimulus still tells; nothing of a recording."""
    stimulus = source.stimulus
    if stimulus is None:
        return Origin()
    origin = origin_of(stimulus.document, folder=stimulus.path.parent, rate_factor=factor)
    source.warn(*origin.notes)
    return origin


def _document(
    source: InputFile,
    signal: Signal,
    file: ExportedFile,
    change: Change,
    origin: Origin,
) -> dict[str, Any]:
    if source.stimulus is None:
        return _recording_document(file, change, source.notes)
    written = Written(
        sample_rate_hz=signal.sample_rate_hz,
        n_samples=signal.n_samples,
        inputs=(signal,),
        mean_power=None,
        gain=10 ** (change.gain_db / 20),
        datatype=file.datatype,
    )
    before = source.stimulus.document
    cycle = (before["loop"]["cycle_samples"] * change.rate_factor).numerator
    return converted_document(
        before,
        file,
        change,
        origin=origin,
        seam=seam_figure(written, cycle_samples=cycle),
        notes=source.notes,
    )


def _check(wanted: Conversion) -> None:
    """Refuse levels that mean nothing."""
    for option, is_wrong, problem, allowed in (
        (
            "--peak",
            wanted.peak_dbfs is not None and not -_MOST_DB <= wanted.peak_dbfs <= 0,
            f"is {wanted.peak_dbfs} dBFS",
            f"from -{_MOST_DB} to 0 dBFS: beyond, the peak would be cut off",
        ),
        (
            "--gain",
            not abs(wanted.gain_db) <= _MOST_DB,
            f"is {wanted.gain_db:g} dB",
            f"from -{_MOST_DB} to {_MOST_DB} dB",
        ),
    ):
        if is_wrong:
            raise ArgumentsError(
                where=option, problem=problem, allowed=allowed, remedy="Correct the level."
            )


_CONTENT: dict[str, Callable[[dict[str, Any], FileFacts], str]] = {
    "sidecar": lambda document, _: as_json(document),
    "curve": lambda document, _: as_csv(document),
    "markers": lambda _, facts: markers.markers_text(facts.annotations),
}


def _beside(name: str, facts: FileFacts, source: InputFile) -> dict[str, str]:
    """Return the names of what goes beside the data: for a recording, its markers at most."""
    found = {}
    if source.loops:
        found = {"sidecar": f"{name}.ccdf.json", "curve": f"{name}.ccdf.csv"}
    if facts.annotations:
        try:
            markers.checked_markers(facts.annotations, n_samples=facts.n_samples, where=name)
        except FileError as error:
            source.warn(f"no file of markers is written: {error.problem}")
        else:
            found["markers"] = f"{name}{markers.SUFFIX}"
    return found


def _format(name: str) -> Format:
    if name in FORMATS:
        made: Format = FORMATS.load(name)()
        return made
    guess = FORMATS.nearest(name)
    raise ArgumentsError(
        where="--to",
        problem=f"{name[:60]!r} is no format",
        allowed=", ".join(FORMATS),
        remedy=f"Did you mean {guess}?" if guess else "Choose one of these.",
    )


# What is written -------------------------------------------------------------------------


def _datatype(form: Format, wanted: Conversion, recording: Recording) -> Datatype:
    name = wanted.datatype
    if name is None and recording.datatype.name in form.datatypes and not recording.is_real:
        name = recording.datatype.name
    datatype = pick_datatype(form, name, "--datatype", bits=wanted.bits, align=wanted.align)
    if datatype.is_real:
        raise ArgumentsError(
            where="--datatype",
            problem=f"{datatype.name} has room for real samples only",
            allowed=", ".join(key for key, one in form.datatypes.items() if not one.is_real),
            remedy="Choose a complex datatype; `wavegen make` writes real ones from a recipe.",
        )
    return datatype


def _facts(source: InputFile, signal: Signal, datatype: Datatype, factor: Fraction) -> FileFacts:
    recording = source.recording
    text = source.stimulus.document["recipe"]["text"] if source.stimulus else None
    return FileFacts(
        sample_rate_hz=signal.sample_rate_hz,
        n_samples=signal.n_samples,
        datatype=datatype,
        title=recording.title or (source.stimulus.document["title"] if source.stimulus else ""),
        description=recording.description or f"converted from {recording.path.name}",
        generator=f"wavegen {__version__}",
        recipe_sha512="" if text is None else hashlib.sha512(text.encode()).hexdigest(),
        annotations=moved(source.marks(), factor, signal.n_samples),
        centre_frequency_hz=recording.centre_frequency_hz,
    )


def _refuse_own_source(source: InputFile, folder: Path, names: tuple[str, ...]) -> None:
    """Refuse to write over what is being read, or over its sidecar."""
    read = [*source.recording.files, *([source.stimulus.path] if source.stimulus else [])]
    for name in names:
        target = folder / name
        if target.exists() and any(target.samefile(path) for path in read):
            raise ArgumentsError(
                where="--name",
                problem=f"{target} belongs to the file that is read",
                allowed="another name or another folder",
                remedy="Add another --name, or another --out.",
            )


# The level --------------------------------------------------------------------------------


def _to_scratch(
    signal: Signal, stack: ExitStack, folder: Path, workers: int, progress: Progress
) -> Signal:
    scratch = stack.enter_context(
        Scratch(folder=folder, sample_rate_hz=signal.sample_rate_hz, n_samples=signal.n_samples)
    )
    task = f"resampling to {format_hz(signal.sample_rate_hz)}"
    render(signal, sink=scratch.write, workers=workers, progress=progress, task=task)
    return scratch.signal()


def _power(signal: Signal, workers: int, progress: Progress) -> PowerStatistics:
    tap = Tap(name="power", signal=signal, meter=PowerMeter(where="the samples"))
    found: PowerStatistics = render(
        signal, taps=(tap,), workers=workers, progress=progress, task="measuring"
    )["power"]
    return found


def _gain(
    signal: Signal, wanted: Conversion, workers: int, progress: Progress, *, loops: bool
) -> float:
    """Return the amplitude factor that is asked for."""
    if wanted.peak_dbfs is None:
        return 10 ** (wanted.gain_db / 20)
    statistics = _power(signal, workers, progress)
    peak = peak_between_samples(signal, statistics, loops=loops)
    return math.sqrt(10 ** (wanted.peak_dbfs / 10) / peak.power)


def _refuse_cut(file: ExportedFile, signal: Signal, gain: float) -> None:
    """Refuse codes that were cut at full scale by more than rounding (+1.0 itself has no code)."""
    largest = 0.0
    for start in range(0, signal.n_samples, STRIP_SAMPLES):
        samples = samples_of(signal, start, min(start + STRIP_SAMPLES, signal.n_samples))
        largest = max(largest, float(np.abs(samples.view(np.float32)).max()))
    largest *= gain
    if largest <= 1.0:
        return
    raise ArgumentsError(
        where="--gain",
        problem=f"{file.n_saturated} I or Q codes would be cut: the larger rail peaks "
        f"{20 * math.log10(largest):.3g} dB over full scale",
        allowed="peaks up to full scale, or a float datatype",
        remedy="Add --peak -1dBFS, or --gain with a lower level.",
    )


def _doubts(file: ExportedFile) -> list[Note]:
    return [replace(note, where=file.names[0]) for note in doubts_of_files([file])]


def _recording_document(file: ExportedFile, change: Change, notes: list[Note]) -> dict[str, Any]:
    row = file_row(file, [None])
    rate_hz = change.source.sample_rate_hz * change.rate_factor
    return {
        "format": f"{FORMAT}.conversion",
        "version": 1,
        "is": "a recording",
        "title": change.source.title,
        "sample_rate_hz": float(rate_hz),
        "sample_rate_exact_hz": str(rate_hz),
        "duration_s": float(row["n_samples"] / rate_hz),
        **{key: row[key] for key in row if key not in {"name", "all_names", "sha512"}},
        "law": None,
        "files": [row],
        "converted": change.document(None),
        "warnings": note_rows([note for note in notes if note.kind == "warning"]),
        "notes": note_rows([note for note in notes if note.kind == "info"]),
    }
