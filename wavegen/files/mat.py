"""MAT files of version 5: ``iq`` (complex) or ``samples`` (real), and ``sample_rate_hz``.

Written through ``scipy.io``, which takes whole arrays, so that lengths are limited; read by
:mod:`wavegen.files.mat_elements`. HDF5 containers (version 7.3) are refused by name. A real
vector is a real signal; two columns of ``iq`` are two channels.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from fractions import Fraction
from pathlib import Path
from typing import Any, ClassVar

import numpy as np

from wavegen.core.errors import FileError
from wavegen.files.analytic import as_complex
from wavegen.files.datatypes import (
    CF32_LE,
    CF64_LE,
    CI8,
    CI16_LE,
    CI32_LE,
    RF32_LE,
    Codes,
    Datatype,
    real_of,
)
from wavegen.files.digest import sha512_of
from wavegen.files.faults import read_head, told
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
from wavegen.files.interleaved import CodedSamples, SampleCount, refuse_misfit
from wavegen.files.mat_elements import MatArray, Part, arrays_of
from wavegen.files.signatures import signature_of

MOST_SAMPLES = 50_000_000
"""Longest array: 400 MB of complex64, all of it in memory."""

_START = b"MATLAB 5.0 MAT-file"
_START_HDF5 = b"MATLAB 7.3 MAT-file"
_HDF5 = b"\x89HDF\r\n\x1a\n"
_TEXT = 116
"""Bytes of free text at the start of the header; the library writes the time into it."""

_PAIRS = {"int8": CI8, "int16": CI16_LE, "int32": CI32_LE, "single": CF32_LE, "double": CF64_LE}
_RATE = "sample_rate_hz"
_IQ, _REAL = "iq", "samples"
"""What an array of complex and one of real samples is called."""


class Mat:
    """MAT files, version 5."""

    name: ClassVar[str] = "mat"
    suffixes: ClassVar[tuple[str, ...]] = (".mat",)
    datatypes: ClassVar[Mapping[str, Datatype]] = {
        "complex64": CF32_LE,
        "cf32_le": CF32_LE,
        "rf32_le": RF32_LE,
    }
    default_datatype: ClassVar[str] = "cf32_le"

    def files(self, stem: str, datatype: Datatype) -> tuple[str, ...]:
        """Return the name of the file."""
        return (f"{stem}.mat",)

    def check(self, facts: FileFacts, where: str) -> None:
        """Refuse two real channels, and what is too long to be held in memory.

        Raises
        ------
        FileError
            Another datatype, two real channels, or more than :data:`MOST_SAMPLES` in all channels.
        """
        check_facts(self, facts, where)
        refuse_real_pair(facts, where)
        if facts.n_channels > facts.n_samples:
            raise FileError(
                where=where,
                problem="one sample of two channels would read as two samples",
                allowed="two samples or more",
                remedy="Write sigmf instead.",
            )
        count = facts.n_samples * facts.n_channels
        if count > MOST_SAMPLES:
            raise FileError(
                where=where,
                problem=f"{count} samples are too many for a MAT file",
                allowed=f"up to {MOST_SAMPLES}, since the whole array is held in memory",
                remedy="Write sigmf instead, or shorten the duration.",
            )

    def writer(self, drafts: tuple[Path, ...], facts: FileFacts) -> Writer:
        """Prepare the array."""
        self.check(facts, drafts[0].name)
        return MatWriter(drafts[0], facts)

    def detect(self, path: Path, head: bytes) -> bool:
        """Return whether the file starts like one, or is named so and starts like nothing else."""
        if head.startswith((_START, _START_HDF5)):
            return True
        known = signature_of(head)
        is_open = known is None or head.startswith(_HDF5)
        return path.suffix.lower() in self.suffixes and is_open

    def read(self, path: Path, hints: ReadHints) -> Recording:
        """Open the only vector of numbers in a file, or the one that is named.

        Raises
        ------
        FileError
            Another version, damaged, too large, several vectors and none named, or no rate.
        """
        _refuse_other_versions(path)
        found = arrays_of(path)
        array = _choose(path, found, hints.variable)
        stated, n_channels = _meaning(array)
        refuse_other_datatype(path, stated, hints)
        datatype = told_word(stated, bits=hints.bits, align=hints.align, where=str(path))
        channel = told_channel(path, n_channels=n_channels, hints=hints)
        rate, warnings = told_rate(path, stated_hz=_rate_in(path, found), hints=hints)
        n_samples = max(array.shape) if 1 in array.shape else array.shape[0]
        signal = MatSamples(
            sample_rate_hz=rate,
            n_samples=n_samples,
            mean_power=None,
            path=path,
            datatype=datatype,
            gain=1.0 if hints.full_scale is None else datatype.full_scale / hints.full_scale,
            array=array,
            channel=channel,
        )
        recording = Recording(
            path=path,
            files=(path,),
            format=self.name,
            signal=signal,
            sample_rate_hz=rate,
            n_samples=n_samples,
            datatype=datatype,
            reference_level_dbm=hints.reference_level_dbm,
            warnings=warnings,
            n_channels=n_channels,
            channel=channel,
        )
        return as_complex(recording)


def _refuse_other_versions(path: Path) -> None:
    head = read_head(path)
    if head.startswith((_HDF5, _START_HDF5)) or _HDF5 in head[512:520]:
        raise _fault(
            path,
            "is a MAT file of version 7.3, an HDF5 container",
            "MAT files of version 5",
            "Save it again with the option '-v6' or '-v7'.",
        )
    if not head.startswith(b"MATLAB 5.0") or head[126:128] not in {b"IM", b"MI"}:
        raise _fault(path, "does not start like a MAT file of version 5", "MAT files of version 5")


def _choose(path: Path, found: Mapping[str, MatArray], wanted: str | None) -> MatArray:
    """Return the array that holds the samples."""
    usable = {name: item for name, item in found.items() if min(item.shape) > 0}
    vectors = [name for name, item in usable.items() if max(item.shape) > 1]
    name = wanted
    if name is None:
        name = next((own for own in (_IQ, _REAL) if own in usable), None)
    if name is None and len(vectors) == 1:
        name = vectors[0]
    if name is not None and name in usable:
        return usable[name]
    known = ", ".join(vectors[:20])[:200] or "none"
    if name is not None:
        problem = f"has no array of numbers {name[:60]!r}"
    else:
        problem = f"has {len(vectors)} arrays of numbers: {known}"
    raise _fault(
        path,
        problem,
        "one array of samples, or the name of one",
        "Add --variable with its name." if vectors else "Save the samples as the variable iq.",
    )


def _meaning(array: MatArray) -> tuple[Datatype, int]:
    """Return datatype and number of channels."""
    rows, columns = array.shape
    datatype = _PAIRS.get(array.kind)
    is_vector = 1 in array.shape
    per_channel = 1 if array.is_complex or is_vector else 2
    is_samples = is_vector or (columns % per_channel == 0 and columns <= 2 * per_channel)
    if datatype is None or (array.is_complex and datatype.is_integer) or not is_samples:
        text = f"{array.name[:60]} is {array.kind}{' complex' if array.is_complex else ''}, "
        raise _fault(
            array.path,
            f"{text}{rows} by {columns}",
            "complex single or double, n by 1; or real columns I and Q; or one real vector",
            "Save it as complex single, one column.",
        )
    n_channels = 1 if is_vector else columns // per_channel
    is_real = is_vector and not array.is_complex
    return (real_of(datatype) if is_real else datatype), n_channels


def _rate_in(path: Path, found: Mapping[str, MatArray]) -> Fraction | None:
    """Return the rate that the file gives: the ratio if there is one and it is closest."""
    numbers = _numbers(found.get(_RATE))
    if len(numbers) != 1:
        return None
    value = numbers[0]
    if not 0 < value < float("inf"):
        raise _fault(path, f"{_RATE} is {value}", "a number above 0, in Hz")
    terms = _numbers(found.get(f"{_RATE}_exact"))
    if len(terms) == 2 and terms[1] >= 1 and all(item.is_integer() for item in terms):
        exact = Fraction(int(terms[0]), int(terms[1]))
        if float(exact) == value:
            return exact
    return Fraction(repr(value))


def _numbers(array: MatArray | None) -> list[float]:
    """Return the numbers of a small real array; none if it is another."""
    if array is None or array.is_complex or array.shape not in {(1, 1), (1, 2), (2, 1)}:
        return []
    count = max(array.shape)
    return [float(item) for item in array.column(array.real, 0, 0, count)]


def _fault(
    path: Path,
    problem: str,
    allowed: str,
    remedy: str = "Check that it was saved and copied whole.",
) -> FileError:
    return FileError(where=str(path), problem=problem, allowed=allowed, remedy=remedy)


@dataclass(frozen=True, eq=False, kw_only=True)
class MatSamples(CodedSamples):
    """One channel of an array in a MAT file, full scale 1.0.

    Parameters
    ----------
    array : MatArray
        Where it stands.
    channel : int
        Which one.
    """

    array: MatArray
    channel: int

    def codes(self, start: int, stop: int) -> Codes:
        """Return the codes of samples ``[start, stop)``, shape (stop - start, n_rails).

        Raises
        ------
        FileError
            The file is gone or changed, or a code that is no word of the datatype.
        """
        n_rails = self.datatype.n_rails
        array = self.array
        rails: list[tuple[Part, int]] = [
            (array.real, self.channel * n_rails + rail) for rail in range(n_rails)
        ]
        if array.imaginary is not None:
            rails = [(array.real, self.channel), (array.imaginary, self.channel)]
        codes = np.empty((stop - start, n_rails), self.datatype.dtype)
        for number, (part, column) in enumerate(rails):
            codes[:, number] = array.column(part, column, start, stop)
        refuse_misfit(self.path, codes, self.datatype, start)
        return codes


class MatWriter:
    """Collects an array and writes it at the end.

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
        self._count = SampleCount(draft, facts.n_samples, n_columns=facts.n_columns)
        self._codes = np.empty((facts.n_samples, facts.n_columns), np.float32)
        self._sha512 = ""

    def write(self, codes: Codes) -> None:
        """Append codes, shape (n, n_columns)."""
        start = self._count.have
        self._count.add(codes)
        self._codes[start : self._count.have] = codes

    def finish(self, statistics: Mapping[str, object] | None = None) -> None:
        """Write the file and hash it; statistics have no place in it.

        Raises
        ------
        FileError
            Samples are missing, or the disk refuses.
        """
        from scipy.io import savemat

        self._count.check_complete()
        rate = self._facts.sample_rate_hz
        is_real = self._facts.datatype.is_real
        samples = {_REAL: self._codes} if is_real else {_IQ: self._codes.view(np.complex64)}
        variables: dict[str, Any] = {**samples, _RATE: float(rate)}
        if Fraction(repr(float(rate))) != rate:
            variables[f"{_RATE}_exact"] = [float(rate.numerator), float(rate.denominator)]
        if self._facts.title:
            variables["title"] = self._facts.title
        with told(self._path):
            savemat(str(self._path), variables, appendmat=False, format="5", oned_as="column")
        with told(self._path), self._path.open("r+b") as file:
            # the library states the time of writing: same samples, same bytes
            file.write((_START + b", written by wavegen").ljust(_TEXT))
        self._sha512 = sha512_of(self._path)

    def close(self) -> None:
        """Let go of the array."""
        self._codes = np.empty((0, 2), np.float32)

    @property
    def sha512(self) -> str:
        """Hex digest of the file's bytes."""
        return self._sha512
