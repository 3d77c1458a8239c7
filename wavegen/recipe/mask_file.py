"""A spectral mask in a file of its own: the points as a recipe writes them."""

from __future__ import annotations

from pathlib import Path

from wavegen.core.errors import FileError
from wavegen.meters.mask import SpectralMask
from wavegen.recipe.checker import check
from wavegen.recipe.reader import read_tree
from wavegen.recipe.tree import FaultError

LARGEST_BYTES = 128 * 1024


def load_mask(path: Path) -> SpectralMask:
    """Read a mask.

    Parameters
    ----------
    path : Path
        YAML with the keys ``points`` (a list of ``{offset: 10 MHz, level: -30 dB}``),
        ``measurement_bandwidth``, and where wanted ``reference`` and ``both_sides``.

    Returns
    -------
    SpectralMask

    Raises
    ------
    FileError
        Missing, unreadable, too large, or no such mask.
    """
    try:
        with path.open("rb") as handle:
            data = handle.read(LARGEST_BYTES + 1)
        text = data.decode("utf-8-sig")
    except (OSError, ValueError) as error:
        raise _fault(path, getattr(error, "strerror", None) or "it is no text in UTF-8") from error
    if len(data) > LARGEST_BYTES:
        raise _fault(path, f"larger than {LARGEST_BYTES // 1024} kB")
    try:
        tree, faults = read_tree(text)
    except FaultError as error:
        raise FileError(**_fields(error.fault.error(str(path)))) from error
    made, found = check(tree, SpectralMask)
    for fault in (*faults, *found):
        raise FileError(**_fields(fault.error(str(path))))
    mask: SpectralMask = made
    return mask


def _fields(error: Exception) -> dict[str, str]:
    return {name: getattr(error, name) for name in ("where", "problem", "allowed", "remedy")}


def _fault(path: Path, problem: str) -> FileError:
    return FileError(
        where=str(path),
        problem=problem,
        allowed="a mask: points, measurement_bandwidth, reference, both_sides",
        remedy="Write points as a list of {offset: 10 MHz, level: -30 dB}.",
    )
