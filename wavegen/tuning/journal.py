"""Every evaluation of a tune in a file, so that one that was interrupted goes on where it stood."""

from __future__ import annotations

import hashlib
import json
import os
import secrets
from collections.abc import Mapping
from pathlib import Path
from typing import Any

from wavegen import __version__
from wavegen.core.errors import FileError
from wavegen.files.faults import told
from wavegen.recipe.dump import dump
from wavegen.recipe.load import LoadedRecipe
from wavegen.tuning.evaluation import Evaluation
from wavegen.tuning.request import TuneRequest

FORMAT = "wavegen.tuning"
VERSION = 1
MOST_BYTES = 64 * 1024 * 1024


def key_of(loaded: LoadedRecipe, request: TuneRequest) -> dict[str, Any]:
    """Return what evaluations depend on, as JSON values.

    Parameters
    ----------
    loaded : LoadedRecipe
        The recipe on which the search is made.
    request : TuneRequest
        Of it counts how things are measured; limits only where an amplifier is driven by them.
    """
    measured = f"{request.fidelity!r} {request.probability!r}"
    key = {
        "program": __version__,
        "recipe": hashlib.sha256(dump(loaded.recipe).encode()).hexdigest(),
        "measured": hashlib.sha256(measured.encode()).hexdigest(),
    }
    if request.device is not None:
        with told(request.device):
            key["device"] = hashlib.sha256(request.device.read_bytes()).hexdigest()
        key["limits"] = request.limits.words()
    return key


class Journal:
    """Evaluations by the text of their stage, on disk after each.

    Parameters
    ----------
    path : Path
        The file; its folder is there.
    key : mapping
        What the evaluations depend on, as JSON values: recipe, data, what is measured.
    overwrite : bool
        Whether a file with another key is replaced.

    Raises
    ------
    FileError
        The file is there and is no such journal, or has another key.
    """

    def __init__(self, path: Path, key: Mapping[str, Any], *, overwrite: bool = False) -> None:
        self.path = path
        self._key: dict[str, Any] = json.loads(json.dumps(dict(key)))
        self._known: dict[str, Evaluation] = {}
        self.n_resumed = 0
        if path.exists():
            self._read(overwrite=overwrite)

    def _read(self, *, overwrite: bool) -> None:
        with told(self.path):
            data = self.path.read_bytes()[: MOST_BYTES + 1]
        try:
            document = json.loads(data)
            is_same = document["format"] == FORMAT and document["key"] == self._key
            rows = [Evaluation.of(row) for row in document["evaluations"]] if is_same else []
        except (ValueError, KeyError, TypeError) as error:
            if overwrite:
                return
            raise self._refusal(problem="is no record of a tune") from error
        if not is_same and not overwrite:
            raise self._refusal(problem="is of another recipe, or of other data or meters")
        self._known = {row.text: row for row in rows}
        self.n_resumed = len(rows)

    def _refusal(self, *, problem: str) -> FileError:
        return FileError(
            where=str(self.path),
            problem=problem,
            allowed="a new name, or the record of the same recipe, which is gone on with",
            remedy="Give --overwrite to begin anew, or choose another output folder.",
        )

    @property
    def evaluations(self) -> tuple[Evaluation, ...]:
        """All so far, in the order in which they were made."""
        return tuple(self._known.values())

    def find(self, text: str) -> Evaluation | None:
        """Return what is known of a stage."""
        return self._known.get(text)

    def add(self, evaluation: Evaluation) -> None:
        """Take in one more, and write all to disk."""
        self._known[evaluation.text] = evaluation
        self.write({})

    def write(self, more: Mapping[str, Any]) -> None:
        """Write the file whole: under another name first, then renamed.

        Parameters
        ----------
        more : mapping
            What stands before the evaluations: the results, once there are any.
        """
        document = {
            "format": FORMAT,
            "version": VERSION,
            "key": self._key,
            "is_complete": bool(more),
            **more,
            "evaluations": [item.row() for item in self._known.values()],
        }
        text = json.dumps(document, indent=1, allow_nan=False, ensure_ascii=False)
        draft = self.path.with_name(f".{self.path.name}.{secrets.token_hex(6)}.part")
        with told(self.path):
            try:
                with draft.open("x", encoding="utf-8") as handle:
                    handle.write(text + "\n")
                    handle.flush()
                    os.fsync(handle.fileno())
                draft.replace(self.path)
            finally:
                draft.unlink(missing_ok=True)
