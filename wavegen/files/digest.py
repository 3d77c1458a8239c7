"""SHA-512 of files: what a recording claims about its data, checked on request."""

from __future__ import annotations

import hashlib
from pathlib import Path

from wavegen.core.errors import FileError
from wavegen.core.progress import Progress, silent
from wavegen.files.faults import regular_size, told
from wavegen.files.format import Recording

_BLOCK = 1 << 20
"""Bytes read at a time."""


def sha512_of(
    path: Path, progress: Progress = silent, *, start: int = 0, n_bytes: int | None = None
) -> str:
    """Return the SHA-512 of a file's bytes, in hex.

    Parameters
    ----------
    path : Path
        An ordinary file of any size; read in blocks.
    progress : Progress
        Told the bytes done.
    start, n_bytes : int, int or None
        A part of it; None is all the rest.

    Raises
    ------
    FileError
        It cannot be read, or ends before that part does.
    """
    total = regular_size(path) - start if n_bytes is None else n_bytes
    digest = hashlib.sha512()
    buffer = bytearray(_BLOCK)
    view = memoryview(buffer)
    done = 0
    with told(path), path.open("rb", buffering=0) as file:
        file.seek(start)
        while count := file.readinto(view[: min(_BLOCK, total - done)]):
            digest.update(view[:count])
            done += count
            progress("hashing", done, total)
    if done < total:
        raise FileError(
            where=str(path),
            problem=f"ends {total - done} bytes too early",
            allowed="files that stay whole while they are read",
            remedy="Copy it again from its source.",
        )
    return digest.hexdigest()


def verify_hash(recording: Recording, progress: Progress = silent) -> bool:
    """Check a recording's data against the digest that it claims.

    Parameters
    ----------
    recording : Recording
        As opened.
    progress : Progress
        Told the bytes done.

    Returns
    -------
    bool
        True if they agree, False if the recording claims none.

    Raises
    ------
    FileError
        They differ: the data are not those that were described.
    """
    if recording.sha512 is None:
        return False
    found = sha512_of(
        recording.path, progress, start=recording.data_start, n_bytes=recording.data_bytes
    )
    if found != recording.sha512.lower():
        raise FileError(
            where=str(recording.path),
            problem=f"its SHA-512 starts {found[:16]}, stated is {recording.sha512[:16].lower()}",
            allowed="data that have not changed since they were described",
            remedy="Copy the recording again from its source.",
        )
    return True
