"""The arrays in a MAT file of version 5, found and read without trusting any length in it.

The usual library reads only whole arrays, and crashed with a segmentation fault on a file with
one byte changed; hence this reader of numeric matrices, of which it is the referee in the tests.
"""

from __future__ import annotations

import math
import zlib
from dataclasses import dataclass
from functools import lru_cache
from pathlib import Path
from typing import Any, BinaryIO

import numpy as np
from numpy.typing import NDArray

from wavegen.core.errors import FileError
from wavegen.files.faults import regular_size, told

HEADER_BYTES = 128
MOST_UNPACKED = 850_000_000
"""Bytes that a compressed array may unpack to: 5e7 complex doubles, held in memory."""

_COMPRESSED, _MATRIX = 15, 14
_MOST_VARIABLES = 1000
_HEAD = 4096
"""Bytes at the start of a matrix that are looked at: flags, sizes and name need far fewer."""

_STORED = {1: "i1", 2: "u1", 3: "i2", 4: "u2", 5: "i4", 6: "u4", 7: "f4", 9: "f8"}
"""Types in which numbers are stored."""

_CLASSES = {
    6: "double",
    7: "single",
    8: "int8",
    9: "uint8",
    10: "int16",
    11: "uint16",
    12: "int32",
    13: "uint32",
}
_COMPLEX_FLAG = 0x0800


@dataclass(frozen=True, slots=True, kw_only=True)
class Part:
    """Where the real or the imaginary numbers of an array stand.

    Parameters
    ----------
    rail : str
        NumPy type as stored, with its byte order; it may be narrower than the array's kind.
    start : int
        First byte: of the file, or of what the array unpacks to.
    """

    rail: str
    start: int


@dataclass(frozen=True, slots=True, kw_only=True)
class MatArray:
    """A matrix of numbers in a file.

    Parameters
    ----------
    path : Path
        The file.
    name, kind : str
        As the file says: ``iq``, ``single``.
    shape : (int, int)
        Rows and columns; columns are stored one after another.
    real : Part
    imaginary : Part or None
        None for real numbers.
    packed_at, packed_bytes, unpacked_bytes : int
        Where the compressed element stands; 0 if it is not compressed.
    """

    path: Path
    name: str
    kind: str
    shape: tuple[int, int]
    real: Part
    imaginary: Part | None
    packed_at: int = 0
    packed_bytes: int = 0
    unpacked_bytes: int = 0

    @property
    def is_complex(self) -> bool:
        """Whether the numbers are complex."""
        return self.imaginary is not None

    def column(self, part: Part, column: int, start: int, stop: int) -> NDArray[Any]:
        """Return elements ``[start, stop)`` of a column, as stored.

        Parameters
        ----------
        part : Part
            :attr:`real` or :attr:`imaginary`.
        column : int
            From 0. A single row counts as a column.
        start, stop : int
            Elements of it.

        Raises
        ------
        FileError
            The file is gone, shorter than it was, or changed.
        """
        dtype = np.dtype(part.rail)
        n_rows = self.shape[0] * self.shape[1] if 1 in self.shape else self.shape[0]
        offset = part.start + (column * n_rows + start) * dtype.itemsize
        if self.packed_bytes:
            content = _unpacked(self.path, self.packed_at, self.packed_bytes, self.unpacked_bytes)
            return np.frombuffer(content, dtype, stop - start, offset)
        with told(self.path):
            found = np.fromfile(self.path, dtype, stop - start, offset=offset)
        if found.size != stop - start:
            raise _fault(self.path, "ends before its arrays do", "files that stay as they are")
        return found


def arrays_of(path: Path) -> dict[str, MatArray]:
    """Return the matrices of numbers in a file by name; text, cells and the like are passed over.

    Parameters
    ----------
    path : Path
        A MAT file of version 5.

    Raises
    ------
    FileError
        Truncated or damaged, lengths that reach beyond the file or its own element, more than is
        read, or one name twice.

    Notes
    -----
    Source: the published description of the level 5 MAT-file format: a header of 128 bytes, then
    elements of type and length (32 bits each), padded to 8 bytes unless compressed (zlib, one
    element each). A matrix holds flags, sizes, name, real and imaginary parts; a part of up to 4
    bytes may share the 8 bytes of its tag.
    """
    size = regular_size(path)
    found: dict[str, MatArray] = {}
    count = 0
    with told(path), path.open("rb") as file:
        mark = file.read(HEADER_BYTES)[126:128]
        if mark not in {b"IM", b"MI"}:
            raise _fault(path, "does not start like a MAT file of version 5", "version 5")
        order = "<" if mark == b"IM" else ">"
        position = HEADER_BYTES
        while position + 8 <= size:
            file.seek(position)
            kind, length = _tag(file.read(8), order)
            if kind not in {_MATRIX, _COMPRESSED} or position + 8 + length > size:
                problem = f"byte {position} starts an element of type {kind}, {length} bytes long"
                raise _fault(path, problem, "matrices that end within the file")
            array = _matrix(path, file, position + 8, length, order, is_packed=kind == _COMPRESSED)
            if array is not None and array.name in found:
                raise _fault(path, f"has the array {array.name[:60]!r} twice", "each name once")
            if array is not None:
                found[array.name] = array
            count += 1
            if count > _MOST_VARIABLES:
                raise _fault(path, "holds too many variables", f"up to {_MOST_VARIABLES}")
            position += 8 + length
    if not count or position != size:
        raise _fault(path, "ends inside an element, or holds none", "MAT files that are whole")
    return found


def _tag(block: bytes, order: str) -> tuple[int, int]:
    kind, length = np.frombuffer(block, f"{order}u4", 2)
    return int(kind), int(length)


def _matrix(
    path: Path, file: BinaryIO, position: int, length: int, order: str, *, is_packed: bool
) -> MatArray | None:
    """Return the matrix in an element, None if it holds other things than numbers."""
    if not is_packed:
        head = file.read(min(length, _HEAD))
        fields = _fields(path, head, length, order, base=position, read=(file, position))
        return None if fields is None else MatArray(path=path, **fields)
    try:
        unpack = zlib.decompressobj()
        head = unpack.decompress(file.read(min(length, _HEAD)), _HEAD)
    except zlib.error as error:
        raise _fault(path, f"cannot be unpacked: {error}", "MAT files that are whole") from error
    kind, inner = _tag(head, order) if len(head) >= 8 else (0, 0)
    if kind != _MATRIX:
        problem = f"holds a compressed element of type {kind}"
        raise _fault(path, problem, "compressed matrices")
    if inner > MOST_UNPACKED:
        problem = f"holds a compressed array of {inner / 1e6:.0f} MB"
        raise _fault(path, problem, f"up to {MOST_UNPACKED / 1e6:.0f} MB", "Convert it to SigMF.")
    packed: dict[str, Any] = {
        "packed_at": position,
        "packed_bytes": length,
        "unpacked_bytes": inner + 8,
    }

    def whole() -> bytes:
        return _unpacked(path, position, length, inner + 8)

    fields = _fields(path, head[8:], inner, order, base=8, read=whole)
    return None if fields is None else MatArray(path=path, **fields, **packed)


def _fields(
    path: Path, head: bytes, length: int, order: str, *, base: int, read: Any
) -> dict[str, Any] | None:
    """Return what a matrix of numbers says; ``head`` starts after its tag."""
    parts: list[tuple[int, int, int]] = []
    position = 0
    wanted = 4
    kind, is_complex = "", False
    while len(parts) < wanted:
        if position + 8 > length:
            raise _fault(path, "has a matrix that ends too early", "MAT files that are whole")
        tag = head[position : position + 8]
        if len(tag) < 8:
            tag = _far(read, base + position)
        part = _part(tag, position, order)
        stored, start, count = part
        if start + count > length:
            problem = f"has a part of {count} bytes in a matrix of {length}"
            raise _fault(path, problem, "parts that end within their matrix")
        parts.append(part)
        if len(parts) == 1:
            if stored != 6 or count != 8 or len(head) < start + 8:
                raise _fault(path, "has a matrix without flags", "MAT files that are whole")
            flags = int(np.frombuffer(head, f"{order}u4", 1, start)[0])
            kind = _CLASSES.get(flags & 0xFF, "")
            is_complex = bool(flags & _COMPLEX_FLAG)
            if not kind:
                return None
            wanted = 5 if is_complex else 4
        position = start + (4 if start - position == 4 else -(-count // 8) * 8)
    (_, sizes_at, sizes), (_, name_at, name_bytes) = parts[1], parts[2]
    if sizes % 4 or name_bytes > 256 or len(head) < max(sizes_at + sizes, name_at + name_bytes):
        raise _fault(path, "has a matrix of unreadable sizes or name", "MAT files that are whole")
    shape = tuple(int(item) for item in np.frombuffer(head, f"{order}i4", sizes // 4, sizes_at))
    if len(shape) != 2 or min(shape) < 0:
        return None
    made = []
    for stored, start, count in parts[3:]:
        rail = _STORED.get(stored)
        if rail is None or count != math.prod(shape) * np.dtype(rail).itemsize:
            problem = f"has {count} bytes of type {stored} for {shape[0]} by {shape[1]} numbers"
            raise _fault(path, problem, "as many numbers as the sizes say")
        made.append(Part(rail=order + rail, start=base + start))
    return {
        "name": head[name_at : name_at + name_bytes].decode("utf-8", "replace"),
        "kind": kind,
        "shape": shape,
        "real": made[0],
        "imaginary": made[1] if is_complex else None,
    }


def _far(read: Any, position: int) -> bytes:
    """Return 8 bytes beyond the head: where the imaginary part starts."""
    if callable(read):
        content: bytes = read()
        return content[position : position + 8].ljust(8, b"\0")
    file, _ = read
    file.seek(position)
    found: bytes = file.read(8)
    return found.ljust(8, b"\0")


def _part(tag: bytes, position: int, order: str) -> tuple[int, int, int]:
    """Return type, start and length of a part, by its tag; small ones start inside it."""
    kind, count = _tag(tag, order)
    if kind >> 16:
        return kind & 0xFFFF, position + 4, min(kind >> 16, 4)
    return kind, position + 8, count


def _unpacked(path: Path, position: int, n_packed: int, n_bytes: int) -> bytes:
    """Return what a compressed element holds; the last one is kept for the next range."""
    with told(path):
        status = path.stat()
    return _unpacked_of(path, position, n_packed, n_bytes, (status.st_mtime_ns, status.st_size))


@lru_cache(maxsize=1)
def _unpacked_of(
    path: Path, position: int, n_packed: int, n_bytes: int, _version: tuple[int, int]
) -> bytes:
    with told(path), path.open("rb") as file:
        file.seek(position)
        packed = file.read(n_packed)
    try:
        content = zlib.decompressobj().decompress(packed, n_bytes)
    except zlib.error as error:
        raise _fault(path, f"cannot be unpacked: {error}", "MAT files that are whole") from error
    if len(content) < n_bytes:
        problem = f"unpacks to {len(content)} of {n_bytes} bytes"
        raise _fault(path, problem, "MAT files that are whole")
    return content


def _fault(
    path: Path,
    problem: str,
    allowed: str,
    remedy: str = "Check that it was saved and copied whole.",
) -> FileError:
    return FileError(where=str(path), problem=problem, allowed=allowed, remedy=remedy)
