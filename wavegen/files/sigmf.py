"""SigMF pairs: ``NAME.sigmf-data`` with the samples, ``NAME.sigmf-meta`` with what they are.

Metadata are built and checked by the ``sigmf`` library; where its schema is looser than the text
of the specification (it does not end the datatype's grammar), this module keeps to the text.
Samples go through :mod:`wavegen.files.interleaved`. Source of the rules: SigMF 1.2.5.
"""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path
from typing import ClassVar

from wavegen.core.errors import FileError
from wavegen.core.units import format_hz
from wavegen.files.analytic import as_complex
from wavegen.files.datatypes import (
    CF32_LE,
    CF64_LE,
    CI8,
    CI16_BE,
    CI16_LE,
    Codes,
    Datatype,
    real_of,
)
from wavegen.files.faults import os_fault, regular_size, told
from wavegen.files.format import (
    FileFacts,
    ReadHints,
    Recording,
    Writer,
    check_facts,
    refuse_other_datatype,
    told_channel,
    told_rate,
    told_word,
)
from wavegen.files.interleaved import InterleavedWriter, open_interleaved
from wavegen.files.sigmf_meta import Metadata, meta_text, read_meta
from wavegen.files.strict_json import finite_json

META, DATA = ".sigmf-meta", ".sigmf-data"
_COMPLEX = (CI16_LE, CI16_BE, CI8, CF32_LE, CF64_LE)
WRITTEN = {item.name: item for item in (*_COMPLEX, *map(real_of, _COMPLEX))}
"""What is written, by the names of the specification."""

_MOST_HZ = 10**12
"""Highest ``core:sample_rate``."""


class Sigmf:
    """SigMF recordings of one channel or two, as a pair of files."""

    name: ClassVar[str] = "sigmf"
    suffixes: ClassVar[tuple[str, ...]] = (DATA, META)
    datatypes: ClassVar[Mapping[str, Datatype]] = WRITTEN
    default_datatype: ClassVar[str] = "ci16_le"

    def files(self, stem: str, datatype: Datatype) -> tuple[str, ...]:
        """Return the names of the pair, the data file first."""
        return (stem + DATA, stem + META)

    def check(self, facts: FileFacts, where: str) -> None:
        """Refuse what the metadata cannot hold.

        Raises
        ------
        FileError
            A datatype that is not written, a rate above 1 THz, or facts that are no JSON.
        """
        check_facts(self, facts, where)
        check_metadata(facts, where)

    def writer(self, drafts: tuple[Path, ...], facts: FileFacts) -> Writer:
        """Open the pair: the data file first."""
        self.check(facts, drafts[0].name)
        return SigmfWriter(drafts[0], drafts[1], facts)

    def detect(self, path: Path, head: bytes) -> bool:
        """Return whether the name is that of one of the pair."""
        return path.suffix.lower() in self.suffixes

    def read(self, path: Path, hints: ReadHints) -> Recording:
        """Open a pair by either of its files, or by their common name.

        Raises
        ------
        FileError
            Either is missing or damaged, or holds what is not read: bytes that are no samples,
            no data, or an extension that must be understood. Or there are several channels and
            none is named.
        """
        meta_path = meta_beside(path)
        meta = read_meta(meta_path)
        refuse_other_datatype(meta_path, meta.datatype, hints)
        data_path = meta_path.parent / (meta.dataset or meta_path.name[: -len(META)] + DATA)
        _refuse_missing_data(data_path, meta_path)
        return recording_of(
            meta,
            hints,
            format_name=self.name,
            meta_path=meta_path,
            data_path=data_path,
            files=(data_path, meta_path),
        )


def recording_of(
    meta: Metadata,
    hints: ReadHints,
    *,
    format_name: str,
    meta_path: Path,
    data_path: Path,
    files: tuple[Path, ...],
    data_start: int = 0,
    data_bytes: int | None = None,
) -> Recording:
    """Return the recording that metadata and a data file make.

    Parameters
    ----------
    meta : Metadata
        As read.
    hints : ReadHints
        What the user says about it.
    format_name : str
        Whose recording it is.
    meta_path, data_path : Path
        For messages, and the file that holds the samples.
    files : tuple of Path
        Every file of the recording.
    data_start, data_bytes : int, int or None
        Where in ``data_path`` the samples lie.

    Raises
    ------
    FileError
        As :meth:`Sigmf.read`.
    """
    bits, align = (hints.bits, hints.align) if hints.bits else (meta.word_bits, meta.word_align)
    datatype = told_word(meta.datatype, bits=bits, align=align, where=str(meta_path))
    channel = told_channel(meta_path, n_channels=meta.n_channels, hints=hints)
    sample_rate_hz, warnings = told_rate(meta_path, stated_hz=meta.sample_rate_hz, hints=hints)
    signal = open_interleaved(
        data_path,
        datatype=datatype,
        sample_rate_hz=sample_rate_hz,
        full_scale=hints.full_scale,
        n_channels=meta.n_channels,
        channel=channel,
        data_start=data_start,
        data_bytes=data_bytes,
    )
    recording = Recording(
        path=data_path,
        files=files,
        format=format_name,
        signal=signal,
        sample_rate_hz=sample_rate_hz,
        n_samples=signal.n_samples,
        datatype=datatype,
        title=meta.title,
        description=meta.description,
        centre_frequency_hz=meta.centre_frequency_hz,
        reference_level_dbm=hints.reference_level_dbm,
        annotations=meta.annotations,
        sha512=meta.sha512,
        statistics=meta.statistics,
        warnings=warnings + meta.warnings + _beyond(meta, data_path, signal.n_samples),
        n_channels=meta.n_channels,
        channel=channel,
        data_start=data_start,
        data_bytes=data_bytes,
    )
    return as_complex(recording)


def check_metadata(facts: FileFacts, where: str) -> None:
    """Refuse facts that SigMF metadata cannot hold.

    Raises
    ------
    FileError
        At ``where``: a rate above 1 THz, or facts that are no JSON.
    """
    if facts.sample_rate_hz > _MOST_HZ:
        raise FileError(
            where=where,
            problem=f"SigMF cannot hold {format_hz(facts.sample_rate_hz)}",
            allowed=f"up to {format_hz(_MOST_HZ)}",
            remedy="Lower the sample rate.",
        )
    refuse_no_json(facts.extra, where)


def meta_beside(path: Path) -> Path:
    """Return the metadata file that belongs to either file of a pair, or to their common name.

    Examples
    --------
    >>> meta_beside(Path("run7.sigmf-data")).name, meta_beside(Path("run7.1")).name
    ('run7.sigmf-meta', 'run7.1.sigmf-meta')
    """
    if path.suffix.lower() == META:
        return path
    if path.suffix.lower() == DATA:
        return path.with_suffix(META)
    return path.with_name(path.name + META)


def _refuse_missing_data(data: Path, meta: Path) -> None:
    try:
        data.stat()
    except FileNotFoundError as error:
        raise FileError(
            where=str(data),
            problem=f"is missing beside {meta.name}",
            allowed="both files of a SigMF pair in one folder",
            remedy="Copy the data file too.",
        ) from error
    except OSError as error:
        raise os_fault(data, error) from error
    regular_size(data)


def _beyond(meta: Metadata, data: Path, n_samples: int) -> tuple[str, ...]:
    """Return a warning if the metadata speak of samples that are not there."""
    last = max(
        [item.start_sample + (item.n_samples or 0) for item in meta.annotations]
        + [start + 1 for start in meta.capture_starts],
        default=0,
    )
    first = min([item.start_sample for item in meta.annotations], default=0)
    if last <= n_samples and first >= 0:
        return ()
    text = (
        f"{data.name} has {n_samples} samples, its metadata speak of samples "
        f"{min(first, 0)} to {max(last, n_samples) - 1}: it may have been cut"
    )
    return (text,)


def refuse_no_json(value: Mapping[str, object], where: str) -> None:
    """Refuse what JSON cannot hold.

    Raises
    ------
    FileError
        At ``where``.
    """
    reason = finite_json(dict(value))
    if reason is not None:
        raise FileError(
            where=where,
            problem=f"facts cannot be written: {reason}",
            allowed="text, finite numbers, lists and objects of them",
            remedy="Leave out what has no value.",
        )


class SigmfWriter:
    """Writes one pair.

    Parameters
    ----------
    data, meta : Path
        The (temporary) files.
    facts : FileFacts
        What will come.
    """

    def __init__(self, data: Path, meta: Path, facts: FileFacts) -> None:
        self._meta = meta
        self._facts = facts
        self._data = InterleavedWriter(
            data,
            datatype=facts.datatype,
            n_samples=facts.n_samples,
            n_channels=facts.n_channels,
        )
        self._sha512 = ""

    def write(self, codes: Codes) -> None:
        """Append codes, shape (n, n_columns)."""
        self._data.write(codes)

    def finish(self, statistics: Mapping[str, object] | None = None) -> None:
        """Close the data file, then write the metadata with its hash and the statistics.

        Raises
        ------
        FileError
            Samples are missing, statistics are no JSON, or the disk refuses.
        """
        refuse_no_json(statistics or {}, self._meta.name)
        self._sha512 = self._data.complete()
        text = meta_text(self._facts, sha512=self._sha512, statistics=statistics)
        with told(self._meta):
            self._meta.write_text(text, encoding="utf-8", newline="\n")

    def close(self) -> None:
        """Close the data file as it is."""
        self._data.close()

    @property
    def sha512(self) -> str:
        """Hex digest of the data file's bytes."""
        return self._sha512
