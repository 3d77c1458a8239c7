"""Bare interleaved samples, as raw files hold them, and others behind a header."""

from __future__ import annotations

import hashlib
from dataclasses import dataclass
from fractions import Fraction
from pathlib import Path

import numpy as np

from wavegen.core.errors import FileError
from wavegen.core.signal import Samples, Signal
from wavegen.files.datatypes import Codes, Datatype, decode, first_misfit
from wavegen.files.faults import regular_size, told


@dataclass(frozen=True, eq=False, kw_only=True)
class CodedSamples(Signal):
    """Samples of one channel in a file, full scale 1.0; real ones in the real part.

    Parameters
    ----------
    path : Path
        The file; it must outlive the signal, unchanged.
    datatype : Datatype
        How samples are coded.
    gain : float
        Factor after decoding (1.0 unless the user states another full scale).
    """

    path: Path
    datatype: Datatype
    gain: float = 1.0

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Read samples ``[start, stop)``.

        Raises
        ------
        FileError
            The file is gone, damaged or shorter than it was.
        """
        return scaled(decode(self.codes(start, stop), self.datatype), self.gain)

    def codes(self, start: int, stop: int) -> Codes:
        """Return the codes of samples ``[start, stop)``, shape (stop - start, n_rails)."""
        raise TypeError(type(self).__name__)  # how codes lie in a file is the format's business


@dataclass(frozen=True, eq=False, kw_only=True)
class InterleavedSamples(CodedSamples):
    """A file of interleaved rails as a signal, full scale 1.0.

    Parameters
    ----------
    n_channels, channel : int
        How many channels are interleaved sample by sample, and which one this is.
    data_start : int
        Byte of the file at which the samples start.

    Notes
    -----
    Ranges are read, not mapped: mapped pages would count as this process's memory.
    """

    n_channels: int = 1
    channel: int = 0
    data_start: int = 0

    def codes(self, start: int, stop: int) -> Codes:
        """Return the codes of samples ``[start, stop)``, shape (stop - start, n_rails).

        Raises
        ------
        FileError
            As :meth:`compute`, or a code that is no word of the datatype.
        """
        n_rails = self.datatype.n_rails
        row = n_rails * self.n_channels
        count = row * (stop - start)
        with told(self.path):
            flat = np.fromfile(
                self.path,
                self.datatype.dtype,
                count,
                offset=self.data_start + start * self.datatype.bytes_per_sample * self.n_channels,
            )
        if flat.size != count:
            raise shorter(self.path, start + flat.size // row, self.n_samples)
        codes = flat.reshape(-1, row)[:, self.channel * n_rails :][:, :n_rails]
        refuse_misfit(self.path, codes, self.datatype, start)
        return codes


def refuse_misfit(path: Path, codes: Codes, datatype: Datatype, start: int) -> None:
    """Refuse codes that are no words of a padded datatype.

    Raises
    ------
    FileError
        Names the first such sample.
    """
    found = first_misfit(codes, datatype)
    if found is None:
        return
    sample, code = found
    span = (
        f"multiples of {1 << datatype.shift}"
        if datatype.shift
        else f"codes from {datatype.lowest} to {datatype.highest}"
    )
    raise FileError(
        where=str(path),
        problem=f"sample {start + sample} holds {code}, no {datatype.align}-aligned word of "
        f"{datatype.n_bits} bits",
        allowed=span,
        remedy="Correct the bits or the alignment, or leave both out.",
    )


def scaled(samples: Samples, gain: float) -> Samples:
    """Multiply our own samples in place, unless the gain is 1."""
    if gain != 1.0:
        samples *= np.float32(gain)
    return samples


def shorter(path: Path, last: int, n_samples: int) -> FileError:
    """Return (not raise) the error about a file that shrank while in use."""
    return FileError(
        where=str(path),
        problem=f"ends after sample {last}",
        allowed=f"{n_samples} samples, as when it was opened",
        remedy="Keep the file unchanged while it is in use.",
    )


def open_interleaved(
    path: Path,
    *,
    datatype: Datatype,
    sample_rate_hz: Fraction,
    full_scale: float | None,
    n_channels: int = 1,
    channel: int = 0,
    data_start: int = 0,
    data_bytes: int | None = None,
) -> InterleavedSamples:
    """Return a file of interleaved rails as a signal.

    Parameters
    ----------
    path : Path
        The data file.
    datatype : Datatype
        How samples are coded.
    sample_rate_hz : Fraction
        Rate, Hz.
    full_scale : float or None
        Code that reads as 1.0 in place of the datatype's.
    n_channels, channel : int
        How many channels are interleaved, and which one is read.
    data_start, data_bytes : int, int or None
        Where the samples lie in the file; None for all the rest of it.

    Raises
    ------
    FileError
        Missing, no ordinary file, empty, or not whole samples.
    """
    size = regular_size(path) - data_start if data_bytes is None else data_bytes
    pair = datatype.bytes_per_sample * n_channels
    if size == 0:
        raise FileError(
            where=str(path),
            problem="is empty",
            allowed="at least one sample",
            remedy="Check that the recording or the copy finished.",
        )
    if size % pair:
        raise FileError(
            where=str(path),
            problem=f"{size} bytes leave {size % pair} over",
            allowed=f"whole {pair}-byte {_row_name(datatype, n_channels)} of {datatype.name}",
            remedy="Check that the copy finished, and the datatype.",
        )
    with told(path), path.open("rb"):
        pass  # permission is asked for now, not in a worker later
    return InterleavedSamples(
        sample_rate_hz=sample_rate_hz,
        n_samples=size // pair,
        mean_power=None,
        path=path,
        datatype=datatype,
        gain=1.0 if full_scale is None else datatype.full_scale / full_scale,
        n_channels=n_channels,
        channel=channel,
        data_start=data_start,
    )


def _row_name(datatype: Datatype, n_channels: int) -> str:
    one = "samples" if datatype.is_real else "I/Q pairs"
    return one if n_channels == 1 else f"rows of {n_channels} {one}"


class InterleavedWriter:
    """Writes codes to a file as they come, and hashes them.

    Parameters
    ----------
    path : Path
        The (temporary) file.
    datatype : Datatype
        Type of the codes.
    n_samples : int
        How many will come.
    n_channels : int
        Channels side by side in the codes.
    header : bytes
        Written, and hashed, before the first sample.

    Raises
    ------
    FileError
        The file cannot be opened or written.
    """

    def __init__(
        self,
        path: Path,
        *,
        datatype: Datatype,
        n_samples: int,
        n_channels: int = 1,
        header: bytes = b"",
    ) -> None:
        self._path = path
        self._datatype = datatype
        self._count = SampleCount(path, n_samples, n_columns=datatype.n_rails * n_channels)
        self._hash = hashlib.sha512()
        with told(path):
            self._file = path.open("wb", buffering=0)
        self._append(memoryview(header))

    def write(self, codes: Codes) -> None:
        """Append codes, shape (n, n_columns).

        Raises
        ------
        FileError
            The disk refuses, another shape, too many, or a code that is no word.
        """
        refuse_misfit(self._path, codes, self._datatype, self._count.have)
        self._count.add(codes)
        contiguous = np.ascontiguousarray(codes, self._datatype.dtype)
        self._append(contiguous.view(np.uint8).reshape(-1).data)

    def _append(self, block: memoryview) -> None:
        self._hash.update(block)
        with told(self._path):
            while block.nbytes:  # an unbuffered write may take a part only
                block = block[self._file.write(block) :]

    def complete(self) -> str:
        """Close the file and return the SHA-512 of its bytes."""
        self.close()
        self._count.check_complete()
        return self._hash.hexdigest()

    def close(self) -> None:
        """Close the file."""
        with told(self._path):
            self._file.close()


class SampleCount:
    """Holds a caller to the number of samples it announced.

    Parameters
    ----------
    path : Path
        For messages.
    n_samples : int
        What was announced.
    n_columns : int
        Columns of the codes.
    """

    def __init__(self, path: Path, n_samples: int, *, n_columns: int = 2) -> None:
        self._path = path
        self._want = n_samples
        self._columns = n_columns
        self.have = 0

    def add(self, codes: Codes) -> None:
        """Count a block.

        Raises
        ------
        FileError
            Not of shape (n, n_columns), or more than announced.
        """
        if codes.ndim != 2 or codes.shape[1] != self._columns:
            raise self._fault(
                problem=f"got codes of shape {codes.shape}",
                allowed=f"shape (n, {self._columns})",
            )
        self.have += codes.shape[0]
        if self.have > self._want:
            raise self._missed()

    def check_complete(self) -> None:
        """Refuse fewer samples than announced.

        Raises
        ------
        FileError
            Some are missing.
        """
        if self.have != self._want:
            raise self._missed()

    def _missed(self) -> FileError:
        have, want = self.have, self._want
        return self._fault(problem=f"{have} samples came", allowed=f"{want}, as announced")

    def _fault(self, *, problem: str, allowed: str) -> FileError:
        return FileError(
            where=str(self._path),
            problem=problem,
            allowed=allowed,
            remedy="Write exactly what the facts announce.",
        )
