"""What comes of a tune."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path
from typing import Any, Literal

from wavegen.core.site import Note
from wavegen.production.sidecar import note_rows, versions
from wavegen.recipe.load import LoadedRecipe
from wavegen.tuning.confirm import Confirmation
from wavegen.tuning.evaluation import Evaluation
from wavegen.tuning.reference import Reference
from wavegen.tuning.request import TuneRequest

State = Literal["kept", "missed", "unfinished", "unsuited"]


@dataclass(frozen=True, slots=True, kw_only=True)
class MethodResult:
    """What came of one method.

    Parameters
    ----------
    kind : str
        Its name in recipes.
    state : str
        ``kept``: the limits are kept; ``missed``: nowhere; ``unfinished``: the time was over
        first; ``unsuited``: the method cannot be used.
    best : Evaluation or None
        Of least cost, else nearest to the limits.
    reason : str
        Why it is unsuited.
    is_cut : bool
        Whether the time was over before all its settings were searched.
    """

    kind: str
    state: State
    best: Evaluation | None = None
    reason: str = ""
    is_cut: bool = False


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Tuned:
    """What came of a tune.

    Parameters
    ----------
    loaded : LoadedRecipe
        The original.
    request : TuneRequest
        What was asked for.
    before : Evaluation
        Without a method.
    methods : tuple of MethodResult
        The best first.
    best : Evaluation or None
        None where no method keeps the limits.
    confirmation : Confirmation or None
        Of the best.
    reference : Reference or None
        The projection at the EVM of the best.
    evaluations : tuple of Evaluation
        All that were made, those of earlier runs too.
    n_resumed : int
        How many of them were there already.
    notes : tuple of Note
        What to know.
    channels : str
        Which adjacent channels were measured; empty where none.
    folder : Path
        Where the files are.
    files : tuple of str
        Tuned recipe (where there is one) and record of all evaluations.
    """

    loaded: LoadedRecipe
    request: TuneRequest
    before: Evaluation
    methods: tuple[MethodResult, ...]
    best: Evaluation | None
    confirmation: Confirmation | None
    reference: Reference | None
    evaluations: tuple[Evaluation, ...]
    n_resumed: int
    notes: tuple[Note, ...]
    channels: str
    folder: Path
    files: tuple[str, ...]

    @property
    def nearest(self) -> Evaluation | None:
        """What misses the limits by least; the untouched signal is among it."""
        made = [item.best for item in self.methods if item.best is not None]
        return min([self.before, *made], key=self.request.limits.shortage_db)

    @property
    def is_unfinished(self) -> bool:
        """Whether nothing keeps the limits, and the time was over before all was tried."""
        return self.best is None and any(item.state == "unfinished" for item in self.methods)

    def document(self) -> dict[str, Any]:
        """Return everything but the evaluations as JSON values."""
        request, limits = self.request, self.request.limits
        return {
            "name": self.loaded.name,
            "title": self.loaded.recipe.title,
            "recipe": {
                "file": self.loaded.file,
                "sha256": self.loaded.sha256,
                "overrides": list(self.loaded.overrides),
            },
            "objective": "level_db" if request.device is None else "output_dbm",
            "probability": request.probability,
            "limits": {
                "told": limits.words(),
                "evm_percent": limits.evm_percent,
                "evm_standard": limits.evm_standard,
                "reserve_percent": limits.reserve_percent,
                "aclr_db": limits.aclr_db,
                "keeps_channel_limits": limits.keeps_channel_limits,
                "keeps_mask": limits.keeps_mask,
            },
            "channels": self.channels,
            "device": None if request.device is None else request.device.name,
            "before": self.before.row(),
            "best": None if self.best is None else self.best_row(self.best),
            "nearest": None if self.best or self.nearest is None else self.row(self.nearest),
            "confirmation": None if self.confirmation is None else self.confirmation.row(),
            "reference": None if self.reference is None else self.reference.row(),
            "methods": [self._method_row(item) for item in self.methods],
            "front": [item.text for item in front(self.evaluations)],
            "n_resumed": self.n_resumed,
            "is_unfinished": self.is_unfinished,
            "warnings": note_rows(self.notes),
            "folder": str(self.folder),
            "files": list(self.files),
            "versions": versions(),
        }

    def row(self, found: Evaluation) -> dict[str, Any]:
        """Return an evaluation with its distances from the limits and from the reference."""
        margins = self.request.limits.margins(found)
        bound = self.reference.level_db(found.evm_percent) if self.reference else None
        if found.output_dbm is not None:
            bound = None
        row = found.row()
        row.pop("evm")
        row.pop("aclr")
        return {
            **row,
            "bound_db": None if bound is None else round(bound, 4),
            "over_bound_db": None if bound is None else round(found.level_db - bound, 4),
            "gained_db": round(self.before.cost - found.cost, 4),
            "margin_db": round(margins.least_db, 4),
            "binding": margins.binding,
        }

    def best_row(self, best: Evaluation) -> dict[str, Any]:
        """Return the best with what it is compared with."""
        return {**self.row(best), "level_before_db": self.before.level_db}

    def _method_row(self, item: MethodResult) -> dict[str, Any]:
        return {
            "method": item.kind,
            "state": item.state,
            "reason": item.reason,
            "is_cut": item.is_cut,
            "best": None if item.best is None else self.row(item.best),
        }


def front(evaluations: tuple[Evaluation, ...]) -> list[Evaluation]:
    """Return the evaluations of which no other has both less EVM and less cost, by rising EVM.

    Parameters
    ----------
    evaluations : tuple of Evaluation
        Those that failed are left out.
    """
    kept: list[Evaluation] = []
    for item in sorted(
        (item for item in evaluations if not item.fault),
        key=lambda item: (item.evm_percent, item.cost),
    ):
        if not kept or item.cost < kept[-1].cost:
            kept.append(item)
    return kept
