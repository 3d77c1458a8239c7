"""NumPy's ``.npy``: one array, its type and shape in a short header.

Written: ``complex64`` of shape (n,), or ``int16`` of shape (n, 2) with I and Q in the columns;
with two channels one more of each. Read: these, and other integers and floats likewise; a single
column is a real signal. The header is text of a fixed form and is matched, never evaluated;
arrays of objects (pickles) are refused. The sample rate is not in the file.
"""

from __future__ import annotations

import io
import math
import re
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import ClassVar

import numpy as np

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
    RF32_LE,
    RI16_LE,
    Datatype,
    real_of,
)
from wavegen.files.faults import regular_size, told
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
from wavegen.files.interleaved import open_interleaved
from wavegen.files.raw import RawWriter

MAGIC = b"\x93NUMPY"

_MOST_HEADER = 4096
"""Bytes of a header; one that this program reads needs under 130."""

_MOST_CHANNELS = 64
_PAIRS = {
    "<i2": CI16_LE,
    ">i2": CI16_BE,
    "|i1": CI8,
    "<i4": CI32_LE,
    "<f4": CF32_LE,
    "<f8": CF64_LE,
    "|u1": CU8,
}
"""Types whose columns are I and Q."""

_COMPLEX = {"<c8": CF32_LE, "<c16": CF64_LE}
_ITEM = re.compile(
    r"\s*(['\"])(?P<key>\w{1,40})\1\s*:\s*"
    r"(?:(['\"])(?P<text>[^'\"]{0,60})\3|(?P<bool>True|False)|\((?P<shape>[0-9L,\s]{0,200})\))"
    r"\s*(?:,|$)"
)


@dataclass(frozen=True, slots=True, kw_only=True)
class Header:
    """What a header says.

    Parameters
    ----------
    descr : str
        Type of an element: byte order, kind and size.
    fortran_order : bool
        Whether the first index runs fastest.
    shape : tuple of int
        Of the array.
    data_start : int
        Byte at which the elements start.
    """

    descr: str
    fortran_order: bool
    shape: tuple[int, ...]
    data_start: int


class Npy:
    """NumPy arrays of samples."""

    name: ClassVar[str] = "npy"
    suffixes: ClassVar[tuple[str, ...]] = (".npy",)
    datatypes: ClassVar[Mapping[str, Datatype]] = {
        "complex64": CF32_LE,
        "int16": CI16_LE,
        "cf32_le": CF32_LE,
        "ci16_le": CI16_LE,
        "ri16_le": RI16_LE,
        "rf32_le": RF32_LE,
    }
    default_datatype: ClassVar[str] = "cf32_le"

    def files(self, stem: str, datatype: Datatype) -> tuple[str, ...]:
        """Return the name of the file."""
        return (f"{stem}.npy",)

    def check(self, facts: FileFacts, where: str) -> None:
        """Refuse a datatype that is not written, and real channels that would read as I and Q.

        Raises
        ------
        FileError
            At ``where``.
        """
        check_facts(self, facts, where)
        refuse_real_pair(facts, where)

    def writer(self, drafts: tuple[Path, ...], facts: FileFacts) -> Writer:
        """Open the file and write its header."""
        self.check(facts, drafts[0].name)
        return RawWriter(drafts[0], facts, header=header_bytes(facts))

    def detect(self, path: Path, head: bytes) -> bool:
        """Return whether the first bytes are those of such a file, whatever its name."""
        return head.startswith(MAGIC)

    def read(self, path: Path, hints: ReadHints) -> Recording:
        """Open an array of samples.

        Raises
        ------
        FileError
            No such file, damaged or cut short; elements or a shape that are no samples; no
            sample rate.
        """
        header = read_header(path)
        stated, n_channels = _meaning(path, header)
        refuse_other_datatype(path, stated, hints)
        datatype = told_word(stated, bits=hints.bits, align=hints.align, where=str(path))
        channel = told_channel(path, n_channels=n_channels, hints=hints)
        sample_rate_hz, _ = told_rate(path, stated_hz=None, hints=hints)
        n_bytes = header.shape[0] * datatype.bytes_per_sample * n_channels
        left = regular_size(path) - header.data_start - n_bytes
        if left < 0:
            raise _fault(path, f"its header states {n_bytes} bytes of data, {-left} are missing")
        signal = open_interleaved(
            path,
            datatype=datatype,
            sample_rate_hz=sample_rate_hz,
            full_scale=hints.full_scale,
            n_channels=n_channels,
            channel=channel,
            data_start=header.data_start,
            data_bytes=n_bytes,
        )
        recording = Recording(
            path=path,
            files=(path,),
            format=self.name,
            signal=signal,
            sample_rate_hz=sample_rate_hz,
            n_samples=signal.n_samples,
            datatype=datatype,
            reference_level_dbm=hints.reference_level_dbm,
            warnings=(f"{path.name} has {left} bytes after its end; left out",) if left else (),
            n_channels=n_channels,
            channel=channel,
        )
        return as_complex(recording)


def header_bytes(facts: FileFacts) -> bytes:
    """Return the header of a file to come, version 1.0.

    Parameters
    ----------
    facts : FileFacts
        Of a datatype that is written.
    """
    is_complex = facts.datatype.container is CF32_LE
    n_columns = facts.n_channels if is_complex else facts.n_columns
    shape = (facts.n_samples,) if n_columns == 1 else (facts.n_samples, n_columns)
    descr = "<c8" if is_complex else facts.datatype.dtype.str
    text = io.BytesIO()
    np.lib.format.write_array_header_1_0(
        text, {"descr": descr, "fortran_order": False, "shape": shape}
    )
    return text.getvalue()


def read_header(path: Path) -> Header:
    """Return the header of a ``.npy`` file of version 1, 2 or 3.

    Raises
    ------
    FileError
        No such file, another version, or a header that is damaged or describes objects or
        records.

    Notes
    -----
    Source: NumPy Enhancement Proposal 1 and ``numpy.lib.format``: magic, version, length (16
    bits in version 1, else 32), then a dictionary as text. It is matched by its grammar.
    """
    regular_size(path)
    with told(path), path.open("rb") as file:
        head = file.read(12 + _MOST_HEADER)
    if not head.startswith(MAGIC) or len(head) < 12:
        raise _fault(path, "does not start like a .npy file")
    major, minor = head[6], head[7]
    if (major, minor) not in {(1, 0), (2, 0), (3, 0)}:
        raise _fault(path, f"is of version {major}.{minor}; versions 1 to 3 are read")
    start = 10 if major == 1 else 12
    length = int.from_bytes(head[8:start], "little")
    content = head[start : start + length]
    if length > _MOST_HEADER or len(content) < length:
        raise _fault(path, f"states a header of {length} bytes")
    found = _items(content.decode("utf-8" if major == 3 else "latin-1", "replace"))
    descr, order, shape = (found.get(key) for key in ("descr", "fortran_order", "shape"))
    if not isinstance(descr, str) or not isinstance(order, bool) or not isinstance(shape, tuple):
        raise _fault(path, "its header is damaged, or describes records")
    return Header(descr=descr, fortran_order=order, shape=shape, data_start=start + length)


def _items(text: str) -> dict[str, object]:
    """Return the entries of a header's dictionary; empty if its text is another."""
    body = text.strip()
    if not (body.startswith("{") and body.endswith("}")):
        return {}
    body = body[1:-1].strip()
    found: dict[str, object] = {}
    position = 0
    while position < len(body):
        item = _ITEM.match(body, position)
        if item is None or item["key"] in found:
            return {}
        position = item.end()
        if item["text"] is not None:
            found[item["key"]] = item["text"]
        elif item["bool"] is not None:
            found[item["key"]] = item["bool"] == "True"
        else:
            numbers = [part.strip().removesuffix("L") for part in item["shape"].split(",")]
            numbers = [part for part in numbers if part]
            if not all(part.isdigit() and len(part) < 19 for part in numbers):
                return {}
            found[item["key"]] = tuple(int(part) for part in numbers)
    return found


def _meaning(path: Path, header: Header) -> tuple[Datatype, int]:
    """Return datatype and number of channels of an array."""
    shape, descr = header.shape, header.descr
    known = _COMPLEX.get(descr) or _PAIRS.get(descr)
    if known is None:
        is_object = descr.startswith("|O")
        raise FileError(
            where=str(path),
            problem="holds Python objects, which are never unpacked"
            if is_object
            else f"holds elements of type {descr!r}",
            allowed="elements of " + ", ".join([*_COMPLEX, *_PAIRS]),
            remedy="Save it again as complex64.",
        )
    columns = shape[1] if len(shape) == 2 else 1
    per_channel = 1 if descr in _COMPLEX or columns == 1 else 2
    is_samples = (
        len(shape) in {1, 2}
        and math.prod(shape) > 0
        and columns % per_channel == 0
        and columns <= per_channel * _MOST_CHANNELS
        and not (header.fortran_order and columns > 1)
    )
    if not is_samples:
        order = " in Fortran order" if header.fortran_order else ""
        raise FileError(
            where=str(path),
            problem=f"is an array of shape {shape}{order}",
            allowed="complex of shape (n,), or I and Q in the columns of shape (n, 2), in C order; "
            "twice as many columns for two channels",
            remedy="Save numpy.ascontiguousarray(array), transposed if need be.",
        )
    is_real = descr in _PAIRS and columns == 1
    if is_real and known is CU8:
        raise FileError(
            where=str(path),
            problem="is one column of unsigned bytes",
            allowed="signed integers or floats for real samples",
            remedy="Convert it to int16.",
        )
    return (real_of(known) if is_real else known), columns // per_channel


def _fault(path: Path, problem: str) -> FileError:
    return FileError(
        where=str(path),
        problem=problem,
        allowed=".npy files of versions 1 to 3, whole",
        remedy="Check that it was saved and copied whole, by numpy.save without objects.",
    )
