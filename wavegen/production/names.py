"""Where the files of a recipe go; nothing may leave the output folder."""

from __future__ import annotations

import re
from pathlib import Path

from wavegen.core.errors import ArgumentsError

_SOUND = re.compile(r"[^\W_][\w .()+,=@-]{0,119}")
_RESERVED = {"con", "prn", "aux", "nul", *(f"com{i}" for i in range(10)), *(f"lpt{i}" for i in range(10))}


def output_folder(out: Path, name: str) -> Path:
    """Return ``OUT/NAME`` for a recipe's name.

    Parameters
    ----------
    out : Path
        The folder given by ``--out``.
    name : str
        The recipe file's stem.

    Raises
    ------
    ArgumentsError
        The name could leave the folder or is none on some system.
    """
    is_sound = _SOUND.fullmatch(name) and name.lower() not in _RESERVED
    if not is_sound or name.endswith((".", " ")):
        raise ArgumentsError(
            where=f"output name {name!r}",
            problem="is no plain file name",
            allowed="letters, digits, spaces and _.()+,=@-, first a letter or digit, up to 120",
            remedy="Rename the recipe file.",
        )
    return out / name
