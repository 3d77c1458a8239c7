"""WAV and RF64 through ``soundfile``: I is the left channel, Q the right.

Rounding and saturation are ours (:mod:`wavegen.files.datatypes`); the library only packs codes,
so that what is read back is what was written, bit for bit.
"""

from __future__ import annotations

import struct
from collections.abc import Iterator, Mapping
from contextlib import contextmanager
from dataclasses import dataclass
from fractions import Fraction
from pathlib import Path
from typing import Any, ClassVar

import numpy as np

from wavegen.core.errors import FileError
from wavegen.core.signal import Samples, Signal
from wavegen.core.units import format_hz
from wavegen.files.datatypes import CF32_LE, CF64_LE, CI16_LE, CI24_LE, CI32_LE, Codes, Datatype
from wavegen.files.datatypes import decode as decode_codes
from wavegen.files.digest import sha512_of
from wavegen.files.faults import told
from wavegen.files.format import (
    FileFacts,
    ReadHints,
    Recording,
    Writer,
    check_facts,
    refuse_other_datatype,
    told_rate,
)
from wavegen.files.interleaved import SampleCount, scaled, shorter
from wavegen.files.riff import Chunk, is_wave, walk

_SUBTYPES = {
    "PCM_16": CI16_LE,
    "PCM_24": CI24_LE,
    "PCM_32": CI32_LE,
    "FLOAT": CF32_LE,
    "DOUBLE": CF64_LE,
}
"""The library's names of codings, and ours; the first, second and fourth are written."""

_HELD = {"PCM_16": "int16", "PCM_24": "int32", "PCM_32": "int32", "FLOAT": "float32"}
"""In what the library hands codes over; DOUBLE is float64."""

_RIFF_LIMIT = (1 << 32) - (1 << 16)
"""Bytes of samples from which RF64 is written: RIFF lengths have 32 bits, and 64 kB are left
for the other chunks."""

_MOST_TITLE = 500
"""Characters of a title that are kept: the library drops it whole if its header overflows."""


class Wav:
    """WAV files, RF64 where the samples need it.

    Parameters
    ----------
    riff_limit_bytes : int
        Size of the samples above which RF64 is written; smaller only in tests.
    """

    name: ClassVar[str] = "wav"
    suffixes: ClassVar[tuple[str, ...]] = (".wav",)
    datatypes: ClassVar[Mapping[str, Datatype]] = {
        "int16": CI16_LE,
        "int24": CI24_LE,
        "float32": CF32_LE,
        "ci16_le": CI16_LE,
        "ci24_le": CI24_LE,
        "cf32_le": CF32_LE,
    }
    default_datatype: ClassVar[str] = "ci16_le"

    def __init__(self, *, riff_limit_bytes: int = _RIFF_LIMIT) -> None:
        self._riff_limit = riff_limit_bytes

    def files(self, stem: str, datatype: Datatype) -> tuple[str, ...]:
        """Return the name of the file."""
        return (f"{stem}.wav",)

    def check(self, facts: FileFacts, where: str) -> None:
        """Refuse rates that the header cannot hold.

        Raises
        ------
        FileError
            A rate that is no whole number of Hz or too high, or another datatype.

        Notes
        -----
        The header holds the rate, and the rate times the bytes of a sample, in 32 bits each;
        the library takes rates up to ``2^31 - 1``.
        """
        check_facts(self, facts, where)
        rate = facts.sample_rate_hz
        most = min((1 << 31) - 1, ((1 << 32) - 1) // facts.datatype.bytes_per_sample)
        if rate.denominator != 1 or rate > most:
            raise FileError(
                where=where,
                problem=f"WAV cannot hold {rate} Hz ({format_hz(rate)}) of {facts.datatype.name}",
                allowed=f"whole Hz up to {most} Hz",
                remedy="Write sigmf instead, or change the sample rate.",
            )

    def writer(self, drafts: tuple[Path, ...], facts: FileFacts) -> Writer:
        """Open the file."""
        self.check(facts, drafts[0].name)
        n_bytes = facts.n_samples * facts.datatype.bytes_per_sample
        return WavWriter(
            drafts[0], facts, container="RF64" if n_bytes > self._riff_limit else "WAV"
        )

    def detect(self, path: Path, head: bytes) -> bool:
        """Return whether the first bytes are those of a WAVE file, whatever its name."""
        return is_wave(head)

    def read(self, path: Path, hints: ReadHints) -> Recording:
        """Open a WAV file of two channels.

        Raises
        ------
        FileError
            Truncated or with lengths that lie, not two channels, a coding that is not read,
            or empty.
        """
        riff = walk(path)
        with _opened(path) as file:
            channels, rate, frames = file.channels, file.samplerate, file.frames
            subtype, title, comment = file.subtype, file.title, file.comment
        _refuse_channels(path, channels)
        datatype = _SUBTYPES.get(subtype)
        if datatype is None:
            raise FileError(
                where=str(path),
                problem=f"is coded as {subtype}",
                allowed=", ".join(_SUBTYPES),
                remedy="Convert it to 16-bit or 32-bit float WAV.",
            )
        refuse_other_datatype(path, datatype, hints)
        if rate < 1 or frames < 1:
            raise FileError(
                where=str(path),
                problem=f"holds {frames} samples at {rate} Hz",
                allowed="at least one sample, at a rate above 0 Hz",
                remedy="Check that the recording finished.",
            )
        sample_rate_hz, warnings = told_rate(path, stated_hz=Fraction(rate), hints=hints)
        if riff.n_trailing:
            warnings += (f"{path.name} has {riff.n_trailing} bytes after its end; left out",)
        signal = WavSamples(
            sample_rate_hz=sample_rate_hz,
            n_samples=frames,
            mean_power=None,
            path=path,
            subtype=subtype,
            gain=1.0 if hints.full_scale is None else datatype.full_scale / hints.full_scale,
        )
        return Recording(
            path=path,
            files=(path,),
            format=self.name,
            signal=signal,
            sample_rate_hz=sample_rate_hz,
            n_samples=frames,
            datatype=datatype,
            title=title,
            description=comment,
            reference_level_dbm=hints.reference_level_dbm,
            warnings=warnings,
        )


def _refuse_channels(path: Path, channels: int) -> None:
    if channels == 2:
        return
    what = "one channel, a real signal" if channels == 1 else f"{channels} channels"
    raise FileError(
        where=str(path),
        problem=f"has {what}",
        allowed="two channels: I on the left, Q on the right",
        remedy="Convert it to complex baseband (I and Q) and save it with two channels."
        if channels == 1
        else "Save the two channels that hold I and Q.",
    )


@contextmanager
def _opened(path: Path) -> Iterator[Any]:
    import soundfile

    try:
        with told(path), soundfile.SoundFile(path) as file:
            yield file
    except soundfile.SoundFileError as error:
        raise FileError(
            where=str(path),
            problem=f"cannot be decoded: {error}",
            allowed="WAV files that hold what their header says",
            remedy="Check that the recording and the copy finished.",
        ) from error


@dataclass(frozen=True, eq=False, kw_only=True)
class WavSamples(Signal):
    """A WAV file of two channels as a signal, full scale 1.0.

    Parameters
    ----------
    path : Path
        The file; it must outlive the signal, unchanged.
    subtype : str
        The library's name of the coding.
    gain : float
        Factor after decoding.
    """

    path: Path
    subtype: str
    gain: float = 1.0

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Read samples ``[start, stop)``.

        Raises
        ------
        FileError
            The file is gone, damaged or shorter than it was.
        """
        return scaled(decode_codes(self.codes(start, stop), _SUBTYPES[self.subtype]), self.gain)

    def codes(self, start: int, stop: int) -> Codes:
        """Return the codes of samples ``[start, stop)``, shape (stop - start, 2)."""
        with _opened(self.path) as file:
            if file.frames < stop:
                raise shorter(self.path, file.frames, self.n_samples)
            file.seek(start)
            codes: Codes = file.read(
                stop - start, dtype=_HELD.get(self.subtype, "float64"), always_2d=True
            )
        if codes.shape[0] != stop - start:
            raise shorter(self.path, start + codes.shape[0], self.n_samples)
        if self.subtype == "PCM_24":
            codes >>= 8  # the library hands 24 bits over at the left of 32
        return codes


class WavWriter:
    """Writes one WAV file.

    Parameters
    ----------
    draft : Path
        The (temporary) file.
    facts : FileFacts
        What will come.
    container : {"WAV", "RF64"}
        Which lengths the header holds: 32 or 64 bits.
    """

    def __init__(self, draft: Path, facts: FileFacts, *, container: str) -> None:
        import soundfile

        self._path = draft
        self._datatype = facts.datatype
        self._count = SampleCount(draft, facts.n_samples)
        self._sha512 = ""
        subtype = next(name for name, item in _SUBTYPES.items() if item is facts.datatype)
        with told(draft), self._library_told():
            self._file = soundfile.SoundFile(
                draft,
                "w",
                samplerate=int(facts.sample_rate_hz),
                channels=2,
                format=container,
                subtype=subtype,
            )
            if facts.title:
                self._file.title = facts.title[:_MOST_TITLE]

    @contextmanager
    def _library_told(self) -> Iterator[None]:
        import soundfile

        try:
            yield
        except soundfile.SoundFileError as error:
            raise FileError(
                where=str(self._path),
                problem=f"cannot be written: {error}",
                allowed="files up to the free disk",
                remedy="Free some disk or choose another output folder.",
            ) from error

    def write(self, codes: Codes) -> None:
        """Append codes, shape (n, 2)."""
        self._count.add(codes)
        block = np.ascontiguousarray(codes, self._datatype.dtype)
        if self._datatype is CI24_LE:
            block = block << 8
        with told(self._path), self._library_told():
            self._file.write(block)

    def finish(self, statistics: Mapping[str, object] | None = None) -> None:
        """Close the file and hash it; a WAV file has no room for statistics."""
        self.close()
        self._count.check_complete()
        riff = walk(self._path)
        peak = riff.find("PEAK")
        if peak is not None:
            _clear_time(self._path, peak)
        self._sha512 = sha512_of(self._path)

    def close(self) -> None:
        """Close the file as it is."""
        with told(self._path), self._library_told():
            self._file.close()

    @property
    def sha512(self) -> str:
        """Hex digest of the file's bytes."""
        return self._sha512


def _clear_time(path: Path, peak: Chunk) -> None:
    """Set the time of writing in the library's PEAK chunk to 0: same samples, same bytes."""
    with told(path), path.open("r+b") as file:
        file.seek(peak.offset + 4)  # after the chunk's version
        file.write(struct.pack("<I", 0))
