"""Raw interleaved I and Q without a header: the file's ending names the datatype.

``NAME.ci16_le`` holds little-endian 16-bit pairs and nothing else. Rate, level and title have
no place in such a file; on reading, the rate is always told (``--sample-rate 20MHz``), and the
datatype where the ending does not name it (``--format ci16_le``). Neither has the length of
shorter words (``--bits 12 --align left``) nor the number of channels: ``--channel`` says that
there are two. Real samples (``NAME.ri16_le``) stand one after another.
"""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path
from typing import ClassVar

from wavegen.core.errors import FileError
from wavegen.files.analytic import as_complex
from wavegen.files.datatypes import (
    CF32_LE,
    CF64_LE,
    CI8,
    CI16_BE,
    CI16_LE,
    CI32_LE,
    CU8,
    RI32_LE,
    Codes,
    Datatype,
    real_of,
)
from wavegen.files.faults import read_head
from wavegen.files.format import (
    FileFacts,
    ReadHints,
    Recording,
    Writer,
    check_facts,
    told_channel,
    told_rate,
    told_word,
)
from wavegen.files.interleaved import InterleavedWriter, open_interleaved
from wavegen.files.signatures import TEXT, is_text, signature_of

_COMPLEX = (CI16_LE, CI16_BE, CI8, CF32_LE, CF64_LE)
_WRITTEN = {item.name: item for item in (*_COMPLEX, *map(real_of, _COMPLEX))}
_READ = _WRITTEN | {item.name: item for item in (CU8, CI32_LE, RI32_LE)}


class Raw:
    """Raw interleaved files."""

    name: ClassVar[str] = "raw"
    suffixes: ClassVar[tuple[str, ...]] = tuple(f".{name}" for name in _READ)
    datatypes: ClassVar[Mapping[str, Datatype]] = _WRITTEN
    default_datatype: ClassVar[str] = "ci16_le"

    def files(self, stem: str, datatype: Datatype) -> tuple[str, ...]:
        """Return the name of the file: the stem with the datatype as its ending."""
        return (f"{stem}.{datatype.name}",)

    def check(self, facts: FileFacts, where: str) -> None:
        """Refuse a datatype that is not written."""
        check_facts(self, facts, where)

    def writer(self, drafts: tuple[Path, ...], facts: FileFacts) -> Writer:
        """Open the file."""
        return RawWriter(drafts[0], facts)

    def detect(self, path: Path, head: bytes) -> bool:
        """Return whether the ending names a datatype and nothing says otherwise."""
        return path.suffix.lower() in self.suffixes and signature_of(head) is None

    def read(self, path: Path, hints: ReadHints) -> Recording:
        """Open a file whose datatype is told, or named by its ending.

        Raises
        ------
        FileError
            No datatype, no sample rate, empty, or not whole samples.
        """
        datatype = told_word(
            _datatype_of(path, hints), bits=hints.bits, align=hints.align, where=str(path)
        )
        n_channels = 1 if hints.channel is None else 2
        channel = told_channel(path, n_channels=n_channels, hints=hints)
        sample_rate_hz, _ = told_rate(path, stated_hz=None, hints=hints)
        signal = open_interleaved(
            path,
            datatype=datatype,
            sample_rate_hz=sample_rate_hz,
            full_scale=hints.full_scale,
            n_channels=n_channels,
            channel=channel,
        )
        head = read_head(path)
        known = signature_of(head) or (TEXT if is_text(head) else None)
        doubt = f"{path.name} starts like {known.what}; it is read as bare samples" if known else ""
        recording = Recording(
            path=path,
            files=(path,),
            format=self.name,
            signal=signal,
            sample_rate_hz=sample_rate_hz,
            n_samples=signal.n_samples,
            datatype=datatype,
            reference_level_dbm=hints.reference_level_dbm,
            warnings=(doubt,) if doubt else (),
            n_channels=n_channels,
            channel=channel,
        )
        return as_complex(recording)


def _datatype_of(path: Path, hints: ReadHints) -> Datatype:
    told = hints.datatype or (hints.format if hints.format in _READ else None)
    wanted = told or path.suffix.lower().removeprefix(".")
    if wanted in _READ:
        return _READ[wanted]
    raise FileError(
        where=str(path),
        problem=f"raw samples cannot be {told!r}" if told else "its name does not say the datatype",
        allowed=", ".join(_READ),
        remedy="Name it, such as --format ci16_le --sample-rate 20MHz.",
    )


class RawWriter:
    """Writes one raw file, or one with nothing but a header before its samples.

    Parameters
    ----------
    draft : Path
        The (temporary) file.
    facts : FileFacts
        What will come.
    header : bytes
        What comes first.
    """

    def __init__(self, draft: Path, facts: FileFacts, *, header: bytes = b"") -> None:
        self._data = InterleavedWriter(
            draft,
            datatype=facts.datatype,
            n_samples=facts.n_samples,
            n_channels=facts.n_channels,
            header=header,
        )
        self._sha512 = ""

    def write(self, codes: Codes) -> None:
        """Append codes, shape (n, n_columns)."""
        self._data.write(codes)

    def finish(self, statistics: Mapping[str, object] | None = None) -> None:
        """Close the file; it has no room for statistics."""
        self._sha512 = self._data.complete()

    def close(self) -> None:
        """Close the file as it is."""
        self._data.close()

    @property
    def sha512(self) -> str:
        """Hex digest of the file's bytes."""
        return self._sha512
