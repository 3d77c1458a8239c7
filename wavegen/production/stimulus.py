"""A stimulus file and its sidecar, found again."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

from wavegen.core.errors import FileError
from wavegen.files.format import Recording
from wavegen.production.sidecar import FORMAT

SUFFIX = ".ccdf.json"
LARGEST_BYTES = 64_000_000


def sidecar_of(recording: Recording) -> dict[str, Any] | None:
    """Return the sidecar beside a data file that lists it, None if there is none.

    Parameters
    ----------
    recording : Recording
        An open file.

    Returns
    -------
    dict or None

    Raises
    ------
    FileError
        A sidecar lies there and cannot be read.
    """
    name = recording.path.name
    for path in sorted(recording.path.parent.glob(f"*{SUFFIX}")):
        if _mentions(path, name):
            document = read_sidecar(path)
            if any(item["name"] == name for item in document["files"]):
                return document
    return None


def _mentions(path: Path, name: str) -> bool:
    """Return whether a sidecar speaks of a file: a damaged one of another file is no matter."""
    try:
        if not path.is_file() or path.stat().st_size > LARGEST_BYTES:
            return False
        return json.dumps(name, ensure_ascii=False).encode() in path.read_bytes()
    except OSError:  # one that may not be read says nothing
        return False


def mismatch(recording: Recording, sidecar: dict[str, Any]) -> str | None:
    """Return how a data file is not the one that its sidecar describes, None if it may be.

    Parameters
    ----------
    recording : Recording
        An open file.
    sidecar : dict
        What lies beside it.

    Returns
    -------
    str or None
        One sentence; lengths and rates are compared, not the hash.
    """
    for what, stated, found in (
        ("samples", sidecar["n_samples"], recording.n_samples),
        ("Hz", sidecar["sample_rate_hz"], float(recording.sample_rate_hz)),
    ):
        if stated != found:
            return (
                f"the sidecar beside it is of a loop with {stated:.12g} {what}, the file has "
                f"{found:.12g}: it is measured as a recording"
            )
    return None


def _fault_of(document: Any) -> str:
    """Return how a document is no sidecar, empty if it is one."""
    from jsonschema import Draft202012Validator

    from wavegen.production.sidecar import schema

    fault = next(Draft202012Validator(schema()).iter_errors(_condensed(document)), None)
    if fault is None:
        return ""
    return f"is no {FORMAT} sidecar: {fault.json_path}: {fault.message[:120]}"


def _condensed(value: Any) -> Any:
    """Return JSON values with the extremes of each list of numbers in place of the list.

    The schema bounds numbers singly, and a curve has thousands.
    """
    if isinstance(value, dict):
        return {key: _condensed(item) for key, item in value.items()}
    if not isinstance(value, list):
        return value
    if len(value) > 2 and all(type(item) in {int, float} for item in value):
        return [min(value), max(value)]
    return [_condensed(item) for item in value]


def read_sidecar(path: Path) -> dict[str, Any]:
    """Read a sidecar.

    Raises
    ------
    FileError
        Too large, not JSON, or not of this format.
    """
    try:
        if path.stat().st_size > LARGEST_BYTES:
            problem = f"is larger than {LARGEST_BYTES // 1_000_000} MB"
        else:
            document = json.loads(path.read_text(encoding="utf-8"))
            problem = _fault_of(document)
    except (OSError, ValueError, RecursionError) as error:
        problem = f"cannot be read: {error}"
    if not problem:
        return dict(document)
    raise FileError(
        where=str(path),
        problem=problem,
        allowed="a sidecar as `wavegen make` writes it",
        remedy="Make the stimulus again, or move the sidecar away to measure a plain recording.",
    )
