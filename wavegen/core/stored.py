"""Signals whose samples lie in a file, and the scratch file that renders go to."""

from __future__ import annotations

import os
import shutil
import tempfile
from dataclasses import dataclass
from fractions import Fraction
from pathlib import Path
from types import TracebackType
from typing import Self

import numpy as np

from wavegen.core.errors import FileError
from wavegen.core.signal import Samples, Signal


@dataclass(frozen=True, eq=False, kw_only=True)
class Stored(Signal):
    """A complex float32 file (native byte order) as a signal.

    Parameters
    ----------
    path : Path
        The file; it must outlive the signal.

    Notes
    -----
    Ranges are read, not mapped: mapped pages would count as this process's memory.
    """

    path: Path

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Read samples ``[start, stop)`` from the file.

        Raises
        ------
        FileError
            The file is gone, or shorter than it was.
        """
        count = stop - start
        try:
            samples = np.fromfile(self.path, np.complex64, count, offset=start * 8)
        except OSError as error:
            raise FileError(
                where=str(self.path),
                problem=f"cannot be read any more ({error.strerror or error})",
                allowed="a file that stays where it is while it is in use",
                remedy="Put the file back and start again.",
            ) from error
        if samples.size != count:
            raise FileError(
                where=str(self.path),
                problem=f"ends after sample {start + samples.size}",
                allowed=f"{self.n_samples} samples, as when it was opened",
                remedy="Keep the file unchanged while it is in use.",
            )
        return samples


class Scratch:
    """A complex float32 file beside the output that is gone at exit.

    Parameters
    ----------
    folder : Path
        Where it lies; must exist.
    sample_rate_hz : Fraction
        Rate of what is written, Hz.
    n_samples : int
        How many samples will be written; the free disk is checked against it first.

    Raises
    ------
    FileError
        The disk has not enough room.
    """

    def __init__(self, *, folder: Path, sample_rate_hz: Fraction, n_samples: int) -> None:
        self._rate = sample_rate_hz
        self._n = n_samples
        need = n_samples * 8
        free = shutil.disk_usage(folder).free
        if free < need:
            raise FileError(
                where=str(folder),
                problem=f"{need / 1e6:.0f} MB of scratch are needed, {free / 1e6:.0f} MB are free",
                allowed="scratch up to the free disk",
                remedy="Free some disk, choose another output folder, or ask for a shorter file.",
            )
        handle, name = tempfile.mkstemp(prefix=".scratch-", suffix=".cf32", dir=folder)
        self.path = Path(name)
        self._file = os.fdopen(handle, "wb")

    def __enter__(self) -> Self:
        """Return itself."""
        return self

    def __exit__(
        self,
        kind: type[BaseException] | None,
        error: BaseException | None,
        trace: TracebackType | None,
    ) -> None:
        """Remove the file, whatever happened."""
        try:
            self._file.close()
        except OSError:  # what could not be flushed is thrown away anyway
            pass
        finally:
            self.path.unlink(missing_ok=True)

    def write(self, samples: Samples) -> None:
        """Append samples.

        Raises
        ------
        FileError
            The disk filled up or failed meanwhile.
        """
        try:
            self._file.write(samples.data)
        except OSError as error:
            raise FileError(
                where=str(self.path.parent),
                problem=f"the scratch file could not be written ({error.strerror or error})",
                allowed=f"{self._n * 8 / 1e6:.0f} MB of scratch",
                remedy="Free some disk, or choose another output folder.",
            ) from error

    def signal(self) -> Stored:
        """Return what was written as a signal."""
        self._file.flush()
        return Stored(sample_rate_hz=self._rate, n_samples=self._n, path=self.path, mean_power=None)
