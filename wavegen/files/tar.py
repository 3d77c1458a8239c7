"""The members of a tar archive, walked without trusting any length or name in it."""

from __future__ import annotations

import tarfile
from dataclasses import dataclass
from pathlib import Path
from typing import BinaryIO

from wavegen.core.errors import FileError
from wavegen.files.faults import regular_size, told

BLOCK = 512
"""Headers and contents start at multiples of this many bytes."""

_MOST_MEMBERS = 1000
_MOST_EXTRA = 1 << 16
"""Bytes of an extended header: it holds names and numbers."""

_NUL = bytes(BLOCK)
_LINKS = {tarfile.SYMTYPE: "symbolic link", tarfile.LNKTYPE: "hard link"}
_NO_FILES = _LINKS | {
    tarfile.CHRTYPE: "device",
    tarfile.BLKTYPE: "device",
    tarfile.FIFOTYPE: "pipe",
    tarfile.GNUTYPE_SPARSE: "sparse file",
    tarfile.CONTTYPE: "contiguous file",
}


@dataclass(frozen=True, slots=True, kw_only=True)
class Entry:
    """One file or folder inside.

    Parameters
    ----------
    name : str
        Relative path with ``/``; it cannot leave the archive.
    is_folder : bool
        Folders have no content.
    start, size : int
        Where in the archive its content lies, bytes.
    """

    name: str
    is_folder: bool
    start: int
    size: int


def entries(path: Path) -> tuple[Entry, ...]:
    """Return the files and folders of an uncompressed tar archive, in order.

    Parameters
    ----------
    path : Path
        The archive.

    Raises
    ------
    FileError
        No tar archive, truncated, or with members that are no plain files or folders, or whose
        names are absolute, climb out, or come twice.

    Notes
    -----
    Source: POSIX.1-2001, ``pax`` interchange format and ``ustar``; single headers are decoded,
    and their checksums checked, by Python's ``tarfile.TarInfo.frombuf``. Lengths are compared
    with the file before anything is read.
    """
    size = regular_size(path)
    found: list[Entry] = []
    extra: dict[str, str] = {}
    position = 0
    with told(path), path.open("rb") as file:
        while True:
            file.seek(position)
            block = file.read(BLOCK)
            if len(block) < BLOCK or block == _NUL:
                break
            if len(found) == _MOST_MEMBERS:
                raise _fault(path, "has too many members", f"up to {_MOST_MEMBERS}")
            header = _header(path, block, position)
            length = _length(path, header, extra)
            start = position + BLOCK
            if length < 0 or start + length > size:
                problem = f"its member {_shown(header.name)} states {length} bytes, "
                problem += f"{size - start} are left"
                raise _fault(path, problem, "members that end within the archive")
            position = start + -(-length // BLOCK) * BLOCK
            if header.type in {tarfile.XHDTYPE, tarfile.XGLTYPE, tarfile.GNUTYPE_LONGNAME}:
                extra |= _extra(path, file, header, length)
                continue
            found.append(_entry(path, header, extra, start, length))
            extra = {}
    if not found:
        raise _fault(path, "holds nothing, or is no tar archive", "a tar archive of a recording")
    names = [entry.name.casefold() for entry in found]
    if len(set(names)) < len(names):
        twice = next(name for name in names if names.count(name) > 1)
        raise _fault(path, f"has {_shown(twice)} twice", "every member once")
    return tuple(found)


def _header(path: Path, block: bytes, position: int) -> tarfile.TarInfo:
    try:
        return tarfile.TarInfo.frombuf(block, "utf-8", "surrogateescape")
    except (tarfile.HeaderError, ValueError) as error:
        problem = f"byte {position} starts no tar header: {error}"
        raise _fault(path, problem, "uncompressed tar archives (POSIX.1-2001)") from error


def _length(path: Path, header: tarfile.TarInfo, extra: dict[str, str]) -> int:
    if header.type in {tarfile.XHDTYPE, tarfile.XGLTYPE, tarfile.GNUTYPE_LONGNAME}:
        return header.size
    if header.type == tarfile.DIRTYPE:
        return 0
    stated = extra.get("size")
    if stated is None:
        return header.size
    if not (stated.isascii() and stated.isdigit() and len(stated) < 19):
        raise _fault(path, f"states a size of {_shown(stated)}", "sizes in bytes")
    return int(stated)


def _extra(path: Path, file: BinaryIO, header: tarfile.TarInfo, length: int) -> dict[str, str]:
    """Return what an extended header says of the next member."""
    if length > _MOST_EXTRA:
        problem = f"has an extended header of {length} bytes"
        raise _fault(path, problem, f"up to {_MOST_EXTRA} bytes")
    content = file.read(length)
    if header.type == tarfile.GNUTYPE_LONGNAME:
        return {"path": content.rstrip(b"\0").decode("utf-8", "surrogateescape")}
    found = _records(path, content)
    if any(key.startswith("GNU.sparse") for key in found):
        raise _fault(path, "holds a sparse file", "files stored whole")
    if header.type == tarfile.XGLTYPE:
        if {"path", "size", "linkpath"} & found.keys():
            raise _fault(path, "gives all members one name or size", "a name for each member")
        return {}
    return found


def _records(path: Path, content: bytes) -> dict[str, str]:
    """Return pax records: ``LENGTH KEY=VALUE`` and a line end, LENGTH of the whole record."""
    found: dict[str, str] = {}
    position = 0
    while position < len(content):
        digits, _, _ = content[position : position + 7].partition(b" ")
        length = int(digits) if digits.isdigit() else 0
        record = content[position : position + length]
        key, equals, value = record[len(digits) + 1 : -1].partition(b"=")
        if length < 5 or len(record) < length or not equals or record[-1:] != b"\n":
            raise _fault(path, "has a damaged extended header", "pax records (POSIX.1-2001)")
        found[key.decode("utf-8", "replace")] = value.decode("utf-8", "surrogateescape")
        position += length
    return found


def _entry(
    path: Path, header: tarfile.TarInfo, extra: dict[str, str], start: int, length: int
) -> Entry:
    name = extra.get("path", header.name)
    kind = _NO_FILES.get(header.type)
    if kind is not None:
        raise _fault(path, f"its member {_shown(name)} is a {kind}", "plain files and folders")
    if header.type not in {tarfile.REGTYPE, tarfile.AREGTYPE, tarfile.DIRTYPE}:
        problem = f"its member {_shown(name)} is of type {header.type!r}"
        raise _fault(path, problem, "plain files and folders")
    is_folder = header.type == tarfile.DIRTYPE or name.endswith("/")
    parts = name.removesuffix("/").removeprefix("./").split("/")
    is_bad = (
        name.startswith("/")
        or any(part in {"", ".."} for part in parts)
        or "\\" in name
        or ":" in name
        or not name.isprintable()
    )
    if is_bad and name not in {".", "./"}:
        problem = f"its member {_shown(name)} could leave the archive's folder"
        raise _fault(path, problem, "relative names without ..")
    return Entry(name="/".join(parts), is_folder=is_folder, start=start, size=length)


def header_of(name: str, *, size: int = 0, is_folder: bool = False) -> bytes:
    """Return the header of a member to be written, the same at any time and for any user.

    Parameters
    ----------
    name : str
        Relative path with ``/``.
    size : int
        Bytes of its content; from 8 GiB on an extended header holds them.
    is_folder : bool
        Whether it is a folder.

    Returns
    -------
    bytes
        Whole blocks.
    """
    info = tarfile.TarInfo(name)
    info.size = size
    info.type = tarfile.DIRTYPE if is_folder else tarfile.REGTYPE
    info.mode = 0o755 if is_folder else 0o644
    return info.tobuf(tarfile.PAX_FORMAT, "utf-8", "strict")


def padding(size: int) -> bytes:
    """Return the zeros between a content and the next header."""
    return bytes(-size % BLOCK)


END = bytes(2 * BLOCK)
"""What closes an archive."""


def _shown(name: str) -> str:
    text = ascii(name)
    return text if len(text) <= 60 else text[:57] + "..."


def _fault(path: Path, problem: str, allowed: str) -> FileError:
    return FileError(
        where=str(path),
        problem=problem,
        allowed=allowed,
        remedy="Unpack it with care and name the recording inside, or copy it again.",
    )
