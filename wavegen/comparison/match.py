"""Is the stimulus like the field? One curve against the other, as a document."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

from wavegen.comparison.curves import Curve
from wavegen.comparison.difference import (
    DOWN_TO,
    TOLERANCE_DB,
    Difference,
    Verdict,
    as_recorded,
    compare,
)
from wavegen.comparison.look_alike import LookAlike, look_alikes
from wavegen.comparison.match_document import (
    figure,
    look_document,
    needed_documents,
    recorded_document,
    row_document,
    side_document,
    spectrum_document,
)
from wavegen.comparison.match_words import called, statement
from wavegen.comparison.needed_samples import Needed, needed_samples
from wavegen.comparison.off_times import off_time_doubts
from wavegen.comparison.side import Side, SideSettings
from wavegen.comparison.sides import open_side
from wavegen.comparison.spectra import (
    SideSpectrum,
    SpectrumDifference,
    refuse_too_narrow,
    side_spectrum,
    spectrum_difference,
    spectrum_warnings,
)
from wavegen.core.allocation import keep_large_blocks
from wavegen.core.progress import Progress, silent
from wavegen.production.sidecar import FORMAT, rounded, versions

PROCESSES = "loops as they are, recordings as samples of what was recorded"
RECORDS = "both sides as recorded: these samples, not what they are samples of"
QUIET = "levels below -20 dB count as -20 dB: how quiet an off-time is does not matter"


@dataclass(frozen=True, slots=True, kw_only=True)
class MatchSettings:
    """What a match means.

    Parameters
    ----------
    tolerance_db : float
        Largest difference of levels that still is a match.
    down_to : float
        Least probability compared.
    is_of_records : bool
        Whether recordings are compared as they stand, exactly, and not as samples of what was
        recorded: each as if it were a loop. Points of a curve stay as unsure as they are.
    looks : bool
        Whether familiar laws near the field's curve are wanted.
    """

    tolerance_db: float = TOLERANCE_DB
    down_to: float = DOWN_TO
    is_of_records: bool = False
    looks: bool = True


DEFAULT = MatchSettings()


def match(
    stimulus: SideSettings,
    field: SideSettings,
    settings: MatchSettings = DEFAULT,
    *,
    workers: int = 1,
    progress: Progress = silent,
) -> dict[str, Any]:
    """Compare the power statistics of a stimulus and of the field.

    Parameters
    ----------
    stimulus, field : SideSettings
        Both sides.
    settings : MatchSettings
        What a match means.
    workers, progress
        As in :func:`wavegen.core.render.render`.

    Returns
    -------
    dict
        JSON values; ``verdict`` is ``match``, ``differ`` or ``undecided``. Differences are those
        of the stimulus from the field: positive where the stimulus is the more stressful.

    Raises
    ------
    FileError, RecipeError, SignalError
        A side cannot be read, made or measured, or cannot hold what the other one is.
    ArgumentsError
        A setting that means nothing.
    """
    keep_large_blocks()
    first, second = (
        open_side(side, workers=workers, progress=progress) for side in (stimulus, field)
    )
    sides = first, second
    recorded = _difference(as_recorded(first.curve), as_recorded(second.curve), settings)
    found = recorded
    plans: tuple[Needed, ...] = ()
    if not settings.is_of_records:
        found = _difference(first.curve, second.curve, settings)
        plans = needed_samples(first.curve, second.curve, found)
    reason = "" if settings.is_of_records else _fault_reason(sides, found, recorded)
    verdict: Verdict = "differ" if reason else found.verdict
    said = reason or statement(found, recorded, plans, sides, is_of_records=settings.is_of_records)
    needed = [] if reason else needed_documents(plans, sides, ("stimulus", "field"))
    spectrum = [side_spectrum(side, workers=workers, progress=progress) for side in sides]
    spectra = _spectra(sides, spectrum)
    looks: tuple[LookAlike, ...] = ()
    if settings.looks:
        lowest = _lowest(second, settings.down_to)
        looks = look_alikes(second.curve, lowest=lowest) if lowest is not None else ()
    width_hz = spectrum[1].occupied.width_hz if spectrum[1] else None
    doubts = spectrum_warnings(sides, spectra) if spectra else []
    warnings = [
        (name, text)
        for side, name in zip(sides, called(*sides), strict=True)
        for text in side.warnings
    ] + [("comparison", text) for text in [*doubts, *off_time_doubts(sides)]]
    return {
        "format": f"{FORMAT}.match",
        "version": 1,
        "verdict": verdict,
        "statement": said,
        "compares": RECORDS if settings.is_of_records else PROCESSES,
        "tolerance_db": found.tolerance_db,
        "down_to": found.down_to,
        "largest_difference_db": figure(found.largest_db),
        "largest_at": found.largest_at,
        "resolved_to": found.resolved_to,
        "decisive": row_document(found.decisive) if found.decisive else None,
        "levels": [row_document(row) for row in found.rows],
        "levels_are": f"over each side's own mean; {QUIET}",
        "mean_difference": _mean_difference(first, second),
        "as_recorded": recorded_document(recorded),
        "needed": needed[0] if needed else None,
        "needed_otherwise": needed[1] if len(needed) > 1 else None,
        "stimulus": side_document(first),
        "field": side_document(second),
        "spectrum": spectrum_document(spectra) if spectra else None,
        "looks_like": [look_document(item, width_hz) for item in looks],
        "versions": versions(),
        "warnings": [{"kind": "warning", "where": where, "text": text} for where, text in warnings],
    }


def _difference(first: Curve, second: Curve, settings: MatchSettings) -> Difference:
    return compare(first, second, tolerance_db=settings.tolerance_db, down_to=settings.down_to)


def _fault_reason(sides: tuple[Side, Side], found: Difference, recorded: Difference) -> str:
    """Return why fill words make two sides differ; empty if they do not.

    They are no part of the process that a recording samples, so that no interval about it
    allows for them.
    """
    faulty = max(range(2), key=lambda k: sides[k].fault_db)
    lifted_db = sides[faulty].fault_db
    if recorded.verdict != "differ" or lifted_db <= recorded.tolerance_db:
        return ""
    largest = f" (by up to {found.largest_db:+.2f} dB)" if found.largest_db is not None else ""
    return (
        f"differ: fill words lift the mean of {called(*sides)[faulty]} by {lifted_db:.2f} dB, so "
        f"that its levels are off by as much{largest}; leave them out with --from"
    )


def _lowest(side: Side, down_to: float) -> float | None:
    """Return the least probability of the usual series that one side resolves."""
    rows = compare(side.curve, side.curve, tolerance_db=1.0, down_to=down_to)
    return rows.resolved_to


def _spectra(
    sides: tuple[Side, Side], spectra: Sequence[SideSpectrum | None]
) -> SpectrumDifference | None:
    if spectra[0] is None or spectra[1] is None:
        return None
    found = spectrum_difference(spectra[0], spectra[1])
    refuse_too_narrow(sides, found)
    return found


def _mean_difference(first: Side, second: Side) -> dict[str, Any] | None:
    """Return the difference of the means where both are absolute, with its interval."""
    if first.scale != "dBm" or second.scale != "dBm":
        return None
    means = first.mean_db, second.mean_db
    if means[0] is None or means[1] is None:
        return None
    difference = means[0] - means[1]
    down = math.hypot(
        means[0] - _or(first.mean_low_db, means[0]), _or(second.mean_high_db, means[1]) - means[1]
    )
    up = math.hypot(
        _or(first.mean_high_db, means[0]) - means[0], means[1] - _or(second.mean_low_db, means[1])
    )
    return {
        "difference_db": rounded(difference, 4),
        "low_db": rounded(difference - down, 4),
        "high_db": rounded(difference + up, 4),
    }


def _or(value: float | None, other: float) -> float:
    return other if value is None else value
