"""The chunks of a RIFF or RF64 file, walked without trusting any length in it."""

from __future__ import annotations

import struct
from dataclasses import dataclass
from pathlib import Path
from typing import BinaryIO

from wavegen.core.errors import FileError
from wavegen.files.faults import regular_size, told

_MOST_CHUNKS = 1000
"""Real files hold a handful; a walk over millions of empty ones would take hours."""

_FINISH = "Check that the recording and the copy finished."


@dataclass(frozen=True, slots=True, kw_only=True)
class Chunk:
    """One chunk of a file.

    Parameters
    ----------
    name : str
        Its four letters.
    offset : int
        Where its content starts, bytes.
    size : int
        Length of its content, bytes.
    """

    name: str
    offset: int
    size: int


@dataclass(frozen=True, slots=True, kw_only=True)
class Riff:
    """What the walk found.

    Parameters
    ----------
    is_rf64 : bool
        Whether sizes come from a ``ds64`` chunk.
    chunks : tuple of Chunk
        In the order of the file.
    n_trailing : int
        Bytes after the end that the header states.
    """

    is_rf64: bool
    chunks: tuple[Chunk, ...]
    n_trailing: int

    def find(self, name: str) -> Chunk | None:
        """Return the first chunk of a name, or None."""
        return next((chunk for chunk in self.chunks if chunk.name == name), None)


def is_wave(head: bytes) -> bool:
    r"""Return whether the first 12 bytes are those of a RIFF or RF64 WAVE file.

    Examples
    --------
    >>> is_wave(b"RF64\xff\xff\xff\xffWAVEds64"), is_wave(b"RIFF....AVI ")
    (True, False)
    """
    return head[:4] in {b"RIFF", b"RF64"} and head[8:12] == b"WAVE"


def walk(path: Path) -> Riff:
    """Return the chunks of a WAVE file whose lengths agree with the file.

    Parameters
    ----------
    path : Path
        The file.

    Raises
    ------
    FileError
        Not such a file, truncated, without ``fmt`` or ``data``, or with lengths that reach
        beyond its end.

    Notes
    -----
    Sources: Multimedia Programming Interface and Data Specifications 1.0 (RIFF, WAVE);
    EBU Tech 3306 (RF64 and ``ds64``).
    """
    size = regular_size(path)
    with told(path), path.open("rb") as file:
        head = file.read(12)
        if not is_wave(head):
            raise _fault(path, "does not start with RIFF or RF64 and WAVE", "WAV files")
        is_rf64 = head[:4] == b"RF64"
        stated = int.from_bytes(head[4:8], "little")
        sizes = _long_sizes(path, file) if is_rf64 else {}
        end = 8 + sizes.get("riff", stated)
        if end > size:
            problem = f"its header states {end} bytes, the file has {size}"
            raise _fault(path, problem, "files as long as their header says")
        chunks = _chunks(path, file, min(end, size), sizes)
    found = Riff(is_rf64=is_rf64, chunks=chunks, n_trailing=size - end)
    for name in ("fmt ", "data"):
        if found.find(name) is None:
            raise _fault(path, f"has no {name.strip()} chunk", "WAV files with fmt and data chunks")
    return found


def _long_sizes(path: Path, file: BinaryIO) -> dict[str, int]:
    block = file.read(36)
    if len(block) < 36 or block[:4] != b"ds64":
        raise _fault(path, "is RF64 without a ds64 chunk", "RF64 files with their 64-bit lengths")
    length, riff, data = struct.unpack_from("<IQQ", block, 4)
    file.seek(12)
    if length < 28:
        raise _fault(path, f"has a ds64 chunk of {length} bytes", "28 bytes or more")
    return {"riff": riff, "data": data}


def _chunks(path: Path, file: BinaryIO, end: int, sizes: dict[str, int]) -> tuple[Chunk, ...]:
    chunks: list[Chunk] = []
    position = 12
    while position + 8 <= end:
        if len(chunks) == _MOST_CHUNKS:
            raise _fault(path, "has too many chunks", f"up to {_MOST_CHUNKS}")
        file.seek(position)
        head = file.read(8)
        name = head[:4].decode("latin-1")
        length = int.from_bytes(head[4:], "little")
        if name == "data" and length == 0xFFFFFFFF:
            length = sizes.get("data", length)
        if position + 8 + length > end:
            left = end - position - 8
            problem = f"its {name.strip()!r} chunk states {length} bytes, {left} are left"
            raise _fault(path, problem, "chunks that end within the file")
        chunks.append(Chunk(name=name, offset=position + 8, size=length))
        position += 8 + length + length % 2
    return tuple(chunks)


def _fault(path: Path, problem: str, allowed: str) -> FileError:
    return FileError(where=str(path), problem=problem, allowed=allowed, remedy=_FINISH)
