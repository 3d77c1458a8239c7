"""WAV and RF64 through ``soundfile``: I is the left channel, Q the right.

Four channels are two coherent signals, one channel is a real signal. Rounding and saturation
are ours (:mod:`wavegen.files.datatypes`); the library only packs codes, so that what is read
back is what was written, bit for bit.
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
from wavegen.core.units import format_hz
from wavegen.files.analytic import as_complex
from wavegen.files.datatypes import (
    CF32_LE,
    CF64_LE,
    CI16_LE,
    CI24_LE,
    CI32_LE,
    RF32_LE,
    RI16_LE,
    RI24_LE,
    Codes,
    Datatype,
    real_of,
)
from wavegen.files.digest import sha512_of
from wavegen.files.faults import told
from wavegen.files.format import (
    FileFacts,
    ReadHints,
    Recording,
    Writer,
    check_facts,
    refuse_other_datatype,
    refuse_real_pair,
    told_channel,
    told_rate,
    told_word,
)
from wavegen.files.interleaved import CodedSamples, SampleCount, refuse_misfit, shorter
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
        "ri16_le": RI16_LE,
        "ri24_le": RI24_LE,
        "rf32_le": RF32_LE,
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
            A rate that is no whole number of Hz or too high, another datatype, or two real
            channels (they would read as I and Q).

        Notes
        -----
        The header holds the rate, and the rate times the bytes of a sample, in 32 bits each;
        the library takes rates up to ``2^31 - 1``.
        """
        check_facts(self, facts, where)
        refuse_real_pair(facts, where)
        rate = facts.sample_rate_hz
        row_bytes = facts.datatype.bytes_per_sample * facts.n_channels
        most = min((1 << 31) - 1, ((1 << 32) - 1) // row_bytes)
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
        n_bytes = facts.n_samples * facts.datatype.bytes_per_sample * facts.n_channels
        return WavWriter(
            drafts[0], facts, container="RF64" if n_bytes > self._riff_limit else "WAV"
        )

    def detect(self, path: Path, head: bytes) -> bool:
        """Return whether the first bytes are those of a WAVE file, whatever its name."""
        return is_wave(head)

    def read(self, path: Path, hints: ReadHints) -> Recording:
        """Open a WAV file: of two channels, of one (real), or one pair of several.

        Raises
        ------
        FileError
            Truncated or with lengths that lie, an odd number of channels, a coding that is not
            read, or empty.
        """
        riff = walk(path)
        with _opened(path) as file:
            channels, rate, frames = file.channels, file.samplerate, file.frames
            subtype, title, comment = file.subtype, file.title, file.comment
        _refuse_channels(path, channels)
        coding = _SUBTYPES.get(subtype)
        if coding is None:
            raise FileError(
                where=str(path),
                problem=f"is coded as {subtype}",
                allowed=", ".join(_SUBTYPES),
                remedy="Convert it to 16-bit or 32-bit float WAV.",
            )
        stated = real_of(coding) if channels == 1 else coding
        refuse_other_datatype(path, stated, hints)
        datatype = told_word(stated, bits=hints.bits, align=hints.align, where=str(path))
        n_channels = max(channels // 2, 1)
        channel = told_channel(path, n_channels=n_channels, hints=hints)
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
            datatype=datatype,
            channel=channel,
            gain=1.0 if hints.full_scale is None else datatype.full_scale / hints.full_scale,
        )
        recording = Recording(
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
            n_channels=n_channels,
            channel=channel,
        )
        return as_complex(recording)


def _refuse_channels(path: Path, channels: int) -> None:
    if channels == 1 or (channels >= 2 and channels % 2 == 0):
        return
    raise FileError(
        where=str(path),
        problem=f"has {channels} channels",
        allowed="one (a real signal), two (I on the left, Q on the right), or pairs of I and Q",
        remedy="Save the two channels that hold I and Q.",
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
class WavSamples(CodedSamples):
    """One signal of a WAV file, full scale 1.0.

    Parameters
    ----------
    subtype : str
        The library's name of the coding.
    channel : int
        Which pair of I and Q.
    """

    subtype: str
    channel: int = 0

    def codes(self, start: int, stop: int) -> Codes:
        """Return the codes of samples ``[start, stop)``, shape (stop - start, n_rails).

        Raises
        ------
        FileError
            As :meth:`compute`, or a code that is no word of the datatype.
        """
        with _opened(self.path) as file:
            if file.frames < stop:
                raise shorter(self.path, file.frames, self.n_samples)
            file.seek(start)
            frames: Codes = file.read(
                stop - start, dtype=_HELD.get(self.subtype, "float64"), always_2d=True
            )
        if frames.shape[0] != stop - start:
            raise shorter(self.path, start + frames.shape[0], self.n_samples)
        n_rails = self.datatype.n_rails
        codes = frames[:, self.channel * n_rails :][:, :n_rails]
        if self.subtype == "PCM_24":
            codes >>= 8  # the library hands 24 bits over at the left of 32
        refuse_misfit(self.path, codes, self.datatype, start)
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
        self._count = SampleCount(draft, facts.n_samples, n_columns=facts.n_columns)
        self._sha512 = ""
        self._is_24_bits = facts.datatype.n_bits == 24
        whole = facts.datatype.container
        subtype = next(name for name, item in _SUBTYPES.items() if whole in {item, real_of(item)})
        with told(draft), self._library_told():
            self._file = soundfile.SoundFile(
                draft,
                "w",
                samplerate=int(facts.sample_rate_hz),
                channels=facts.n_columns,
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
        """Append codes, shape (n, n_columns)."""
        refuse_misfit(self._path, codes, self._datatype, self._count.have)
        self._count.add(codes)
        block = np.ascontiguousarray(codes, self._datatype.dtype)
        if self._is_24_bits:
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
