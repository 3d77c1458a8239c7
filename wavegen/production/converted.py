"""The sidecar of a stimulus that was converted: what stays, what changes, what is checked anew."""

from __future__ import annotations

import math
from dataclasses import dataclass
from fractions import Fraction
from pathlib import Path
from typing import Any

from wavegen.core.errors import FileError, RecipeError, SignalError
from wavegen.core.site import Note
from wavegen.dsp.bursts import Bursts
from wavegen.files.format import Recording
from wavegen.laws.law import Law
from wavegen.laws.term import NoLaw
from wavegen.meters.seam import SeamFigure
from wavegen.production.bench import PathLevel, refuse_overload
from wavegen.production.export import ExportedFile
from wavegen.production.judgement import DEFAULT, judge, law_of
from wavegen.production.law_rows import law_document, process_rows
from wavegen.production.prepare import prepare
from wavegen.production.sidecar import (
    gaussian_reference,
    grid_db,
    note_rows,
    on_figures,
    power_figures,
    rounded,
    seam_row,
    versions,
)
from wavegen.production.stimulus_document import file_row
from wavegen.recipe.load import load_text
from wavegen.stages.channel.gate import on_time

NO_RECIPE = NoLaw(reason="the file has no recipe")


@dataclass(frozen=True, slots=True, kw_only=True)
class Origin:
    """What the recipe in a sidecar still tells of the loop that is converted.

    Parameters
    ----------
    law : Law or NoLaw
        What the power statistics must be; none by name after a change of rate.
    bursts : Bursts or None
        When the loop is on, at its new rate; None if it is never off.
    notes : tuple of str
        What could not be carried over.
    """

    law: Law | NoLaw = NO_RECIPE
    bursts: Bursts | None = None
    notes: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class Change:
    """What a conversion does to the samples.

    Parameters
    ----------
    source : Recording
        What was read.
    sha512 : str
        Of its data file.
    rate_factor : Fraction
        New rate over old.
    gain_db : float
        Power ratio, dB.
    """

    source: Recording
    sha512: str
    rate_factor: Fraction
    gain_db: float

    def document(self, earlier: dict[str, Any] | None) -> dict[str, Any]:
        """Return it as JSON values, with what an earlier conversion did."""
        source = self.source
        return {
            "from": source.path.name,
            "format": source.format,
            "datatype": source.datatype.name,
            "sha512": self.sha512,
            "sample_rate_hz": float(source.sample_rate_hz),
            "n_samples": source.n_samples,
            "rate_factor": str(self.rate_factor),
            "gain_db": rounded(self.gain_db),
            "before": earlier,
        }


def origin_of(document: dict[str, Any], *, folder: Path, rate_factor: Fraction) -> Origin:
    """Read the recipe in a sidecar again, for what is compared anew.

    Parameters
    ----------
    document : dict
        The sidecar of the source.
    folder : Path
        Where its data files may be found.
    rate_factor : Fraction
        New rate over old.

    Returns
    -------
    Origin
    """
    recipe = document["recipe"]
    has_law, is_gated = document["law"] is not None, document["on_time"] is not None
    notes = []
    if has_law and rate_factor != 1:
        notes.append("the law of the recipe is not compared after a change of rate")
    if has_law and rate_factor != 1:
        none = NoLaw(reason="the law of the recipe is not compared after a change of rate")
    else:
        none = NoLaw(reason=document["no_law"] or "the law could not be carried over")
    if not is_gated and (not has_law or rate_factor != 1):
        return Origin(law=none, notes=tuple(notes))
    try:
        loaded = load_text(
            recipe["text"], name=recipe["name"], overrides=recipe["overrides"], folder=folder
        )
        prepared = prepare(loaded)
        law = law_of(prepared)
        bursts = on_time(prepared.built.signal)
    except (RecipeError, FileError, SignalError) as error:
        lost = [
            word
            for word, is_lost in (("law", has_law and rate_factor == 1), ("on-time", is_gated))
            if is_lost
        ]
        notes.append(
            f"the {' and the '.join(lost)} could not be carried over: the recipe in the sidecar "
            f"cannot be built here ({error})"
        )
        return Origin(law=none, notes=tuple(notes))
    for earlier in _earlier_factors(document):
        rate_factor *= earlier
    if rate_factor != 1:
        moved = bursts.resampled(rate_factor) if bursts else None
        return Origin(law=none, bursts=moved, notes=tuple(notes))
    return Origin(law=law if has_law else none, bursts=bursts)


def _earlier_factors(document: dict[str, Any]) -> list[Fraction]:
    found = []
    converted = document.get("converted")
    while converted:
        found.append(Fraction(converted["rate_factor"]))
        converted = converted["before"]
    return found


def converted_document(
    before: dict[str, Any],
    file: ExportedFile,
    change: Change,
    *,
    origin: Origin,
    seam: SeamFigure,
    notes: list[Note],
) -> dict[str, Any]:
    """Return the sidecar of a converted stimulus.

    Parameters
    ----------
    before : dict
        The sidecar of the source.
    file : ExportedFile
        What was written; everything measured is measured on its codes.
    change : Change
        What was done.
    origin : Origin
        From :func:`origin_of`.
    seam : SeamFigure
        Of the written codes.
    notes : list of Note
        What is doubtful about the conversion.

    Returns
    -------
    dict
        Valid by :func:`wavegen.production.sidecar.schema`.

    Raises
    ------
    TargetMissed
        A rating of the bench would be exceeded.
    """
    codes = file.channels[0]
    duty = float(origin.bursts.duty) if origin.bursts else None
    judgement = judge(origin.law, codes, file.datatype, DEFAULT)
    rate_hz = change.source.sample_rate_hz * change.rate_factor
    cycle = before["loop"]["cycle_samples"] * change.rate_factor
    notes = [*notes, *_left_behind(before)]
    return before | {
        "versions": versions(),
        "sample_rate_hz": float(rate_hz),
        "sample_rate_exact_hz": str(rate_hz),
        "n_samples": codes.statistics.n_samples,
        "duration_s": float(codes.statistics.n_samples / rate_hz),
        "loop": {"cycle_samples": cycle.numerator, "seam": seam_row(seam)},
        "scaling": _scaling(before["scaling"], codes, change),
        "second_channel": None,
        "side_information": None,
        "warnings": before["warnings"] + note_rows([n for n in notes if n.kind == "warning"]),
        "notes": before["notes"] + note_rows([n for n in notes if n.kind == "info"]),
        **power_figures(codes.statistics, codes.peak),
        "on_time": on_figures(codes, duty),
        "reference": gaussian_reference(grid_db(codes.statistics)),
        "process": process_rows(codes),
        "law": law_document(origin.law, judgement),
        "no_law": origin.law.reason if isinstance(origin.law, NoLaw) else None,
        "bench": _bench(before["bench"], file),
        "files": [file_row(file, [duty], [judgement])],
        "converted": change.document(before.get("converted")),
    }


def _left_behind(before: dict[str, Any]) -> list[Note]:
    """Note the tables of side information, which stay beside the source."""
    names = [item["name"] for item in before["side_information"] or ()]
    if not names:
        return []
    text = f"receivers still need {' and '.join(names)}, which stay beside the source"
    return [Note(kind="info", where="side_information", text=text)]


def _scaling(before: dict[str, Any], codes: Any, change: Change) -> dict[str, Any]:
    """Return where the peaks and the average stand now; rails after a change of rate unknown."""
    peak_db = 10 * math.log10(codes.peak.power)
    is_same_rate = change.rate_factor == 1
    rails = {
        key: rounded(before[key] + change.gain_db)
        if is_same_rate and before[key] is not None
        else None
        for key in ("i_peak_dbfs", "q_peak_dbfs")
    }
    return {
        "gain_db": rounded(before["gain_db"] + change.gain_db),
        "peak_dbfs": rounded(peak_db),
        "average_dbfs": rounded(codes.statistics.mean_db),
        **rails,
    }


def _no_limits(row: dict[str, Any]) -> dict[str, Any]:
    """Return the ratings that every place is asked for, where a row leaves them out."""
    return {key: None for key in ("average_limit_dbm", "peak_limit_dbm") if key not in row}


def _bench(before: dict[str, Any] | None, file: ExportedFile) -> dict[str, Any] | None:
    """Return the levels along the path with the peak of what was written."""
    if before is None:
        return None
    codes = file.channels[0]
    is_burst = before["averaged_over"] == "burst" and codes.on_statistics is not None
    statistics = codes.on_statistics if is_burst else codes.statistics
    assert statistics is not None  # noqa: S101 - asked above
    papr_db = 10 * math.log10(codes.peak.power) - statistics.mean_db
    rows = []
    for row in before["path"]:
        if row.get("channel", 0) != 0:
            continue
        peak_dbm = rounded(row["average_dbm"] + papr_db, 3)
        moved = {"peak_envelope_dbm": peak_dbm}
        if "mixer_peak_dbm" in row:
            rise = peak_dbm - row["peak_envelope_dbm"]
            moved["mixer_peak_dbm"] = rounded(row["mixer_peak_dbm"] + rise, 3)
        rows.append({key: value for key, value in (row | moved).items() if key != "channel"})
    levels = [PathLevel(**row, **_no_limits(row), number=n) for n, row in enumerate(rows)]
    refuse_overload(levels, accepted=before.get("accepted_risks", ()))
    return before | {"path": rows}
