"""Trouble with files, told in the program's own words."""

from __future__ import annotations

import errno
import stat
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

from wavegen.core.errors import FileError

_REASONS = {
    errno.ENOENT: (
        "there is no such file",
        "a file that exists",
        "Check the name and the folder.",
    ),
    errno.EACCES: (
        "permission is denied",
        "files and folders you may use",
        "Change the permissions or choose another place.",
    ),
    errno.EPERM: (
        "the operation is not permitted",
        "files and folders you may use",
        "Change the permissions or choose another place.",
    ),
    errno.EROFS: (
        "the file system is read-only",
        "folders that can be written",
        "Choose another output folder.",
    ),
    errno.ENOSPC: (
        "the disk is full",
        "files up to the free disk",
        "Free some disk or choose another output folder.",
    ),
    errno.EDQUOT: (
        "the disk quota is used up",
        "files up to the quota",
        "Free some disk or choose another output folder.",
    ),
    errno.EFBIG: (
        "the file is too large for the file system",
        "files as large as the file system holds",
        "Ask for a shorter file or choose another output folder.",
    ),
    errno.EISDIR: ("is a folder", "a file", "Name the file inside it."),
    errno.ENOTDIR: (
        "a part of the path is not a folder",
        "folders on the way to the file",
        "Check the path.",
    ),
    errno.ENAMETOOLONG: (
        "the name is too long for the file system",
        "shorter names",
        "Shorten the name.",
    ),
    errno.ELOOP: (
        "the symbolic links go in circles",
        "links that end at a file",
        "Name the file itself.",
    ),
}


def os_fault(path: Path, error: OSError) -> FileError:
    """Return (not raise) the operating system's refusal as a FileError.

    Parameters
    ----------
    path : Path
        The file or folder concerned.
    error : OSError
        What the system said.
    """
    said = error.strerror or str(error)
    problem, allowed, remedy = _REASONS.get(
        error.errno or 0,
        (
            f"the system says: {said}",
            "files that can be read and written",
            "Check the disk and the path.",
        ),
    )
    return FileError(where=str(path), problem=problem, allowed=allowed, remedy=remedy)


@contextmanager
def told(path: Path) -> Iterator[None]:
    """Turn every OSError inside into a FileError about ``path``.

    Raises
    ------
    FileError
        In place of an OSError; other errors pass.
    """
    try:
        yield
    except OSError as error:
        raise os_fault(path, error) from error


def regular_size(path: Path) -> int:
    """Return the size of an ordinary file, bytes, without opening it.

    Raises
    ------
    FileError
        Missing, out of reach, a folder, a pipe, a socket or a device (reading one of those
        could wait for ever).
    """
    with told(path):
        status = path.stat()
    if stat.S_ISDIR(status.st_mode):
        raise FileError(
            where=str(path),
            problem="is a folder",
            allowed="a file",
            remedy="Name the file inside it.",
        )
    if not stat.S_ISREG(status.st_mode):
        raise FileError(
            where=str(path),
            problem="is a pipe, a socket or a device",
            allowed="an ordinary file, of which any part can be read",
            remedy="Save the samples to a file first.",
        )
    return status.st_size


def read_head(path: Path, n_bytes: int = 4096) -> bytes:
    """Return the first bytes of an ordinary file.

    Raises
    ------
    FileError
        As :func:`regular_size`, or it cannot be opened.
    """
    regular_size(path)
    with told(path), path.open("rb") as file:
        return file.read(n_bytes)
