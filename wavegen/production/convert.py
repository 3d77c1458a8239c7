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

from wavegen import __version__
from wavegen.core.errors import ArgumentsError, FileError
from wavegen.core.progress import Progress, silent
from wavegen.core.render import render
from wavegen.core.signal import Signal
from wavegen.core.site import Note
from wavegen.core.stored import Scratch
from wavegen.core.units import format_hz
from wavegen.files import markers
from wavegen.files.analytic import analytic_loop, looped
from wavegen.files.atomic import Drafts, check_name
from wavegen.files.datatypes import Datatype
from wavegen.files.faults import told
from wavegen.files.format import Annotation, FileFacts, ReadHints
from wavegen.meters.seam import SeamFigure, seam_figure
from wavegen.production.carriage import Carriage, check_folding, plan_carriage
from wavegen.production.conversion import (
    Conversion,
    check_conversion,
    datatype_of,
    format_named,
)
from wavegen.production.conversion_level import gain_to_peak, power_of, refuse_cut
from wavegen.production.converted import (
    Change,
    ChannelOrigin,
    Origin,
    channel_document,
    converted_document,
    origin_of,
)
from wavegen.production.doubts import doubts_of_files
from wavegen.production.export import Channel, ExportedFile, Written, export
from wavegen.production.input_file import InputFile, moved, open_input
from wavegen.production.judgement import data_samples_of
from wavegen.production.resampling import factor_of, loop_at_rate, recording_at_rate
from wavegen.production.sidecar import FORMAT, TWO_CHANNELS, as_csv, as_json, note_rows
from wavegen.production.stimulus import recipe_channel
from wavegen.production.stimulus_document import file_row


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
    notes : tuple of Note
        What was rounded, doubtful or worth knowing about this conversion alone.
    """

    folder: Path
    files: tuple[Path, ...]
    document: dict[str, Any]
    notes: tuple[Note, ...] = ()

    @property
    def differs(self) -> bool:
        """Whether the file differs from the law of one of its channels."""
        laws = [self.document["law"], (self.document.get("second_channel") or {}).get("law")]
        return any(law is not None and law["verdict"] == "differs" for law in laws)


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
        The data file; of a stimulus with one file also its folder or its sidecar.
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
    check_conversion(wanted)
    form = format_named(wanted.format)
    source = open_input(path, hints, output_rate_hz=wanted.sample_rate_hz, progress=progress)
    datatype = datatype_of(form, wanted, source.recording)
    rate_hz = wanted.sample_rate_hz or source.recording.sample_rate_hz
    factor = factor_of(source.recording.signal, rate_hz)
    carriage = plan_carriage(
        source,
        datatype,
        centre_hz=wanted.real_centre_hz,
        input_centre_hz=wanted.input_real_centre_hz,
        rate_hz=rate_hz,
        n_samples=math.ceil(source.recording.n_samples * factor),
    )
    signals = _signals(source, carriage, rate_hz)
    origins = _origins(source, factor)
    name = f"{source.stem}-{wanted.format}" if wanted.name is None else wanted.name
    name = check_name(name, "--name")
    folder = out / name
    marks = moved(_marks(source, origins), factor, signals[0].n_samples)
    facts = _facts(source, signals, datatype, marks, carriage)
    form.check(facts, "--to")
    names = form.files(name, datatype)
    beside = _beside(name, facts, source)
    _refuse_own_source(source, folder, (*names, *beside.values()))
    with Drafts(folder, overwrite=overwrite) as drafts, ExitStack() as stack:
        paths = tuple(drafts.add(one) for one in names)
        texts = {key: drafts.add(one) for key, one in beside.items()}
        signals = [_leaf(one, stack, drafts.folder, workers, progress) for one in signals]
        gain = 10 ** (wanted.gain_db / 20)
        if wanted.peak_dbfs is not None or carriage.is_moved_up:
            powers = [power_of(one, workers=workers, progress=progress) for one in signals]
            check_folding(source, signals, powers, carriage)
            if wanted.peak_dbfs is not None:
                gain = gain_to_peak(signals, powers, wanted.peak_dbfs, loops=source.loops)
        channels = [
            Channel(
                signal=carriage.raised(signal),
                bursts=origin.bursts,
                data_samples=data_samples_of(origin.law, signal, workers=workers),
            )
            for signal, origin in zip(signals, origins, strict=True)
        ]
        file = export(
            channels,
            gain=gain,
            form=form,
            facts=facts,
            names=names,
            drafts=paths,
            loops=source.loops,
            workers=workers,
            progress=progress,
        )
        file = replace(file, centre_hz=carriage.to_hz)
        if file.n_saturated:
            refuse_cut(file, [channel.signal for channel in channels], gain)
        source.notes.extend(_doubts(file))
        change = Change(
            source=source.recording,
            sha512=source.sha512,
            rate_factor=factor,
            gain_db=20 * math.log10(gain),
            channel=source.taken_channel,
            from_hz=carriage.from_hz,
            to_hz=carriage.to_hz,
        )
        document = _document(source, channels, file, change, origins)
        for key, draft in texts.items():
            with told(draft):
                draft.write_text(_CONTENT[key](document, facts), encoding="utf-8", newline="\n")
    files = tuple(folder / one for one in (*names, *beside.values()))
    notes = tuple(source.notes)
    return Converted(folder=folder, files=files, document=document, notes=notes)


# What is read -----------------------------------------------------------------------------


def _signals(source: InputFile, carriage: Carriage, rate_hz: Fraction) -> list[Signal]:
    """Return each channel at its rate, without its intermediate frequency if that is taken off."""
    found = []
    for recording in source.recordings:
        signal = carriage.lowered(looped(recording) if source.loops else recording.signal)
        doubts: list[str] = []
        if rate_hz != signal.sample_rate_hz:
            changed = loop_at_rate if source.loops else recording_at_rate
            signal, doubts = changed(signal, rate_hz)
        found.append(signal)
        if len(found) == 1:  # the second has the same band and the same ends
            source.warn(*doubts)
    return found


def _origins(source: InputFile, factor: Fraction) -> list[Origin]:
    """Return what the recipe of a stimulus still tells of each channel; nothing of a recording."""
    stimulus = source.stimulus
    if stimulus is None:
        return [Origin()] * len(source.recordings)
    found = [
        origin_of(
            channel_document(stimulus.document, stimulus.items[0], recording.channel),
            folder=stimulus.path.parent,
            rate_factor=factor,
            channel=recipe_channel(stimulus.document, recording.channel),
        )
        for recording in source.recordings
    ]
    source.warn(*dict.fromkeys(text for origin in found for text in origin.notes))
    return found


def _marks(source: InputFile, origins: list[Origin]) -> tuple[Annotation, ...]:
    """Return the markers of what is read: those of bursts are its own where one is taken of two."""
    marks = source.marks()
    if source.stimulus is None or not source.taken_channel:
        return marks
    kept = [mark for mark in marks if mark.label == "period start"]
    bursts = origins[0].bursts
    if bursts is not None:
        kept += [
            markers.marker("burst on", start, length)
            for start, length in bursts.starts(source.recording.n_samples)
        ]
    return tuple(sorted(kept, key=lambda mark: (mark.start_sample, mark.n_samples or 0)))


def _document(
    source: InputFile,
    channels: list[Channel],
    file: ExportedFile,
    change: Change,
    origins: list[Origin],
) -> dict[str, Any]:
    if source.stimulus is None:
        return _recording_document(file, change, source.notes)
    document, item = source.stimulus.document, source.stimulus.items[0]
    gain = 10 ** (change.gain_db / 20)
    found = []
    for recording, channel, origin in zip(source.recordings, channels, origins, strict=True):
        before = channel_document(document, item, recording.channel)
        cycle = (before["loop"]["cycle_samples"] * change.rate_factor).numerator
        seam = _seam(channel.signal, gain, file.datatype, cycle)
        found.append(ChannelOrigin(before=before, origin=origin, seam=seam))
    return converted_document(document, file, change, channels=found, notes=source.notes)


def _seam(signal: Signal, gain: float, datatype: Datatype, cycle_samples: int) -> SeamFigure:
    """Return how the written codes of one channel close."""
    written: Signal = Written(
        sample_rate_hz=signal.sample_rate_hz,
        n_samples=signal.n_samples,
        inputs=(signal,),
        mean_power=None,
        gain=gain,
        datatype=datatype,
    )
    if datatype.is_real:
        written = analytic_loop(written)
    return seam_figure(written, cycle_samples=cycle_samples)


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


def _facts(
    source: InputFile,
    signals: list[Signal],
    datatype: Datatype,
    marks: tuple[Annotation, ...],
    carriage: Carriage,
) -> FileFacts:
    recording, signal = source.recording, signals[0]
    text = source.stimulus.document["recipe"]["text"] if source.stimulus else None
    centre_hz = recording.centre_frequency_hz
    return FileFacts(
        sample_rate_hz=signal.sample_rate_hz,
        n_samples=signal.n_samples,
        datatype=datatype,
        title=recording.title or (source.stimulus.document["title"] if source.stimulus else ""),
        description=_description(source),
        generator=f"wavegen {__version__}",
        recipe_sha512="" if text is None else hashlib.sha512(text.encode()).hexdigest(),
        annotations=marks,
        centre_frequency_hz=None if centre_hz is None else centre_hz - float(carriage.shift_hz),
        n_channels=len(signals),
    )


def _description(source: InputFile) -> str:
    """Return what a file says about itself, and which channel of two it is now."""
    recording = source.recording
    text = recording.description or f"converted from {recording.path.name}"
    if source.taken_channel is None:
        return text
    count = recording.n_channels
    return f"{text.removesuffix(TWO_CHANNELS)}; channel {source.taken_channel} of {count}"


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


def _leaf(
    signal: Signal, stack: ExitStack, folder: Path, workers: int, progress: Progress
) -> Signal:
    """Return a signal whose ranges can be read: rendered to a scratch file where it is computed."""
    if not signal.inputs:
        return signal
    scratch = stack.enter_context(
        Scratch(folder=folder, sample_rate_hz=signal.sample_rate_hz, n_samples=signal.n_samples)
    )
    task = f"computing at {format_hz(signal.sample_rate_hz)}"
    render(signal, sink=scratch.write, workers=workers, progress=progress, task=task)
    return scratch.signal()


def _doubts(file: ExportedFile) -> list[Note]:
    return [replace(note, where=file.names[0]) for note in doubts_of_files([file])]


def _recording_document(file: ExportedFile, change: Change, notes: list[Note]) -> dict[str, Any]:
    row = file_row(file, [None] * len(file.channels), [None] * len(file.channels))
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
        "rounded": note_rows([note for note in notes if note.kind == "rounded"]),
        "warnings": note_rows([note for note in notes if note.kind == "warning"]),
        "notes": note_rows([note for note in notes if note.kind == "info"]),
    }
