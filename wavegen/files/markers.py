"""Markers beside a recording: where a period, a burst, a frame or a slot starts.

In SigMF they are annotations of the recording itself; for other formats they go to
``NAME.markers.csv`` with the columns ``start_sample,n_samples,label``.
"""

from __future__ import annotations

import csv
import io
from collections.abc import Iterable
from pathlib import Path
from typing import Literal

from wavegen.core.errors import FileError
from wavegen.files.faults import regular_size, told
from wavegen.files.format import Annotation

SUFFIX = ".markers.csv"
"""Ending of a file of markers."""

Kind = Literal["period start", "burst on", "frame", "slot"]
KINDS: tuple[Kind, ...] = ("period start", "burst on", "frame", "slot")
"""Labels of our own markers; files by others may hold any."""

_HEADINGS = ["start_sample", "n_samples", "label"]
_MOST_BYTES = 64_000_000
_MOST_LABEL = 200


def marker(kind: Kind, start_sample: int, n_samples: int | None = None) -> Annotation:
    """Return one marker of a kind.

    Parameters
    ----------
    kind : {"period start", "burst on", "frame", "slot"}
        What starts there.
    start_sample : int
        First sample of it.
    n_samples : int, optional
        How long it lasts; for a burst, its on-time.

    Examples
    --------
    >>> marker("slot", 15360, 15360).label
    'slot'
    """
    return Annotation(start_sample=start_sample, n_samples=n_samples, label=kind)


def every(kind: Kind, length_samples: int, total_samples: int) -> tuple[Annotation, ...]:
    """Return markers of equal length, one after another, as many as fit.

    Parameters
    ----------
    kind : {"period start", "burst on", "frame", "slot"}
        What starts there.
    length_samples : int
        Length of each.
    total_samples : int
        Length of the recording.

    Raises
    ------
    ValueError
        A length below 1.

    Examples
    --------
    >>> [item.start_sample for item in every("slot", 100, 350)]
    [0, 100, 200]
    """
    if length_samples < 1:
        message = f"markers of {length_samples} samples"
        raise ValueError(message)
    return tuple(
        marker(kind, start, length_samples)
        for start in range(0, total_samples - length_samples + 1, length_samples)
    )


def checked_markers(
    markers: Iterable[Annotation], *, n_samples: int, where: str
) -> tuple[Annotation, ...]:
    """Return markers by their start, each once.

    Parameters
    ----------
    markers : iterable of Annotation
        In any order.
    n_samples : int
        Length of the recording.
    where : str
        For messages.

    Raises
    ------
    FileError
        At ``where``: outside the recording, of no length, with a label too long or with
        control characters, or the same twice.
    """
    ordered = sorted(markers, key=lambda item: (item.start_sample, item.n_samples or 0, item.label))
    for number, item in enumerate(ordered):
        end = item.start_sample + (1 if item.n_samples is None else item.n_samples)
        problem = None
        if item.start_sample < 0 or end > n_samples:
            problem = f"the marker {item.label[:40]!r} covers {item.start_sample} to {end - 1}"
        elif item.n_samples is not None and item.n_samples < 1:
            problem = f"the marker {item.label[:40]!r} has {item.n_samples} samples"
        elif len(item.label) > _MOST_LABEL or not item.label.isprintable():
            problem = f"the label {item.label[:40]!r} is too long or not printable"
        elif number and ordered[number - 1] == item:
            problem = f"the marker {item.label[:40]!r} at {item.start_sample} comes twice"
        if problem is not None:
            raise FileError(
                where=where,
                problem=problem,
                allowed=f"markers inside samples 0 to {n_samples - 1}, each once, with labels of "
                f"up to {_MOST_LABEL} characters",
                remedy="Correct or leave out this marker.",
            )
    return tuple(ordered)


def markers_text(markers: Iterable[Annotation]) -> str:
    """Return the text of ``NAME.markers.csv``.

    Parameters
    ----------
    markers : iterable of Annotation
        From :func:`checked_markers`; start, length and label are kept.

    Examples
    --------
    >>> print(markers_text([marker("burst on", 40, 20)]), end="")
    start_sample,n_samples,label
    40,20,burst on
    """
    text = io.StringIO()
    rows = csv.writer(text, lineterminator="\n")
    rows.writerow(_HEADINGS)
    for item in markers:
        length = "" if item.n_samples is None else item.n_samples
        rows.writerow([item.start_sample, length, item.label])
    return text.getvalue()


def read_markers(path: Path, *, n_samples: int) -> tuple[Annotation, ...]:
    """Return the markers in a file.

    Parameters
    ----------
    path : Path
        ``NAME.markers.csv``.
    n_samples : int
        Length of the recording that they belong to.

    Raises
    ------
    FileError
        No such file, too large, other columns, rows that are no markers, or markers that the
        recording cannot have.
    """
    size = regular_size(path)
    if size > _MOST_BYTES:
        raise _fault(path, f"has {size / 1e6:.0f} MB")
    try:
        with told(path):
            text = path.read_text(encoding="utf-8-sig")
        rows = list(csv.reader(io.StringIO(text), strict=True))
    except (UnicodeDecodeError, csv.Error) as error:
        raise _fault(path, f"cannot be read: {error}") from error
    rows = [row for row in rows if row and not row[0].startswith("#")]
    if not rows or [item.strip().lower() for item in rows[0]] != _HEADINGS:
        raise _fault(path, "its first line does not name the columns")
    return checked_markers(
        (_read_row(path, number, row) for number, row in enumerate(rows[1:], 1)),
        n_samples=n_samples,
        where=str(path),
    )


def _read_row(path: Path, number: int, row: list[str]) -> Annotation:
    fields = [item.strip() for item in row[:2]]
    is_good = len(row) == 3 and all(
        item.isascii() and item.isdigit() and len(item) < 19 for item in fields if item
    )
    if not is_good or not fields[0]:
        raise _fault(path, f"marker {number} is {','.join(row)[:60]!r}")
    return Annotation(
        start_sample=int(fields[0]),
        n_samples=int(fields[1]) if fields[1] else None,
        label=row[2],
    )


def _fault(path: Path, problem: str) -> FileError:
    return FileError(
        where=str(path),
        problem=problem,
        allowed="the columns start_sample,n_samples,label, whole numbers from 0 in the first two "
        "(the second may be empty)",
        remedy="Correct the file, or write the markers again.",
    )
