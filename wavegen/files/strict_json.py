"""JSON from strangers: bounded in size and depth, finite numbers, no key twice."""

from __future__ import annotations

import json
import math
from pathlib import Path
from typing import NoReturn

from wavegen.core.errors import FileError
from wavegen.files.faults import regular_size, told

MOST_BYTES = 16_000_000
"""Largest document that is read; a SigMF file of 100 000 annotations has about this size."""


_MOST_DEPTH = 60
"""Deepest nesting that is read: those who walk the result may recurse."""


def read_json(path: Path, most_bytes: int = MOST_BYTES) -> dict[str, object]:
    """Return the JSON object in a file.

    Parameters
    ----------
    path : Path
        An ordinary file of UTF-8 text.
    most_bytes : int
        Largest size that is read.

    Raises
    ------
    FileError
        Out of reach, too large, not UTF-8, not JSON (RFC 8259 knows no NaN), a number beyond
        double precision, nested too deep, a key twice in one object, or no object at the top.
    """
    size = regular_size(path)
    _refuse_large(path, size, most_bytes)
    with told(path):
        content = path.read_bytes()
    return parse_json(path, content, most_bytes)


def parse_json(path: Path, content: bytes, most_bytes: int = MOST_BYTES) -> dict[str, object]:
    """Return the JSON object in the bytes of a file.

    Parameters
    ----------
    path : Path
        Where they come from, for messages.
    content : bytes
        UTF-8 text.
    most_bytes : int
        Largest size that is read.

    Raises
    ------
    FileError
        As :func:`read_json`.
    """
    _refuse_large(path, len(content), most_bytes)
    try:
        text = content.decode("utf-8-sig")
        found = json.loads(
            text,
            object_pairs_hook=_object,
            parse_float=_finite,
            parse_constant=_no_constant,
        )
    except UnicodeDecodeError as error:
        problem = f"byte {error.start} is not UTF-8"
        raise _fault(path, problem, "JSON in UTF-8") from error
    except json.JSONDecodeError as error:
        problem = f"line {error.lineno}, column {error.colno}: {error.msg}"
        raise _fault(path, problem, "JSON (RFC 8259)") from error
    except RecursionError as error:
        raise _fault(path, "is nested too deep", f"up to {_MOST_DEPTH} levels") from error
    except ValueError as error:  # from the hooks below, and integers of thousands of digits
        raise _fault(path, str(error), "JSON (RFC 8259) with each key once") from error
    inside = _fault_inside(found)
    if inside:
        raise _fault(path, inside, f"up to {_MOST_DEPTH} levels of well-formed text and numbers")
    if not isinstance(found, dict):
        raise _fault(path, f"holds a JSON {type(found).__name__}", "a JSON object")
    return found


def _refuse_large(path: Path, size: int, most_bytes: int) -> None:
    if size > most_bytes:
        raise _fault(path, f"has {size / 1e6:.1f} MB", f"up to {most_bytes / 1e6:.0f} MB of JSON")


def finite_json(value: object) -> str | None:
    """Return what keeps a value from being written as JSON, or None if nothing does.

    Examples
    --------
    >>> finite_json({"mean_dbfs": -12.5}), finite_json([float("nan")]) is None
    (None, False)
    """
    try:
        json.dumps(value, allow_nan=False)
    except (TypeError, ValueError) as error:
        return str(error)
    return None


def _fault_inside(document: object) -> str | None:
    """Return what is wrong in a document, walked without recursion."""
    level = [document]
    for _ in range(_MOST_DEPTH):
        if any(isinstance(item, str) and not _is_encodable(item) for item in level):
            return "holds half a character (a lone surrogate)"
        level = [
            part
            for item in level
            for part in (
                (*item, *item.values())
                if isinstance(item, dict)
                else item
                if isinstance(item, list)
                else ()
            )
        ]
        if not level:
            return None
    return "is nested too deep"


def _is_encodable(text: str) -> bool:
    try:
        text.encode()
    except UnicodeEncodeError:
        return False
    return True


def _object(pairs: list[tuple[str, object]]) -> dict[str, object]:
    found = dict(pairs)
    if len(found) != len(pairs):
        names = [name for name, _ in pairs]
        twice = next(name for name in names if names.count(name) > 1)
        message = f"has the key {twice[:60]!r} twice in one object"
        raise ValueError(message)
    return found


def _finite(text: str) -> float:
    value = float(text)
    if not math.isfinite(value):
        message = f"has the number {text[:40]}, beyond double precision"
        raise ValueError(message)
    return value


def _no_constant(name: str) -> NoReturn:
    message = f"has {name}, which is no JSON number"
    raise ValueError(message)


def _fault(path: Path, problem: str, allowed: str) -> FileError:
    return FileError(
        where=str(path),
        problem=problem,
        allowed=allowed,
        remedy="Check that it is the right file and was copied whole.",
    )
