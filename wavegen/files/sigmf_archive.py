"""SigMF archives: one recording in an uncompressed tar file, written and read in place.

``NAME.sigmf`` holds the folder ``NAME`` with ``NAME.sigmf-data`` and ``NAME.sigmf-meta``. Samples
are read at their place inside; nothing is unpacked. Source: SigMF 1.2.5, "Archive".
"""

from __future__ import annotations

import hashlib
from collections.abc import Mapping
from dataclasses import replace
from pathlib import Path, PurePosixPath
from typing import ClassVar

import numpy as np

from wavegen.core.errors import FileError
from wavegen.files.atomic import final_name
from wavegen.files.datatypes import Codes, Datatype
from wavegen.files.faults import read_head, told
from wavegen.files.format import (
    FileFacts,
    ReadHints,
    Recording,
    Writer,
    check_facts,
    refuse_other_datatype,
)
from wavegen.files.interleaved import SampleCount, refuse_misfit
from wavegen.files.sigmf import DATA, META, WRITTEN, check_metadata, recording_of, refuse_no_json
from wavegen.files.sigmf_meta import meta_text, parsed_meta
from wavegen.files.signatures import signature_of
from wavegen.files.strict_json import MOST_BYTES, parse_json
from wavegen.files.tar import END, Entry, entries, header_of, padding


class SigmfArchive:
    """SigMF recordings of one channel or two, in one file."""

    name: ClassVar[str] = "sigmf_archive"
    suffixes: ClassVar[tuple[str, ...]] = (".sigmf",)
    datatypes: ClassVar[Mapping[str, Datatype]] = WRITTEN
    default_datatype: ClassVar[str] = "ci16_le"

    def files(self, stem: str, datatype: Datatype) -> tuple[str, ...]:
        """Return the name of the archive."""
        return (f"{stem}.sigmf",)

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
        """Open the archive and write what comes before the samples."""
        self.check(facts, drafts[0].name)
        return SigmfArchiveWriter(drafts[0], facts)

    def detect(self, path: Path, head: bytes) -> bool:
        """Return whether the name is that of an archive."""
        return path.suffix.lower() in self.suffixes

    def read(self, path: Path, hints: ReadHints) -> Recording:
        """Open the one recording in an archive, in place.

        Raises
        ------
        FileError
            Compressed, damaged or hostile; no recording inside, or several; or what a pair of
            files would be refused for.
        """
        _refuse_compressed(path)
        found = entries(path)
        meta_entry, data_entry = _the_recording(path, found)
        meta_path = path / meta_entry.name
        if meta_entry.size > MOST_BYTES:
            raise _fault(
                meta_path, f"has {meta_entry.size / 1e6:.1f} MB", f"{MOST_BYTES / 1e6:.0f} MB"
            )
        with told(path), path.open("rb") as file:
            file.seek(meta_entry.start)
            content = file.read(meta_entry.size)
        meta = parsed_meta(meta_path, parse_json(meta_path, content))
        refuse_other_datatype(meta_path, meta.datatype, hints)
        if meta.dataset is not None and meta.dataset != PurePosixPath(data_entry.name).name:
            problem = f"core:dataset is {meta.dataset[:60]!r}"
            raise _fault(meta_path, problem, "the data file in the archive")
        others = len([item for item in found if not item.is_folder]) - 2
        recording = recording_of(
            meta,
            hints,
            format_name=self.name,
            meta_path=meta_path,
            data_path=path,
            files=(path,),
            data_start=data_entry.start,
            data_bytes=data_entry.size,
        )
        if not others:
            return recording
        text = f"{path.name} holds {others} more files; left out"
        return replace(recording, warnings=(*recording.warnings, text))


def _refuse_compressed(path: Path) -> None:
    known = signature_of(read_head(path))
    if known is not None and "tar" not in known.what.split():
        raise FileError(
            where=str(path),
            problem=f"is {known.what}, no uncompressed tar archive",
            allowed="SigMF archives: uncompressed tar",
            remedy=known.remedy,
        )


def _the_recording(path: Path, found: tuple[Entry, ...]) -> tuple[Entry, Entry]:
    """Return the members that hold metadata and samples of the only recording."""
    files = [item for item in found if not item.is_folder]
    real = [item for item in files if not PurePosixPath(item.name).name.startswith("._")]
    metas = [item for item in real if item.name.lower().endswith(META)]
    datas = [item for item in real if item.name.lower().endswith(DATA)]
    if len(metas) != 1:
        names = ", ".join(item.name[:60] for item in metas[:4])
        problem = f"holds {len(metas)} recordings: {names}" if metas else "holds no metadata"
        raise _fault(path, problem, "archives of one recording")
    stem = metas[0].name[: -len(META)]
    own = [item for item in datas if item.name[: -len(DATA)] == stem]
    if len(own) != 1 or len(datas) != 1:
        problem = f"holds {len(datas)} data files, none or others beside {metas[0].name[:60]}"
        raise _fault(path, problem, "one data file of the metadata's name")
    return metas[0], own[0]


def _fault(path: Path, problem: str, allowed: str) -> FileError:
    return FileError(
        where=str(path),
        problem=problem,
        allowed=allowed,
        remedy="Unpack the archive and name the recording inside.",
    )


class SigmfArchiveWriter:
    """Writes one archive: folder, samples as they come, then metadata.

    Parameters
    ----------
    draft : Path
        The (temporary) file.
    facts : FileFacts
        What will come.
    """

    def __init__(self, draft: Path, facts: FileFacts) -> None:
        self._path = draft
        self._facts = facts
        self._stem = final_name(draft).removesuffix(".sigmf")
        self._count = SampleCount(draft, facts.n_samples, n_columns=facts.n_columns)
        self._all = hashlib.sha512()
        self._data = hashlib.sha512()
        self._size = facts.n_samples * facts.datatype.bytes_per_sample * facts.n_channels
        self._sha512 = ""
        with told(draft):
            self._file = draft.open("wb", buffering=0)
        self._append(header_of(self._stem, is_folder=True))
        self._append(header_of(f"{self._stem}/{self._stem}{DATA}", size=self._size))

    def _append(self, content: bytes | memoryview) -> None:
        block = memoryview(content)
        self._all.update(block)
        with told(self._path):
            while block.nbytes:  # an unbuffered write may take a part only
                block = block[self._file.write(block) :]

    def write(self, codes: Codes) -> None:
        """Append codes, shape (n, n_columns)."""
        refuse_misfit(self._path, codes, self._facts.datatype, self._count.have)
        self._count.add(codes)
        contiguous = np.ascontiguousarray(codes, self._facts.datatype.dtype)
        block = contiguous.view(np.uint8).reshape(-1).data
        self._data.update(block)
        self._append(block)

    def finish(self, statistics: Mapping[str, object] | None = None) -> None:
        """Write the metadata with the hash of the samples and the statistics, and close.

        Raises
        ------
        FileError
            Samples are missing, statistics are no JSON, or the disk refuses.
        """
        refuse_no_json(statistics or {}, self._path.name)
        self._count.check_complete()
        text = meta_text(self._facts, sha512=self._data.hexdigest(), statistics=statistics)
        content = text.encode()
        self._append(padding(self._size))
        self._append(header_of(f"{self._stem}/{self._stem}{META}", size=len(content)))
        self._append(content + padding(len(content)) + END)
        self.close()
        self._sha512 = self._all.hexdigest()

    def close(self) -> None:
        """Close the file as it is."""
        with told(self._path):
            self._file.close()

    @property
    def sha512(self) -> str:
        """Hex digest of the archive's bytes."""
        return self._sha512
