"""A stimulus file and its sidecar, found again."""

from __future__ import annotations

import json
from dataclasses import dataclass, replace
from fractions import Fraction
from pathlib import Path
from typing import Any

from wavegen.core.errors import FileError
from wavegen.files.analytic import edge_text
from wavegen.files.faults import told
from wavegen.files.format import ReadHints, Recording
from wavegen.files.read import open_recording
from wavegen.production.measure import completed_hints
from wavegen.production.sidecar import FORMAT

SUFFIX = ".ccdf.json"
LARGEST_BYTES = 64_000_000


@dataclass(frozen=True, slots=True, kw_only=True)
class Stimulus:
    """A sidecar, and which of its files are meant.

    Parameters
    ----------
    path : Path
        The sidecar; its files lie beside it.
    document : dict
        What it says.
    names : tuple of str
        Data files that are meant: all that it lists, or the one that was named.
    """

    path: Path
    document: dict[str, Any]
    names: tuple[str, ...]

    @property
    def items(self) -> list[dict[str, Any]]:
        """Entries of the files that are meant."""
        return [item for item in self.document["files"] if item["name"] in self.names]

    def open(self, item: dict[str, Any], hints: ReadHints | None = None) -> Recording:
        """Open one of its files; the sidecar gives the rate where the file itself does not.

        Raises
        ------
        FileError
            Missing or damaged.
        """
        return open_listed(self.path.parent / item["name"], self.document, hints or ReadHints())


def open_listed(path: Path, document: dict[str, Any], hints: ReadHints) -> Recording:
    """Open a file that a sidecar lists, which gives the rate where the file itself does not.

    Raises
    ------
    FileError
        Missing or damaged.
    """
    try:
        recording = open_recording(path, hints)
    except FileError:
        if hints.sample_rate_hz is not None:
            raise
        hints = replace(hints, sample_rate_hz=Fraction(document["sample_rate_exact_hz"]))
        recording = open_recording(path, hints)
    entry = next(item for item in document["files"] if item["name"] == recording.path.name)
    completed = completed_hints(entry, recording, hints)
    return recording if completed is hints else open_recording(path, completed)


def find_stimulus(path: Path) -> Stimulus:
    """Return the stimulus that a path means.

    Parameters
    ----------
    path : Path
        A folder that holds one, a sidecar, or a data file (of a pair either, or their common
        name) that a sidecar beside it lists.

    Returns
    -------
    Stimulus

    Raises
    ------
    FileError
        There is none, several, or its sidecar cannot be read.
    """
    if "\0" in str(path):
        raise FileError(
            where=repr(str(path)),
            problem="the name holds a NUL character",
            allowed="names that a file can have",
            remedy="Check the name.",
        )
    with told(path):
        is_folder = path.is_dir()
    if is_folder:
        path = _only_sidecar(path)
    if path.name.lower().endswith(SUFFIX):
        document = read_sidecar(path)
        names = tuple(item["name"] for item in document["files"])
        return Stimulus(path=path, document=document, names=names)
    found = listing(path)
    if found is not None:
        return found
    with told(path):
        path.stat()
    raise FileError(
        where=str(path),
        problem="no sidecar beside it lists this file",
        allowed=f"a stimulus with its sidecar NAME{SUFFIX}, as `wavegen make` writes them",
        remedy="Name the sidecar, or measure the file with `wavegen measure`.",
    )


def listing(path: Path) -> Stimulus | None:
    """Return the stimulus whose sidecar lists a file, None if there is none.

    Parameters
    ----------
    path : Path
        A data file, any other file of it, or the common name of a pair. It need not exist.

    Raises
    ------
    FileError
        A sidecar speaks of it and cannot be read.
    """
    name = path.name
    for sidecar in _sidecars(path.parent):
        if not _mentions(sidecar, name, is_whole=bool(path.suffix)):
            continue
        document = read_sidecar(sidecar)
        for item in document["files"]:
            if name in item["all_names"] or name in _stems(item["all_names"]):
                return Stimulus(path=sidecar, document=document, names=(item["name"],))
    return None


def _stems(names: list[str]) -> set[str]:
    """Return the common name of a pair; a single file has none."""
    stems = {name.rpartition(".")[0] for name in names}
    return stems if len(names) > 1 and len(stems) == 1 else set()


def _sidecars(folder: Path) -> list[Path]:
    with told(folder):
        return sorted(path for path in folder.glob(f"*{SUFFIX}") if not path.is_dir())


def _only_sidecar(folder: Path) -> Path:
    found = _sidecars(folder)
    own = folder / f"{folder.resolve().name}{SUFFIX}"
    if own in found:
        return own
    if len(found) == 1:
        return found[0]
    raise FileError(
        where=str(folder),
        problem=f"holds {len(found) or 'no'} sidecars" + (": which one?" if found else ""),
        allowed=f"a folder with one file that ends in {SUFFIX}",
        remedy=f"Name one of them, such as {found[0].name}." if found else "Check the path.",
    )


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


def _mentions(path: Path, name: str, *, is_whole: bool = True) -> bool:
    """Return whether a sidecar speaks of a file: a damaged one of another file is no matter.

    A name that is not the whole one may go on, as the common name of a pair does.
    """
    try:
        if not path.is_file() or path.stat().st_size > LARGEST_BYTES:
            return False
        quoted = json.dumps(name, ensure_ascii=False)
        return (quoted if is_whole else quoted[:-1]).encode("utf-8", "replace") in path.read_bytes()
    except OSError:  # one that may not be read says nothing
        return False


def recipe_channel(document: dict[str, Any], channel: int = 0) -> int:
    """Return which channel of its recipe a channel of a stimulus is.

    Parameters
    ----------
    document : dict
        A sidecar; a conversion may have taken one of two channels.
    channel : int
        Which of the channels that its files have.
    """
    converted = document.get("converted")
    while converted:
        taken = converted.get("channel")
        if taken is not None:
            return int(taken)
        converted = converted["before"]
    return channel


def loop_warnings(recording: Recording) -> list[str]:
    """Return the warnings about a recording that hold where it repeats: not those on its ends."""
    if not recording.is_real:
        return list(recording.warnings)
    ends = edge_text(recording.path, recording.n_samples)
    return [text for text in recording.warnings if text != ends]


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
        names = [name for item in document["files"] for name in (item["name"], *item["all_names"])]
        names += [item["name"] for item in document["side_information"] or ()]
        outside = next((name for name in names if not _is_plain(name)), None)
        return f"lists {outside[:60]!r}, which is no name beside it" if outside else ""
    return f"is no {FORMAT} sidecar: {fault.json_path}: {fault.message[:120]}"


def _is_plain(name: str) -> bool:
    """Return whether a name stays in its folder, here and on other systems."""
    return name not in {"", ".", ".."} and not set(name) & set("/\\\0")


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
