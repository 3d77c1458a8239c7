"""Data files as subjects: what is a loop, which part is meant, what is known beside the samples."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from fractions import Fraction
from pathlib import Path
from typing import Any

from wavegen.core.errors import ArgumentsError
from wavegen.core.excerpt import excerpt
from wavegen.core.timespan import TimeSpan
from wavegen.files import markers
from wavegen.files.analytic import edge_text, looped
from wavegen.files.format import Annotation, ReadHints, Recording
from wavegen.files.read import open_recording
from wavegen.meters.faults import code_scale
from wavegen.production.measure import completed_hints
from wavegen.production.measure_settings import whole_samples
from wavegen.production.prepare import Prepared
from wavegen.production.stimulus import mismatch, recipe_channel, sidecar_of
from wavegen.production.subject import Subject
from wavegen.production.symbol_plan import described_recipe, symbol_plan
from wavegen.stages.channel.gate import on_time


@dataclass(frozen=True, slots=True, kw_only=True)
class FilePart:
    """Which part of a file is meant, and whether it repeats.

    Parameters
    ----------
    first, stop : TimeSpan or None
        From where to where (not included).
    period : TimeSpan or None
        It repeats after this time; the first period counts.
    loops : bool
        The file repeats as a whole.
    """

    first: TimeSpan | None = None
    stop: TimeSpan | None = None
    period: TimeSpan | None = None
    loops: bool = False

    def range(self, n_samples: int, rate_hz: Fraction) -> tuple[int, int]:
        """Return first sample and end.

        Raises
        ------
        ArgumentsError
            Nothing, or more than the file holds.
        """
        first, stop, period = (
            None if span is None else whole_samples(span, rate_hz, option)
            for span, option in (
                (self.first, "--from"),
                (self.stop, "--to"),
                (self.period, "--period"),
            )
        )
        first = first or 0
        stop = n_samples if stop is None else stop
        if period is not None:
            stop = min(stop, first + period)
        if not 0 <= first < stop <= n_samples or (period is not None and stop - first < period):
            raise ArgumentsError(
                where="--from/--to/--period",
                problem=f"samples {first} to {stop} are asked of {n_samples}",
                allowed=f"a stretch inside 0 to {n_samples} samples that is not empty",
                remedy="Correct the limits.",
            )
        return first, stop

    @property
    def is_cut(self) -> bool:
        """Whether it is not the file as a whole."""
        return any(span is not None for span in (self.first, self.stop, self.period))


WHOLE_FILE = FilePart()


def open_subject(
    path: Path,
    hints: ReadHints | None = None,
    part: FilePart = WHOLE_FILE,
    *,
    reads_markers: bool = False,
) -> Subject:
    """Open a data file as something to measure.

    Parameters
    ----------
    path : Path
        The file.
    hints : ReadHints, optional
        What the user says about it.
    part : FilePart
        Which part is meant.
    reads_markers : bool
        Whether markers are wanted: a file of them beside it may be damaged.

    Returns
    -------
    Subject
        A loop if its sidecar or ``part`` says so, else a recording.

    Raises
    ------
    FileError
        It cannot be read.
    ArgumentsError
        A part that is not there.
    """
    hints = hints or ReadHints()
    recording = open_recording(path, hints)
    sidecar, entry = _described(recording)
    if entry is not None:
        completed = completed_hints(entry, recording, hints)
        if completed is not hints:
            recording = open_recording(path, completed)
    warnings = list(recording.warnings)
    if sidecar is not None:
        other = mismatch(recording, sidecar)
        if other is not None:
            sidecar = entry = None
            warnings.append(other)
    first, stop = part.range(recording.n_samples, recording.sample_rate_hz)
    is_whole = sidecar is not None and not part.is_cut
    loops = part.loops or part.period is not None or is_whole
    if loops and recording.is_real:  # what follows the end is known
        ends = edge_text(recording.path, recording.n_samples)
        warnings = [text for text in warnings if text != ends]
    facts: dict[str, object] = {
        "file_format": recording.format,
        "datatype": recording.datatype.label,
        "is_real": recording.is_real,
    }
    if recording.n_channels > 1:
        facts["channel"] = recording.channel
    subject = Subject(
        name=recording.path.name,
        signal=looped(recording, first, stop) if loops else excerpt(recording.signal, first, stop),
        loops=loops,
        reference_level_dbm=recording.reference_level_dbm,
        is_power=recording.is_power,
        is_real=recording.is_real,
        code_scale=code_scale(recording),
        is_described=sidecar is not None,
        annotations=_marks(recording, sidecar, first, stop) if reads_markers else (),
        warnings=tuple(warnings),
        facts=facts,
    )
    if sidecar is None or entry is None:
        return subject
    return _with_sidecar(subject, recording, sidecar, entry, is_whole=is_whole)


def _described(recording: Recording) -> tuple[dict[str, Any] | None, dict[str, Any] | None]:
    """Return the sidecar beside a file and what it says of that file."""
    sidecar = sidecar_of(recording)
    if sidecar is None:
        return None, None
    name = recording.path.name
    return sidecar, next(item for item in sidecar["files"] if item["name"] == name)


def _with_sidecar(
    subject: Subject,
    recording: Recording,
    sidecar: dict[str, Any],
    entry: dict[str, Any],
    *,
    is_whole: bool,
) -> Subject:
    """Return a subject with what its sidecar says of levels, loop, gate and symbols."""
    if subject.reference_level_dbm is None and sidecar["bench"]:
        level_dbm = _bench_reference(sidecar["bench"], entry, recording.channel)
        subject = replace(
            subject, reference_level_dbm=level_dbm, reference_is="by the bench of its sidecar"
        )
    if not is_whole:
        return subject
    law = sidecar["law"] if not recording.channel else (sidecar["second_channel"] or {}).get("law")
    prepared = _recipe_of(sidecar, recording)
    return replace(
        subject,
        cycle_samples=sidecar["loop"]["cycle_samples"],
        every_loop=law["name"] if law and law["holds"] == "every loop" else "",
        bursts=on_time(prepared.built.signal) if prepared else None,
        symbols=symbol_plan(prepared) if prepared else None,
    )


def _recipe_of(sidecar: dict[str, Any], recording: Recording) -> Prepared | None:
    """Return the recipe as a graph where it has a gate or symbols to tell of."""
    recipe = sidecar["recipe"]
    words = " ".join([recipe["text"], *recipe["overrides"]])
    if "ofdm" not in words and "gate" not in words:
        return None
    channel = recipe_channel(sidecar, recording.channel)
    return described_recipe(sidecar, recording.path.parent, channel)


def _bench_reference(bench: dict[str, Any], entry: dict[str, Any], channel: int) -> float | None:
    """Return how much 0 dBFS is at the input of the device, dBm."""
    figures = entry["channels"][channel] if entry["channels"] else entry
    if bench["averaged_over"] == "burst" and figures["on_time"]:
        figures = figures["on_time"]
    places = [place for place in bench["path"] if place.get("channel", channel) == channel]
    device = next((place for place in places if place["role"] == "device"), None)
    return None if device is None else float(device["average_dbm"] - figures["mean_dbfs"])


def _marks(
    recording: Recording, sidecar: dict[str, Any] | None, first: int, stop: int
) -> tuple[Annotation, ...]:
    """Return the markers of a file, else those beside it, on the axis of the part."""
    found = recording.annotations or _marks_beside(recording, sidecar)
    return tuple(
        replace(item, start_sample=item.start_sample - first)
        for item in found
        if item.start_sample < stop and item.start_sample + (item.n_samples or 1) > first
    )


def _marks_beside(recording: Recording, sidecar: dict[str, Any] | None) -> tuple[Annotation, ...]:
    stems: Sequence[str] = (recording.path.stem,)
    if sidecar is not None:
        stems = (recording.path.stem, sidecar["recipe"]["name"])
    for stem in stems:
        path = recording.path.parent / f"{stem}{markers.SUFFIX}"
        if path.is_file():
            return markers.read_markers(path, n_samples=recording.n_samples)
    return ()
