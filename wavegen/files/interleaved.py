"""Bare interleaved I and Q, as raw files and SigMF data files hold them."""

from __future__ import annotations

import hashlib
from dataclasses import dataclass
from fractions import Fraction
from pathlib import Path

import numpy as np

from wavegen.core.errors import FileError
from wavegen.core.signal import Samples, Signal
from wavegen.files.datatypes import Codes, Datatype, decode
from wavegen.files.faults import regular_size, told


@dataclass(frozen=True, eq=False, kw_only=True)
class InterleavedSamples(Signal):
    """A file of interleaved rails as a signal, full scale 1.0.

    Parameters
    ----------
    path : Path
        The file; it must outlive the signal, unchanged.
    datatype : Datatype
        How samples are coded.
    gain : float
        Factor after decoding (1.0 unless the user states another full scale).

    Notes
    -----
    Ranges are read, not mapped: mapped pages would count as this process's memory.
    """

    path: Path
    datatype: Datatype
    gain: float = 1.0

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Read samples ``[start, stop)``.

        Raises
        ------
        FileError
            The file is gone or shorter than it was.
        """
        return scaled(decode(self.codes(start, stop), self.datatype), self.gain)

    def codes(self, start: int, stop: int) -> Codes:
        """Return the codes of samples ``[start, stop)``, shape (stop - start, 2)."""
        count = 2 * (stop - start)
        with told(self.path):
            flat = np.fromfile(
                self.path,
                self.datatype.dtype,
                count,
                offset=start * self.datatype.bytes_per_sample,
            )
        if flat.size != count:
            raise shorter(self.path, start + flat.size // 2, self.n_samples)
        return flat.reshape(-1, 2)


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
    path: Path, *, datatype: Datatype, sample_rate_hz: Fraction, full_scale: float | None
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

    Raises
    ------
    FileError
        Missing, no ordinary file, empty, or not whole samples.
    """
    size = regular_size(path)
    pair = datatype.bytes_per_sample
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
            allowed=f"whole {pair}-byte I/Q pairs of {datatype.name}",
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
    )


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

    Raises
    ------
    FileError
        The file cannot be opened.
    """

    def __init__(self, path: Path, *, datatype: Datatype, n_samples: int) -> None:
        self._path = path
        self._datatype = datatype
        self._count = SampleCount(path, n_samples)
        self._hash = hashlib.sha512()
        with told(path):
            self._file = path.open("wb", buffering=0)

    def write(self, codes: Codes) -> None:
        """Append codes, shape (n, 2)."""
        self._count.add(codes)
        contiguous = np.ascontiguousarray(codes, self._datatype.dtype)
        block = contiguous.view(np.uint8).reshape(-1).data
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
    """

    def __init__(self, path: Path, n_samples: int) -> None:
        self._path = path
        self._want = n_samples
        self._have = 0

    def add(self, codes: Codes) -> None:
        """Count a block.

        Raises
        ------
        FileError
            Not of shape (n, 2), or more than announced.
        """
        if codes.ndim != 2 or codes.shape[1] != 2:
            raise self._fault(problem=f"got codes of shape {codes.shape}", allowed="shape (n, 2)")
        self._have += codes.shape[0]
        if self._have > self._want:
            raise self._missed()

    def check_complete(self) -> None:
        """Refuse fewer samples than announced.

        Raises
        ------
        FileError
            Some are missing.
        """
        if self._have != self._want:
            raise self._missed()

    def _missed(self) -> FileError:
        have, want = self._have, self._want
        return self._fault(problem=f"{have} samples came", allowed=f"{want}, as announced")

    def _fault(self, *, problem: str, allowed: str) -> FileError:
        return FileError(
            where=str(self._path),
            problem=problem,
            allowed=allowed,
            remedy="Write exactly what the facts announce.",
        )
