"""A data file that is to be written anew: whether it is a loop, and what marks it has."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from fractions import Fraction
from pathlib import Path

from wavegen.core.errors import FileError
from wavegen.core.progress import Progress, silent
from wavegen.core.site import Note
from wavegen.files import markers
from wavegen.files.digest import sha512_of
from wavegen.files.faults import told
from wavegen.files.format import Annotation, ReadHints, Recording
from wavegen.files.read import open_recording
from wavegen.production.stimulus import (
    SUFFIX,
    Stimulus,
    find_stimulus,
    listing,
    loop_warnings,
    mismatch,
)


@dataclass(frozen=True, slots=True, kw_only=True)
class InputFile:
    """What is read.

    Parameters
    ----------
    recordings : tuple of Recording
        The channels of it that are read: one, or both of two.
    stimulus : Stimulus or None
        Its sidecar, if the file is the loop that it describes; None for a recording.
    sha512 : str
        Of the data file.
    notes : list of Note
        What is doubtful; filled on.
    """

    recordings: tuple[Recording, ...]
    stimulus: Stimulus | None
    sha512: str
    notes: list[Note]

    @property
    def recording(self) -> Recording:
        """The first channel that is read; all have its rate, length and datatype."""
        return self.recordings[0]

    @property
    def taken_channel(self) -> int | None:
        """Which channel is read where it is one of several; None where all are."""
        recording = self.recording
        is_all = len(self.recordings) == recording.n_channels
        return None if is_all else recording.channel

    @property
    def centre_hz(self) -> Fraction | None:
        """Where the carrier of real samples stands by the sidecar, Hz, if it says so."""
        if self.stimulus is None or not self.recording.is_real:
            return None
        stated = self.stimulus.items[0]["real"]
        if stated is None:
            return None
        cycle_hz = self.recording.sample_rate_hz / self.recording.n_samples
        return round(Fraction(stated["centre_hz"]) / cycle_hz) * cycle_hz

    @property
    def loops(self) -> bool:
        """Whether the last sample is followed by the first."""
        return self.stimulus is not None

    @property
    def stem(self) -> str:
        """Name of the data file without its ending."""
        return self.recording.path.stem

    def warn(self, *texts: str) -> None:
        """Take note of doubts."""
        where = self.recording.path.name
        self.notes.extend(Note(kind="warning", where=where, text=text) for text in texts)

    def tell(self, text: str) -> None:
        """Take note of what was done."""
        self.notes.append(Note(kind="info", where=self.recording.path.name, text=text))

    def marks(self) -> tuple[Annotation, ...]:
        """Return the markers of the file itself, else those in a file beside it.

        Raises
        ------
        FileError
            A file of markers lies there and cannot be read.
        """
        if self.recording.annotations:
            return self.recording.annotations
        stems = [self.stem]
        if self.stimulus is not None:
            stems.append(self.stimulus.path.name.removesuffix(".ccdf.json"))
        for stem in stems:
            path = self.recording.path.parent / f"{stem}{markers.SUFFIX}"
            if path.is_file():
                return markers.read_markers(path, n_samples=self.recording.n_samples)
        return ()


def open_input(
    path: Path,
    hints: ReadHints,
    *,
    output_rate_hz: Fraction | None = None,
    progress: Progress = silent,
) -> InputFile:
    """Open a data file, and its sidecar if its bytes are those that it describes.

    Parameters
    ----------
    path : Path
        The file; of a stimulus with one file also its folder or its sidecar.
    hints : ReadHints
        What the user says about it.
    output_rate_hz : Fraction, optional
        Rate of the output, Hz: taken as that of a file that does not say its own.
    progress : Progress
        Told how far the hash has come.

    Returns
    -------
    InputFile

    Raises
    ------
    FileError
        It cannot be read, holds power alone, or more than two channels of which none is named.
    """
    path = _data_file(path)
    stimulus = listing(path)
    if stimulus:
        recordings = _listed(stimulus, hints)
    else:
        recordings = _opened(path, _told_rate(path, hints, output_rate_hz))
    recording = recordings[0]
    if recording.is_power:
        raise FileError(
            where=str(path),
            problem="holds power against time, without phase",
            allowed="samples of I and Q, or real ones",
            remedy="Measure it with `wavegen measure`.",
        )
    sha512 = sha512_of(recording.path, progress)
    reason = _no_loop(recording, stimulus, sha512)
    found = InputFile(
        recordings=recordings, stimulus=None if reason else stimulus, sha512=sha512, notes=[]
    )
    found.warn(*(loop_warnings(recording) if found.loops else recording.warnings))
    if reason:
        found.warn(f"{reason}: it is converted as a recording, without a sidecar")
    return found


def _data_file(path: Path) -> Path:
    """Return the data file that is meant by the folder or the sidecar of a stimulus."""
    if "\0" in str(path):
        return path  # opening it says what is wrong
    with told(path):
        is_folder = path.is_dir()
    if not (is_folder or path.name.lower().endswith(SUFFIX)):
        return path
    stimulus = find_stimulus(path)
    if len(stimulus.names) > 1:
        raise FileError(
            where=str(path),
            problem=f"there are {len(stimulus.names)} files of this stimulus",
            allowed=", ".join(stimulus.names),
            remedy=f"Name one of them, such as {stimulus.path.parent / stimulus.names[0]}.",
        )
    return stimulus.path.parent / stimulus.names[0]


def _listed(stimulus: Stimulus, hints: ReadHints) -> tuple[Recording, ...]:
    """Open a file that a sidecar lists: the channel that is named, else all."""
    item = stimulus.items[0]
    if not item["channels"] or hints.channel is not None:
        return (stimulus.open(item, hints),)
    count = len(item["channels"])
    return tuple(stimulus.open(item, replace(hints, channel=number)) for number in range(count))


def _opened(path: Path, hints: ReadHints) -> tuple[Recording, ...]:
    """Open any other file: the channel that is named, else both of two.

    A file without a header has two channels only if one is named.
    """
    try:
        return (open_recording(path, hints),)
    except FileError:
        if hints.channel is not None:
            raise
        first = open_recording(path, replace(hints, channel=0))
        if first.format == "raw" or first.n_channels != 2:
            raise
        return first, open_recording(path, replace(hints, channel=1))


def _told_rate(path: Path, hints: ReadHints, rate_hz: Fraction | None) -> ReadHints:
    """Return hints with the rate of the output for a file that does not say its own."""
    if hints.sample_rate_hz is not None or rate_hz is None:
        return hints
    try:
        _opened(path, hints)
    except FileError:
        return replace(hints, sample_rate_hz=rate_hz)
    return hints


def _no_loop(recording: Recording, stimulus: Stimulus | None, sha512: str) -> str:
    """Return why a file with a sidecar is not the loop that it describes; empty if it is."""
    if stimulus is None:
        return ""
    item = stimulus.items[0]
    if item["sha512"] != sha512:
        return f"its bytes are not those that {stimulus.path.name} describes"
    if mismatch(recording, stimulus.document) is not None:
        return f"its length or rate is not that of {stimulus.path.name}"
    return ""


def moved(
    marks: tuple[Annotation, ...], factor: Fraction, n_samples: int
) -> tuple[Annotation, ...]:
    """Return markers on another axis, cut where it ends; those beyond it are left out.

    Parameters
    ----------
    marks : tuple of Annotation
        On the axis of the source.
    factor : Fraction
        New rate over old.
    n_samples : int
        Length of the new axis.
    """
    moved = []
    for mark in marks:
        start = math.floor(mark.start_sample * factor)
        if not 0 <= start < n_samples:
            continue
        length = mark.n_samples
        if length is not None:
            stop = math.ceil((mark.start_sample + length) * factor)
            length = max(min(stop, n_samples) - start, 1)
        moved.append(replace(mark, start_sample=start, n_samples=length))
    return tuple(moved)
